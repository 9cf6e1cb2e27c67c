"""Orders, stock, shop, people and the month."""

import re

import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.storage.engine import Database
from service.storage.idempotency import KeptAnswer
from service.storage.serials import shown
from tests.bench.conftest import Bench
from tests.clients import PASSWORD
from tests.pages.reading import Page, get, refused, send, sent
from tests.runs.conftest import Floor, Hands


def test_an_order_is_placed_and_closed(as_owner: TestClient, floor: Floor) -> None:
    place = sent(
        as_owner,
        "/orders/new",
        customer="Invented <Guitars>",
        revision_id=floor.revision_id,
        quantity="12",
        promised_on="2026-12-18",
    )
    page = get(as_owner, place)
    assert "Invented <Guitars>" in page.text
    assert "0 of 12 accepted" in page.text
    assert sent(as_owner, f"{place}/close", reason="Withdrawn.") == place
    assert "closed" in get(as_owner, place).words_of("span", **{"class": "state s-closed"})[0]


def test_an_order_without_a_recipe_keeps_what_was_typed(as_owner: TestClient, floor: Floor) -> None:
    page = refused(as_owner, "/orders/new", customer="Invented", quantity="a dozen", note="Soon.")
    assert floor.revision_id in page.response.text
    assert page.form("/orders/new").fields["note"] == "Soon."
    assert "Nothing is chosen here." in page.text
    assert "is not a number" in page.text


def test_a_spool_is_received_and_given_its_own_resistance(as_operator: TestClient) -> None:
    place = sent(
        as_operator,
        "/stock/spools",
        wire_size="AWG 42",
        wire_build="single",
        conductor="copper",
        supplier_lot="INV-9",
        net_mass_kg="250 g",
    )
    assert "250 g" in get(as_operator, place).text
    trial = {
        "resistance_ohm": "541 mΩ",
        "length_m": "1",
        "temperature_c": "20",
        "relative_uncertainty_percent": "0,5",
    }
    page = refused(as_operator, f"{place}/measurement", **trial)
    assert "Is this value meant?" in page.text
    sent(as_operator, f"{place}/measurement", **{**trial, "resistance_ohm": "5,41"})
    assert "5.410 Ω/m at 20 °C ± 1.0 %" in get(as_operator, place).text


def test_a_slip_on_receipt_is_corrected_with_a_reason(
    as_operator: TestClient, floor: Floor
) -> None:
    here = f"/stock/spools/{shown(floor.spool)}"
    seen = get(as_operator, here).form(f"{here}/receipt").fields
    page = refused(
        as_operator, f"{here}/receipt", **{**seen, "net_mass_kg": "900", "reason": "Slip."}
    )
    assert "cannot be on a spool" in page.text
    fields = {**seen, "net_mass_kg": "0,9", "reason": "Weighed again.", "idempotency_key": "one"}
    assert sent(as_operator, f"{here}/receipt", **fields) == here
    assert "0.9000 kg" in get(as_operator, here).text
    refused(as_operator, f"{here}/receipt", 412, **{**fields, "idempotency_key": "two"})


def test_only_a_lead_ends_a_quarantine(
    as_operator: TestClient, as_lead: TestClient, floor: Floor
) -> None:
    here = f"/stock/spools/{shown(floor.spool)}/state"
    sent(as_operator, here, state="quarantined", reason="Flakes.")
    page = refused(as_operator, here, 403, state="on the shelf", reason="It is fine.")
    assert "Ask a lead to end the quarantine." in page.text
    sent(as_lead, here, state="on the shelf", reason="Only the outer layer.")


def test_a_spool_tells_which_coils_came_from_it(operator: Hands, floor: Floor) -> None:
    serial = operator.wound()
    page = get(operator.client, f"/stock/spools/{floor.spool}")
    assert shown(serial) in page.words_of("a", **{"class": "serial"})


def test_a_quarantined_spool_is_not_offered_at_the_start(operator: Hands, floor: Floor) -> None:
    here = f"/stock/spools/{shown(floor.spool)}"
    sent(operator.client, f"{here}/state", state="quarantined", reason="Nicks in the enamel.")
    (serial,) = operator.plan()
    page = get(operator.client, f"/runs/{serial}")
    assert "No spool of this wire is on the shelf." in page.text


def test_a_counters_key_is_shown_once_and_kept_nowhere(
    as_lead: TestClient, database: Database, floor: Floor
) -> None:
    answer = send(as_lead, "/shop/counters", name="Counter A", machine_id=floor.machine_id)
    assert answer.status_code == 200
    (key,) = Page(answer).words_of("code")
    assert re.fullmatch(r"cwd_[\w-]{43}", key)
    assert key not in get(as_lead, "/shop").response.text
    with database.read() as session:
        assert not session.scalars(sa.select(KeptAnswer.key)).all()


