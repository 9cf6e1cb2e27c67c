"""Dimensions of standard round winding wires as printed, in the units in which they are printed.

NEMA MW 1000 (AWG sizes, mil): the bare diameters of AWG 20 to 40, the least increase by the
enamel and the largest overall diameter of the single build follow a wire maker's reproduction of
the standard; the heavy build from AWG 24 and all of AWG 41 to 46 follow an open data set of
standard wires that reproduces the same standard in millimetres.

IEC 60317-0-1 (metric sizes, µm): overall diameters to 500 µm follow the same open data set and,
where they were compared, a second wire maker's table; above that, the standard's table of least
increase and largest overall diameter. Intermediate sizes above 500 µm (530, 600, 670, 750, 850,
950) take the allowances of the next larger size, as the standard lets intermediate sizes do.
"""

from typing import Final, NamedTuple


class NemaRow(NamedTuple):
    """One AWG size: bare least/nominal/largest and overall least/largest by build, in mil."""

    bare: tuple[float, float, float]
    single: tuple[float, float]
    heavy: tuple[float, float]


class IecRow(NamedTuple):
    """One metric size, in µm.

    `tolerance` of the bare diameter is None where the standard limits the resistance instead.
    """

    tolerance: float | None
    grade_1: tuple[float, float]
    grade_2: tuple[float, float]


NEMA_MW_1000: Final[dict[int, NemaRow]] = {
    20: NemaRow((31.7, 32.0, 32.2), (32.9, 33.9), (34.0, 35.2)),
    21: NemaRow((28.2, 28.5, 28.6), (29.3, 30.3), (30.4, 31.6)),
    22: NemaRow((25.0, 25.3, 25.4), (26.1, 27.0), (27.1, 28.1)),
    23: NemaRow((22.4, 22.6, 22.7), (23.4, 24.3), (24.4, 25.4)),
    24: NemaRow((19.9, 20.1, 20.2), (20.9, 21.7), (21.8, 22.7)),
    25: NemaRow((17.7, 17.9, 18.0), (18.6, 19.4), (19.5, 20.3)),
    26: NemaRow((15.7, 15.9, 16.0), (16.6, 17.3), (17.4, 18.2)),
    27: NemaRow((14.1, 14.2, 14.3), (14.9, 15.6), (15.7, 16.4)),
    28: NemaRow((12.5, 12.6, 12.7), (13.3, 14.0), (14.1, 14.7)),
    29: NemaRow((11.2, 11.3, 11.4), (11.9, 12.6), (12.7, 13.3)),
    30: NemaRow((9.9, 10.0, 10.1), (10.6, 11.2), (11.3, 11.9)),
    31: NemaRow((8.8, 8.9, 9.0), (9.4, 10.0), (10.1, 10.8)),
    32: NemaRow((7.9, 8.0, 8.1), (8.5, 9.1), (9.1, 9.8)),
    33: NemaRow((7.0, 7.1, 7.2), (7.5, 8.1), (8.1, 8.8)),
    34: NemaRow((6.2, 6.3, 6.4), (6.7, 7.2), (7.2, 7.8)),
    35: NemaRow((5.5, 5.6, 5.7), (5.9, 6.4), (6.4, 7.0)),
    36: NemaRow((4.9, 5.0, 5.1), (5.3, 5.8), (5.7, 6.3)),
    37: NemaRow((4.4, 4.5, 4.6), (4.7, 5.2), (5.2, 5.7)),
    38: NemaRow((3.9, 4.0, 4.1), (4.2, 4.7), (4.6, 5.1)),
    39: NemaRow((3.4, 3.5, 3.6), (3.6, 4.1), (4.0, 4.5)),
    40: NemaRow((3.0, 3.1, 3.2), (3.2, 3.7), (3.6, 4.0)),
    41: NemaRow((2.7, 2.8, 2.9), (2.9, 3.3), (3.2, 3.6)),
    42: NemaRow((2.4, 2.5, 2.6), (2.6, 3.0), (2.8, 3.2)),
    43: NemaRow((2.1, 2.2, 2.3), (2.3, 2.6), (2.5, 2.9)),
    44: NemaRow((1.9, 2.0, 2.1), (2.1, 2.4), (2.3, 2.7)),
    45: NemaRow((1.69, 1.76, 1.83), (1.79, 2.05), (1.99, 2.30)),
    46: NemaRow((1.51, 1.57, 1.64), (1.61, 1.85), (1.81, 2.10)),
}

# The largest heavy-build diameter of AWG 20 to 23 was not seen in print. It is the seen nominal
# plus as much as the nominal exceeds the least, which holds for every finer printed row.
NEMA_HEAVY_BY_RULE: Final = frozenset({20, 21, 22, 23})

