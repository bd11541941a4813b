"""Time occupied against the law of random arrivals; number inside against simulation and sums by hand."""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.stats import union_us_in
from ginnel.stats.occupancy import DoorError, number_inside, share_occupied

S = 1_000_000
HOUR = 3600 * S


@pytest.mark.parametrize(
    ("per_hour", "stay_s", "total", "any_present"),
    # Poisson arrivals: sum of presences q D, share of time with anybody 1 - exp(-q D)
    [(60, 3, 0.0500, 0.0488), (200, 4, 0.2222, 0.1993), (600, 4, 0.6667, 0.4866), (1200, 4, 1.3333, 0.7364)],
)
def test_random_presences_occupy_what_the_law_says(
    per_hour: int, stay_s: float, total: float, any_present: float
) -> None:
    assert 1 - np.exp(-per_hour * stay_s / 3600) == pytest.approx(any_present, abs=5e-5)
    hours = 400
    rng = np.random.default_rng(per_hour)
    starts = np.sort(rng.integers(0, hours * HOUR, rng.poisson(per_hour * hours)))
    occupied = union_us_in(np.array([0, hours * HOUR]), starts, starts + round(stay_s * S))
    share = share_occupied(occupied.astype(float), np.array([hours * HOUR], float))[0]
    assert share == pytest.approx(any_present, rel=0.01)
    assert len(starts) * stay_s / (hours * 3600) == pytest.approx(total, rel=0.02)  # a sum may exceed 1


def test_occupancy_of_a_vehicle_detector() -> None:
    # 1200 vehicles an hour, 4.5 m long over a zone of 2 m at 13.4 m/s, none overlapping: 0.16169 by hand
    starts = np.arange(1200, dtype=np.int64) * 3 * S
    occupied = union_us_in(np.array([0, HOUR]), starts, starts + round((4.5 + 2) / 13.4 * S))
    assert share_occupied(occupied.astype(float), np.array([HOUR], float))[0] == pytest.approx(
        0.16169, abs=5e-6
    )


def test_no_listening_has_no_share_and_no_share_is_above_1() -> None:
    np.testing.assert_array_equal(share_occupied(np.array([0.0, 5.0]), np.array([0.0, 4.0])), [np.nan, 1.0])


def test_variance_of_what_is_counted_is_the_published_one() -> None:
    # 1000 each way: missed at recall 0.95, sd sqrt(2 n r (1 - r)) = 9.7468; turned round with p = 0.02,
    # sd 2 sqrt(2 n p (1 - p)) = 12.522, of the net as counted: as corrected, over r and over 1 - 2 p
    recall = DoorError(recall_entering=0.95, recall_leaving=0.95)
    _, variance = number_inside(np.array([950.0]), np.array([950.0]), recall)
    assert np.sqrt(variance[0]) * 0.95 == pytest.approx(9.7468, abs=5e-5)
    turned = DoorError(direction_error=0.02)
    _, variance = number_inside(np.array([1000.0]), np.array([1000.0]), turned)
    assert np.sqrt(variance[0]) * 0.96 == pytest.approx(12.522, abs=5e-4)


def test_known_recalls_that_differ_leave_no_bias() -> None:
    # 1000 each way at recalls 0.96 and 0.95 count 10 too many inside (by hand)
    as_counted, _ = number_inside(np.array([960.0]), np.array([950.0]), DoorError())
    assert as_counted[0] == 10
    known = DoorError(recall_entering=0.96, recall_leaving=0.95)
    corrected, _ = number_inside(np.array([960.0]), np.array([950.0]), known)
    assert corrected[0] == pytest.approx(0, abs=1e-9)


@pytest.mark.parametrize(
    "error",
    [
        DoorError(recall_entering=0.9, recall_leaving=0.95, direction_error=0.03),
        DoorError(recall_entering=0.9, recall_leaving=0.85, recall_se=0.02),
        DoorError(direction_error=0.1),
    ],
)
def test_net_and_variance_hold_in_simulation(error: DoorError) -> None:
    """People pass a door that misses some and turns some round; recalls are off by their standard error."""
    rng = np.random.default_rng(5)
    n_in, n_out, runs = 700, 500, 20_000
    r_in = np.clip(error.recall_entering + error.recall_se * rng.standard_normal(runs), 0, 1)
    r_out = np.clip(error.recall_leaving + error.recall_se * rng.standard_normal(runs), 0, 1)
    seen_in, seen_out = rng.binomial(n_in, r_in), rng.binomial(n_out, r_out)
    turned_in = rng.binomial(seen_in, error.direction_error)
    turned_out = rng.binomial(seen_out, error.direction_error)
    entered, left = seen_in - turned_in + turned_out, seen_out - turned_out + turned_in
    net, variance = number_inside(entered.astype(float), left.astype(float), error)
    assert np.mean(net) == pytest.approx(n_in - n_out, abs=6 * np.std(net) / np.sqrt(runs) + 1)
    assert np.mean(variance) == pytest.approx(np.var(net), rel=0.1)
    inside = np.abs(net - (n_in - n_out)) <= 1.96 * np.sqrt(variance)
    assert np.mean(inside) == pytest.approx(0.95, abs=0.01)


def test_errors_that_cannot_be_are_refused() -> None:
    with pytest.raises(ValueError, match="recall"):
        DoorError(recall_entering=0)
    with pytest.raises(ValueError, match="direction_error"):
        DoorError(direction_error=0.5)
