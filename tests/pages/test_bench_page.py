from service.storage.serials import shown
from tests.bench.conftest import Bench
from tests.pages.reading import Page, get, refused, send, sent
from tests.runs.conftest import Hands


def entry(bench: Bench, serial: str, **changes: str) -> dict[str, str]:
    """What stands in the entry, with the readings typed in."""
    page = get(bench.client, f"/bench/{serial}")
    form = page.form(f"/bench/{shown(serial)}")
    usual = bench.entry()
    return {
        **form.fields,
        "resistance_ohm": f"{usual['resistance_ohm'] / 1e3:.4f} kΩ".replace(".", ","),
        "coil_temperature_c": "20,0",
        "resistance_instrument_id": bench.meter,
        "inductance_h": f"{usual['inductance_h']:.4f}".replace(".", ","),
        "inductance_instrument_id": bench.meter,
        **changes,
    }


def test_a_coil_is_found_by_its_label(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    page = get(bench.client, "/bench")
    assert any(shown(serial) in words for words in page.words_of("a", **{"class": "ticket"}))
    answer = bench.client.get("/bench", params={"label": serial.lower()}, follow_redirects=False)
    assert answer.headers["location"] == f"/bench/{shown(serial)}"


def test_three_answers_stand_in_three_panels(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    here = f"/bench/{shown(serial)}"
    assert sent(bench.client, here, **entry(bench, serial)) == here
    page = get(bench.client, here)
    panels = page.words_of("section", **{"class": "answer sheet"})
    assert len(panels) == 3
    assert panels[0].startswith("1. Does it conform? conforms")
    assert panels[1].startswith("2. Is it what was predicted? as predicted")
    assert panels[2].startswith("3. Is the process drifting? learning")
    drawings = page.all("svg", **{"class": "drawing"})
    assert len(drawings) == 4
    assert all(drawing.attributes["aria-label"] for drawing in drawings)


def test_likely_causes_come_with_what_to_check(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    resistance = bench.entry()["resistance_ohm"] * 1.25
    fields = entry(bench, serial, resistance_ohm=f"{resistance:.1f}")
    sent(bench.client, f"/bench/{serial}", **fields)
    page = get(bench.client, f"/bench/{serial}")
    assert "does not conform" in page.words_of("section", **{"class": "answer sheet"})[0]
    (causes,) = page.all("ol", **{"class": "likely"})
    assert "wire one gauge off" in causes.text
    assert "quarantine the spool" in causes.text


def test_a_value_far_off_is_asked_back_with_what_was_typed(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    here = f"/bench/{shown(serial)}"
    page = refused(bench.client, here, **entry(bench, serial, resistance_ohm="6,2", note="Odd."))
    assert "Is this value meant?" in page.text
    assert "is the unit right" in page.text
    form = page.form(here)
    assert form.fields["resistance_ohm"] == "6,2"
    assert form.fields["note"] == "Odd."
    assert form.fields["inductance_instrument_id"] == bench.meter
    assert page.all("input", name="confirmed", type="checkbox")
    assert operator.show(serial)["state"] == "wound"
    assert sent(bench.client, here, **form.fields, confirmed="yes") == here
    assert operator.show(serial)["state"] == "measured"


def test_frequency_and_meter_alone_are_no_inductance(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    sent(bench.client, f"/bench/{serial}", **entry(bench, serial, inductance_h=""))
    page = get(bench.client, f"/bench/{serial}")
    assert "Not measured, though limited: inductance" in page.text


def test_every_wrong_field_is_told_at_once(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    fields = entry(
        bench, serial, resistance_ohm="many", coil_temperature_c="", quality_factor="1.2.3"
    )
    page = refused(bench.client, f"/bench/{serial}", **fields)
    wrong = {
        element.attributes["name"] for element in page.all("input", **{"aria-invalid": "true"})
    }
    assert wrong == {"resistance_ohm", "coil_temperature_c", "quality_factor"}


def test_a_coil_that_conforms_is_released_by_one_tap(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    sent(bench.client, f"/bench/{serial}", **entry(bench, serial))
    page = get(bench.client, f"/bench/{serial}")
    form = page.form(f"/runs/{shown(serial)}/decision")
    assert sent(bench.client, form.action, **form.fields) == "/bench"
    assert operator.show(serial)["state"] == "accepted"


def test_a_coil_that_does_not_conform_cannot_be_released(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    wrong = entry(bench, serial, resistance_ohm=str(bench.entry()["resistance_ohm"] * 1.1))
    sent(bench.client, f"/bench/{serial}", **wrong)
    page = get(bench.client, f"/bench/{serial}")
    (release,) = page.all("input", name="kind", value="release")
    assert "disabled" in release.attributes
    assert "Its last verdict is “does not conform”." in page.text


def test_a_correction_takes_the_place_and_keeps_the_first_in_the_history(
    bench: Bench, operator: Hands
) -> None:
    serial = operator.wound()
    verdict = bench.verdict(serial, resistance_ohm=bench.entry()["resistance_ohm"] * 1.1)
    path = f"/bench/{shown(serial)}/corrections/{verdict['measurement']['id']}"
    page = get(bench.client, path)
    assert "stays in the record" in page.text
    fields = {
        **page.form(path).fields,
        "resistance_ohm": str(bench.entry()["resistance_ohm"]),
        "correction_reason": "Read the wrong scale.",
    }
    assert sent(bench.client, path, **fields) == f"/bench/{shown(serial)}"
    assert "“Read the wrong scale.”" in get(bench.client, f"/bench/{serial}").text
    history = get(bench.client, f"/runs/{serial}").text
    assert "corrected later" in history
    assert "Correction: Read the wrong scale." in history


def test_an_operator_reads_the_verdict_and_enters_none(bench: Bench, operator: Hands) -> None:
    serial = operator.wound()
    bench.verdict(serial)
    page = get(operator.client, f"/bench/{serial}")
    assert page.words_of("section", **{"class": "answer sheet"})
    assert not page.all("input", name="resistance_ohm")
    answer = send(operator.client, f"/bench/{serial}", resistance_ohm="1")
    assert answer.status_code == 403
    assert "role" in Page(answer).text
