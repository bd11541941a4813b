"""The dashboard in a real browser: it draws, breaks no rule of its own, and fits a phone."""

from __future__ import annotations

import pytest
from playwright.sync_api import Browser, ConsoleMessage, Page

from ginnel.web.server import Server

DAY = "sensor=corridor&show=day&on=2026-03-02"


def watched(page: Page) -> tuple[list[str], list[str]]:
    """Lists that fill with what the browser complains of, and with what it asks for."""
    complaints: list[str] = []
    asked: list[str] = []

    def heard(message: ConsoleMessage) -> None:
        if message.type in ("error", "warning"):
            complaints.append(message.text)

    page.on("console", heard)
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("request", lambda request: asked.append(request.url))
    return complaints, asked


@pytest.mark.parametrize(
    ("width", "scheme"), [(1200, "light"), (1200, "dark"), (360, "light")], ids=["light", "dark", "phone"]
)
def test_the_day_is_drawn_without_a_complaint(
    server: Server, browser: Browser, width: int, scheme: str
) -> None:
    context = browser.new_context(viewport={"width": width, "height": 800}, color_scheme=scheme)  # type: ignore[arg-type]
    page = context.new_page()
    complaints, asked = watched(page)
    for url, place in (("busy", "flow"), ("fast", "speeds"), ("sure", "coverage"), ("full", "occupied")):
        page.goto(f"{server.address}{url}?{DAY}")
        page.wait_for_selector(f"main[data-drawn={scheme}]", timeout=20_000)
        box = page.locator(f"#{place} .bk-Figure").bounding_box()
        assert box is not None
        assert box["width"] > 0.6 * min(width, 1100) - 60
        assert box["height"] > 60
        assert page.evaluate("document.documentElement.scrollWidth") <= width, "nothing sticks out sideways"
    assert complaints == []
    assert all(url.startswith((server.address, "data:")) for url in asked)
    context.close()


def test_the_pickers_go_to_another_sensor_and_day(server: Server, browser: Browser) -> None:
    page = browser.new_page()
    page.goto(f"{server.address}busy?{DAY}")
    page.wait_for_selector("main[data-drawn]")
    with page.expect_navigation():
        page.select_option("select[name=sensor]", "gate")
    assert "sensor=gate&show=day&on=2026-03-02" in page.url
    with page.expect_navigation():
        page.click("a[rel=next]")
    assert "sensor=gate&show=day&on=2026-03-03" in page.url
    page.close()


def test_a_page_without_its_charts_opens_the_tables(server: Server, browser: Browser) -> None:
    page = browser.new_page()
    page.route("**/charts/**", lambda route: route.abort())
    page.goto(f"{server.address}busy?{DAY}")
    page.wait_for_selector("details.numbers[open]")
    assert page.locator("#flow").inner_text() == "The chart could not be drawn; its table says the same."
    page.close()
