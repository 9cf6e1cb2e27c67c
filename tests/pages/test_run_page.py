import pytest
from fastapi.testclient import TestClient

from service.storage.serials import shown
from tests.bench.conftest import Bench
from tests.pages.reading import get, refused, send, sent
from tests.runs.conftest import Floor, Hands


def start_fields(hands: Hands, serial: str) -> dict[str, str]:
    """What stands in the start form, with machine and spool chosen."""
    page = get(hands.client, f"/runs/{shown(serial)}")
    form = page.form(f"/runs/{shown(serial)}/start")
    machines = [radio.attributes["value"] for radio in page.all("input", name="machine_id")]
    return {**form.fields, "machine_id": machines[0]}


def test_a_planned_coil_offers_the_fitting_spool_and_the_magnets(
    operator: Hands, floor: Floor
) -> None:
    (serial,) = operator.plan()
    page = get(operator.client, f"/runs/{serial}")
    form = page.form(f"/runs/{shown(serial)}/start")
    assert shown(floor.spool) in page.text
    assert shown(floor.thinner_spool) not in page.text
    assert form.fields["spool"]
    assert form.fields["magnet_lot"]
    assert "7600 turns of AWG 42 single copper" in page.text
    assert "no gloves at a turning spindle" in page.text


def test_start_and_finish_lead_back_to_the_run(operator: Hands) -> None:
    (serial,) = operator.plan()
    here = f"/runs/{shown(serial)}"
    assert sent(operator.client, f"{here}/start", **start_fields(operator, serial)) == here
    assert operator.show(serial)["state"] == "winding"
    assert sent(operator.client, f"{here}/correct", agreed_turns="7 600", reason="By eye.") == here
    run = operator.show(serial)
    assert run["state"] == "wound"
    assert run["agreed_turns"] == 7600


def test_a_double_tap_starts_once(operator: Hands) -> None:
    (serial,) = operator.plan()
    fields = start_fields(operator, serial)
    answers = [send(operator.client, f"/runs/{shown(serial)}/start", **fields) for _ in range(2)]
    assert [answer.status_code for answer in answers] == [303, 303]
    assert answers[1].headers["idempotency-replayed"] == "true"
    assert answers[1].headers["location"] == answers[0].headers["location"]
    assert len(operator.show(serial)["attempts"]) == 1


def test_a_form_that_was_sent_and_then_changed_is_told_apart_from_a_double_tap(
    operator: Hands,
) -> None:
    serial = operator.started()
    fields = {"idempotency_key": "one", "agreed_turns": "7600", "reason": "By eye."}
    sent(operator.client, f"/runs/{serial}/correct", **fields)
    page = refused(operator.client, f"/runs/{serial}/correct", **{**fields, "agreed_turns": "7500"})
    assert page.words_of("h1") == ["This form was sent before"]
    assert operator.show(serial)["agreed_turns"] == 7600


def test_a_scanned_label_goes_before_the_chosen_spool(operator: Hands, floor: Floor) -> None:
    (serial,) = operator.plan()
    fields = {**start_fields(operator, serial), "spool_label": shown(floor.thinner_spool)}
    page = refused(operator.client, f"/runs/{serial}/start", **fields)
    assert "The recipe is wound with AWG 42 single copper" in page.text
    assert page.form(f"/runs/{shown(serial)}/start").fields["spool_label"] == shown(
        floor.thinner_spool
    )
    assert operator.show(serial)["state"] == "planned"


def test_a_busy_machine_names_the_coil_on_it(operator: Hands, floor: Floor) -> None:
    other = operator.started()
    (serial,) = operator.plan()
    page = get(operator.client, f"/runs/{serial}")
    assert f"{shown(other)} is on it" in page.text
    (busy,) = page.all("input", name="machine_id", value=floor.machine_id)
    assert "disabled" in busy.attributes


def test_a_count_far_from_the_recipe_is_asked_back_and_then_taken(operator: Hands) -> None:
    serial = operator.started()
    here = f"/runs/{shown(serial)}"
    page = refused(operator.client, f"{here}/correct", agreed_turns="760", reason="By eye.")
    assert "Is this value meant?" in page.text
    assert "Was 7600 meant?" in page.text
    form = page.form(f"{here}/correct")
    assert form.fields["agreed_turns"] == "760"
    assert form.fields["reason"] == "By eye."
    assert page.all("input", name="confirmed", type="checkbox")
    assert sent(operator.client, f"{here}/correct", **form.fields, confirmed="yes") == here
    assert operator.show(serial)["agreed_turns"] == 760


