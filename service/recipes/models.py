"""Tables of recipes: a name, and revisions of which a released one never changes."""

import uuid
from datetime import datetime
from typing import Any

from sqlalchemy import CheckConstraint, ForeignKey, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column, relationship

from service.storage.types import Base, Id, Versioned, between, in_list, length, table_args

REVISION_STATES = ["draft", "released", "retired"]
STAGES = ["raw", "potted", "final"]
CHARACTERISTICS = ["resistance", "inductance", "quality_factor", "self_resonance"]
KINDS = ["pickup", "voice coil"]


class Recipe(Base):
    __tablename__ = "recipe"
    __table_args__ = table_args(length("name", 120), in_list("kind", KINDS))

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(unique=True)
    kind: Mapped[str]
    created_at: Mapped[datetime]


class Revision(Versioned, Base):
    """One state of a recipe. ``body`` is the recipe file; the expectation is frozen at release."""

    __tablename__ = "revision"
    __table_args__ = table_args(
        UniqueConstraint("recipe_id", "number"),
        in_list("state", REVISION_STATES),
        between("number", 1, 1_000_000),
        CheckConstraint(
            "state = 'draft' OR (released_at IS NOT NULL AND expectation IS NOT NULL)",
            name="released_is_whole",
        ),
    )

    id: Mapped[Id]
    recipe_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("recipe.id"), index=True)
    number: Mapped[int]
    state: Mapped[str]
    body: Mapped[dict[str, Any]]
    note: Mapped[str | None]
    expectation: Mapped[dict[str, Any] | None]
    created_at: Mapped[datetime]
    created_by: Mapped[str]
    released_at: Mapped[datetime | None]
    released_by: Mapped[str | None]
    retired_at: Mapped[datetime | None]
    recipe: Mapped[Recipe] = relationship(lazy="joined", innerjoin=True)
    limits: Mapped[list["RevisionLimit"]] = relationship(
        lazy="selectin", order_by="RevisionLimit.id"
    )


class RevisionLimit(Base):
    """A specification limit (the customer's) for one characteristic at one stage, SI, at 20 °C."""

    __tablename__ = "revision_limit"
    __table_args__ = table_args(
        UniqueConstraint("revision_id", "stage", "characteristic"),
        in_list("stage", STAGES),
        in_list("characteristic", CHARACTERISTICS),
        CheckConstraint("lower IS NOT NULL OR upper IS NOT NULL", name="one_side_at_least"),
        CheckConstraint(
            "lower IS NULL OR upper IS NULL OR lower < upper", name="lower_below_upper"
        ),
    )

    id: Mapped[Id]
    revision_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("revision.id"), index=True)
    stage: Mapped[str]
    characteristic: Mapped[str]
    lower: Mapped[float | None]
    upper: Mapped[float | None]
