"""What people do with recipes: draft, revise, release, retire."""

import unicodedata
import uuid
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.errors import AlreadyThere, NotFound
from service.recipes import rules
from service.recipes.body import RecipeBody
from service.recipes.freezing import expectation_of, limits_of, refuse_unwindable
from service.recipes.models import Recipe, Revision, RevisionLimit
from service.recipes.prediction import predict
from service.storage.records import Actor, record
from service.web.schemas import Json


def stored_body(body: RecipeBody) -> Json:
    """The body with all its defaults written out, so that a later default changes no recipe."""
    stored: Json = body.model_dump(mode="json", by_alias=True)
    return stored


def body_of(revision: Revision) -> RecipeBody:
    return RecipeBody.model_validate(revision.body)


def recipe_by_id(session: Session, recipe_id: uuid.UUID, *, pointer: str | None = None) -> Recipe:
    recipe = session.get(Recipe, recipe_id)
    if recipe is None:
        raise NotFound("There is no such recipe.", pointer=pointer, value=str(recipe_id))
    return recipe


def revision_by_id(
    session: Session, revision_id: uuid.UUID, *, pointer: str | None = None
) -> Revision:
    revision = session.get(Revision, revision_id)
    if revision is None:
        raise NotFound("There is no such revision.", pointer=pointer, value=str(revision_id))
    return revision


def hold_revision(session: Session, revision: Revision) -> Revision:
    """The revision as it is now, locked until the transaction ends."""
    statement = (
        sa.select(Revision)
        .where(Revision.id == revision.id)
        .with_for_update(of=Revision)
        .execution_options(populate_existing=True)
    )
    return session.scalars(statement).one()


def create_recipe(
    session: Session,
    actor: Actor,
    *,
    name: str,
    kind: str,
    body: RecipeBody,
    note: str | None,
    now: datetime,
) -> Revision:
    """A recipe, and its first revision as a draft."""
    name = unicodedata.normalize("NFC", name)
    if session.scalar(sa.select(Recipe.id).where(Recipe.name == name)):
        raise AlreadyThere(
            f"There is a recipe named “{name}” already.",
            pointer="/name",
            value=name,
            mend="Give it another name, or make a new revision of that recipe.",
        )
    recipe = Recipe(name=name, kind=kind, created_at=now)
    session.add(recipe)
    session.flush()
    record(
        session,
        actor,
        "create recipe",
        "recipe",
        recipe.id,
        at=now,
        after={"name": name, "kind": kind},
    )
    return _draft(session, actor, recipe, 1, body, note, now)


def new_revision(
    session: Session,
    actor: Actor,
    recipe_id: uuid.UUID,
    *,
    body: RecipeBody,
    note: str | None,
    now: datetime,
) -> Revision:
    """The next revision of a recipe, as a draft."""
    recipe = session.get(Recipe, recipe_id, with_for_update={"key_share": True})
    if recipe is None:
        raise NotFound("There is no such recipe.", value=str(recipe_id))
    last = session.scalar(
        sa.select(sa.func.max(Revision.number)).where(Revision.recipe_id == recipe_id)
    )
    return _draft(session, actor, recipe, (last or 0) + 1, body, note, now)


def _draft(
    session: Session,
    actor: Actor,
    recipe: Recipe,
    number: int,
    body: RecipeBody,
    note: str | None,
    now: datetime,
) -> Revision:
    revision = Revision(
        recipe_id=recipe.id,
        number=number,
        state="draft",
        body=stored_body(body),
        note=note,
        created_at=now,
        created_by=actor.name,
        recipe=recipe,
        limits=[],
    )
    session.add(revision)
    session.flush()
    after = {"recipe": recipe.name, "number": number, "body": revision.body, "note": note}
    record(session, actor, "draft revision", "revision", revision.id, at=now, after=after)
    return revision


def change_draft(
    session: Session,
    actor: Actor,
    revision: Revision,
    *,
    body: RecipeBody,
    note: str | None,
    now: datetime,
) -> Revision:
    """Replace the content of a draft. Raises WrongState for a released or retired revision."""
    revision = hold_revision(session, revision)
    rules.check_draft(revision.state, "change")
    before = {"body": revision.body, "note": revision.note}
    revision.body, revision.note = stored_body(body), note
    session.flush()
    after = {"body": revision.body, "note": note}
    record(
        session,
        actor,
        "change draft",
        "revision",
        revision.id,
        at=now,
        before=before,
        after=after,
    )
    return revision


def release(
    session: Session,
    actor: Actor,
    revision: Revision,
    now: datetime,
    *,
    retire_previous: bool = True,
) -> Revision:
    """Release a draft: freeze its expectation and set its limits.

    Raises InvalidValue where the coil cannot be wound, WrongState where it is no draft.
    """
    revision = hold_revision(session, revision)
    rules.check_draft(revision.state, "release")
    body = body_of(revision)
    answer = predict(body)
    refuse_unwindable(body, answer)
    revision.expectation = expectation_of(answer)
    revision.limits = [
        RevisionLimit(
            stage=limit.stage,
            characteristic=limit.characteristic,
            lower=limit.lower,
            upper=limit.upper,
        )
        for limit in limits_of(body, answer)
    ]
    revision.state, revision.released_at, revision.released_by = "released", now, actor.name
    session.flush()
    after = {
        "state": "released",
        "expectation": revision.expectation,
        "limits": [
            [limit.stage, limit.characteristic, limit.lower, limit.upper]
            for limit in revision.limits
        ],
    }
    record(
        session,
        actor,
        "release revision",
        "revision",
        revision.id,
        at=now,
        before={"state": "draft"},
        after=after,
    )
    if retire_previous:
        for earlier in _released_before(session, revision):
            _retire(session, actor, earlier, f"Revision {revision.number} was released.", now)
    return revision


def _released_before(session: Session, revision: Revision) -> list[Revision]:
    statement = (
        sa.select(Revision)
        .where(
            Revision.recipe_id == revision.recipe_id,
            Revision.id != revision.id,
            Revision.state == "released",
        )
        .order_by(Revision.number)
        .with_for_update(of=Revision)
    )
    return list(session.scalars(statement))


def retire(
    session: Session, actor: Actor, revision: Revision, *, reason: str, now: datetime
) -> Revision:
    """Take a released revision out of use: it takes no new orders, and stays in the record."""
    revision = hold_revision(session, revision)
    rules.check_released(revision.state, "retire")
    return _retire(session, actor, revision, reason, now)


def _retire(
    session: Session, actor: Actor, revision: Revision, reason: str, now: datetime
) -> Revision:
    revision.state, revision.retired_at = "retired", now
    session.flush()
    record(
        session,
        actor,
        "retire revision",
        "revision",
        revision.id,
        at=now,
        before={"state": "released"},
        after={"state": "retired"},
        reason=reason,
    )
    return revision
