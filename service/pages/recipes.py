"""Recipes and their revisions: read, compared, released and retired."""

import uuid
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any

import sqlalchemy as sa
from fastapi import APIRouter, Depends, Request, Response
from sqlalchemy.orm import Session, defer, lazyload

from service.errors import InvalidValue, NotFound
from service.pages.drawings import drawings_of
from service.pages.forms import Entered, Form, FormWork
from service.pages.recipe_fields import name_of, told
from service.pages.render import carry_out, page, see_other
from service.pages.shop import check_version
from service.recipes import acts, rules
from service.recipes.body import RecipeBody
from service.recipes.models import Recipe, Revision
from service.recipes.prediction import predict
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/recipes", route_class=UnitRoute, include_in_schema=False)

# What is told of a prediction: its field, its name, its unit, what turns it into that unit.
EXPECTED = (
    ("resistance_at_20_c_ohm", "Resistance at 20 °C", "Ω", 1.0),
    ("resistance_ohm", "Resistance at the recipe’s temperature", "Ω", 1.0),
    ("apparent_inductance_h", "Inductance as a meter shows it", "H", 1.0),
    ("inductance_h", "True inductance, poles fitted", "H", 1.0),
    ("air_inductance_h", "Inductance in air", "H", 1.0),
    ("quality_factor", "Q at the test frequency", "", 1.0),
    ("self_resonance_hz", "Self-resonance, no load", "Hz", 1.0),
    ("self_capacitance_f", "Self-capacitance", "F", 1.0),
    ("output_mv", "Output for the stated string", "V", 1e-3),
    ("pole_flux_density_t", "Flux density at the poles", "T", 1.0),
    ("force_factor_n_per_a", "Force factor Bl", "N/A", 1.0),
    ("wire_length_m", "Wire as laid", "m", 1.0),
    ("wire_mass_g", "Bare wire", "g", 1.0),
    ("outer_build_mm", "Depth of the winding", "mm", 1.0),
    ("fill_factor", "Conductor over section", "", 1.0),
)
_BUDGET_OF = (("resistance_ohm", "Resistance"), ("inductance_h", "Inductance"))
_SHARE_TOLD = 0.01


@dataclass(frozen=True)
class Quantity:
    """One line of a prediction."""

    name: str
    value: float
    standard_uncertainty: float
    unit: str


@dataclass(frozen=True)
class Foreseen:
    """A prediction, or why there is none."""

    quantities: list[Quantity]
    budget: list[tuple[str, list[tuple[str, float]]]]
    warnings: list[str]
    problem: InvalidValue | None
    build_mm: float | None


def foresee(body: Mapping[str, Any]) -> Foreseen:
    """What a coil of this body would be."""
    try:
        answer = predict(RecipeBody.model_validate(body))
    except InvalidValue as problem:
        return Foreseen([], [], [], problem, None)
    return foreseen_of(answer.model_dump())


def foreseen_of(answer: Mapping[str, Any]) -> Foreseen:
    """A prediction as it is told, from an answer or from what a release has frozen."""
    quantities = [
        Quantity(name, found["value"] * factor, found["standard_uncertainty"] * factor, unit)
        for field, name, unit, factor in EXPECTED
        if (found := answer.get(field)) and found["value"]
    ]
    budget = [
        (name, _shares(answer.get("uncertainty_budget", []), field)) for field, name in _BUDGET_OF
    ]
    build = answer.get("outer_build_mm")
    return Foreseen(
        quantities,
        budget,
        [warning["sentence"] for warning in answer.get("warnings", [])],
        None,
        build["value"] if build else None,
    )


def _shares(lines: list[dict[str, Any]], field: str) -> list[tuple[str, float]]:
    found = [(str(line["input"]), float(line["share"].get(field, 0.0))) for line in lines]
    told_of = [item for item in found if item[1] >= _SHARE_TOLD]
    return sorted(told_of, key=lambda item: -item[1])


