"""Edges of the bench: readings in, verdicts out."""

import uuid
from datetime import datetime
from typing import Annotated, Any, Literal, Self

from pydantic import ConfigDict, Field, model_validator

from service.runs.schemas import Cause
from service.web.schemas import Body, Flag, Moment, Note, Number, View

Stage = Literal["raw", "potted", "final"]
EXAMPLE: dict[str, Any] = {
    "stage": "raw",
    "resistance_ohm": 6512.0,
    "coil_temperature_c": 21.5,
    "resistance_instrument_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f",
    "inductance_h": 2.31,
    "test_frequency_hz": 1000.0,
    "inductance_model": "series",
    "inductance_instrument_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f",
}


class ReadingBody(Body):
    """One sitting at the bench. A value far from what is expected is asked back once."""

    model_config = ConfigDict(json_schema_extra={"examples": [EXAMPLE]})

    stage: Stage = "raw"
    resistance_ohm: Annotated[Number, Field(gt=0, le=1e8)]
    coil_temperature_c: Annotated[Number, Field(ge=-40, le=200)] = Field(
        description="Of the coil, not of the room."
    )
    resistance_instrument_id: uuid.UUID
    lead_resistance_ohm: Annotated[Number, Field(ge=0, le=100)] | None = Field(
        default=None,
        description="Of the test leads; the instrument's own when left out, none with four wires.",
    )
    inductance_h: Annotated[Number, Field(gt=-1e4, lt=1e4)] | None = None
    test_frequency_hz: Annotated[Number, Field(gt=0, le=1e7)] | None = None
    inductance_model: Literal["series", "parallel"] | None = None
    inductance_instrument_id: uuid.UUID | None = None
    quality_factor: Annotated[Number, Field(gt=0, le=1e4)] | None = None
    self_resonance_hz: Annotated[Number, Field(gt=0, le=1e9)] | None = None
    insulation_ohm: Annotated[Number, Field(ge=0, le=1e15)] | None = None
    polarity: Literal["as marked", "reversed"] | None = None
    note: Note | None = None
    measured_at: Moment | None = None
    confirmed: Flag = Field(default=False, description="A value that was asked back is meant.")

    @model_validator(mode="after")
    def _inductance_is_whole(self) -> Self:
        parts = {
            "test_frequency_hz": self.test_frequency_hz,
            "inductance_model": self.inductance_model,
            "inductance_instrument_id": self.inductance_instrument_id,
        }
        if self.inductance_h is not None:
            for name, part in parts.items():
                if part is None:
                    raise ValueError(f"an inductance says nothing without {name}; add it")
        elif any(part is not None for part in parts.values()):
            raise ValueError("frequency, model and meter belong to an inductance; add inductance_h")
        return self


class CorrectionBody(Body):
    """The reading as it should have been entered, and why."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"reading": EXAMPLE, "reason": "Typed 6512 for 6152 (invented)."}]
        }
    )

    reading: ReadingBody
    reason: Note


class MeasurementView(View):
    id: uuid.UUID
    run: str
    stage: str
    resistance_ohm: float
    coil_temperature_c: float
    resistance_instrument_id: uuid.UUID
    lead_resistance_ohm: float
    inductance_h: float | None
    test_frequency_hz: float | None
    inductance_model: str | None
    inductance_instrument_id: uuid.UUID | None
    quality_factor: float | None
    self_resonance_hz: float | None
    insulation_ohm: float | None
    polarity: str | None
    note: str | None
    confirmed: bool
    measured_at: datetime
    recorded_at: datetime
    measured_by: str
    supersedes_id: uuid.UUID | None
    correction_reason: str | None


class VerdictView(View):
    """The three answers, each with its numbers in ``reasoning``."""

    id: uuid.UUID
    measurement: MeasurementView
    conformity: str
    agreement: str
    process: str
    first: bool
    rule: str
    kernel_version: str
    at: datetime
    reasoning: dict[str, Any]


class DispositionBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"decision": "scrap", "cause": "shorted turns", "reason": "Layer short at flange."}
            ]
        }
    )

    decision: Literal["release", "concession", "regrade", "hold", "rework", "repair", "scrap"]
    cause: Cause | None = None
    reason: Note | None = None
    regrade_recipe_id: uuid.UUID | None = None


class DispositionView(View):
    kind: str
    cause: str | None
    reason: str
    regrade_recipe_id: uuid.UUID | None
    decided_by: str
    decided_at: datetime
    run_state: str
