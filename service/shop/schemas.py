"""Edges of the workshop, its machines and its instruments."""

import uuid
from datetime import date
from typing import Annotated, Literal

from pydantic import AfterValidator, ConfigDict, Field, StringConstraints

from service.web.schemas import Body, Flag, Name, Number, View, Whole, no_nul

RewindRule = Literal["same unit", "new unit"]
SerialNumber = Annotated[
    str,
    StringConstraints(strip_whitespace=True, min_length=1, max_length=60),
    AfterValidator(no_nul),
]
Percent = Annotated[Number, Field(ge=0, le=50)]
Speed = Annotated[Number, Field(gt=0, le=100_000)]
Pulses = Annotated[Whole, Field(ge=1, le=1000)]


class WorkshopView(View):
    name: str
    time_zone: str
    rewind_rule: str
    version: int


class WorkshopEdit(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"name": "Alder Lane Winding (invented)", "time_zone": "Europe/Berlin"}]
        }
    )

    name: Name | None = None
    time_zone: Name | None = None
    rewind_rule: RewindRule | None = Field(
        default=None, description="Whether a rewound coil counts as the same unit or a new one."
    )


class MachineBody(Body):
    model_config = ConfigDict(
        json_schema_extra={"examples": [{"name": "Winder A", "top_speed_rpm": 1500.0}]}
    )

    name: Name
    top_speed_rpm: Speed
    pulses_per_turn: Pulses = 1
    counts_direction: Flag = False


class MachineEdit(Body):
    name: Name | None = None
    top_speed_rpm: Speed | None = None
    pulses_per_turn: Pulses | None = None
    counts_direction: Flag | None = None
    active: Flag | None = None


class MachineView(View):
    id: uuid.UUID
    name: str
    top_speed_rpm: float
    pulses_per_turn: int
    counts_direction: bool
    active: bool
    version: int


class InstrumentBody(Body):
    """Accuracy is ± (percent of reading + fixed part), read as a half-width."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "Bench meter 1",
                    "serial_number": "INV-001",
                    "measures_resistance": True,
                    "measures_inductance": True,
                    "resistance_accuracy_percent": 0.1,
                    "inductance_accuracy_percent": 0.3,
                    "four_wire": True,
                    "calibrated_on": "2026-03-02",
                    "calibration_due": "2027-03-02",
                }
            ]
        }
    )

    name: Name
    serial_number: SerialNumber
    measures_resistance: Flag
    measures_inductance: Flag = False
    resistance_accuracy_percent: Percent = 0.0
    resistance_accuracy_ohm: Annotated[Number, Field(ge=0, le=1e6)] = 0.0
    inductance_accuracy_percent: Percent = 0.0
    inductance_accuracy_h: Annotated[Number, Field(ge=0, le=100)] = 0.0
    four_wire: Flag = False
    lead_resistance_ohm: Annotated[Number, Field(ge=0, le=100)] = 0.0
    calibrated_on: date
    calibration_due: date


class InstrumentEdit(Body):
    name: Name | None = None
    resistance_accuracy_percent: Percent | None = None
    resistance_accuracy_ohm: Annotated[Number, Field(ge=0, le=1e6)] | None = None
    inductance_accuracy_percent: Percent | None = None
    inductance_accuracy_h: Annotated[Number, Field(ge=0, le=100)] | None = None
    lead_resistance_ohm: Annotated[Number, Field(ge=0, le=100)] | None = None
    calibrated_on: date | None = None
    calibration_due: date | None = None
    active: Flag | None = None


class InstrumentView(View):
    id: uuid.UUID
    name: str
    serial_number: str
    measures_resistance: bool
    measures_inductance: bool
    resistance_accuracy_percent: float
    resistance_accuracy_ohm: float
    inductance_accuracy_percent: float
    inductance_accuracy_h: float
    four_wire: bool
    lead_resistance_ohm: float
    calibrated_on: date
    calibration_due: date
    overdue: bool
    active: bool
    version: int
