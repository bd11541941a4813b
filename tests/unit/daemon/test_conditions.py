"""Conditions: raised after some bad minutes, cleared after some good ones, never flickering."""

from __future__ import annotations

import pytest

from ginnel.daemon.conditions import RULES, ConditionWatch, Finding
from ginnel.words import Condition

MINUTE_US = 60_000_000


def told(pattern: str, kind: str = "input-clips") -> list[tuple[int, str]]:
    """What a string of minutes (b bad, g good, . neither) raises (+) and clears (-), and when."""
    watch = ConditionWatch()
    found = []
    for minute, letter in enumerate(pattern):
        is_bad = {"b": True, "g": False, ".": None}[letter]
        finding = Finding(kind=kind, sensor="north", is_bad=is_bad, sentence=f"since {minute}")
        found += [
            (minute, "+" if one.cleared_us is None else "-")
            for one in watch.push(minute * MINUTE_US, [finding])
        ]
    return found


@pytest.mark.parametrize(
    ("pattern", "expected"),
    [
        # this one is raised after 3 and cleared after 10
        ("bbb", [(2, "+")]),
        ("bbbbbb", [(2, "+")]),
        ("bbgbbgbb", []),
        ("bbb" + "g" * 9 + "b" + "g" * 9, [(2, "+")]),
        ("bbb" + "g" * 10 + "ggbbb", [(2, "+"), (12, "-"), (17, "+")]),
        ("b.b.b", [(4, "+")]),
        ("bbb" + "g.....ggggggggg", [(2, "+"), (17, "-")]),
        ("g" * 20, []),
    ],
)
def test_nothing_flickers(pattern: str, expected: list[tuple[int, str]]) -> None:
    assert told(pattern) == expected


def test_the_same_kind_at_two_sensors_is_two_conditions() -> None:
    watch = ConditionWatch()
    for sensor in ("north", "south"):
        (raised,) = watch.push(5, [Finding(kind="source-lost", sensor=sensor, is_bad=True, sentence="x")])
        assert raised == Condition(
            kind="source-lost",
            sensor=sensor,
            severity=RULES["source-lost"].severity,
            raised_us=5,
            sentence="x",
            advice=RULES["source-lost"].advice,
        )
    (cleared,) = watch.push(9, [Finding(kind="source-lost", sensor="north", is_bad=False, sentence="")])
    assert (cleared.sensor, cleared.raised_us, cleared.cleared_us, cleared.sentence) == ("north", 5, 9, "x")
    assert [one.sensor for one in watch.raised] == ["south"]


def test_what_was_raised_before_a_restart_is_cleared_after_it() -> None:
    first = ConditionWatch()
    raised = first.push(5, [Finding(kind="source-lost", sensor="north", is_bad=True, sentence="x")])
    watch = ConditionWatch()
    watch.adopt(raised)
    assert watch.push(7, [Finding(kind="source-lost", sensor="north", is_bad=True, sentence="y")]) == []
    (cleared,) = watch.push(9, [Finding(kind="source-lost", sensor="north", is_bad=False, sentence="")])
    assert (cleared.raised_us, cleared.cleared_us) == (5, 9)


def test_a_sensor_that_is_gone_has_no_troubles() -> None:
    watch = ConditionWatch()
    bad = [Finding(kind="source-lost", sensor=name, is_bad=True, sentence="x") for name in ("north", "south")]
    everyone = Finding(kind="disk-nearly-full", sensor=None, is_bad=True, sentence="x")
    watch.push(5, [*bad, everyone])
    (cleared,) = watch.forget(9, ["south"])
    assert (cleared.sensor, cleared.cleared_us) == ("north", 9)
    assert [one.sensor for one in watch.raised] == ["south", None]


def test_a_clock_that_stepped_back_clears_nothing_before_it_was_raised() -> None:
    watch = ConditionWatch()
    watch.push(500, [Finding(kind="source-lost", sensor="north", is_bad=True, sentence="x")])
    (cleared,) = watch.push(3, [Finding(kind="source-lost", sensor="north", is_bad=False, sentence="")])
    assert cleared.cleared_us == 500


def test_every_kind_fits_its_column_and_says_what_to_do() -> None:
    for kind, rule in RULES.items():
        assert len(kind) <= 32
        assert rule.advice[-1] in ".?"
        assert rule.raise_min > 0 < rule.clear_min
