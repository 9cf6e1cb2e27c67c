from typing import Any

import pytest
from fastapi.testclient import TestClient

from service.pages.forms import Form
from service.pages.recipe_fields import GROUPS, at, body_from
from service.recipes.body import RecipeBody
from tests.pages.reading import Page, get, refused, send, sent
from tests.recipes.bodies import example, voice_coil
from tests.runs.conftest import Floor


def typed(body: dict[str, Any]) -> dict[str, list[str]]:
    """A body as somebody would type it into the form."""
    fields = {}
    for group in GROUPS:
        for field in group.fields:
            value = at(body, field.path)
            if value is True:
                fields[field.path] = ["yes"]
            elif value is not None and value is not False:
                fields[field.path] = [f"{value:g}" if isinstance(value, float) else str(value)]
    return fields


@pytest.mark.parametrize(
    ("body", "kind"),
    [
        (example(), "pickup"),
        (example(scatter=None), "pickup"),
        (example(poles=None), "pickup"),
        (voice_coil(), "voice coil"),
        (voice_coil(layers=4, former_slit=True), "voice coil"),
    ],
)
def test_a_recipe_typed_into_the_form_is_that_recipe(body: dict[str, Any], kind: str) -> None:
    form = Form(typed(body))
    read = body_from(form, kind, {})
    assert not form.problems
    assert RecipeBody.model_validate(read) == RecipeBody.model_validate(body)


def test_what_the_form_does_not_ask_stays_as_it_was() -> None:
    before = example(scatter={"seed": 7}, string={"distance_mm": 2.5})
    read = body_from(Form(typed(before)), "pickup", before)
    assert read["scatter"]["seed"] == 7
    assert read["string"] == {"distance_mm": 2.5}


def test_limits_of_single_stages_are_read_by_the_row() -> None:
    fields = typed(example())
    fields |= {
        "limit1.stage": ["final"],
        "limit1.characteristic": ["self_resonance"],
        "limit1.lower": ["6k"],
        "limit1.kind": ["absolute"],
        "limit0.stage": ["raw"],
    }
    form = Form(fields)
    body_from(form, "pickup", {})
    assert "limit1.lower" in form.problems
    fields["limit1.lower"] = ["6000"]
    limits = body_from(Form(fields), "pickup", {})["tolerance"]["stage_limits"]
    assert limits == [
        {
            "stage": "final",
            "characteristic": "self_resonance",
            "lower": 6000.0,
            "upper": None,
            "kind": "absolute",
        }
    ]


def test_a_draft_is_foreseen_kept_and_released(as_lead: TestClient) -> None:
    fields = {name: values[0] for name, values in typed(example()).items()}
    fields |= {"kind": "pickup", "name": "Harbour bridge"}
    answer = send(as_lead, "/recipes/new/prediction", **fields)
    page = Page(answer)
    assert answer.status_code == 200
    assert "What it would be" in page.text
    assert page.form("/recipes/new").fields["name"] == "Harbour bridge"
    assert len(page.all("svg", **{"class": "drawing"})) == 2
    assert "Harbour bridge" not in get(as_lead, "/recipes").text

    place = sent(as_lead, "/recipes/new", **fields)
    page = get(as_lead, place)
    assert page.words_of("h1") == ["Harbour bridge, revision 1"]
    form = page.form(f"{place}/release")
    assert sent(as_lead, form.action, **form.fields) == place
    page = get(as_lead, place)
    assert "Frozen when it was released." in page.text
    assert "Specification limits" in page.text


def test_what_a_new_revision_changes_is_shown(as_lead: TestClient, floor: Floor) -> None:
    here = f"/recipes/{floor.recipe_id}/1/revise"
    page = get(as_lead, here)
    fields = {**page.form(here).fields, "turns": "7650", "note": "50 turns more."}
    place = sent(as_lead, here, **fields)
    assert place == f"/recipes/{floor.recipe_id}/2"
    page = get(as_lead, place)
    rows = page.words_of("tr")
    assert "Turns: on the coil 7600 7650" in rows
    assert "“50 turns more.”" in page.text
    answer = as_lead.get(f"/recipes/{floor.recipe_id}", follow_redirects=False)
    assert answer.headers["location"] == f"/recipes/{floor.recipe_id}/1"


def test_two_leads_at_one_draft_do_not_overwrite_each_other(
    as_lead: TestClient, floor: Floor
) -> None:
    made = f"/recipes/{floor.recipe_id}/1/revise"
    draft = sent(as_lead, made, **get(as_lead, made).form(made).fields)
    edit = f"{draft}/edit"
    seen = get(as_lead, edit).form(edit).fields
    sent(as_lead, edit, **{**seen, "turns": "7700", "idempotency_key": "first"})
    page = refused(as_lead, edit, 412, **{**seen, "turns": "7500", "idempotency_key": "second"})
    assert "It was changed since you read it." in page.text
    assert page.form(edit).fields["turns"] == "7500"


def test_a_recipe_that_cannot_be_is_refused_beside_the_field(as_lead: TestClient) -> None:
    fields = {name: values[0] for name, values in typed(example()).items()}
    fields |= {"kind": "pickup", "name": "Impossible", "wire.size": "AWG 99", "poles.count": "1,5"}
    page = refused(as_lead, "/recipes/new", **fields)
    assert "not a whole number" in page.text
    page = refused(as_lead, "/recipes/new", **{**fields, "poles.count": "6"})
    (size,) = page.all("input", name="wire.size")
    assert size.attributes["aria-invalid"] == "true"
    assert "is no standard wire" in page.text


def test_only_a_lead_drafts(as_operator: TestClient, floor: Floor) -> None:
    assert send(as_operator, "/recipes/new", name="X").status_code == 403
    page = get(as_operator, f"/recipes/{floor.recipe_id}/1")
    assert [form.action for form in page.forms] == ["/sign-out"]
