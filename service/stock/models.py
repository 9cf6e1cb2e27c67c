"""Tables of what coils are made from: spools of wire and lots of magnets."""

import uuid
from datetime import datetime

from sqlalchemy import CheckConstraint, ForeignKey
from sqlalchemy.orm import Mapped, mapped_column

from service.storage.types import Base, Id, Versioned, above, between, in_list, length, table_args

SPOOL_STATES = ["on the shelf", "quarantined", "empty"]


class Spool(Versioned, Base):
    """A spool of wire. Its own ohm per metre, once measured, replaces the wire table's."""

    __tablename__ = "spool"
    __table_args__ = table_args(
        length("serial", 7, 7),
        length("wire_size", 20),
        length("wire_build", 20),
        length("supplier_lot", 60),
        above("net_mass_kg", 0, 500),
        between("drawn_length_m", 0, 1e9),
        between("drawn_mass_kg", 0, 1e4),
        in_list("state", SPOOL_STATES),
        CheckConstraint(
            "(resistance_per_metre_ohm IS NULL) = (resistance_per_metre_relative_uncertainty"
            " IS NULL)",
            name="resistance_with_uncertainty",
        ),
        CheckConstraint(
            "resistance_per_metre_ohm IS NULL OR (resistance_per_metre_ohm > 0 AND"
            " resistance_per_metre_ohm < 1e4)",
            name="resistance_range",
        ),
    )

    id: Mapped[Id]
    serial: Mapped[str] = mapped_column(unique=True)
    wire_size: Mapped[str]
    wire_build: Mapped[str]
    conductor: Mapped[str]
    supplier_lot: Mapped[str]
    net_mass_kg: Mapped[float]
    resistance_per_metre_ohm: Mapped[float | None]
    resistance_per_metre_relative_uncertainty: Mapped[float | None]
    resistance_measured_at: Mapped[datetime | None]
    drawn_length_m: Mapped[float] = mapped_column(default=0.0)
    drawn_mass_kg: Mapped[float] = mapped_column(default=0.0)
    state: Mapped[str]
    received_at: Mapped[datetime]


class SpoolDraw(Base):
    """Wire taken from a spool, one row for each coil or trial."""

    __tablename__ = "spool_draw"
    __table_args__ = table_args(
        length("purpose", 120), between("length_m", 0, 1e6), between("mass_kg", 0, 1e3)
    )

    id: Mapped[Id]
    spool_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("spool.id"), index=True)
    length_m: Mapped[float]
    mass_kg: Mapped[float]
    purpose: Mapped[str]
    at: Mapped[datetime]


class MagnetLot(Versioned, Base):
    __tablename__ = "magnet_lot"
    __table_args__ = table_args(
        length("serial", 7, 7),
        length("material", 60),
        length("piece", 60),
        length("supplier_lot", 60),
        between("pieces", 1, 1_000_000),
    )

    id: Mapped[Id]
    serial: Mapped[str] = mapped_column(unique=True)
    material: Mapped[str]
    piece: Mapped[str]
    supplier_lot: Mapped[str]
    pieces: Mapped[int]
    received_at: Mapped[datetime]
