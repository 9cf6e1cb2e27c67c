"""Inductance of air coils: circles, current sheets, and coils with a section of their own."""

from collections.abc import Sequence
from dataclasses import replace
from functools import lru_cache

from service.physics.arguments import non_negative
from service.physics.circles import (
    mutual_inductance_of_circles,
    nagaoka_coefficient,
    solenoid_inductance,
)
from service.physics.neumann import height_lags, profile_lags
from service.physics.section import WindingSection
from service.physics.section_pairs import mutual_per_turns

__all__ = [
    "WindingSection",
    "coil_inductance",
    "mutual_inductance_of_circles",
    "mutual_inductance_of_coils",
    "nagaoka_coefficient",
    "solenoid_inductance",
    "uneven_coil_inductance",
]


def coil_inductance(section: WindingSection, turns: float) -> float:
    """Return the inductance of an air coil whose turns fill its section evenly.

    Args:
        section: shape of the coil.
        turns: number of turns, whole or not.

    Returns:
        Inductance in H.

    Raises:
        ValueError: turns negative or not finite, or `section` is not a WindingSection.

    Neumann's integral with uniform current density over build and height, along straight sides
    and corners alike. The logarithmic part is integrated in closed form or spread by
    substitution; the relative error is below 1e-9 for the shapes of a workshop, and below 2e-7
    for any shape (sides, radii, build and height anywhere from micrometres to a metre).

    The current of a real winding flows in round wires with gaps between them. Maxwell's
    correction for that (Treatise, art. 693) adds mu0/(2 pi) N times the turn length times
    ln(pitch/wire diameter) + 0.15: 0.002 % for thousands of turns, 0.2 % for a few dozen. What
    an uneven lay changes is larger.
    """
    n = non_negative("turns", turns)
    return n * n * _inductance_per_turn_squared(_checked("section", section))


def uneven_coil_inductance(
    section: WindingSection, turns: float, shares: Sequence[Sequence[float]]
) -> float:
    """Return the inductance of an air coil whose turns lie unevenly in its section.

    Args:
        section: shape that holds all turns.
        turns: number of turns.
        shares: relative numbers of turns in equal cells of the section: one row for each step of
            build from the inside out, in each row one number for each step of height. A single
            row gives a profile over the height alone. Only the proportions matter.

    Returns:
        Inductance in H.

    Raises:
        ValueError: rows of different lengths or none, a share negative or not finite, or no
            share above zero.

    Same integral as `coil_inductance`, with the density uniform in each cell. The time grows
    with the cells of a row and with the square of the rows: one row of ten takes a tenth of a
    second, three rows of ten half a second.
    """
    n = non_negative("turns", turns)
    rows = _checked_shares(shares)
    shape = _checked("section", section)
    step = shape.build / len(rows)
    rings = [
        replace(
            shape,
            inner_radius=shape.inner_radius + i * step,
            outer_radius=shape.inner_radius + (i + 1) * step,
        )
        for i in range(len(rows))
    ]
    slice_height = shape.height / len(rows[0])
    total = 0.0
    for i, row in enumerate(rows):
        for j in range(i, len(rows)):
            if any(row) and any(rows[j]):
                lags = profile_lags(row, rows[j], slice_height)
                total += (1.0 if i == j else 2.0) * mutual_per_turns(rings[i], rings[j], lags)
    return n * n * total


def _checked_shares(shares: Sequence[Sequence[float]]) -> list[list[float]]:
    rows = [[non_negative("shares", share) for share in row] for row in shares]
    if not rows or not rows[0] or any(len(row) != len(rows[0]) for row in rows):
        raise ValueError(f"shares must be rows of one length, got {shares!r}")
    whole = sum(map(sum, rows))
    if whole <= 0.0:
        raise ValueError(f"shares must have one above zero, got {shares!r}")
    return [[share / whole for share in row] for row in rows]


def mutual_inductance_of_coils(
    coil_a: WindingSection,
    turns_a: float,
    coil_b: WindingSection,
    turns_b: float,
    distance: float,
) -> float:
    """Return the mutual inductance of two coaxial coils in parallel planes, in air.

    Args:
        coil_a, coil_b: shapes with the same straight sides, wound in the same sense.
        turns_a, turns_b: numbers of turns.
        distance: between their mid-planes, m.

    Returns:
        Mutual inductance in H.

    Raises:
        ValueError: different straight sides, or an argument negative or not finite.

    Same integral as `coil_inductance`, which it equals for a coil with itself at distance 0. The
    relative error is below 1e-8 up to a distance of ten times the coil's size; further away it
    grows with the fourth power of the distance, because the integral around a turn cancels.
    """
    a, b = _checked("coil_a", coil_a), _checked("coil_b", coil_b)
    product = non_negative("turns_a", turns_a) * non_negative("turns_b", turns_b)
    apart = non_negative("distance", distance)
    for name in ("straight_x", "straight_y"):
        if getattr(a, name) != getattr(b, name):
            raise ValueError(
                f"coil_b must have the {name} of coil_a ({getattr(a, name)!r}), "
                f"got {getattr(b, name)!r}"
            )
    return product * mutual_per_turns(a, b, height_lags(a.height, b.height, apart))


def _checked(name: str, section: WindingSection) -> WindingSection:
    if not isinstance(section, WindingSection):
        raise ValueError(f"{name} must be a WindingSection, got {section!r}")
    return section


@lru_cache(maxsize=4096)
def _inductance_per_turn_squared(section: WindingSection) -> float:
    lags = height_lags(section.height, section.height, 0.0)
    return mutual_per_turns(section, section, lags)
