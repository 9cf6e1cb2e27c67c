"""The month's report, to read and to print."""

from datetime import datetime
from zoneinfo import ZoneInfo

from fastapi import APIRouter, Request, Response

from service.pages.render import clock_of, page, see_other
from service.reports import acts
from service.reports.rules import Month
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/months", route_class=UnitRoute, include_in_schema=False)


@router.get("")
def this_month(reading: Reading, _actor: access.Anybody) -> Response:
    return see_other(f"/months/{clock_of(reading).month}")


@router.get("/{month}")
def show(
    month: str, request: Request, reading: Reading, _actor: access.Anybody, now: Now
) -> Response:
    report = acts.month(reading, month, now)
    most = max((count for _cause, count in report.tally.scrap_by_cause), default=1)
    return page(
        request,
        reading,
        "month.html",
        report=report,
        tally=report.tally,
        title=_title(report.month, report.zone),
        most=most,
        before=_beside(report.month, -1),
        after=_beside(report.month, 1),
    )


def _title(month: Month, zone: str) -> str:
    there: datetime = month.start.astimezone(ZoneInfo(zone))
    return f"{there:%B %Y}"


def _beside(month: Month, step: int) -> str:
    number = month.year * 12 + month.number - 1 + step
    return f"{number // 12:04d}-{number % 12 + 1:02d}"
