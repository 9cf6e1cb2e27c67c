"""Rules of the workshop: time zones, and whether an instrument may be trusted today."""

import functools
from dataclasses import dataclass
from datetime import date, datetime
from zoneinfo import ZoneInfo, available_timezones

from service.errors import InvalidValue

# In the data, but no place's time: a stand-in, and whatever the computer is set to.
_NO_PLACE = frozenset({"Factory", "localtime"})


@functools.cache
def _zone_names() -> frozenset[str]:
    """The names that may be chosen. The list leaves out what the data also hold: the zones with
    leap seconds, by which a month would end 27 seconds late.
    """
    return frozenset(available_timezones()) - _NO_PLACE


def zone(name: str, pointer: str = "/time_zone") -> ZoneInfo:
    """The time zone of that name (IANA). Raises InvalidValue for a name that is not known."""
    if name not in _zone_names():
        raise InvalidValue(
            f"There is no time zone “{name}”.",
            pointer=pointer,
            value=name,
            mend="Use a name of the IANA list, as in Europe/Berlin.",
        )
    return ZoneInfo(name)


def day_in(zone_name: str, moment: datetime) -> date:
    """The shop's calendar day at that moment."""
    return moment.astimezone(zone(zone_name)).date()


@dataclass(frozen=True)
class Accuracy:
    """What a meter measures, and its ± (relative part × reading + fixed part) for each."""

    measures_resistance: bool
    measures_inductance: bool
    resistance_relative: float
    resistance_ohm: float
    inductance_relative: float
    inductance_h: float


def check_accuracy(accuracy: Accuracy) -> None:
    """Refuse a meter that measures nothing, or that is never wrong: verdicts rest on its doubt."""
    if not (accuracy.measures_resistance or accuracy.measures_inductance):
        raise InvalidValue(
            "This instrument measures nothing that is used here.",
            pointer="/measures_resistance",
            value=False,
            mend="Say whether it measures resistance, inductance, or both.",
        )
    for quantity, is_measured, parts in (
        (
            "resistance",
            accuracy.measures_resistance,
            accuracy.resistance_relative + accuracy.resistance_ohm,
        ),
        (
            "inductance",
            accuracy.measures_inductance,
            accuracy.inductance_relative + accuracy.inductance_h,
        ),
    ):
        if is_measured and parts == 0:
            raise InvalidValue(
                f"No instrument measures {quantity} without error.",
                pointer=f"/{quantity}_accuracy_percent",
                value=0,
                mend="Enter the accuracy from its data sheet or its calibration certificate.",
            )


def check_calibration(calibrated_on: date, calibration_due: date) -> None:
    """Refuse a calibration that is due before it was done."""
    if calibration_due < calibrated_on:
        raise InvalidValue(
            "The calibration is due before it was done.",
            pointer="/calibration_due",
            value=str(calibration_due),
            mend="Correct one of the two dates.",
        )


def is_overdue(calibration_due: date, today: date) -> bool:
    """An instrument may be used on its due day, and decides nothing from the day after."""
    return today > calibration_due
