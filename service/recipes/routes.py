"""Routes of recipes: drafts, revisions, release, differences, and predictions."""

import uuid
from collections import defaultdict
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Depends, Query, Request, Response
from sqlalchemy.orm import Session, defer, lazyload

from service.recipes import acts, rules
from service.recipes.body import RecipeBody
from service.recipes.models import Recipe, Revision
from service.recipes.prediction import PredictionAnswer, predict
from service.recipes.schemas import (
    DifferenceItem,
    DifferenceView,
    DraftBody,
    NewRecipeBody,
    RecipeLine,
    RecipeView,
    ReleaseBody,
    RetireBody,
    RevisionLine,
    RevisionView,
)
from service.web import access
from service.web.edits import IfMatch, check_seen, tag
from service.web.paging import After, Limit, link_next, page
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute, tags=["recipes"])


def revision_view(revision: Revision) -> RevisionView:
    line = RevisionLine.model_validate(revision)
    return RevisionView(
        **line.model_dump(),
        recipe_id=revision.recipe_id,
        recipe=revision.recipe.name,
        kind=revision.recipe.kind,
        body=revision.body,
        expectation=revision.expectation,
        limits=revision.limits,
        released_by=revision.released_by,
        retired_at=revision.retired_at,
        version=revision.version,
    )


def _lines(session: Session, recipe_ids: list[uuid.UUID]) -> dict[uuid.UUID, list[RevisionLine]]:
    """The revisions of the recipes, newest first, without their bodies."""
    statement = (
        sa.select(Revision)
        .where(Revision.recipe_id.in_(recipe_ids))
        .order_by(Revision.number.desc())
        .options(
            defer(Revision.body),
            defer(Revision.expectation),
            lazyload(Revision.recipe),
            lazyload(Revision.limits),
        )
    )
    found: dict[uuid.UUID, list[RevisionLine]] = defaultdict(list)
    for revision in session.scalars(statement):
        found[revision.recipe_id].append(RevisionLine.model_validate(revision))
    return found


def _newest(lines: list[RevisionLine], state: str) -> RevisionLine | None:
    return next((line for line in lines if line.state == state), None)


@router.post("/recipes", status_code=201)
def create_recipe(
    body: NewRecipeBody, work: Work, now: Now, actor: access.Lead, response: Response
) -> RevisionView:
    """Make a recipe with its first draft; the answer is that draft."""
    revision = acts.create_recipe(
        work, actor, name=body.name, kind=body.kind, body=body.body, note=body.note, now=now
    )
    return _created(response, revision)


def _created(response: Response, revision: Revision) -> RevisionView:
    response.headers["Location"] = f"/api/v1/revisions/{revision.id}"
    tag(response, revision.version)
    return revision_view(revision)


@router.get("/recipes")
def list_recipes(
    request: Request,
    response: Response,
    reading: Reading,
    _actor: access.Anybody,
    limit: Limit = 50,
    after: After = None,
) -> list[RecipeLine]:
    """Recipes, newest first, each with its newest released revision and its newest draft."""
    recipes, more = page(reading, sa.select(Recipe), Recipe.id, limit, after)
    lines = _lines(reading, [recipe.id for recipe in recipes])
    link_next(request, response, recipes[-1].id if recipes else None, more)
    return [
        RecipeLine(
            id=recipe.id,
            name=recipe.name,
            kind=recipe.kind,
            created_at=recipe.created_at,
            released=_newest(lines[recipe.id], "released"),
            draft=_newest(lines[recipe.id], "draft"),
        )
        for recipe in recipes
    ]


@router.get("/recipes/{recipe_id}")
def show_recipe(recipe_id: uuid.UUID, reading: Reading, _actor: access.Anybody) -> RecipeView:
    recipe = acts.recipe_by_id(reading, recipe_id)
    return RecipeView(
        id=recipe.id,
        name=recipe.name,
        kind=recipe.kind,
        created_at=recipe.created_at,
        revisions=_lines(reading, [recipe.id])[recipe.id],
    )


