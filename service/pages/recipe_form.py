"""A recipe's draft as a form: new, changed, or as the next revision; with a prediction at hand."""

import uuid
from collections.abc import Mapping
from typing import Annotated, Any

from fastapi import APIRouter, Query, Request, Response
from pydantic import ValidationError
from sqlalchemy.orm import Session

from service.pages.drawings import Drawing, drawings_of
from service.pages.forms import Entered, Form, FormWork
from service.pages.recipe_fields import (
    LIMIT_CHARACTERISTICS,
    LIMIT_KINDS,
    LIMIT_ROWS,
    LIMIT_STAGES,
    at,
    body_from,
    groups_for,
)
from service.pages.recipes import Foreseen, foresee, revision_of
from service.pages.render import carry_out, page, see_other
from service.pages.shop import check_version
from service.physics.pole_materials import POLE_MATERIALS
from service.recipes import acts
from service.recipes.body import RecipeBody
from service.recipes.models import KINDS, Revision
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/recipes", route_class=UnitRoute, include_in_schema=False)

Kind = Annotated[str, Query(max_length=20)]
_PICKUP = KINDS[0]


def _page(
    request: Request,
    session: Session,
    form: Form,
    *,
    title: str,
    action: str,
    kind: str,
    body: Mapping[str, Any],
    revision: Revision | None = None,
    foreseen: Foreseen | None = None,
    drawings: list[Drawing] | None = None,
) -> Response:
    return page(
        request,
        session,
        "recipe_form.html",
        status=form.status,
        form=form,
        title=title,
        action=action,
        kind=kind,
        kinds=KINDS,
        groups=groups_for(kind),
        body=body,
        at=at,
        revision=revision,
        is_new=action == "/recipes/new",
        foreseen=foreseen,
        drawings=drawings or [],
        materials=list(POLE_MATERIALS),
        limit_rows=range(LIMIT_ROWS),
        stated=at(body, "tolerance.stage_limits") or [],
        limit_stages=[(one, one) for one in LIMIT_STAGES],
        limit_characteristics=[(one, one.replace("_", " ")) for one in LIMIT_CHARACTERISTICS],
        limit_kinds=[(one, one) for one in LIMIT_KINDS],
    )


def _read(form: Form, kind: str, before: Mapping[str, Any]) -> tuple[RecipeBody | None, Any]:
    """The body of the form, checked, and as plain JSON; None where something is wrong."""
    plain = body_from(form, kind, before)
    if form.problems:
        return None, plain
    try:
        return RecipeBody.model_validate(plain), plain
    except ValidationError as error:
        form.take_validation(error)
        return None, plain


def _foreseen(form: Form, kind: str, before: Mapping[str, Any]) -> dict[str, Any]:
    """What the coil in the form would be, for the page that shows the form again."""
    body, plain = _read(form, kind, before)
    if body is None:
        form.take(next(iter(form.problems.values())))
        return {}
    foreseen = foresee(plain)
    if foreseen.problem is not None:
        form.take(foreseen.problem)
        return {}
    return {"foreseen": foreseen, "drawings": drawings_of(plain, foreseen.build_mm)}


def _kind(text: str) -> str:
    return text if text in KINDS else _PICKUP


@router.get("/new")
def new_recipe(
    request: Request, reading: Reading, _actor: access.Lead, kind: Kind = _PICKUP
) -> Response:
    return _new(request, reading, Form(), _kind(kind))


def _new(request: Request, session: Session, form: Form, kind: str, **more: Any) -> Response:
    return _page(
        request,
        session,
        form,
        title=f"New recipe for a {kind}{'' if kind != _PICKUP else ' coil'}",
        action="/recipes/new",
        kind=kind,
        body={},
        **more,
    )


@router.post("/new/prediction")
def predict_new(request: Request, reading: Reading, _actor: access.Lead, form: Entered) -> Response:
    kind = _kind(form.value("kind"))
    return _new(request, reading, form, kind, **_foreseen(form, kind, {}))


@router.post("/new")
def create(
    request: Request, actor: access.Lead, form: Entered, work: FormWork, now: Now
) -> Response:
    kind = _kind(form.value("kind"))
    name = form.text("name")
    note = form.optional_text("note")
    body, _plain = _read(form, kind, {})
    made: list[Revision] = []

    def act() -> None:
        if body is not None:
            made.append(
                acts.create_recipe(work, actor, name=name, kind=kind, body=body, note=note, now=now)
            )

    if carry_out(work, form, act):
        return see_other(f"/recipes/{made[0].recipe_id}/{made[0].number}")
    return _new(request, work, form, kind)


@router.get("/{recipe_id}/{number}/edit")
def edit(
    recipe_id: uuid.UUID, number: int, request: Request, reading: Reading, _actor: access.Lead
) -> Response:
    return _draft(request, reading, Form(), revision_of(reading, recipe_id, number), "edit")


@router.get("/{recipe_id}/{number}/revise")
def revise(
    recipe_id: uuid.UUID, number: int, request: Request, reading: Reading, _actor: access.Lead
) -> Response:
    return _draft(request, reading, Form(), revision_of(reading, recipe_id, number), "revise")


def _draft(
    request: Request, session: Session, form: Form, revision: Revision, what: str, **more: Any
) -> Response:
    name = revision.recipe.name
    return _page(
        request,
        session,
        form,
        title=(
            f"{name}, draft {revision.number}"
            if what == "edit"
            else f"{name}: next revision, from revision {revision.number}"
        ),
        action=f"/recipes/{revision.recipe_id}/{revision.number}/{what}",
        kind=revision.recipe.kind,
        body=revision.body,
        revision=revision,
        **more,
    )


@router.post("/{recipe_id}/{number}/edit/prediction")
def predict_edit(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    reading: Reading,
    _actor: access.Lead,
    form: Entered,
) -> Response:
    revision = revision_of(reading, recipe_id, number)
    found = _foreseen(form, revision.recipe.kind, revision.body)
    return _draft(request, reading, form, revision, "edit", **found)


@router.post("/{recipe_id}/{number}/revise/prediction")
def predict_revise(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    reading: Reading,
    _actor: access.Lead,
    form: Entered,
) -> Response:
    revision = revision_of(reading, recipe_id, number)
    found = _foreseen(form, revision.recipe.kind, revision.body)
    return _draft(request, reading, form, revision, "revise", **found)


@router.post("/{recipe_id}/{number}/edit")
def change(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    actor: access.Lead,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    revision = revision_of(work, recipe_id, number)
    note = form.optional_text("note")
    body, _plain = _read(form, revision.recipe.kind, revision.body)

    def act() -> None:
        check_version(form, revision.version)
        if body is not None:
            acts.change_draft(work, actor, revision, body=body, note=note, now=now)

    if carry_out(work, form, act):
        return see_other(f"/recipes/{recipe_id}/{number}")
    return _draft(request, work, form, revision_of(work, recipe_id, number), "edit")


@router.post("/{recipe_id}/{number}/revise")
def make_revision(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    actor: access.Lead,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    revision = revision_of(work, recipe_id, number)
    note = form.optional_text("note")
    body, _plain = _read(form, revision.recipe.kind, revision.body)
    made: list[Revision] = []

    def act() -> None:
        if body is not None:
            made.append(acts.new_revision(work, actor, recipe_id, body=body, note=note, now=now))

    if carry_out(work, form, act):
        return see_other(f"/recipes/{recipe_id}/{made[0].number}")
    return _draft(request, work, form, revision_of(work, recipe_id, number), "revise")
