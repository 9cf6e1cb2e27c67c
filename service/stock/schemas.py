"""Edges of stock: spools and magnet lots."""

import uuid
from datetime import datetime
from typing import Annotated, Literal

from pydantic import AfterValidator, ConfigDict, Field, StringConstraints

from service.web.schemas import Body, Flag, Name, Note, Number, View, Whole, no_nul

Lot = Annotated[
    str,
    StringConstraints(strip_whitespace=True, min_length=1, max_length=60),
    AfterValidator(no_nul),
]
Mass = Annotated[Number, Field(gt=0, le=500)]
Pieces = Annotated[Whole, Field(ge=1, le=1_000_000)]
SpoolState = Literal["on the shelf", "quarantined", "empty"]


class SpoolBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "wire_size": "AWG 42",
                    "wire_build": "single",
                    "supplier_lot": "INV-2026-07",
                    "net_mass_kg": 1.2,
                }
            ]
        }
    )

    wire_size: Lot
    wire_build: Lot
    conductor: Name = "copper"
    supplier_lot: Lot
    net_mass_kg: Mass


class SpoolMeasurementBody(Body):
    """A measured length of the spool's wire."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"resistance_ohm": 5.41, "length_m": 1.0, "temperature_c": 21.5}]
        }
    )

    resistance_ohm: Annotated[Number, Field(gt=0, le=1e7)]
    length_m: Annotated[Number, Field(gt=0, le=1e5)]
    temperature_c: Annotated[Number, Field(ge=-40, le=100)]
    relative_uncertainty_percent: Annotated[Number, Field(gt=0, le=20)] = Field(
        default=0.5,
        description="Standard uncertainty; 0.5 % is the method's precision in IEC 60851-5.",
    )
    confirmed: Flag = False


class SpoolEdit(Body):
    """What is left out stays. The wire itself cannot be corrected: receive the spool anew."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"state": "quarantined", "reason": "Enamel flakes at the flange."}]
        }
    )

    state: SpoolState | None = None
    supplier_lot: Lot | None = None
    net_mass_kg: Mass | None = None
    reason: Note


class SpoolView(View):
    id: uuid.UUID
    serial: str
    label: str
    wire_size: str
    wire_build: str
    conductor: str
    supplier_lot: str
    net_mass_kg: float
    resistance_ohm_per_m: float | None
    resistance_relative_uncertainty_percent: float | None
    resistance_measured_at: datetime | None
    remaining_length_m: float
    remaining_mass_kg: float
    state: str
    received_at: datetime
    version: int


class MagnetLotBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "material": "alnico 5",
                    "piece": "rod 4.8 x 17 mm",
                    "supplier_lot": "INV-M-3",
                    "pieces": 600,
                }
            ]
        }
    )

    material: Lot
    piece: Lot
    supplier_lot: Lot
    pieces: Pieces


class MagnetLotEdit(Body):
    """What is left out stays."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"pieces": 580, "reason": "Twenty came broken."}]}
    )

    material: Lot | None = None
    piece: Lot | None = None
    supplier_lot: Lot | None = None
    pieces: Pieces | None = None
    reason: Note


class MagnetLotView(View):
    id: uuid.UUID
    serial: str
    label: str
    material: str
    piece: str
    supplier_lot: str
    pieces: int
    received_at: datetime
    version: int
