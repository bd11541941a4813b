"""`ginnel plan` as a person meets it, before and after there are settings."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from click.testing import CliRunner
from tests.system.conftest import Ginnel

from ginnel.cli import main


def row(text: str, start: str) -> list[str]:
    found = re.search(rf"^  {re.escape(start)}  +(.*)$", text, re.MULTILINE)
    assert found is not None, f"no row {start!r} in:\n{text}"
    return re.split(r"  +", found[1])


def test_a_plan_needs_no_settings(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("GINNEL_CONFIG", raising=False)
    done = CliRunner().invoke(main, ["plan", "--height-m", "1", "--gain-dbi", "8", "--power-mw", "20"])
    assert done.exit_code == 0, done.output
    assert done.output.startswith("* A person can be counted")
    # radar equation by formula, straight along the axis: -86.915 dBm at 20 m; a person's 94.09 Hz at 1.34 m/s
    at_20_m = row(done.output, "20")
    assert float(at_20_m[4]) == pytest.approx(-86.9, abs=0.05)
    assert at_20_m[2] == "94"
    assert row(done.output, "lamps  100")[0] == "1.42"
    assert row(done.output, "1")[0] == "1.34"
    # 0.01004 W/m2 at 1 m beside ICNIRP's 36.26, by formula
    assert re.search(r"^  1 +0\.01 +36\.26$", done.output, re.MULTILINE)
    assert list(tmp_path.iterdir()) == []


def test_the_settings_are_taken_and_options_lie_over_them(ginnel: Ginnel) -> None:
    assert "lane: 10.525 GHz, mono" in ginnel("plan").stdout
    assert "2.4 m up, 0 m from the middle of a path 2 m wide" in ginnel("plan").stdout
    other = ginnel("plan", "--carrier-ghz", "24.125", "--channels", "iq", "--beam-angle-deg", "30").stdout
    assert "lane: 24.125 GHz, iq" in other
    assert "turned by 30 degrees (oblique), tilted by 15" in other
    assert row(other, "lamps  100")[0] == "0.62"
    # 10.550 told as 10.525 GHz reads 0.238 % high; at 24.125 GHz 50 MHz read 0.207 %
    assert row(other, "carrier 50 MHz higher than told") == ["+0.21%"]


def test_a_picture_comes_with_it(ginnel: Ginnel, tmp_path: Path) -> None:
    assert ginnel("plan", "--plot", "plan.svg").exit_code == 0
    assert "<svg" in (tmp_path / "plan.svg").read_text("utf-8")


@pytest.mark.parametrize(
    ("options", "exit_code", "line"),
    [
        (("--plot", "plan.pdf"), 1, "a plot is a .png or an .svg file"),
        (("--plot", "nowhere/plan.png"), 1, "nowhere/plan.png: cannot be written"),
        (("--sensor", "gate"), 1, "no sensor is called gate"),
        (("--rate", "100"), 2, "must be from 500 Hz"),
        (("--highpass-hz", "50", "--lowpass-hz", "50"), 2, "must be above the lower corner, 50"),
        (("--height-m", "-1"), 2, "--height-m"),
        (("--config", "none.toml"), 1, "none.toml: is not there"),
    ],
)
def test_what_is_wrong_is_one_line(
    ginnel: Ginnel, options: tuple[str, ...], exit_code: int, line: str
) -> None:
    done = ginnel("plan", *options)
    assert done.exit_code == exit_code
    assert line in done.stderr
    assert "Traceback" not in done.stderr
