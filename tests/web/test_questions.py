"""The seven questions, answered by clicking and by keyboard alone, over the demo's eight weeks.

Accessibility is judged by axe-core (WCAG 2.1 A and AA): nothing that it calls serious or critical.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any, Literal

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page
from tests.web.conftest import serving
from tests.web.test_browser import watched

from ginnel.demo import draw_weeks, prepare
from ginnel.web.server import Server

Scheme = Literal["light", "dark"]
DESK, PHONE = (1280, 900), (390, 844)
#: What a week of the demo shows, by the name of the page in the row of questions: a chart, and a word.
WEEK = "sensor=north-corridor&show=week&on=2026-04-06"
CHARTS = {"How busy": "flow", "How fast": "speeds", "How full": "occupied", "How sure": "coverage"}
ADDRESSES = ("", "busy", "fast", "full", "one-by-one", "sure", "take-away", "side-by-side")
#: Goals of ours (no source): compressed bytes at the first visit and at each after; time to the first chart.
FIRST_VISIT_BYTES, LATER_BYTES = 400_000, 60_000


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Server]:
    """The dashboard over the demo's drawn weeks."""
    settings = prepare(tmp_path_factory.mktemp("demo"))
    draw_weeks(settings)
    with serving(settings) as server:
        yield server


def opened(browser: Browser, size: tuple[int, int], scheme: Scheme) -> Page:
    context = browser.new_context(
        viewport={"width": size[0], "height": size[1]}, color_scheme=scheme, has_touch=size == PHONE
    )
    return context.new_page()


def drawn(page: Page) -> None:
    page.wait_for_selector("main[data-drawn]", timeout=20_000)


@pytest.mark.parametrize("size", [DESK, PHONE], ids=["desk", "phone"])
def test_every_question_is_answered_within_three_clicks(
    demo: Server, browser: Browser, size: tuple[int, int]
) -> None:
    page = opened(browser, size, "light")
    complaints, asked = watched(page)
    page.goto(demo.address)
    assert "No sensor is listening now." in page.inner_text("main")

    page.click("text=north-corridor")  # how busy, the newest day
    drawn(page)
    with page.expect_navigation():
        page.select_option("select[name=show]", "week")
    drawn(page)
    answer = page.inner_text(".answer")
    assert re.search(r"[\d,]+ passed: [\d,]+ to the workshops, [\d,]+ to the street", answer), answer
    assert page.locator("#week .bk-Figure").is_visible()

    for name, chart in CHARTS.items():
        page.click(f"nav >> text={name}")
        drawn(page)
        assert "show=week" in page.url, "the view goes along"
        assert page.locator(f"#{chart} .bk-Figure").is_visible()
        page.click("summary >> nth=0")
        assert page.locator("details[open] table").first.locator("tr").count() > 3

    page.click("nav >> text=One by one")
    assert re.search(r"From .* to .* \d+ passed", page.inner_text(".answer"))
    page.click("text=08:00")
    assert page.locator("section table tbody tr").count() > 10

    page.click("nav >> text=Take away")
    with page.expect_download() as download:
        page.click("tr:has-text('Counts') >> text=csv")
    lines = download.value.path().read_text("utf-8").splitlines()
    assert lines[0].startswith("sensor,interval_start")
    assert complaints == []
    assert all(url.startswith((demo.address, "data:", "blob:")) for url in asked), (
        "nothing leaves the machine"
    )
    page.context.close()


def test_the_keyboard_alone_reaches_every_question(demo: Server, browser: Browser) -> None:
    page = opened(browser, DESK, "light")
    page.goto(f"{demo.address}busy?{WEEK}")
    drawn(page)
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.textContent") == "To the answer", "first of all, a way past"
    reached: list[str] = []
    for _ in range(30):
        page.keyboard.press("Tab")
        told = page.evaluate(
            "(() => { const at = document.activeElement; const e = at.closest('.chart') || at;"
            " return [e.name || e.id || e.textContent.trim(), getComputedStyle(e).outlineStyle]; })()"
        )
        reached.append(told[0])
        # the browser marks the parts of a date itself, inside the field
        assert told[1] != "none" or told[0] == "on", f"{told[0]} shows that it has the focus"
        if told[0] == "The numbers":
            break
    for name in ("Now", *CHARTS, "One by one", "Take away", "sensor", "show", "on"):
        assert name in reached
    page.keyboard.press("Enter")
    assert page.locator("details[open] table").first.is_visible()
    page.focus("nav >> text=How fast")
    page.keyboard.press("Enter")
    drawn(page)
    assert "/fast?" in page.url
    page.focus("select[name=show]")
    with page.expect_navigation():
        page.keyboard.type("month")
    assert "show=month" in page.url
    page.context.close()


@pytest.mark.parametrize(
    ("size", "scheme", "addresses"),
    [
        (DESK, "light", ADDRESSES),
        (DESK, "dark", ("", "busy", "sure")),
        (PHONE, "dark", ("busy", "one-by-one")),
    ],
    ids=["light", "dark", "phone"],
)
def test_axe_finds_nothing_serious(
    demo: Server, browser: Browser, size: tuple[int, int], scheme: Scheme, addresses: tuple[str, ...]
) -> None:
    page = opened(browser, size, scheme)
    serious: list[Any] = []
    for address in addresses:
        page.goto(f"{demo.address}{address}?{WEEK}")
        if page.locator("main[data-charts]").count():
            drawn(page)
        page.evaluate("document.querySelectorAll('details').forEach(one => one.open = true)")
        found = Axe().run(page).response["violations"]
        serious += [
            (address, one["id"], one["nodes"][0]["html"][:200], one["nodes"][0]["failureSummary"])
            for one in found
            if one["impact"] in ("serious", "critical")
        ]
        assert page.evaluate("document.documentElement.scrollWidth") <= size[0], f"{address} sticks out"
    assert serious == []
    page.context.close()


def test_pages_are_light(demo: Server, browser: Browser) -> None:
    """Bytes as they went over the wire, told by the browser's own developer protocol."""
    page = opened(browser, DESK, "light")
    wire = page.context.new_cdp_session(page)
    wire.send("Network.enable")
    sizes: list[float] = []
    wire.on("Network.loadingFinished", lambda event: sizes.append(event["encodedDataLength"]))
    visits = []
    for address in ("busy", "fast", "sure"):
        sizes.clear()
        page.goto(f"{demo.address}{address}?{WEEK}")
        drawn(page)
        visits.append(sum(sizes))
    print("bytes:", visits)
    assert visits[0] < FIRST_VISIT_BYTES
    assert max(visits[1:]) < LATER_BYTES
    page.context.close()


def test_the_first_page_keeps_itself_fresh(demo: Server, browser: Browser) -> None:
    page = opened(browser, DESK, "light")
    page.route("**/now-part", lambda route: route.fulfill(body="<p>fresh</p>", content_type="text/html"))
    page.clock.install()
    page.goto(demo.address)
    page.clock.run_for(11_000)
    page.wait_for_selector("text=fresh")
    page.context.close()


def test_a_printed_page_has_its_tables_and_no_controls(demo: Server, browser: Browser) -> None:
    page = opened(browser, DESK, "dark")
    page.goto(f"{demo.address}busy?{WEEK}")
    drawn(page)
    page.emulate_media(media="print")
    page.evaluate("window.dispatchEvent(new Event('beforeprint'))")
    assert page.locator("details table").first.is_visible()
    assert not page.locator("nav.questions").is_visible()
    assert page.evaluate("getComputedStyle(document.body).backgroundColor") == "rgb(255, 255, 255)"
    page.context.close()
