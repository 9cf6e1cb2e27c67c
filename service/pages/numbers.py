"""Numbers as people type them, and numbers as people read them.

Typed: the decimal mark is a comma or a point, never both; a unit or prefix may follow where the
field's unit makes it clear. Shown: a decimal point, a thin space between thousands (ISO 80000-1).
"""

import math
import re
from dataclasses import dataclass
from types import MappingProxyType

from service.errors import InvalidValue

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:[.,][0-9]*)?|[.,][0-9]+)(?:[eE][+-]?[0-9]{1,2})?")
_GROUPED = re.compile(r"[+-]?[0-9]{1,3}(?: [0-9]{3})+(?![0-9])")
_SPACES = "\u00a0\u202f\u2009"
_THIN = "\u202f"


@dataclass(frozen=True)
class Unit:
    """The unit of a field, and what may be typed after the number: ending → factor."""

    symbol: str
    endings: MappingProxyType[str, float]


def _unit(symbol: str, endings: dict[str, float]) -> Unit:
    return Unit(symbol, MappingProxyType({"": 1.0, **endings}))


def _spelled(names: tuple[str, ...], prefixes: dict[str, float]) -> dict[str, float]:
    return {prefix + name: factor for prefix, factor in prefixes.items() for name in names}


_OHM = ("Ω", "ohm", "ohms", "Ohm", "Ohms", "OHM")
OHM = _unit(
    "Ω",
    {
        **_spelled(_OHM, {"": 1.0, "m": 1e-3, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9}),
        "k": 1e3,
        "K": 1e3,
        "M": 1e6,
        "G": 1e9,
    },
)
OHM_PER_METRE = _unit("Ω/m", _spelled(tuple(f"{name}/m" for name in _OHM), {"": 1.0}))
HENRY = _unit("H", _spelled(("H",), {"": 1.0, "m": 1e-3, "µ": 1e-6, "u": 1e-6}))
HERTZ = _unit(
    "Hz",
    {**_spelled(("Hz", "hz", "HZ"), {"": 1.0, "k": 1e3, "K": 1e3, "M": 1e6}), "k": 1e3, "K": 1e3},
)
CELSIUS = _unit("°C", {"°C": 1.0, "C": 1.0, "°": 1.0})
MILLIMETRE = _unit("mm", {"mm": 1.0, "µm": 1e-3, "um": 1e-3, "cm": 10.0})
METRE = _unit("m", {"m": 1.0, "km": 1e3, "cm": 1e-2, "mm": 1e-3})
KILOGRAM = _unit("kg", {"kg": 1.0, "g": 1e-3})
NEWTON = _unit("N", {"N": 1.0, "mN": 1e-3, "cN": 1e-2, "gf": 9.80665e-3})
TESLA = _unit("T", {"T": 1.0, "mT": 1e-3})
PERCENT = _unit("%", {"%": 1.0})
RPM = _unit("rpm", {"rpm": 1.0, "1/min": 1.0, "/min": 1.0})
TURNS = _unit("turns", {"turns": 1.0, "turn": 1.0, "t": 1.0})
PLAIN = _unit("", {})


def read_number(text: str, unit: Unit = PLAIN, pointer: str = "") -> float:
    """The number in a typed text, in the field's own unit.

    Raises InvalidValue with a sentence for a mix of comma and point, for text, and for a unit
    that does not belong to the field.
    """
    typed = text.strip()
    for space in _SPACES:
        typed = typed.replace(space, " ")
    typed = typed.replace("−", "-").replace("\u2126", "Ω").replace("\u03bc", "µ")
    if grouped := _GROUPED.match(typed):
        typed = grouped[0].replace(" ", "") + typed[grouped.end() :]
    found = _NUMBER.match(typed)
    if found is None:
        raise _refused(text, pointer, "is not a number")
    ending = typed[found.end() :].strip()
    if ending[:1] in {".", ","}:
        raise _refused(text, pointer, "has more than one decimal mark")
    factor = unit.endings.get(ending.replace(" ", ""))
    if factor is None:
        wanted = f"“{unit.symbol}”" if unit.symbol else "a number without a unit"
        raise InvalidValue(
            f"“{text.strip()}” ends in “{ending}”; this field is for {wanted}.",
            pointer=pointer,
            value=text,
            mend=f"Type the number in {unit.symbol}." if unit.symbol else "Type the number alone.",
        )
    value = float(found[0].replace(",", ".")) * factor
    if not math.isfinite(value):
        raise _refused(text, pointer, "is too large")
    return value


def _refused(text: str, pointer: str, why: str) -> InvalidValue:
    return InvalidValue(
        f"“{text.strip()}” {why}.",
        pointer=pointer,
        value=text,
        mend="Write one comma or one point as the decimal mark and no mark between thousands, "
        "as in 7500,2 or 7500.2.",
    )


_PREFIXES = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"))
_PREFIXED = {"Ω", "H", "Hz", "F", "T", "V", "N"}


def scale_of(value: float, unit: str) -> tuple[float, str]:
    """The factor and the unit in which a value is shown: 6312 Ω is shown in kΩ."""
    if unit == "F":
        return 1e-12, "pF"
    if unit in _PREFIXED and value and math.isfinite(value):
        for factor, prefix in _PREFIXES:
            if abs(value) >= factor * 0.99995:
                return factor, prefix + unit
    return 1.0, unit


def shown_number(value: float, decimals: int = 0) -> str:
    """A number with so many decimals, thousands set apart from 10 000 on."""
    text = f"{value:.{decimals}f}"
    whole, point, rest = text.lstrip("-").partition(".")
    if len(whole) > 4:
        whole = f"{int(whole):,}".replace(",", _THIN)
    sign = "−" if text.startswith("-") and float(text) != 0 else ""
    return f"{sign}{whole}{point}{rest}"


def shown_significant(value: float, digits: int = 4) -> str:
    """A number to so many significant digits, without an exponent."""
    return shown_number(value, _decimals(value, digits))


def _decimals(value: float, digits: int) -> int:
    if not value or not math.isfinite(value):
        return 0
    rounded = float(f"{value:.{digits - 1}e}")
    return max(0, digits - 1 - math.floor(math.log10(abs(rounded))))


def shown_turns(value: float) -> str:
    """Turns: whole where they are whole, else to a tenth (a counter may pulse twice a turn)."""
    return shown_number(value, 0 if abs(value - round(value)) < 0.05 else 1)


def shown_quantity(value: float, unit: str, digits: int = 4) -> str:
    """A value with its unit and a fitting prefix: ``6.312 kΩ``."""
    factor, symbol = scale_of(value, unit)
    text = shown_significant(value / factor, digits)
    return f"{text}\u00a0{symbol}" if symbol else text


def shown_uncertain(value: float, standard_uncertainty: float, unit: str) -> str:
    """A value with twice its standard uncertainty: ``6.31 ± 0.50 kΩ``."""
    factor, symbol = scale_of(value, unit)
    spread = 2.0 * standard_uncertainty / factor
    decimals = _decimals(spread, 2) if spread else _decimals(value / factor, 4)
    text = f"{shown_number(value / factor, decimals)}\u00a0±\u00a0{shown_number(spread, decimals)}"
    return f"{text}\u00a0{symbol}" if symbol else text


def shown_percent(share: float, decimals: int = 0) -> str:
    """A share as per cent, with the sign that it has."""
    return f"{shown_number(100.0 * share, decimals)}\u00a0%"
