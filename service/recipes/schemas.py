"""Edges of recipes: drafts in; revisions with their limits and expectation out."""

import uuid
from datetime import datetime
from typing import Any, Literal

from pydantic import ConfigDict, Field

from service.recipes.body import EXAMPLE, RecipeBody
from service.web.schemas import Body, Flag, Json, Name, Note, View


class NewRecipeBody(Body):
    """A recipe and its first draft."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "Harbour neck",
                    "kind": "pickup",
                    "note": "Invented example.",
                    "body": EXAMPLE,
                }
            ]
        }
    )

    name: Name
    kind: Literal["pickup", "voice coil"] = "pickup"
    body: RecipeBody
    note: Note | None = None


class DraftBody(Body):
    """The content of a draft."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"body": EXAMPLE, "note": "20 turns more."}]}
    )

    body: RecipeBody
    note: Note | None = Field(default=None, description="What changed, and why.")


class ReleaseBody(Body):
    model_config = ConfigDict(json_schema_extra={"examples": [{"retire_previous": True}]})

    retire_previous: Flag = Field(
        default=True, description="Retire the revision that was released before it."
    )


class RetireBody(Body):
    model_config = ConfigDict(
        json_schema_extra={"examples": [{"reason": "The wire is not made any more."}]}
    )

    reason: Note


class LimitView(View):
    """A specification limit, SI; a resistance is meant at 20 °C."""

    stage: str
    characteristic: str
    lower: float | None
    upper: float | None


class RevisionLine(View):
    """A revision in a list."""

    id: uuid.UUID
    number: int
    state: str
    note: str | None
    created_at: datetime
    created_by: str
    released_at: datetime | None


class RecipeLine(View):
    """A recipe in a list, with the newest released revision, if any."""

    id: uuid.UUID
    name: str
    kind: str
    created_at: datetime
    released: RevisionLine | None
    draft: RevisionLine | None


class RecipeView(View):
    id: uuid.UUID
    name: str
    kind: str
    created_at: datetime
    revisions: list[RevisionLine] = Field(description="Newest first.")


class RevisionView(RevisionLine):
    recipe_id: uuid.UUID
    recipe: str
    kind: str
    body: Json
    expectation: Json | None = Field(
        description="The prediction as it was when the revision was released; never made anew."
    )
    limits: list[LimitView] = Field(description="Set at release.")
    released_by: str | None
    retired_at: datetime | None
    version: int


class DifferenceItem(View):
    pointer: str = Field(description="The field, as a JSON Pointer (RFC 6901).")
    before: Any
    after: Any


class DifferenceView(View):
    """What differs from the revision compared against to this one."""

    against: RevisionLine
    revision: RevisionLine
    differences: list[DifferenceItem]
