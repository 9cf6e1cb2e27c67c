"""Routes of the reports: the month."""

from datetime import datetime

from fastapi import APIRouter
from pydantic import Field

from service.reports import acts
from service.reports.rules import Group, MonthReport, Rate
from service.storage.serials import shown
from service.web import access
from service.web.schemas import View
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/api/v1/reports", route_class=UnitRoute, tags=["reports"])


class RateView(View):
    count: int
    of: int
    value: float | None
    low: float | None = Field(description="Lower end of the 95 % Wilson interval.")
    high: float | None


class GroupView(View):
    name: str
    started: int
    first_pass_yield: RateView
    scrap: int


class CauseView(View):
    cause: str
    count: int


class HoldView(View):
    run: str
    recipe: str
    since: datetime


class MonthView(View):
    """A month's yield: counts, rates with intervals, and what each word means."""

    month: str
    time_zone: str
    starts_at: datetime
    ends_at: datetime
    is_running: bool = Field(description="The month is not over: these counts will grow.")
    made_at: datetime
    rewind_rule: str
    started: int
    balance: dict[str, int] = Field(description="Adds up to started, exactly.")
    first_pass_yield: RateView
    rework: RateView
    scrap: RateView
    scrap_by_cause: list[CauseView]
    recipes: list[GroupView]
    machines: list[GroupView]
    first_conformity: dict[str, int]
    wire_used_m: float
    wire_used_kg: float
    corrections: int
    drift_signals: int
    open_holds: list[HoldView]
    definitions: dict[str, str]


def _rate(found: Rate) -> RateView:
    return RateView.model_validate(found)


def _group(group: Group) -> GroupView:
    return GroupView(
        name=group.name,
        started=group.started,
        first_pass_yield=_rate(group.first_pass),
        scrap=group.scrap,
    )


def month_view(report: MonthReport) -> MonthView:
    tally = report.tally
    return MonthView(
        month=report.month.name,
        time_zone=report.zone,
        starts_at=report.month.start,
        ends_at=report.month.end,
        is_running=report.is_running,
        made_at=report.made_at,
        rewind_rule=report.rewind_rule,
        started=tally.started,
        balance=tally.balance,
        first_pass_yield=_rate(tally.first_pass),
        rework=_rate(tally.rework),
        scrap=_rate(tally.scrap),
        scrap_by_cause=[CauseView(cause=c, count=n) for c, n in tally.scrap_by_cause],
        recipes=[_group(group) for group in tally.recipes],
        machines=[_group(group) for group in tally.machines],
        first_conformity=tally.first_conformity,
        wire_used_m=report.wire_used_m,
        wire_used_kg=report.wire_used_kg,
        corrections=report.corrections,
        drift_signals=report.signals,
        open_holds=[
            HoldView(run=shown(serial), recipe=recipe, since=since)
            for serial, recipe, since in report.open_holds
        ],
        definitions=report.definitions,
    )


@router.get("/months/{month}")
def show_month(month: str, reading: Reading, now: Now, _actor: access.Anybody) -> MonthView:
    """The month's yield, in the shop's time zone, from the records as they stand."""
    return month_view(acts.month(reading, month, now))
