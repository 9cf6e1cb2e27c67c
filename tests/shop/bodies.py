"""Bodies of an invented workshop's machines and instruments."""

from typing import Any

Json = dict[str, Any]


def machine(**changes: Any) -> Json:
    return {"name": "Winder A", "top_speed_rpm": 1500.0, **changes}


def instrument(**changes: Any) -> Json:
    usual = {
        "name": "Bench meter 1",
        "serial_number": "INV-001",
        "measures_resistance": True,
        "measures_inductance": True,
        "resistance_accuracy_percent": 0.1,
        "resistance_accuracy_ohm": 0.02,
        "inductance_accuracy_percent": 0.3,
        "four_wire": True,
        "calibrated_on": "2026-03-02",
        "calibration_due": "2027-03-02",
    }
    return {**usual, **changes}