IEC_60317_0_1: Final[dict[float, IecRow]] = {
    20: IecRow(None, (22, 24), (25, 27)),
    21: IecRow(None, (23, 26), (27, 28)),
    22: IecRow(None, (24, 27), (28, 30)),
    23: IecRow(None, (25, 28), (29, 31)),
    24: IecRow(None, (26, 29), (30, 32)),
    25: IecRow(None, (28, 31), (32, 34)),
    27: IecRow(None, (30, 33), (34, 36)),
    28: IecRow(None, (31, 34), (35, 38)),
    30: IecRow(None, (33, 37), (38, 41)),
    32: IecRow(None, (35, 39), (40, 43)),
    34: IecRow(None, (37, 41), (42, 46)),
    36: IecRow(None, (40, 44), (45, 49)),
    38: IecRow(None, (42, 46), (47, 51)),
    40: IecRow(None, (44, 49), (50, 54)),
    43: IecRow(None, (47, 52), (53, 58)),
    45: IecRow(None, (50, 55), (56, 61)),
    48: IecRow(None, (53, 59), (60, 64)),  # a national adoption prints 65 for the largest grade 2
    50: IecRow(None, (55, 60), (61, 66)),
    53: IecRow(None, (58, 64), (65, 70)),
    56: IecRow(None, (62, 67), (68, 74)),
    60: IecRow(None, (66, 72), (73, 79)),
    63: IecRow(None, (69, 76), (77, 83)),
    67: IecRow(3, (74, 80), (81, 88)),
    70: IecRow(3, (77, 83), (84, 90)),
    71: IecRow(3, (78, 84), (85, 91)),
    75: IecRow(3, (82, 89), (90, 95)),
    80: IecRow(3, (87, 94), (95, 101)),
    85: IecRow(3, (93, 100), (101, 107)),
    90: IecRow(3, (98, 105), (106, 113)),
    95: IecRow(3, (103, 111), (112, 119)),
    100: IecRow(3, (108, 117), (118, 125)),
    106: IecRow(3, (115, 123), (124, 132)),
    110: IecRow(3, (119, 128), (129, 137)),
    112: IecRow(3, (121, 130), (131, 139)),
    118: IecRow(3, (128, 136), (137, 145)),
    120: IecRow(3, (130, 138), (139, 148)),
    125: IecRow(3, (135, 144), (145, 154)),
    130: IecRow(3, (141, 150), (151, 160)),
    132: IecRow(3, (143, 152), (153, 162)),
    140: IecRow(3, (151, 160), (161, 171)),
    150: IecRow(3, (162, 171), (172, 182)),
    160: IecRow(3, (172, 182), (183, 194)),
    170: IecRow(3, (183, 194), (195, 205)),
    180: IecRow(3, (193, 204), (205, 217)),
    190: IecRow(3, (204, 216), (217, 228)),
    200: IecRow(3, (214, 226), (227, 239)),
    212: IecRow(3, (227, 240), (241, 254)),
    224: IecRow(3, (239, 252), (253, 266)),
    236: IecRow(4, (253, 267), (268, 283)),
    250: IecRow(4, (267, 281), (282, 297)),
    265: IecRow(4, (283, 297), (298, 314)),
    280: IecRow(4, (298, 312), (313, 329)),
    300: IecRow(4, (319, 334), (335, 352)),
    315: IecRow(4, (334, 349), (350, 367)),
    335: IecRow(4, (355, 372), (373, 391)),
    355: IecRow(4, (375, 392), (393, 411)),
    375: IecRow(5, (396, 414), (415, 434)),
    400: IecRow(5, (421, 439), (440, 459)),
    425: IecRow(5, (447, 466), (467, 488)),
    450: IecRow(5, (472, 491), (492, 513)),
    475: IecRow(5, (499, 519), (520, 541)),
    500: IecRow(5, (524, 544), (545, 566)),
    530: IecRow(6, (555, 576), (577, 600)),
    560: IecRow(6, (585, 606), (607, 630)),
    600: IecRow(6, (627, 649), (650, 674)),
    630: IecRow(6, (657, 679), (680, 704)),
    670: IecRow(7, (698, 722), (723, 749)),
    710: IecRow(7, (738, 762), (763, 789)),
    750: IecRow(8, (780, 805), (806, 834)),
    800: IecRow(8, (830, 855), (856, 884)),
    850: IecRow(9, (882, 909), (910, 939)),
    900: IecRow(9, (932, 959), (960, 989)),
    950: IecRow(10, (984, 1012), (1013, 1044)),
    1000: IecRow(10, (1034, 1062), (1063, 1094)),
}

IEC_OVERALL_BY_RULE: Final = frozenset({530, 600, 670, 750, 850, 950})

# Resistance limits printed by a wire maker after the standard, ohm/m at 20 °C (least, largest).
IEC_RESISTANCE_LIMITS: Final[dict[float, tuple[float, float]]] = {
    30: (21.76, 26.60),
    32: (19.13, 23.38),
    38: (13.6105, 16.5346),
    40: (12.28, 14.92),
    45: (9.705, 11.79),
    50: (7.922, 9.489),
    53: (7.0509, 8.4456),
    56: (6.316, 7.565),
    60: (5.562, 6.529),
    63: (5.045, 5.922),
}

# The other sizes that are limited by resistance: nominal ± this share, up to and including the
# size. The printed rows above have exactly these shares; where the share changes between two
# printed rows (at 34 and 36 µm, and at 48 µm) the place of the change is from memory.
IEC_RESISTANCE_SHARES: Final[tuple[tuple[float, float], ...]] = (
    (34, 0.100),
    (45, 0.097),
    (56, 0.090),
    (63, 0.080),
)
