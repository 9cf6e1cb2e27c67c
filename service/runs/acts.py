"""What people do with the work: orders, plans, windings, decisions."""

from service.runs.decisions import decide
from service.runs.holding import hold_run, run_by_label
from service.runs.orders import close_order, hold_order, order_by_label, place_order
from service.runs.planning import plan_runs
from service.runs.winding import finish, lose, start

__all__ = [
    "close_order",
    "decide",
    "finish",
    "hold_order",
    "hold_run",
    "lose",
    "order_by_label",
    "place_order",
    "plan_runs",
    "run_by_label",
    "start",
]
