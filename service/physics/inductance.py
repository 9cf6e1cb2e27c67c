"""Inductance of air coils."""

from service.physics.circles import (
    mutual_inductance_of_circles,
    nagaoka_coefficient,
    solenoid_inductance,
)
from service.physics.section import WindingSection

__all__ = [
    "WindingSection",
    "mutual_inductance_of_circles",
    "nagaoka_coefficient",
    "solenoid_inductance",
]
