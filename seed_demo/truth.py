"""What an invented coil really shows at the bench: the physics of what really happened, and noise.

The service never sees this; it sees the readings.
"""

import math
import random
from typing import Any

from seed_demo.client import Client
from seed_demo.workshop import CoilPlan, SpoolPlan

# Spread within a recipe and a spool: R 0.3-0.8 %, L 0.5-1.5 % (common practice, no source).
_RESISTANCE_SPREAD = 0.003
_INDUCTANCE_SPREAD = 0.006
# Per share of turns shorted, at 1 kHz: R -1, L -2.1, Q -5.6 (coupled-circuit calculation).
_SHORT = (-1.0, -2.1, -5.6)


def readings(
    api: Client,
    body: dict[str, Any],
    spool: SpoolPlan,
    plan: CoilPlan,
    turns: int,
    dice: random.Random,
    temperature_c: float,
) -> dict[str, float]:
    """Resistance at the coil's temperature, series inductance and Q at the test frequency."""
    true_body = {
        **body,
        "turns": turns - plan.missing_turns,
        "wire": {**body["wire"], "spool_resistance_ohm_per_m": spool.ohm_per_metre
                 * spool.true_factor},
        "conditions": {**body["conditions"], "temperature_c": temperature_c},
    }  # fmt: skip
    true = api.post("/predictions", true_body)
    r, inductance, q = (math.exp(factor * plan.shorted_share) for factor in _SHORT)
    return {
        "resistance_ohm": _digits(
            true["resistance_ohm"]["value"] * r * (1 + dice.gauss(0, _RESISTANCE_SPREAD))
        ),
        "inductance_h": _digits(
            true["apparent_inductance_h"]["value"]
            * inductance
            * (1 + dice.gauss(0, _INDUCTANCE_SPREAD))
        ),
        "quality_factor": _digits(true["quality_factor"]["value"] * q),
    }


def _digits(value: float) -> float:
    """As a meter with five digits shows it."""
    return float(f"{value:.5g}")
