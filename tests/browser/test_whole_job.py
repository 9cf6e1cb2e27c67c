"""The whole job in a browser, from an empty workshop to the month's yield."""

from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

import httpx
import pytest
from playwright.sync_api import Page, ViewportSize, expect

from service.web.access import Role
from tests.browser.conftest import NARROW, WIDE, Enter, Open

pytestmark = [pytest.mark.browser, pytest.mark.slow]

TURNS = 7600
FIRST_PASSWORD = "copper wax and felt"
RECIPE = {
    "former.straight_x_mm": "52",
    "former.straight_y_mm": "0",
    "former.corner_radius_mm": "3",
    "former.winding_height_mm": "11",
    "former.flange_build_mm": "5,5",
    "wire.size": "AWG 42",
    "turns": str(TURNS),
    "scatter.turns_per_pass": "60",
    "scatter.wander_mm": "0,10",
    "scatter.edge_dwell_turns": "2",
    "scatter.tension_n": "16 gf",
    "poles.count": "6",
    "poles.diameter_mm": "4.8",
    "poles.length_mm": "17",
    "poles.pitch_mm": "10,4",
    "poles.material": "alnico 5",
    "tolerance.resistance_percent": "5",
    "tolerance.inductance_percent": "8",
}
EXPECTED = ("Resistance at 20 °C", "Inductance as a meter shows it")


def fill(page: Page, **fields: str) -> None:
    for name, value in fields.items():
        page.locator(f'main [name="{name}"]:visible').first.fill(value)


def press(page: Page, name: str) -> None:
    page.get_by_role("button", name=name, exact=True).click()


def unfold(page: Page, name: str) -> None:
    page.locator("summary", has_text=name).click()


@dataclass
class Counter:
    """A machine's counter that sends cumulative totals."""

    address: str
    key: str
    sequence: int = 0

    def count(self, *totals: int) -> None:
        events = []
        for total in totals:
            self.sequence += 1
            events.append({"boot": 1, "sequence": self.sequence, "kind": "total", "count": total})
        answer = httpx.post(
            f"{self.address}/api/v1/counters/events",
            json={"events": events},
            headers={"Authorization": f"Bearer {self.key}"},
        )
        assert answer.status_code == 200, answer.text


def add_people(page: Page) -> None:
    for name, role in (("Mira Voss", "lead"), ("Tom Aldar", "operator"), ("Ines Brook", "bench")):
        page.goto("/shop/people")
        fill(page, name=name, password=FIRST_PASSWORD)
        page.locator(f'form[action="/shop/people"] [value="{role}"]').check()
        press(page, "Add")
        expect(page.get_by_role("heading", name=name)).to_be_visible()


def set_up_shop(page: Page) -> str:
    """Machine, counter, instrument and stock; the counter's key."""
    page.goto("/shop")
    unfold(page, "Add a machine")
    fill(page, name="Winder A", top_speed_rpm="1500 rpm", pulses_per_turn="1")
    press(page, "Add it")
    unfold(page, "Add an instrument")
    form = page.locator('form[action="/shop/instruments"]')
    today = datetime.now(UTC).date()
    for name, value in {
        "serial_number": "INV-1",
        "name": "Bridge",
        "resistance_accuracy_percent": "0,1",
        "calibrated_on": str(today - timedelta(days=10)),
        "calibration_due": str(today + timedelta(days=300)),
    }.items():
        form.locator(f'[name="{name}"]').fill(value)
    form.locator('[name="measures_inductance"]').check()
    form.locator('[name="four_wire"]').check()
    form.get_by_role("button").click()
    expect(page.get_by_role("link", name="Bridge")).to_be_visible()
    unfold(page, "Issue a key for a counter")
    page.locator('form[action="/shop/counters"] [name="name"]').fill("Counter A")
    press(page, "Issue the key")
    key = page.locator("code").inner_text()
    page.goto("/stock")
    unfold(page, "Receive a spool")
    fill(page, wire_size="AWG 42", supplier_lot="INV-42", net_mass_kg="1,2 kg")
    press(page, "Receive it")
    fill(page, resistance_ohm="5,44", temperature_c="20")
    press(page, "Give the spool its own ohm per metre")
    expect(page.get_by_text("5.440 Ω/m at 20 °C")).to_be_visible()
    page.goto("/stock")
    unfold(page, "Receive magnets")
    form = page.locator('form[action="/stock/magnets"]')
    for name, value in {
        "material": "alnico 5",
        "piece": "rod 4.8 × 17 mm",
        "supplier_lot": "INV-M",
        "pieces": "600",
    }.items():
        form.locator(f'[name="{name}"]').fill(value)
    press(page, "Receive them")
    return key


