"""A store with known days in it, and the dashboard over it: asked without a network, or in a real browser.

All counts that tests expect are counted by hand in the lists below.
"""

from __future__ import annotations

import contextlib
import os
import shutil
import threading
from collections.abc import Iterator
from datetime import UTC, datetime, timedelta
from html.parser import HTMLParser

import pytest
from flask.testing import FlaskClient
from playwright.sync_api import Browser, sync_playwright

from ginnel.config import Settings, load_settings
from ginnel.store import open_store, put_site, record_span
from ginnel.times import to_us
from ginnel.web.app import create_app
from ginnel.web.server import Server, bind
from ginnel.words import Direction, Flag, Passage, Sensor, Site, Span, Story

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
CORRIDOR = Sensor(name="corridor", approaching_name="to the looms", receding_name="to the gate")
GATE = Sensor(name="gate")

#: 2026-03-02 in Dublin, which is on UTC in winter: time, direction, speed. 5 in, 2 out, 1 unknown.
PASSAGES = [
    ("08:05:00", Direction.APPROACHING, 1.05),
    ("08:20:00", Direction.APPROACHING, 1.15),
    ("08:59:59", Direction.APPROACHING, 1.25),
    ("09:00:00", Direction.APPROACHING, 1.35),
    ("09:10:00", Direction.RECEDING, 1.45),
    ("11:30:00", Direction.RECEDING, 1.55),
    ("11:31:00", Direction.UNKNOWN, None),
    ("11:45:00", Direction.APPROACHING, 2.05),
]
#: listened from 08:00 to 10:00 and from 11:30 to 12:00: 2.5 h
SPANS = [("08:00:00", "10:00:00"), ("11:30:00", "12:00:00")]


def at_us(clock: str, day: str = "2026-03-02") -> int:
    return to_us(datetime.fromisoformat(f"{day}T{clock}").replace(tzinfo=UTC))


def passage(clock: str, direction: Direction, speed_mps: float | None, day: str = "2026-03-02") -> Passage:
    crossed_us = at_us(clock, day)
    return Passage(
        started_us=crossed_us,
        crossed_us=crossed_us,
        ended_us=crossed_us + 1,
        direction=direction,
        direction_confidence=None if direction is Direction.UNKNOWN else 0.93,
        speed_mps=speed_mps,
        speed_se_mps=None if speed_mps is None else 0.05,
        snr_db=20.0,
        flags=frozenset({Flag.OVERLAPPING}) if direction is Direction.UNKNOWN else frozenset(),
    )


@pytest.fixture(scope="session")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Settings:
    """Settings of the looms' site, with the day above in its store, which the dashboard only reads."""
    file = tmp_path_factory.mktemp("looms") / "ginnel.toml"
    file.write_text('[web]\nlocale = "en-IE"\n[[sensor]]\nname = "corridor"\n', "utf-8")
    settings = load_settings(file)
    with open_store(settings.store.url, create=True) as store:
        put_site(store, Site(name="Loom house <5>", timezone="Europe/Dublin"))
        passages = [passage(*one) for one in PASSAGES]
        for start, end in SPANS:
            span = Span(started_us=at_us(start), ended_us=at_us(end), sample_rate_hz=8000.0)
            inside = [p for p in passages if span.started_us <= p.crossed_us < span.ended_us]
            record_span(store, CORRIDOR, span, inside, "test")
        # spring: the clock goes from 01:00 to 02:00 on 2026-03-29, and everything was heard
        spring = Span(
            started_us=at_us("00:00:00", "2026-03-29"),
            ended_us=at_us("23:00:00", "2026-03-29"),
            sample_rate_hz=8000.0,
        )
        record_span(store, GATE, spring, [passage("01:30:00", Direction.RECEDING, 1.0, "2026-03-29")], "test")
        turned = Passage(
            **{
                name: getattr(passage("10:00:00", Direction.APPROACHING, 1.0, "2026-03-30"), name)
                for name in Passage.__slots__
                if name != "story"
            },
            story=Story.TURN_BACK,
        )
        short = Span(
            started_us=turned.crossed_us,
            ended_us=turned.crossed_us + timedelta(minutes=1) // timedelta(microseconds=1),
            sample_rate_hz=8000.0,
        )
        record_span(store, GATE, short, [turned], "test")
    return settings


@pytest.fixture
def client(settings: Settings) -> Iterator[FlaskClient]:
    """The dashboard, asked without a network."""
    app = create_app(settings)
    with app.test_client() as client:
        yield client
    app.extensions["ginnel.store"].close()


class _Tables(HTMLParser):
    """All tables of a page, as lists of rows of text."""

    def __init__(self) -> None:
        super().__init__()
        self.tables: list[list[list[str]]] = []
        self._in_cell = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "table":
            self.tables.append([])
        elif tag == "tr":
            self.tables[-1].append([])
        elif tag in ("td", "th"):
            self.tables[-1][-1].append("")
            self._in_cell = True

    def handle_endtag(self, tag: str) -> None:
        if tag in ("td", "th"):
            self._in_cell = False

    def handle_data(self, data: str) -> None:
        if self._in_cell:
            self.tables[-1][-1][-1] += data


def tables_of(client: FlaskClient, url: str) -> list[list[list[str]]]:
    """Every table of a page, read with the standard library's parser."""
    answer = client.get(url)
    assert answer.status_code == 200
    parser = _Tables()
    parser.feed(answer.text)
    return [[[" ".join(cell.split()) for cell in row] for row in table] for table in parser.tables]


@contextlib.contextmanager
def serving(settings: Settings) -> Iterator[Server]:
    """The real server on a free port, in a thread of its own."""
    with bind(settings, 0) as server:

        def answer() -> None:
            with contextlib.suppress(OSError):  # whoever asked for it closes the socket that is waited for
                server.run()

        thread = threading.Thread(target=answer, daemon=True)
        thread.start()
        yield server
    thread.join(timeout=10)


@pytest.fixture
def server(settings: Settings) -> Iterator[Server]:
    """The real server over the store above."""
    with serving(settings) as server:
        yield server


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    """Debian's Chromium; where there is none, a reason to skip, but never in CI."""
    if CHROMIUM is None:
        if os.environ.get("CI"):
            pytest.fail("chromium is missing, and CI must not skip the browser", pytrace=False)
        pytest.skip("no chromium here: apt install chromium to test in a browser")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=CHROMIUM,
            args=["--no-sandbox", "--disable-gpu", "--disable-background-networking"],
        )
        yield browser
        browser.close()
