"""Levels of service against the worked example and the tables of the Highway Capacity Manual, 7th edition."""

from __future__ import annotations

import pytest

from ginnel.stats.walkway import FOOT_M, Level, level_of_service, space_m2, unit_flow


def test_worked_example() -> None:
    # chapter 35, problem 1: 5 ft effective width, 100 persons in 15 min, 240 ft/min
    flow = unit_flow(100, 5 * FOOT_M)
    assert flow * FOOT_M == pytest.approx(1.33, abs=0.005)  # persons a minute and foot
    space = space_m2(240 * FOOT_M / 60, flow)
    assert space / FOOT_M**2 == pytest.approx(180, abs=0.5)
    assert level_of_service(space) is Level.A


@pytest.mark.parametrize(
    ("platoons", "limits_ft2"), [(False, (60, 40, 24, 15, 8)), (True, (530, 90, 40, 23, 11))]
)
def test_limits_of_exhibits_24_1_and_24_2(platoons: bool, limits_ft2: tuple[int, ...]) -> None:
    levels = list(Level)
    for i, limit in enumerate(limits_ft2):
        assert level_of_service(limit * 1.001 * FOOT_M**2, platoons=platoons) is levels[i]
        assert level_of_service(limit * 0.999 * FOOT_M**2, platoons=platoons) is levels[i + 1]


def test_metric_limits_are_those_of_the_metric_edition() -> None:
    # HCM 2000, exhibit 18-3: A above 5.6 m2, B 3.7, C 2.2, D 1.4, E 0.75 (rounded there)
    for level, least in zip("ABCDE", (5.6, 3.72, 2.23, 1.40, 0.75), strict=True):
        assert level_of_service(least + 0.01) is Level(level)


def test_an_empty_walkway_is_free() -> None:
    assert space_m2(1.3, 0.0) == float("inf")
    assert level_of_service(float("inf"), platoons=True) is Level.A
    with pytest.raises(ValueError, match="positive"):
        unit_flow(1, 0)