@router.get("")
def list_recipes(request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    recipes = reading.scalars(sa.select(Recipe).order_by(Recipe.kind, Recipe.name)).all()
    revisions: dict[uuid.UUID, list[Revision]] = {recipe.id: [] for recipe in recipes}
    for revision in _lines(reading, sa.true()):
        revisions[revision.recipe_id].append(revision)
    return page(request, reading, "recipes.html", recipes=recipes, revisions=revisions)


def _lines(session: Session, where: sa.ColumnElement[bool]) -> list[Revision]:
    """Revisions without their bodies, the newest first."""
    return list(
        session.scalars(
            sa.select(Revision)
            .where(where)
            .order_by(Revision.number.desc())
            .options(
                defer(Revision.body),
                defer(Revision.expectation),
                lazyload(Revision.recipe),
                lazyload(Revision.limits),
            )
        )
    )


@router.get("/{recipe_id}")
def show_recipe(recipe_id: uuid.UUID, reading: Reading, _actor: access.Anybody) -> Response:
    """The revision in use, else the newest."""
    lines = _lines(reading, Revision.recipe_id == recipe_id)
    if not lines:
        raise NotFound("There is no such recipe.", value=str(recipe_id))
    in_use = next((line for line in lines if line.state == "released"), lines[0])
    return see_other(f"/recipes/{recipe_id}/{in_use.number}")


def revision_of(session: Session, recipe_id: uuid.UUID, number: int) -> Revision:
    revision = session.scalars(
        sa.select(Revision).where(Revision.recipe_id == recipe_id, Revision.number == number)
    ).one_or_none()
    if revision is None:
        raise NotFound("There is no such revision.", value=number)
    return revision


@router.get("/{recipe_id}/{number}")
def show_revision(
    recipe_id: uuid.UUID, number: int, request: Request, reading: Reading, _actor: access.Anybody
) -> Response:
    return _page(request, reading, recipe_id, number)


def _page(
    request: Request,
    session: Session,
    recipe_id: uuid.UUID,
    number: int,
    which: str = "",
    form: Form | None = None,
) -> Response:
    forms = {name: Form(prefix=f"{name}-") for name in ("release", "retire")}
    if form is not None:
        form.prefix = f"{which}-"
        forms[which] = form
    revision = revision_of(session, recipe_id, number)
    before = session.scalars(
        sa.select(Revision)
        .where(Revision.recipe_id == recipe_id, Revision.number < number)
        .order_by(Revision.number.desc())
        .limit(1)
    ).one_or_none()
    differences = [
        (name_of(one.pointer), one.before, one.after)
        for one in (rules.difference(before.body, revision.body) if before else [])
    ]
    foreseen = foreseen_of(revision.expectation) if revision.expectation else foresee(revision.body)
    return page(
        request,
        session,
        "recipe.html",
        status=form.status if form else 200,
        revision=revision,
        recipe=revision.recipe,
        lines=_lines(session, Revision.recipe_id == recipe_id),
        told=told(revision.body, revision.recipe.kind),
        foreseen=foreseen,
        drawings=drawings_of(revision.body, foreseen.build_mm),
        before=before,
        differences=differences,
        forms=forms,
    )


def _foresee_release(recipe_id: uuid.UUID, number: int, reading: Reading) -> None:
    """Make the prediction before the writing transaction opens; the release finds it kept."""
    revision = revision_of(reading, recipe_id, number)
    if revision.state == "draft":
        foresee(revision.body)


@router.post("/{recipe_id}/{number}/release")
def release(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    actor: access.Lead,
    _foreseen: Annotated[None, Depends(_foresee_release)],
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    retire_previous = form.flag("retire_previous")

    def act() -> None:
        revision = revision_of(work, recipe_id, number)
        check_version(form, revision.version)
        acts.release(work, actor, revision, now, retire_previous=retire_previous)

    if carry_out(work, form, act):
        return see_other(f"/recipes/{recipe_id}/{number}")
    return _page(request, work, recipe_id, number, "release", form)


@router.post("/{recipe_id}/{number}/retire")
def retire(
    recipe_id: uuid.UUID,
    number: int,
    request: Request,
    actor: access.Lead,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    reason = form.text("reason", 1000)
    if carry_out(
        work,
        form,
        lambda: acts.retire(
            work, actor, revision_of(work, recipe_id, number), reason=reason, now=now
        ),
    ):
        return see_other(f"/recipes/{recipe_id}/{number}")
    return _page(request, work, recipe_id, number, "retire", form)