def make_recipe(page: Page) -> tuple[str, str]:
    """Drafted, foreseen, released; the resistance (kΩ) and inductance (H) that are expected."""
    page.goto("/recipes/new")
    fill(page, name="Harbour neck", **RECIPE)
    page.locator('[name="scatter.traverse"]').select_option("triangle")
    press(page, "What would it be?")
    expect(page.get_by_role("heading", name="What it would be")).to_be_visible()
    assert page.locator('[name="turns"]').input_value() == str(TURNS)
    press(page, "Keep the draft")
    press(page, "Release it")
    expect(page.get_by_text("Frozen when it was released.")).to_be_visible()
    rows = page.locator("table.expected tr")
    told = (rows.filter(has_text=name).locator("td").first.inner_text() for name in EXPECTED)
    resistance, inductance = (text.split()[0] for text in told)
    return resistance, inductance


def order_and_plan(page: Page) -> None:
    page.goto("/orders/new")
    fill(page, customer="Seven Bridges Guitars (invented)", quantity="2")
    page.locator('[name="revision_id"]').select_option(label="Harbour neck, revision 1")
    press(page, "Place the order")
    page.get_by_role("link", name="Plan coils for it").click()
    fill(page, count="2")
    press(page, "Plan them")
    expect(page.get_by_text("0 of 2 accepted, 2 under way")).to_be_visible()


def wind(page: Page, floor: Page, counter: Counter) -> str:
    """Start a coil, watch its count grow on both screens, and take it off."""
    page.goto("/floor")
    page.locator("a.ticket").first.click()
    serial = page.locator("h1 .serial").inner_text()
    press(page, "Start winding")
    floor.goto("/floor")
    to_go = floor.locator('[data-live="to_go"]')
    expect(to_go).to_have_text(str(TURNS))
    with floor.expect_response("**/api/v1/live/floor"):
        floor.reload()
    counter.count(0, 1200)
    expect(to_go).to_have_text(str(TURNS - 1200))
    expect(page.locator('[data-live="turns"]')).to_have_text("1200")
    counter.count(4210, TURNS - 2)
    expect(to_go).to_have_text("2")
    page.reload()
    expect(page.locator("table.gap")).to_contain_text("−2")
    press(page, "Agree with the machine")
    expect(page.locator(".title .state")).to_have_text("wound")
    return serial


def measure(page: Page, serial: str, resistance: str, inductance: str) -> None:
    page.goto("/bench")
    page.get_by_label("Coil’s label").fill(serial.lower().replace("-", ""))
    page.keyboard.press("Enter")
    page.locator('[name="resistance_instrument_id"]').select_option(label="Bridge")
    page.locator('[name="inductance_instrument_id"]').select_option(label="Bridge")
    fill(page, resistance_ohm=resistance, coil_temperature_c="20,0", inductance_h=inductance)
    press(page, "Judge this coil")
    expect(page.locator("#refusal")).to_contain_text("Is this value meant?")
    assert page.locator('[name="inductance_h"]').input_value() == inductance
    fill(page, resistance_ohm=resistance.replace(".", ",") + "k")
    press(page, "Judge this coil")
    answers = page.locator(".answer > .state")
    expect(answers).to_have_text(["conforms", "as predicted", "learning"])


@pytest.mark.parametrize("viewport", [WIDE, NARROW], ids=["tablet", "phone"])
def test_the_whole_job_is_done_at_the_pages(
    viewport: ViewportSize, enter: Enter, open_page: Open, address: str
) -> None:
    owner = open_page(enter("Olga Fenn", Role.OWNER), viewport)
    add_people(owner)

    def sign_in(name: str) -> Page:
        page = open_page(viewport=viewport)
        page.goto("/orders")
        fill(page, name=name, password=FIRST_PASSWORD)
        press(page, "Sign in")
        expect(page.get_by_role("heading", level=1)).to_have_text("Orders")
        return page

    lead = sign_in("Mira Voss")
    counter = Counter(address, set_up_shop(lead))
    resistance, inductance = make_recipe(lead)
    order_and_plan(lead)
    operator = sign_in("Tom Aldar")
    serial = wind(operator, lead, counter)
    bench = sign_in("Ines Brook")
    measure(bench, serial, resistance, inductance)
    press(bench, "Release it, and go to the next coil")
    expect(bench.get_by_role("heading", level=1)).to_have_text("Bench")
    owner.goto("/months")
    expect(owner.locator("tr", has_text="good first time").locator("td")).to_have_text("1")
    expect(owner.locator("tr.sum td")).to_have_text("1")
