"""Rules of the workshop: time zones, and whether an instrument may be trusted today."""

from datetime import date, datetime
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from service.errors import InvalidValue


def zone(name: str, pointer: str = "/time_zone") -> ZoneInfo:
    """The time zone of that name (IANA). Raises InvalidValue for a name that is not known."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        raise InvalidValue(
            f"There is no time zone “{name}”.",
            pointer=pointer,
            value=name,
            mend="Use a name of the IANA list, as in Europe/Berlin.",
        ) from None


def day_in(zone_name: str, moment: datetime) -> date:
    """The shop's calendar day at that moment."""
    return moment.astimezone(zone(zone_name)).date()


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