def test_a_machine_is_added_and_a_late_edit_refused(as_lead: TestClient) -> None:
    fields = {"name": "Winder C", "top_speed_rpm": "1.500", "pulses_per_turn": "1"}
    page = refused(as_lead, "/shop/machines", **{**fields, "pulses_per_turn": "0,5"})
    assert "is outside 1 to 1000" in page.text
    sent(as_lead, "/shop/machines", **{**fields, "top_speed_rpm": "1500 rpm"})
    link = next(a for a in get(as_lead, "/shop").all("a") if a.text == "Winder C")
    here = link.attributes["href"]
    seen = get(as_lead, here).form(here).fields
    sent(as_lead, here, **{**seen, "name": "Winder D", "idempotency_key": "one"})
    page = refused(as_lead, here, 412, **{**seen, "name": "Winder E", "idempotency_key": "two"})
    assert "It was changed since you read it." in page.text


def test_an_instrument_shows_when_its_calibration_is_overdue(
    as_lead: TestClient, bench: Bench
) -> None:
    assert bench.overdue
    rows = [row for row in get(as_lead, "/shop").words_of("tr") if row.startswith("Old meter")]
    assert rows[0].endswith("overdue")


def test_a_new_calibration_is_recorded(as_lead: TestClient, bench: Bench) -> None:
    here = f"/shop/instruments/{bench.overdue}"
    fields = get(as_lead, here).form(here).fields
    fields |= {"calibrated_on": "2026-11-02", "calibration_due": "2099-11-02"}
    sent(as_lead, here, **fields)
    rows = [row for row in get(as_lead, "/shop").words_of("tr") if row.startswith("Old meter")]
    assert rows[0].endswith("2 Nov 2099")


def test_the_time_zone_must_be_one_that_exists(as_owner: TestClient) -> None:
    fields = get(as_owner, "/shop").form("/shop/workshop").fields
    page = refused(as_owner, "/shop/workshop", **{**fields, "time_zone": "Europe/Atlantis"})
    assert "There is no time zone" in page.text
    sent(as_owner, "/shop/workshop", **{**fields, "time_zone": "Europe/Berlin"})
    assert 'data-zone="Europe/Berlin"' in get(as_owner, "/floor").response.text


def test_an_owner_adds_a_person_who_can_then_sign_in(
    as_owner: TestClient, client: TestClient
) -> None:
    page = refused(as_owner, "/shop/people", name="Invented Bench", password="short")
    assert "at least 12 characters" in page.text
    sent(
        as_owner,
        "/shop/people",
        name="Invented Bench",
        password="a long invented one",
        roles="bench",
    )
    fields = {"name": "Invented Bench", "password": "a long invented one"}
    assert sent(client, "/sign-in", **fields) == "/floor"
    assert get(client, "/bench").words_of("h1") == ["Bench"]


def test_the_last_owner_cannot_be_let_go(as_owner: TestClient) -> None:
    page = get(as_owner, "/shop/people")
    form = next(form for form in page.forms if "version" in form.fields)
    fields = {"version": form.fields["version"], "roles": "operator", "reason": "Change."}
    page = refused(as_owner, form.action, 409, **fields, active="yes")
    assert "This is the last owner" in page.text


def test_people_are_not_shown_to_everybody(as_operator: TestClient) -> None:
    get(as_operator, "/shop/people", 403)


def test_a_password_is_changed_with_the_present_one(as_operator: TestClient) -> None:
    fields = {"present_password": "not it", "new_password": "another invented one"}
    page = refused(as_operator, "/password", **fields)
    assert "The present password does not fit." in page.text
    assert sent(as_operator, "/password", **{**fields, "present_password": PASSWORD}) == "/sign-in"
    answer = as_operator.get("/floor", headers={"Accept": "text/html"}, follow_redirects=False)
    assert answer.status_code == 303


def test_the_month_adds_up_and_shows_its_causes(
    operator: Hands, bench: Bench, as_owner: TestClient
) -> None:
    good, bad = operator.wound(), operator.wound()
    bench.verdict(good)
    bench.decide(good, "release")
    bench.verdict(bad, resistance_ohm=bench.entry()["resistance_ohm"] * 1.2)
    bench.decide(bad, "scrap", cause="shorted turns", reason="Nick.")
    answer = as_owner.get("/months", headers={"Accept": "text/html"}, follow_redirects=False)
    page = get(as_owner, answer.headers["location"])
    rows = page.words_of("tr")
    assert "good first time 1" in rows
    assert "scrap 1" in rows
    assert "started 2" in rows
    assert "shorted turns 1" in rows
    assert "So few coils make no percentage." in page.text


def test_a_month_that_is_none_is_told(as_owner: TestClient) -> None:
    assert "is no month" in get(as_owner, "/months/2026-13", 422).text
