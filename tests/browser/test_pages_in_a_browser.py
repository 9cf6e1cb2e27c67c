"""How the pages stand on the glass: size, contrast, reach; and what their small scripts do."""

from pathlib import Path

import httpx
import pytest
from playwright.sync_api import Page, ViewportSize, expect

from service.storage.engine import Database
from service.web.access import Role
from tests.browser.conftest import NARROW, WIDE, Enter, Open
from tests.browser.shop import Shop, open_shop

pytestmark = pytest.mark.browser

CONTRAST = (Path(__file__).parent / "contrast.js").read_text()
# 12 mm on a ten-inch tablet of 217 mm laid out 1280 pixels wide.
TWELVE_MM = 12 / 217 * 1280
TARGETS = (
    "button, .button, .ticket, .choice, summary, select, nav a, "
    "input:not([type=hidden]):not([type=radio]):not([type=checkbox])"
)


@pytest.fixture
def shop(store: Database) -> Shop:
    return open_shop(store)


@pytest.fixture
def token(enter: Enter) -> str:
    return enter("Mira Holt", *Role)


@pytest.mark.slow
@pytest.mark.parametrize("viewport", [WIDE, NARROW], ids=["tablet", "phone"])
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_every_page_fits_its_width_and_can_be_read(
    shop: Shop, token: str, open_page: Open, viewport: ViewportSize, scheme: str
) -> None:
    page = open_page(token, viewport, color_scheme=scheme)
    for path in shop.paths:
        page.goto(path)
        for summary in page.locator("main summary").all():
            summary.click()
        width = page.evaluate("document.documentElement.scrollWidth")
        assert width <= viewport["width"], path
        assert page.evaluate(CONTRAST) == [], path


def test_what_is_touched_on_the_floor_is_twelve_millimetres_high(
    shop: Shop, token: str, open_page: Open
) -> None:
    page = open_page(token)
    for path in (
        "/floor",
        f"/runs/{shop.planned}",
        f"/runs/{shop.winding}",
        f"/bench/{shop.wound}",
    ):
        page.goto(path)
        for target in page.locator(f"body.shop :is({TARGETS})").all():
            box = target.bounding_box()
            is_in_head = target.evaluate("element => !!element.closest('.who')")
            if box is not None and not is_in_head:
                assert box["height"] >= TWELVE_MM, (path, target.inner_text())


def test_the_keyboard_reaches_the_content_first_and_shows_where_it_is(
    shop: Shop, token: str, open_page: Open
) -> None:
    page = open_page(token)
    page.goto(f"/runs/{shop.planned}")
    page.keyboard.press("Tab")
    expect(page.locator(":focus")).to_have_text("Skip to the content")
    page.keyboard.press("Enter")
    page.keyboard.press("Tab")
    outline = page.locator(":focus").evaluate("element => getComputedStyle(element).outlineWidth")
    assert page.locator(":focus").evaluate("element => !!element.closest('main')")
    assert float(outline.removesuffix("px")) >= 2


def test_the_count_on_the_screen_follows_the_machine(
    shop: Shop, token: str, open_page: Open, address: str
) -> None:
    page = open_page(token)
    with page.expect_response("**/api/v1/live/floor"):
        page.goto("/floor")
    for sequence, (turns, to_go) in enumerate(((0, "7600"), (7588, "12"), (7610, "10")), 1):
        event = {
            "boot": 1, "sequence": sequence, "kind": "total", "count": turns, "speed_rpm": 980.0,
        }  # fmt: skip
        answer = httpx.post(
            f"{address}/api/v1/counters/events",
            json={"events": [event]},
            headers={"Authorization": f"Bearer {shop.key}"},
        )
        assert answer.status_code == 200, answer.text
        expect(page.locator('[data-live="to_go"]')).to_have_text(to_go)
    expect(page.locator('[data-live="to_go_words"]')).to_have_text("turns too many")
    expect(page.locator('[data-live="speed"]')).to_have_text(", 980 rpm")


def test_a_silent_stream_is_told(shop: Shop, token: str, open_page: Open) -> None:
    page = open_page(token)
    page.clock.install()
    page.route("**/api/v1/live/floor", lambda route: route.fulfill(status=204))
    page.goto(f"/runs/{shop.winding}")
    expect(page.locator("#news")).to_be_hidden()
    page.clock.run_for(22_000)
    expect(page.locator("#news")).to_contain_text("No news since")


def test_what_was_typed_at_the_bench_survives_a_reload_until_it_is_recorded(
    shop: Shop, token: str, open_page: Open
) -> None:
    page = open_page(token)
    here = f"/bench/{shop.wound}"
    page.goto(here)
    page.locator('[name="resistance_ohm"]').fill("5,7k")
    page.reload()
    assert page.locator('[name="resistance_ohm"]').input_value() == "5,7k"
    page.locator('[name="coil_temperature_c"]').fill("20")
    page.locator('[name="resistance_instrument_id"]').select_option(label="Bridge")
    page.get_by_role("button", name="Judge this coil").click()
    expect(page.locator(".answer").first).to_be_visible()
    assert page.evaluate("Object.keys(sessionStorage).length") == 0


def test_a_coil_is_started_without_any_script(shop: Shop, token: str, open_page: Open) -> None:
    page = open_page(token, java_script_enabled=False)
    page.goto(f"/runs/{shop.planned}")
    page.get_by_role("radio", name="Winder B").check()
    page.get_by_role("button", name="Start winding").click()
    expect(page.locator(".title .state")).to_have_text("winding")


@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_the_month_is_printed_without_what_is_for_the_screen(
    shop: Shop, token: str, open_page: Open, paper: str
) -> None:
    page = open_page(token)
    page.goto("/months")
    assert shop.order
    page.emulate_media(media="print")
    for hidden in ("nav", ".who form", ".skip"):
        expect(page.locator(hidden)).to_be_hidden()
    expect(page.get_by_role("heading", name="Balance")).to_be_visible()
    assert page.pdf(format=paper).startswith(b"%PDF")


def fill_and_press_twice(page: Page) -> None:
    page.evaluate(
        """() => {
            const form = document.querySelector('form[action$="/start"]');
            form.requestSubmit();
            form.requestSubmit();
        }"""
    )


def test_a_second_tap_sends_nothing(shop: Shop, token: str, open_page: Open) -> None:
    page = open_page(token)
    page.goto(f"/runs/{shop.planned}")
    page.get_by_role("radio", name="Winder B").check()
    posts: list[str] = []
    page.on(
        "request", lambda request: posts.append(request.url) if request.method == "POST" else None
    )
    fill_and_press_twice(page)
    expect(page.locator(".title .state")).to_have_text("winding")
    assert len(posts) == 1
