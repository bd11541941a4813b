"""Spaces: their doors, their hour of emptiness, and what is wrong with them in one line each."""

from __future__ import annotations

from pathlib import Path

import pytest

from ginnel.config import load_settings
from ginnel.errors import ConfigError
from ginnel.words import Direction, Door, Space

GOOD = """
[[sensor]]
name = "north"
path_width_m = 2.5
[[sensor]]
name = "south"
[[space]]
name = "north wing"
empty_at = 03:30:00
[[space.door]]
sensor = "north"
entering = "approaching"
[[space.door]]
sensor = "south"
entering = "receding"
recall = 0.9
recall_se = 0.01
direction_error = 0.05
"""


def load(tmp_path: Path, text: str) -> Space:
    path = tmp_path / "ginnel.toml"
    path.write_text(text, "utf-8")
    (space,) = load_settings(path).space
    return space.to_space()


def test_a_space_with_two_doors(tmp_path: Path) -> None:
    assert load(tmp_path, GOOD) == Space(
        name="north wing",
        empty_at_min=210,
        doors=(
            Door(sensor="north", entering=Direction.APPROACHING),
            Door(
                sensor="south",
                entering=Direction.RECEDING,
                recall=0.9,
                recall_se=0.01,
                direction_error=0.05,
            ),
        ),
    )


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('sensor = "south"', 'sensor = "west"', "space north wing: no sensor is called west"),
        ("03:30:00", "03:30:10", r"space\[0\].empty_at: must be a whole minute"),
        (
            "recall = 0.9\n",
            "recall = 1.1\n",
            r"line 16: space\[0\]\.door\[1\]\.recall: .*less than or equal to 1",
        ),
        ("direction_error = 0.05", "direction_error = 0.5", r"direction_error: .*less than 0\.5"),
        ('entering = "receding"', 'entering = "in"', r"entering: must be 'approaching' or 'receding'"),
        ("recall_se", "recal_se", "unknown key; did you mean recall_se"),
        ("path_width_m = 2.5", "path_width_m = 0", r"sensor\[0\]\.path_width_m: must be greater than 0"),
    ],
)
def test_a_bad_space_is_one_line(tmp_path: Path, old: str, new: str, message: str) -> None:
    assert old in GOOD
    with pytest.raises(ConfigError, match=message) as caught:
        load(tmp_path, GOOD.replace(old, new))
    assert len(str(caught.value).splitlines()) == 1


def test_two_spaces_need_two_names(tmp_path: Path) -> None:
    space = GOOD[GOOD.index("[[space]]") :]
    with pytest.raises(ConfigError, match="two spaces are called north wing"):
        load(tmp_path, GOOD + space)


def test_a_space_can_come_from_the_environment(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GINNEL_SPACE__0__EMPTY_AT", "05:00")
    assert load(tmp_path, GOOD).empty_at_min == 300
