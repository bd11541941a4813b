"""The dashboard in a real browser: it draws, breaks no rule of its own, and fits a phone."""

from __future__ import annotations

import contextlib
import os
import shutil
import threading
from collections.abc import Iterator

import pytest
from playwright.sync_api import Browser, ConsoleMessage, sync_playwright

from ginnel.config import Settings
from ginnel.web.server import Server, bind

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")

if CHROMIUM is None and os.environ.get("CI"):
    pytest.fail("chromium is missing, and CI must not skip the browser", pytrace=False)
pytestmark = pytest.mark.skipif(
    CHROMIUM is None, reason="no chromium here: apt install chromium to test in a browser"
)


@pytest.fixture
def server(settings: Settings) -> Iterator[Server]:
    """The real server on a free port, in a thread of its own."""
    with bind(settings, 0) as server:

        def answer() -> None:
            with contextlib.suppress(OSError):  # the fixture closes the socket that is waited for
                server.run()

        thread = threading.Thread(target=answer, daemon=True)
        thread.start()
        yield server
    thread.join(timeout=10)


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=CHROMIUM,
            args=["--no-sandbox", "--disable-gpu", "--disable-background-networking"],
        )
        yield browser
        browser.close()


@pytest.mark.parametrize(
    ("width", "scheme"), [(1200, "light"), (1200, "dark"), (360, "light")], ids=["light", "dark", "phone"]
)
def test_the_day_is_drawn_without_a_complaint(
    server: Server, browser: Browser, width: int, scheme: str
) -> None:
    context = browser.new_context(viewport={"width": width, "height": 800}, color_scheme=scheme)  # type: ignore[arg-type]
    page = context.new_page()
    complaints: list[str] = []
    asked: list[str] = []

    def heard(message: ConsoleMessage) -> None:
        if message.type in ("error", "warning"):
            complaints.append(message.text)

    page.on("console", heard)
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("request", lambda request: asked.append(request.url))
    page.goto(f"{server.address}?sensor=corridor&day=2026-03-02")
    page.wait_for_selector(f"main[data-drawn={scheme}]", timeout=20_000)
    assert complaints == []
    assert all(url.startswith((server.address, "data:")) for url in asked)
    for place in ("flow", "coverage", "speed"):
        box = page.locator(f"#{place} .bk-Figure").bounding_box()
        assert box is not None
        assert box["width"] > 0.8 * min(width, 990) - 60
        assert box["height"] > 60
    assert page.evaluate("document.documentElement.scrollWidth") <= width, "nothing sticks out sideways"
    context.close()


def test_the_pickers_go_to_another_sensor_and_day(server: Server, browser: Browser) -> None:
    page = browser.new_page()
    page.goto(f"{server.address}?sensor=corridor&day=2026-03-02")
    page.wait_for_selector("main[data-drawn]")
    with page.expect_navigation():
        page.select_option("select[name=sensor]", "gate")
    assert "sensor=gate&day=2026-03-02" in page.url
    with page.expect_navigation():
        page.click("a[rel=next]")
    assert "sensor=gate&day=2026-03-03" in page.url
    page.close()


def test_a_page_without_its_charts_opens_the_tables(server: Server, browser: Browser) -> None:
    page = browser.new_page()
    page.route("**/charts.json*", lambda route: route.abort())
    page.goto(f"{server.address}?sensor=corridor&day=2026-03-02")
    page.wait_for_selector("details.numbers[open]")
    assert page.locator("#flow").inner_text() == "The chart could not be drawn; its table says the same."
    page.close()