def test_a_number_that_is_not_clear_is_refused_beside_its_field(operator: Hands) -> None:
    serial = operator.started()
    page = refused(operator.client, f"/runs/{serial}/correct", agreed_turns="7.600,5")
    (field,) = page.all("input", name="agreed_turns")
    assert field.attributes["aria-invalid"] == "true"
    assert "correct-agreed_turns-wrong" in field.attributes["aria-describedby"]
    assert "more than one decimal mark" in page.text


def test_a_lost_coil_keeps_its_cause(operator: Hands) -> None:
    serial = operator.started()
    sent(operator.client, f"/runs/{serial}/loss", cause="wire break", reason="Snarl.")
    run = operator.show(serial)
    assert run["state"] == "rework"
    assert "Lost: wire break" in get(operator.client, f"/runs/{serial}").text


def test_an_auditor_reads_a_run_and_is_offered_nothing(
    as_auditor: TestClient, operator: Hands
) -> None:
    serial = operator.started()
    page = get(as_auditor, f"/runs/{serial}")
    assert [form.action for form in page.forms] == ["/sign-out"]
    answer = send(as_auditor, f"/runs/{serial}/finish")
    assert answer.status_code == 403


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"kind": "scrap", "reason": "Layer short."}, "Scrap needs a cause."),
        ({"kind": "regrade", "reason": "Low."}, "names the recipe"),
        ({"kind": "release"}, "This field is empty."),
        ({"reason": "Because."}, "Nothing is chosen here."),
    ],
)
def test_a_decision_that_does_not_say_enough_is_refused(
    operator: Hands, bench: Bench, fields: dict[str, str], says: str
) -> None:
    serial = operator.wound()
    bench.verdict(serial)
    page = refused(bench.client, f"/runs/{serial}/decision", **fields)
    assert says in page.text
    assert operator.show(serial)["state"] == "measured"


def test_the_history_tells_what_happened_in_order(operator: Hands, bench: Bench) -> None:
    serial = operator.wound()
    bench.verdict(serial)
    sent(bench.client, f"/runs/{serial}/decision", kind="hold", reason="Ask the customer.")
    page = get(operator.client, f"/runs/{serial}")
    history = page.words_of("li")[-6:]
    assert [line.split()[1] for line in history[-5:-2]] == ["planned", "winding", "wound"]
    assert "conforms Measured (raw): " in history[-2]
    assert "on hold Hold" in history[-1]
    assert "“Ask the customer.”" in history[-1]


def test_coils_are_planned_for_an_order_and_more_than_it_wants_is_asked_back(lead: Hands) -> None:
    order = shown(lead.ordered(2))
    page = refused(lead.client, "/runs/new", order=order, count="3")
    assert "The order is for 2" in page.text
    assert page.form("/runs/new").fields["order"] == order
    assert sent(lead.client, "/runs/new", order=order, count="2") == f"/orders/{order}"
    assert "0 of 2 accepted, 2 under way" in get(lead.client, f"/orders/{order}").text


def test_any_label_is_found(operator: Hands, floor: Floor) -> None:
    (serial,) = operator.plan()
    for typed, place in (
        (serial.lower(), f"/runs/{shown(serial)}"),
        (f" {shown(floor.spool)} ", f"/stock/spools/{shown(floor.spool)}"),
        (floor.lot, "/stock"),
    ):
        answer = operator.client.get("/find", params={"label": typed}, follow_redirects=False)
        assert answer.headers["location"] == place


def test_runs_are_listed_by_state_and_page_by_page(operator: Hands) -> None:
    operator.plan(51)
    wound = operator.wound()
    page = get(operator.client, "/runs")
    assert len(page.all("a", **{"class": "serial"})) == 50
    older = next(link for link in page.all("a") if link.text == "Older")
    assert len(get(operator.client, older.attributes["href"]).all("a", **{"class": "serial"})) == 2
    page = get(operator.client, f"/runs?recipe={operator.floor.recipe_id}&state=scrapped")
    assert "No run is like that." in page.text
    (only,) = get(operator.client, "/runs?state=wound").words_of("a", **{"class": "serial"})
    assert only == shown(wound)
