"""The page to print, against arithmetic by hand; HTML parsed by Python's own parser, PDF read by pypdf."""

from __future__ import annotations

import io
import re
from pathlib import Path
from xml.etree import ElementTree

import pypdf
import pytest

from ginnel.errors import ExportError
from ginnel.export import Question
from ginnel.export.bars import Bar, bar_chart
from ginnel.export.summary import Summary, summaries
from ginnel.export.summary_pages import summary_html, summary_pdf, write_summary
from ginnel.store import Store, record_span
from ginnel.words import Direction, Passage, Sensor, Span

S = 1_000_000
HOUR = 3600 * S
MONDAY = 1_772_409_600 * S  # 2026-03-02T00:00Z, midnight in Dublin too
NAME = '<b>"north"'
SENSOR = Sensor(name=NAME, approaching_name="to the yard", receding_name="to the street")


def passage(at_us: int, direction: Direction, speed_mps: float) -> Passage:
    return Passage(
        started_us=at_us,
        crossed_us=at_us,
        ended_us=at_us + S,
        direction=direction,
        direction_confidence=0.9,
        speed_mps=speed_mps,
        speed_se_mps=0.01,
        snr_db=12.0,
    )


@pytest.fixture
def pages(store: Store) -> tuple[Summary, ...]:
    """Two days: the first heard throughout, 3 passages in and 1 out at eight; the second half heard."""
    at_eight = MONDAY + 8 * HOUR
    first = [passage(at_eight + n * 60 * S, Direction.APPROACHING, 1.0 + n / 10) for n in range(3)]
    first.append(passage(at_eight + 30 * S, Direction.RECEDING, 1.4))
    for start_us, hours, passages in ((MONDAY, 24, first), (MONDAY + 24 * HOUR, 12, [])):
        span = Span(started_us=start_us, ended_us=start_us + hours * HOUR, sample_rate_hz=8000.0)
        record_span(store, SENSOR, span, passages, "7")
    return summaries(store, Question())


def test_the_numbers_are_those_of_the_log(pages: tuple[Summary, ...]) -> None:
    (page,) = pages
    assert page.title == f"Tannery annex: {NAME}"
    assert page.period == "2026-03-02 to 2026-03-03, 2 days, times by the clock of Europe/Dublin"
    facts = dict(page.facts)
    assert facts["Listened"] == "36.0 h, 75.0 % of the time"
    # exact 95 % limits of a count of 4 (Garwood 1936): 1.09 and 10.24
    assert facts["Passages counted"] == "4 (95 % limits 1 to 10)"
    assert facts["  to the yard"] == "3"
    assert facts["  to the street"] == "1"
    assert facts["Busiest day"] == "2026-03-02: 4"
    assert facts["Peak hour"].startswith("2026-03-02 0")
    assert facts["Speed"].startswith("mean 1.18 m/s")  # (1.0 + 1.1 + 1.2 + 1.4) / 4 = 1.175
    assert page.cautions[0] == "25.0 % of the time was not listened to; the count is that of the rest."
    assert any("Chain 7." in line for line in page.method)


def test_html_is_whole_harmless_and_needs_nothing_else(pages: tuple[Summary, ...]) -> None:
    text = summary_html(pages)
    assert "<b>" not in text
    assert "&lt;b&gt;" in text
    assert "<script" not in text
    assert re.findall(r'(?:src|href)="', text) == []
    drawings = re.findall(r"<svg.*?</svg>", text, re.DOTALL)
    assert len(drawings) == 2
    for drawing in drawings:
        ElementTree.fromstring(drawing)


def test_pdf_says_the_same_on_one_page(pages: tuple[Summary, ...]) -> None:
    read = pypdf.PdfReader(io.BytesIO(summary_pdf(pages)))
    assert len(read.pages) == 1
    text = " ".join(read.pages[0].extract_text().split())
    for what, value in pages[0].facts:
        assert what.strip() in text
        assert " ".join(value.split()) in text
    assert "25.0 % of the time was not listened to" in text
    assert "The average day" in text


@pytest.mark.parametrize("fonts", [Path("/usr/share/fonts/truetype/dejavu"), Path("/nowhere")])
def test_pdf_of_names_in_other_scripts_is_made_all_the_same(
    store: Store, monkeypatch: pytest.MonkeyPatch, fonts: Path
) -> None:
    monkeypatch.setattr("ginnel.export.summary_pages._FONTS", fonts)
    span = Span(started_us=MONDAY, ended_us=MONDAY + HOUR, sample_rate_hz=8000.0)
    record_span(store, Sensor(name="Šiauliai", approaching_name="į kiemą"), span, [], "1")
    text = pypdf.PdfReader(io.BytesIO(summary_pdf(summaries(store, Question())))).pages[0].extract_text()
    assert ("Šiauliai" if (fonts / "DejaVuSans.ttf").is_file() else "?iauliai") in text


def test_bars_are_as_high_as_their_values_and_unheard_is_no_zero() -> None:
    bars = [
        Bar(label="a", value=10.0),
        Bar(label="b", value=5.0),
        Bar(label="", value=0.0),
        Bar(label="c", value=None),
    ]
    drawing = ElementTree.fromstring(bar_chart(bars))
    heights = [float(one.attrib["height"]) for one in drawing if one.tag.endswith("rect")]
    fills = [one.attrib["fill"] for one in drawing if one.tag.endswith("rect")]
    assert heights[0] == pytest.approx(2 * heights[1])
    assert heights[2] == 0
    assert heights[3] >= heights[0]
    assert fills[3] != fills[0] == fills[1]
    texts = [one.text for one in drawing if one.tag.endswith("text")]
    assert texts == ["0", "2", "4", "6", "8", "10", "a", "b", "c"]


def test_nothing_to_tell_is_one_clear_line(store: Store, tmp_path: Path) -> None:
    with pytest.raises(ExportError, match="nothing in the log to summarise yet"):
        summaries(store, Question())


def test_a_file_appears_whole(pages: tuple[Summary, ...], tmp_path: Path) -> None:
    for kind in ("html", "pdf"):
        write_summary(pages, tmp_path / f"page.{kind}", kind)
    assert (tmp_path / "page.html").read_text("utf-8") == summary_html(pages)
    assert (tmp_path / "page.pdf").read_bytes().startswith(b"%PDF")
