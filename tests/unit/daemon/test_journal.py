"""Log lines: systemd's priorities in front where the journal listens (sd-daemon(3)), the time elsewhere."""

from __future__ import annotations

import logging
import re
from collections.abc import Iterator

import pytest

from ginnel.daemon.journal import log_to_stderr


@pytest.fixture(autouse=True)
def _as_before() -> Iterator[None]:
    log = logging.getLogger("ginnel")
    before = log.handlers[:], log.level, log.propagate
    yield
    log.handlers[:], log.propagate = before[0], before[2]
    log.setLevel(before[1])


def test_the_journal_gets_a_priority_before_every_line(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("JOURNAL_STREAM", "8:1234")
    log_to_stderr(is_quiet=False)
    log = logging.getLogger("ginnel.daemon.test")
    log.info("listening")
    log.error("two\nlines")
    assert capsys.readouterr().err == "<6>listening\n<3>two\n<3>lines\n"


def test_elsewhere_a_line_has_its_time_in_utc_and_quiet_leaves_the_news_out(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.delenv("JOURNAL_STREAM", raising=False)
    log_to_stderr(is_quiet=True)
    log = logging.getLogger("ginnel.daemon.test")
    log.info("news")
    log.warning("hears nothing")
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ WARNING hears nothing\n", capsys.readouterr().err)
