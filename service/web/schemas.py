"""Base models of the edges: what comes in is strict, what goes out is plain."""

from datetime import datetime
from typing import Annotated, Any

from pydantic import (
    AfterValidator,
    AwareDatetime,
    BaseModel,
    ConfigDict,
    Field,
    StrictBool,
    StrictInt,
    StringConstraints,
)


def no_nul(text: str) -> str:
    """The text, which PostgreSQL must be able to store. Raises ValueError for a NUL."""
    if "\x00" in text:
        raise ValueError("a NUL character cannot be stored; leave it out")
    return text


class Body(BaseModel):
    """A request body: unknown fields are refused, so that a misspelt one is not lost."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)


class View(BaseModel):
    """An answer."""

    model_config = ConfigDict(from_attributes=True)


Number = Annotated[float, Field(strict=True, allow_inf_nan=False)]
Whole = StrictInt
Flag = StrictBool
Name = Annotated[
    str,
    StringConstraints(strip_whitespace=True, min_length=1, max_length=120),
    AfterValidator(no_nul),
]
Note = Annotated[
    str,
    StringConstraints(strip_whitespace=True, min_length=1, max_length=1000),
    AfterValidator(no_nul),
]


def _storable(moment: datetime) -> datetime:
    if not _FIRST_YEAR <= moment.year <= _LAST_YEAR:
        raise ValueError(f"the year must lie from {_FIRST_YEAR} to {_LAST_YEAR}")
    return moment


# Far enough from the ends of the calendar that no change of time zone leaves it.
_FIRST_YEAR, _LAST_YEAR = 1900, 9000
Moment = Annotated[AwareDatetime, AfterValidator(_storable)]
Json = dict[str, Any]

__all__ = [
    "Body",
    "Flag",
    "Json",
    "Moment",
    "Name",
    "Note",
    "Number",
    "View",
    "Whole",
    "datetime",
    "no_nul",
]
