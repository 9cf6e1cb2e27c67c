"""Column types and table options that mean the same on SQLite and on PostgreSQL."""

import uuid
from datetime import UTC, datetime
from typing import Annotated, Any, ClassVar, cast

import sqlalchemy as sa
from sqlalchemy import CheckConstraint, MetaData
from sqlalchemy.engine import Dialect
from sqlalchemy.ext.compiler import compiles
from sqlalchemy.orm import DeclarativeBase, Mapped, declared_attr, mapped_column
from sqlalchemy.types import TypeDecorator, TypeEngine
from uuid_utils.compat import uuid7

# SQLite's STRICT tables know six type names only; these rules map ours onto them.
_STRICT_NAMES: tuple[tuple[tuple[type[TypeEngine[Any]], ...], str], ...] = (
    ((sa.DateTime, sa.Date, sa.String, sa.Text, sa.VARCHAR, sa.Uuid, sa.JSON), "TEXT"),
    ((sa.Boolean, sa.Integer, sa.BigInteger, sa.SmallInteger), "INTEGER"),
    ((sa.Float, sa.Double), "REAL"),
    ((sa.LargeBinary,), "BLOB"),
)


def _register(kind: type[TypeEngine[Any]], name: str) -> None:
    @compiles(kind, "sqlite")
    def _name(_element: object, _compiler: object, **_kw: object) -> str:
        return name


for _kinds, _name in _STRICT_NAMES:
    for _kind in _kinds:
        _register(_kind, _name)


class Utc(TypeDecorator[datetime]):
    """Aware in, aware out, UTC at rest; text order is time order on SQLite."""

    impl = sa.DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError(f"time without a zone: {value!r}")
        value = value.astimezone(UTC)
        return value.replace(tzinfo=None) if dialect.name == "sqlite" else value

    def process_result_value(self, value: Any | None, _dialect: Dialect) -> datetime | None:
        if value is None:
            return None
        value = cast(datetime, value)
        return value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)


def new_id() -> uuid.UUID:
    """UUIDv7 (RFC 9562): time-ordered, so new rows land at the end of an index."""
    return uuid7()


Id = Annotated[uuid.UUID, mapped_column(primary_key=True, default=new_id)]


class Base(DeclarativeBase):
    metadata = MetaData(
        naming_convention={
            "ix": "ix_%(table_name)s_%(column_0_N_name)s",
            "uq": "uq_%(table_name)s_%(column_0_N_name)s",
            "ck": "ck_%(table_name)s_%(constraint_name)s",
            "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
            "pk": "pk_%(table_name)s",
        }
    )
    type_annotation_map: ClassVar = {
        datetime: Utc,
        str: sa.Text,
        float: sa.Double,
        dict[str, Any]: sa.JSON(none_as_null=True),
        list[Any]: sa.JSON(none_as_null=True),
    }


class Versioned:
    """A row with a version: its ETag, and the guard against two edits at once."""

    version: Mapped[int] = mapped_column(default=1)

    @declared_attr.directive
    def __mapper_args__(cls) -> dict[str, Any]:  # noqa: N805 - SQLAlchemy hands in the class
        return {"version_id_col": cls.__table__.c.version}  # type: ignore[attr-defined]  # made by Base


def table_args(*items: sa.schema.SchemaItem) -> tuple[Any, ...]:
    """``__table_args__`` of a table that is STRICT on SQLite."""
    return (*items, {"sqlite_strict": True})


def in_list(column: str, values: list[str]) -> CheckConstraint:
    """CHECK that a text column holds one of the named values."""
    listed = ", ".join(f"'{value}'" for value in values)
    return CheckConstraint(f"{column} IN ({listed})", name=f"{column}_known")


def length(column: str, longest: int, shortest: int = 1) -> CheckConstraint:
    """CHECK the length of a text; SQLite does not enforce VARCHAR(n)."""
    return CheckConstraint(
        f"length({column}) BETWEEN {shortest} AND {longest}", name=f"{column}_length"
    )


def between(column: str, lower: float, upper: float) -> CheckConstraint:
    """CHECK a number's range; a NaN fails it on PostgreSQL and NOT NULL refuses it on SQLite."""
    return CheckConstraint(
        f"{column} >= {lower!r} AND {column} <= {upper!r}", name=f"{column}_range"
    )


def above(column: str, lower: float, upper: float) -> CheckConstraint:
    """As ``between`` with the lower end left out."""
    return CheckConstraint(
        f"{column} > {lower!r} AND {column} <= {upper!r}", name=f"{column}_range"
    )
