"""Automatic against manual counts: published measures by hand, published estimates, simulation."""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.stats.agreement import chapman, deviations, geh

AUTOMATIC = np.array([95, 48, 210, 0, 130, 77])
MANUAL = np.array([100, 50, 200, 4, 150, 80])


def test_deviations_by_hand() -> None:
    # formulas of NCHRP Report 797 (from memory), recomputed for six intervals
    found = deviations(AUTOMATIC, MANUAL)
    assert found.mean == pytest.approx(-0.201806, abs=5e-7)
    assert found.mean_absolute == pytest.approx(0.218472, abs=5e-7)
    assert found.weighted == pytest.approx(0.075342, abs=5e-7)
    assert found.overall == pytest.approx(-0.041096, abs=5e-7)
    assert found.correlation == pytest.approx(0.99133, abs=5e-6)


def test_intervals_without_anybody_are_left_out_and_told() -> None:
    found = deviations(np.append(AUTOMATIC, 3), np.append(MANUAL, 0))
    assert (found.n, found.n_left_out) == (6, 1)
    assert found.mean == deviations(AUTOMATIC, MANUAL).mean
    assert found.overall == pytest.approx((560 + 3) / 584 - 1)
    nobody = deviations(np.array([1]), np.array([0]))
    assert (nobody.n, nobody.mean, nobody.overall, nobody.correlation) == (0, None, None, None)


def test_geh_by_hand() -> None:
    # sqrt(2 (a - b)^2 / (a + b)), recomputed
    one, other = np.array([1000, 1000, 100, 200, 400, 0]), np.array([900, 1200, 80, 150, 325, 0])
    expected = [3.2444, 6.0302, 2.1082, 3.7796, 3.9392, 0]
    np.testing.assert_allclose(geh(one, other), expected, atol=5e-5)
    np.testing.assert_array_equal(geh(one, other), geh(other, one))


@pytest.mark.parametrize(
    ("counted", "estimate", "se"),
    [
        ((100, 100, 10), 926.3636, 238.5506),  # published as 926, against 1000 by Lincoln and Petersen
        ((10, 15, 5), 28.3333, 5.9094),
        ((100, 100, 20), 484.7619, 82.0315),
        ((95, 90, 86), 99.4138, 0.6871),
    ],
)
def test_chapman(counted: tuple[int, int, int], estimate: float, se: float) -> None:
    assert chapman(*counted) == pytest.approx((estimate, se), abs=5e-5)


def test_chapman_finds_the_truth_on_average() -> None:
    # 200 passed, observers with recalls 0.95 and 0.90, independent
    rng = np.random.default_rng(3)
    first, second = rng.random((4000, 200)) < 0.95, rng.random((4000, 200)) < 0.90
    found = np.array(
        [chapman(int(a.sum()), int(b.sum()), int((a & b).sum())) for a, b in zip(first, second, strict=True)]
    )
    assert found[:, 0].mean() == pytest.approx(200, abs=0.1)
    assert found[:, 1].mean() == pytest.approx(found[:, 0].std(), rel=0.06)


def test_more_seen_by_both_than_by_one_is_refused() -> None:
    with pytest.raises(ValueError, match="both=6"):
        chapman(5, 10, 6)
