"""Tables of the workshop itself: its settings, machines and instruments."""

from datetime import date, datetime

from sqlalchemy import CheckConstraint
from sqlalchemy.orm import Mapped, mapped_column

from service.storage.types import Base, Id, Versioned, above, between, in_list, length, table_args

REWIND_RULES = ["same unit", "new unit"]
THE_WORKSHOP = 1


class Workshop(Versioned, Base):
    """One row: what belongs to the workshop and not to the computer."""

    __tablename__ = "workshop"
    __table_args__ = table_args(
        CheckConstraint(f"id = {THE_WORKSHOP}", name="one_row"),
        length("name", 120),
        length("time_zone", 60),
        in_list("rewind_rule", REWIND_RULES),
    )

    id: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    name: Mapped[str]
    time_zone: Mapped[str]
    rewind_rule: Mapped[str]


class Machine(Versioned, Base):
    __tablename__ = "machine"
    __table_args__ = table_args(
        length("name", 120), above("top_speed_rpm", 0, 100_000), between("pulses_per_turn", 1, 1000)
    )

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(unique=True)
    top_speed_rpm: Mapped[float]
    pulses_per_turn: Mapped[int]
    counts_direction: Mapped[bool]
    active: Mapped[bool] = mapped_column(default=True)
    created_at: Mapped[datetime]


class Instrument(Versioned, Base):
    """A meter. Its accuracy is ± (relative part × reading + fixed part), read as a half-width."""

    __tablename__ = "instrument"
    __table_args__ = table_args(
        length("name", 120),
        length("serial_number", 60),
        between("resistance_accuracy_relative", 0, 0.5),
        between("resistance_accuracy_ohm", 0, 1e6),
        between("inductance_accuracy_relative", 0, 0.5),
        between("inductance_accuracy_h", 0, 100),
        between("lead_resistance_ohm", 0, 100),
        CheckConstraint("calibration_due >= calibrated_on", name="due_after_calibration"),
    )

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(unique=True)
    serial_number: Mapped[str]
    measures_resistance: Mapped[bool]
    measures_inductance: Mapped[bool]
    resistance_accuracy_relative: Mapped[float]
    resistance_accuracy_ohm: Mapped[float]
    inductance_accuracy_relative: Mapped[float]
    inductance_accuracy_h: Mapped[float]
    four_wire: Mapped[bool]
    lead_resistance_ohm: Mapped[float]
    calibrated_on: Mapped[date]
    calibration_due: Mapped[date]
    active: Mapped[bool] = mapped_column(default=True)
    created_at: Mapped[datetime]
