"""Statistics of a small workshop: pure functions and frozen results, each with its source.

Names are loaded when first used, so that importing the package costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from service.statistics.change import ChangePoint, change_point
    from service.statistics.charts import (
        AttributeChart,
        ControlLimits,
        Cusum,
        Ewma,
        c_chart,
        cusum,
        ewma,
        individuals_chart,
        p_chart,
        u_chart,
    )
    from service.statistics.gauge import GaugeStudy, gauge_study
    from service.statistics.indices import Capability, capability, capability_from_moments
    from service.statistics.intervals import (
        exact_interval,
        funnel_limits,
        tolerance_factor,
        wilson_interval,
    )
    from service.statistics.moments import Summary, summary
    from service.statistics.pairing import Pairs, optimal_pairs
    from service.statistics.patterns import RuleSignal, run_rules
    from service.statistics.yields import first_pass_yield, rolled_throughput_yield

_HOMES = {
    "moments": ("Summary", "summary"),
    "charts": (
        "AttributeChart",
        "ControlLimits",
        "Cusum",
        "Ewma",
        "c_chart",
        "cusum",
        "ewma",
        "individuals_chart",
        "p_chart",
        "u_chart",
    ),
    "patterns": ("RuleSignal", "run_rules"),
    "indices": ("Capability", "capability", "capability_from_moments"),
    "intervals": ("exact_interval", "funnel_limits", "tolerance_factor", "wilson_interval"),
    "gauge": ("GaugeStudy", "gauge_study"),
    "yields": ("first_pass_yield", "rolled_throughput_yield"),
    "change": ("ChangePoint", "change_point"),
    "pairing": ("Pairs", "optimal_pairs"),
}
_HOME_OF = {name: home for home, names in _HOMES.items() for name in names}

__all__ = [
    "AttributeChart",
    "Capability",
    "ChangePoint",
    "ControlLimits",
    "Cusum",
    "Ewma",
    "GaugeStudy",
    "Pairs",
    "RuleSignal",
    "Summary",
    "c_chart",
    "capability",
    "capability_from_moments",
    "change_point",
    "cusum",
    "ewma",
    "exact_interval",
    "first_pass_yield",
    "funnel_limits",
    "gauge_study",
    "individuals_chart",
    "optimal_pairs",
    "p_chart",
    "rolled_throughput_yield",
    "run_rules",
    "summary",
    "tolerance_factor",
    "u_chart",
    "wilson_interval",
]


def __getattr__(name: str) -> object:
    if name not in _HOME_OF:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    found: object = getattr(import_module(f"{__name__}.{_HOME_OF[name]}"), name)
    globals()[name] = found
    return found