@router.post("/recipes/{recipe_id}/revisions", status_code=201)
def new_revision(
    recipe_id: uuid.UUID,
    body: DraftBody,
    work: Work,
    now: Now,
    actor: access.Lead,
    response: Response,
) -> RevisionView:
    """Make the next revision of a recipe, as a draft."""
    revision = acts.new_revision(work, actor, recipe_id, body=body.body, note=body.note, now=now)
    return _created(response, revision)


@router.get("/revisions/{revision_id}")
def show_revision(
    revision_id: uuid.UUID, reading: Reading, _actor: access.Anybody, response: Response
) -> RevisionView:
    revision = acts.revision_by_id(reading, revision_id)
    tag(response, revision.version)
    return revision_view(revision)


@router.put("/revisions/{revision_id}")
def change_draft(
    revision_id: uuid.UUID,
    body: DraftBody,
    work: Work,
    now: Now,
    actor: access.Lead,
    response: Response,
    if_match: IfMatch = None,
) -> RevisionView:
    """Replace the content of a draft; needs the ETag that you have seen."""
    revision = acts.hold_revision(work, acts.revision_by_id(work, revision_id))
    rules.check_draft(revision.state, "change")
    check_seen(if_match, revision.version)
    revision = acts.change_draft(work, actor, revision, body=body.body, note=body.note, now=now)
    tag(response, revision.version)
    return revision_view(revision)


def _foresee(revision_id: uuid.UUID, reading: Reading) -> None:
    """Make the prediction before the writing transaction opens; the release finds it kept.

    A prediction may take a quarter of a second, and the embedded database has one writer.
    """
    predict(acts.body_of(acts.revision_by_id(reading, revision_id)))


@router.post("/revisions/{revision_id}/release")
def release(
    revision_id: uuid.UUID,
    body: ReleaseBody,
    actor: access.Lead,
    _foreseen: Annotated[None, Depends(_foresee)],
    work: Work,
    now: Now,
    response: Response,
    if_match: IfMatch = None,
) -> RevisionView:
    """Release a draft: its expectation is frozen and its limits are set, for good.

    Refused where the coil cannot be wound. If-Match is honoured where sent.
    """
    revision = acts.hold_revision(work, acts.revision_by_id(work, revision_id))
    if if_match is not None:
        check_seen(if_match, revision.version)
    revision = acts.release(work, actor, revision, now, retire_previous=body.retire_previous)
    tag(response, revision.version)
    return revision_view(revision)


@router.post("/revisions/{revision_id}/retire")
def retire(
    revision_id: uuid.UUID,
    body: RetireBody,
    work: Work,
    now: Now,
    actor: access.Lead,
    response: Response,
) -> RevisionView:
    """Take a released revision out of use: no new orders; what was wound to it keeps it."""
    revision = acts.retire(
        work, actor, acts.revision_by_id(work, revision_id), reason=body.reason, now=now
    )
    tag(response, revision.version)
    return revision_view(revision)


@router.get("/revisions/{revision_id}/difference")
def show_difference(
    revision_id: uuid.UUID,
    against: Annotated[uuid.UUID, Query(description="The revision to compare with.")],
    reading: Reading,
    _actor: access.Anybody,
) -> DifferenceView:
    """What changed from the revision ``against`` to this one, field by field."""
    revision = acts.revision_by_id(reading, revision_id)
    earlier = acts.revision_by_id(reading, against, pointer="against")
    return DifferenceView(
        against=RevisionLine.model_validate(earlier),
        revision=RevisionLine.model_validate(revision),
        differences=[
            DifferenceItem.model_validate(item)
            for item in rules.difference(earlier.body, revision.body)
        ],
    )


@router.post("/predictions")
def predict_coil(body: RecipeBody, _actor: access.Anybody) -> PredictionAnswer:
    """What a coil of this recipe will measure, with uncertainty; stores nothing."""
    return predict(body)
