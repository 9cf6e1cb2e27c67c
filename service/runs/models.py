"""Tables of the work: orders, runs (one coil each), attempts to wind it, and what was decided."""

import uuid
from datetime import date, datetime

import sqlalchemy as sa
from sqlalchemy import CheckConstraint, ForeignKey, Index, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column, relationship

from service.recipes.models import Revision
from service.runs.rules import DISPOSITIONS, SCRAP_CAUSES, RunState
from service.shop.models import Machine
from service.stock.models import MagnetLot, Spool
from service.storage.types import Base, Id, Versioned, between, in_list, length, table_args

ORDER_STATES = ["open", "closed"]
OUTCOMES = ["winding", "wound", "lost"]


class Order(Versioned, Base):
    __tablename__ = "coil_order"
    __table_args__ = table_args(
        length("serial", 7, 7),
        length("customer", 120),
        between("quantity", 1, 100_000),
        in_list("state", ORDER_STATES),
    )

    id: Mapped[Id]
    serial: Mapped[str] = mapped_column(unique=True)
    customer: Mapped[str]
    revision_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("revision.id"), index=True)
    quantity: Mapped[int]
    promised_on: Mapped[date | None]
    state: Mapped[str]
    note: Mapped[str | None]
    created_at: Mapped[datetime]
    revision: Mapped[Revision] = relationship(lazy="joined", innerjoin=True)


class Run(Versioned, Base):
    """One coil on one spindle, from plan to decision."""

    __tablename__ = "run"
    __table_args__ = table_args(
        length("serial", 7, 7),
        in_list("state", [state.value for state in RunState]),
        between("attempt_number", 0, 1000),
        Index("ix_run_state_changed", "state", "changed_at"),
    )

    id: Mapped[Id]
    serial: Mapped[str] = mapped_column(unique=True)
    order_id: Mapped[uuid.UUID | None] = mapped_column(ForeignKey("coil_order.id"), index=True)
    revision_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("revision.id"), index=True)
    magnet_lot_id: Mapped[uuid.UUID | None] = mapped_column(ForeignKey("magnet_lot.id"), index=True)
    state: Mapped[str]
    attempt_number: Mapped[int] = mapped_column(default=0)
    created_at: Mapped[datetime]
    changed_at: Mapped[datetime]
    revision: Mapped[Revision] = relationship(lazy="joined", innerjoin=True)
    order: Mapped[Order | None] = relationship(lazy="select")
    magnet_lot: Mapped[MagnetLot | None] = relationship(lazy="select")
    attempts: Mapped[list["Attempt"]] = relationship(
        lazy="selectin", order_by="Attempt.number", back_populates="run"
    )
    dispositions: Mapped[list["Disposition"]] = relationship(
        lazy="selectin", order_by="Disposition.id"
    )

    @property
    def attempt(self) -> "Attempt | None":
        """The attempt in hand, or the last one."""
        return self.attempts[-1] if self.attempts else None


class Attempt(Base):
    """One winding of a run; a rewound or restarted coil has several."""

    __tablename__ = "attempt"
    __table_args__ = table_args(
        UniqueConstraint("run_id", "number"),
        in_list("outcome", OUTCOMES),
        between("number", 1, 1000),
        CheckConstraint("ended_at IS NULL OR ended_at >= started_at", name="ends_after_start"),
        CheckConstraint("(outcome = 'winding') = (ended_at IS NULL)", name="ended_has_outcome"),
        CheckConstraint(
            "agreed_turns IS NULL OR (agreed_turns >= 0 AND agreed_turns < 10000000)",
            name="agreed_turns_range",
        ),
        # One open attempt a machine, held by the database itself.
        Index(
            "uq_attempt_machine_open",
            "machine_id",
            unique=True,
            sqlite_where=sa.text("ended_at IS NULL"),
            postgresql_where=sa.text("ended_at IS NULL"),
        ),
    )

    id: Mapped[Id]
    run_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("run.id"), index=True)
    number: Mapped[int]
    machine_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("machine.id"), index=True)
    spool_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("spool.id"), index=True)
    outcome: Mapped[str]
    started_at: Mapped[datetime] = mapped_column(index=True)
    started_by: Mapped[str]
    ended_at: Mapped[datetime | None]
    ended_by: Mapped[str | None]
    machine_turns: Mapped[float | None]
    agreed_turns: Mapped[float | None]
    agreed_reason: Mapped[str | None]
    wire_length_m: Mapped[float | None]
    lost_cause: Mapped[str | None]
    run: Mapped[Run] = relationship(back_populates="attempts", lazy="raise")
    machine: Mapped[Machine] = relationship(lazy="joined", innerjoin=True)
    spool: Mapped[Spool] = relationship(lazy="joined", innerjoin=True)


class Disposition(Base):
    """What was decided about a coil, by whom and why; a new decision is a new row."""

    __tablename__ = "disposition"
    __table_args__ = table_args(
        in_list("kind", [kind.value for kind in DISPOSITIONS]),
        CheckConstraint(
            "kind != 'scrap' OR cause IN (" + ", ".join(f"'{c}'" for c in SCRAP_CAUSES) + ")",
            name="scrap_has_cause",
        ),
        CheckConstraint(
            "(kind = 'regrade') = (regrade_recipe_id IS NOT NULL)", name="regrade_names_recipe"
        ),
        length("reason", 1000),
    )

    id: Mapped[Id]
    run_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("run.id"), index=True)
    kind: Mapped[str]
    cause: Mapped[str | None]
    reason: Mapped[str]
    regrade_recipe_id: Mapped[uuid.UUID | None] = mapped_column(ForeignKey("recipe.id"))
    decided_by: Mapped[str]
    decided_at: Mapped[datetime] = mapped_column(index=True)
