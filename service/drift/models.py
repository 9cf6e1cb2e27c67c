"""Tables of the drift watch: one row a stream with its kept state, and its points."""

import uuid
from datetime import datetime

from sqlalchemy import ForeignKey, Index, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column

from service.recipes.models import CHARACTERISTICS
from service.storage.types import Base, Id, between, in_list, table_args


class Stream(Base):
    """Coils of one recipe revision from one machine, one characteristic, in order."""

    __tablename__ = "stream"
    __table_args__ = table_args(
        UniqueConstraint("revision_id", "machine_id", "characteristic"),
        in_list("characteristic", CHARACTERISTICS),
        between("points", 0, 1e12),
    )

    id: Mapped[Id]
    revision_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("revision.id"))
    machine_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("machine.id"))
    characteristic: Mapped[str]
    points: Mapped[int] = mapped_column(default=0)
    ewma: Mapped[float] = mapped_column(default=0.0)
    last: Mapped[float] = mapped_column(default=0.0)
    signal: Mapped[str | None]
    changed_at: Mapped[datetime]


class StreamPoint(Base):
    """The standardised difference of one measured coil; a corrected reading's point is voided."""

    __tablename__ = "stream_point"
    __table_args__ = table_args(
        UniqueConstraint("stream_id", "measurement_id"),
        Index("ix_stream_point_order", "stream_id", "position"),
    )

    id: Mapped[Id]
    stream_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("stream.id"))
    run_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("run.id"))
    measurement_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("measurement.id"), index=True)
    position: Mapped[int]
    difference: Mapped[float]
    ewma: Mapped[float]
    signal: Mapped[str | None]
    voided: Mapped[bool] = mapped_column(default=False)
    at: Mapped[datetime]
