"""Tables of the test bench: readings as they were taken, and the verdict on each."""

import uuid
from datetime import datetime
from typing import Any

from sqlalchemy import CheckConstraint, ForeignKey, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column, relationship

from service.recipes.models import STAGES
from service.runs.models import Run
from service.storage.types import Base, Id, above, between, in_list, length, table_args

MODELS = ["series", "parallel"]
POLARITIES = ["as marked", "reversed"]
CONFORMITIES = ["conforms", "not decided", "does not conform"]
AGREEMENTS = ["as predicted", "not as predicted", "not decided"]


class Measurement(Base):
    """One sitting at the bench. Never changed: a correction is a new row that supersedes it."""

    __tablename__ = "measurement"
    __table_args__ = table_args(
        UniqueConstraint("supersedes_id"),
        in_list("stage", STAGES),
        above("resistance_ohm", 0, 1e8),
        between("coil_temperature_c", -40, 200),
        CheckConstraint(
            "inductance_h IS NULL OR (inductance_h > -1e4 AND inductance_h < 1e4)",
            name="inductance_range",
        ),
        CheckConstraint(
            "(inductance_h IS NULL) = (test_frequency_hz IS NULL)", name="inductance_has_frequency"
        ),
        CheckConstraint(
            "(inductance_h IS NULL) = (inductance_model IS NULL)", name="inductance_has_model"
        ),
        CheckConstraint(
            "inductance_model IS NULL OR inductance_model IN ('series', 'parallel')",
            name="model_known",
        ),
        CheckConstraint(
            "(supersedes_id IS NULL) = (correction_reason IS NULL)", name="correction_has_reason"
        ),
    )

    id: Mapped[Id]
    run_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("run.id"), index=True)
    attempt_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("attempt.id"), index=True)
    stage: Mapped[str]
    resistance_ohm: Mapped[float]
    coil_temperature_c: Mapped[float]
    resistance_instrument_id: Mapped[uuid.UUID] = mapped_column(
        ForeignKey("instrument.id"), index=True
    )
    lead_resistance_ohm: Mapped[float]
    inductance_h: Mapped[float | None]
    test_frequency_hz: Mapped[float | None]
    inductance_model: Mapped[str | None]
    inductance_instrument_id: Mapped[uuid.UUID | None] = mapped_column(
        ForeignKey("instrument.id"), index=True
    )
    quality_factor: Mapped[float | None]
    self_resonance_hz: Mapped[float | None]
    insulation_ohm: Mapped[float | None]
    polarity: Mapped[str | None]
    note: Mapped[str | None]
    entered: Mapped[dict[str, Any]]
    confirmed: Mapped[bool]
    measured_at: Mapped[datetime] = mapped_column(index=True)
    recorded_at: Mapped[datetime]
    measured_by: Mapped[str]
    supersedes_id: Mapped[uuid.UUID | None] = mapped_column(ForeignKey("measurement.id"))
    correction_reason: Mapped[str | None]
    run: Mapped[Run] = relationship(lazy="select")
    verdict: Mapped["Verdict"] = relationship(
        lazy="joined", back_populates="measurement", uselist=False
    )


class Verdict(Base):
    """The three answers to one measurement, with the versions of what gave them."""

    __tablename__ = "verdict"
    __table_args__ = table_args(
        in_list("conformity", CONFORMITIES),
        in_list("agreement", AGREEMENTS),
        length("rule", 60),
        length("kernel_version", 40),
    )

    id: Mapped[Id]
    measurement_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("measurement.id"), unique=True)
    run_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("run.id"), index=True)
    conformity: Mapped[str]
    agreement: Mapped[str]
    process: Mapped[str]
    first: Mapped[bool]
    reasoning: Mapped[dict[str, Any]]
    rule: Mapped[str]
    kernel_version: Mapped[str]
    at: Mapped[datetime] = mapped_column(index=True)
    measurement: Mapped[Measurement] = relationship(back_populates="verdict", lazy="raise")
