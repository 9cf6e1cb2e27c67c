"""Tables of people, the roles that they play, and their sign-ins."""

import uuid
from datetime import datetime

from sqlalchemy import ForeignKey
from sqlalchemy.orm import Mapped, mapped_column, relationship

from service.storage.types import Base, Id, Versioned, in_list, length, table_args
from service.web.access import Role


class Person(Versioned, Base):
    __tablename__ = "person"
    __table_args__ = table_args(length("name", 120))

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(unique=True)
    password_hash: Mapped[str]
    active: Mapped[bool] = mapped_column(default=True)
    created_at: Mapped[datetime]
    parts: Mapped[list["PersonRole"]] = relationship(
        lazy="selectin", cascade="all, delete-orphan", order_by="PersonRole.role"
    )

    @property
    def roles(self) -> list[str]:
        return [part.role for part in self.parts]


class PersonRole(Base):
    __tablename__ = "person_role"
    __table_args__ = table_args(in_list("role", [role.value for role in Role]))

    person_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("person.id"), primary_key=True)
    role: Mapped[str] = mapped_column(primary_key=True)


class SignIn(Base):
    """A session; only the SHA-256 of its token is kept, so a stolen table opens nothing."""

    __tablename__ = "sign_in"
    __table_args__ = table_args(length("token_hash", 64, 64))

    id: Mapped[Id]
    person_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("person.id"), index=True)
    token_hash: Mapped[str] = mapped_column(unique=True)
    started_at: Mapped[datetime]
    seen_at: Mapped[datetime]
    ended_at: Mapped[datetime | None]


class FailedSignIn(Base):
    """Kept in the database, so that a restart does not forget who was guessing."""

    __tablename__ = "failed_sign_in"
    __table_args__ = table_args(length("name", 120, 0), length("address", 60, 0))

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(index=True)
    address: Mapped[str] = mapped_column(index=True)
    at: Mapped[datetime] = mapped_column(index=True)
