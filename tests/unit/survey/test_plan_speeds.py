"""What falsifies a speed, against numbers reckoned by hand or published."""

from __future__ import annotations

import pytest

from ginnel.survey.plan_radar import CAR, PERSON
from ginnel.survey.plan_speeds import (
    angle_error_ratio,
    carrier_error_ratio,
    distance_error_ratio,
    mains_lines,
    speed_errors,
    usual_speeds_mps,
)


@pytest.mark.parametrize(
    ("carrier_hz", "mains_hz", "expected_mps"),
    [
        # f c / (2 f0) by hand; that lamps disturb microwave detectors so: US patent 8 102 259
        (10.525e9, 50, {50: 0.7121, 100: 1.4242, 200: 2.8484, 300: 4.2726, 600: 8.5452}),
        (10.525e9, 60, {60: 0.8545, 120: 1.7090, 240: 3.4181, 360: 5.1271}),
        (24.125e9, 50, {50: 0.3107, 100: 0.6213, 200: 1.2427, 500: 3.1067}),
        (24.125e9, 60, {120: 0.7456, 480: 2.9824}),
    ],
)
def test_mains_lines_look_like_these_speeds(
    carrier_hz: float, mains_hz: float, expected_mps: dict[float, float]
) -> None:
    found = {line.shift_hz: line.speed_mps for line in mains_lines(carrier_hz, mains_hz, PERSON, 10.0)}
    for shift_hz, speed_mps in expected_mps.items():
        assert found[shift_hz] == pytest.approx(speed_mps, abs=1e-4)


def test_lamps_lie_among_walkers_at_10_ghz_but_not_among_cars() -> None:
    walkers = mains_lines(10.525e9, 50, PERSON, 10.0)
    assert [line.shift_hz for line in walkers if line.is_expected] == [100]
    assert not any(line.is_expected for line in mains_lines(10.525e9, 50, CAR, 30.0))
    # Weidmann's walkers, N(1.34, 0.26): 90 % lie in 0.9123 to 1.7677 m/s, so 120 Hz is inside, 60 is not
    assert [line.shift_hz for line in mains_lines(10.525e9, 60, PERSON, 10.0) if line.is_expected] == [120]


def test_usual_speeds_are_those_between_the_5th_and_the_95th_percentile() -> None:
    # Weidmann's N(1.34, 0.26), percentiles by formula
    assert usual_speeds_mps(PERSON) == pytest.approx((0.9123, 1.7677), abs=1e-4)


def test_the_hidden_share_is_that_of_a_bell_curve() -> None:
    line = mains_lines(10.525e9, 50, PERSON, 2 * 0.26 * 70.21524)[1]
    # half a bin is one standard deviation about 1.4242, 0.3238 of one above the mean: table of the normal
    # curve, Phi(1.3238) - Phi(-0.6762) = 0.9072 - 0.2495
    assert line.hidden_share == pytest.approx(0.6577, abs=5e-4)


def test_a_wrong_carrier_scales_all_speeds() -> None:
    assert carrier_error_ratio(10.587e9, 10.525e9) == pytest.approx(0.00589, abs=1e-5)
    assert carrier_error_ratio(10.550e9, 10.525e9) == pytest.approx(0.00238, abs=1e-5)
    assert carrier_error_ratio(24.175e9, 24.125e9) == pytest.approx(0.00207, abs=1e-5)


@pytest.mark.parametrize(
    ("angle_deg", "cosine"), [(15, 0.96593), (20, 0.93969), (30, 0.86603), (45, 0.70711)]
)  # the table of cosines
def test_a_turned_beam_told_as_straight_reads_its_cosine(angle_deg: float, cosine: float) -> None:
    assert 1 + angle_error_ratio(angle_deg, 0) == pytest.approx(cosine, abs=1e-5)
    assert (1 + angle_error_ratio(angle_deg, 0)) * (1 + angle_error_ratio(0, angle_deg)) == pytest.approx(1)


def test_a_wrong_nearest_distance_matters_near_the_sensor() -> None:
    # by hand at x = d: sqrt(1 + 1.21) / sqrt 2 = 1.05119
    assert distance_error_ratio(1.0, 1.1) == pytest.approx(0.05119, abs=1e-5)
    assert distance_error_ratio(10.0, 1.1) < 0.0011


def test_usual_mistakes_name_themselves() -> None:
    ratios = {error.cause: error.ratio for error in speed_errors(24.125e9, 30.0)}
    assert ratios["carrier 50 MHz higher than told"] == pytest.approx(0.00207, abs=1e-5)
    # cos 31 / cos 30 = 0.857167 / 0.866025
    assert ratios["beam at 31 degrees, told as 30"] == pytest.approx(-0.01023, abs=1e-5)
