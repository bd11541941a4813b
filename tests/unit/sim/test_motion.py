"""Paths, arrivals and recorded walks.

Speeds of arrivals: free walking speed N(1.34, 0.26) m/s, Weidmann (ETH IVT 90, 1993).
Recorded walks: HERMES corridor experiment, doi 10.34735/ped.2009.10 to .14: 25 people each way.
"""

from __future__ import annotations

import os
from pathlib import Path as FilePath

import numpy as np
import pytest

from ginnel.sim import (
    Path,
    Scene,
    constant_speed,
    follow,
    meandering,
    poisson_walkers,
    sampled,
    stop_and_go,
    turn_back,
)
from ginnel.words import Direction, Sensor, Story

WALKS = FilePath(
    os.environ.get("GINNEL_TRAJECTORIES", FilePath(__file__).parents[4] / "shared" / "trajectories")
)


@pytest.mark.parametrize("direction", [Direction.APPROACHING, Direction.RECEDING])
def test_constant_speed_crosses_when_told(direction: Direction) -> None:
    path = constant_speed(crossed_s=20.0, speed_mps=1.5, direction=direction)
    assert path.crossings_s() == pytest.approx([20.0])
    x_m = path.spline()(np.array([19.0, 21.0]))[:, 0]
    towards = -1 if direction is Direction.APPROACHING else 1
    assert x_m == pytest.approx([-1.5 * towards, 1.5 * towards] if towards > 0 else [1.5, -1.5])


@pytest.mark.parametrize("direction", [Direction.APPROACHING, Direction.RECEDING])
@pytest.mark.parametrize("seed", range(5))
def test_an_unsteady_pace_still_crosses_when_told_and_walks_the_whole_path(
    direction: Direction, seed: int
) -> None:
    path = constant_speed(crossed_s=20.0, speed_mps=1.3, direction=direction, unsteady=0.05, seed=seed)
    assert path.crossings_s() == pytest.approx([20.0], abs=1e-3)
    ends_m = sorted((path.x_m[0], path.x_m[-1]))
    assert ends_m == pytest.approx([-0.5, 15.0], abs=0.1)
    speeds = np.abs(np.diff(path.x_m) / np.diff(path.times_s))
    assert speeds.mean() == pytest.approx(1.3, rel=0.06)
    assert 0.01 < speeds.std() / 1.3 < 0.08


def test_who_stops_stands_where_told_and_walks_on() -> None:
    path = stop_and_go(started_s=0, speed_mps=1.2, direction=Direction.RECEDING, stop_at_m=5.0, dwell_s=4.0)
    spline = path.spline()
    times_s = np.arange(0, path.ended_s, 0.01)
    still = np.abs(spline(times_s, 1)[:, 0]) < 1e-3
    assert still.sum() * 0.01 == pytest.approx(4.0, abs=0.2)
    assert spline(times_s[still])[:, 0] == pytest.approx(np.full(still.sum(), 5.0), abs=0.05)
    assert len(path.crossings_s()) == 1


def test_who_turns_back_never_crosses() -> None:
    path = turn_back(started_s=1.0, speed_mps=1.3, turn_at_m=2.0)
    assert path.crossings_s() == []
    assert path.x_m.min() == pytest.approx(2.0, abs=0.05)
    assert path.x_m[-1] == pytest.approx(15.0, abs=1e-6)


@pytest.mark.parametrize(
    ("times_s", "x_m", "complaint"),
    [([0.0, 0.0], [1.0, 2.0], "ascend"), ([0.0, 1.0], [1.0, np.nan], "finite"), ([0.0], [1.0], "at least 2")],
)
def test_impossible_paths_are_refused(times_s: list[float], x_m: list[float], complaint: str) -> None:
    with pytest.raises(ValueError, match=complaint):
        Path(times_s=np.array(times_s), x_m=np.array(x_m), y_m=np.zeros(len(x_m)))


def test_smoothing_takes_sway_away_and_leaves_the_walk() -> None:
    times_s = np.arange(0, 10, 1 / 16)
    walk = 7.0 - 1.4 * times_s
    sway = 0.03 * np.sin(2 * np.pi * 1.86 * times_s)
    smooth = sampled(times_s, walk + sway, np.zeros_like(walk))
    assert np.abs(smooth.x_m - walk)[16:-16].max() < 0.1 * 0.03
    straight = sampled(times_s, walk, np.zeros_like(walk))
    np.testing.assert_allclose(straight.x_m, walk, atol=1e-9)


def test_arrivals_are_poisson_with_the_published_speeds() -> None:
    movers = poisson_walkers(duration_s=36_000, per_hour=200, share_approaching=0.7, unsteady=0.0, seed=11)
    n = len(movers)
    assert abs(n - 2000) < 4 * np.sqrt(2000)
    speeds = np.array([abs(np.diff(m.path.x_m) / np.diff(m.path.times_s))[0] for m in movers])
    assert speeds.mean() == pytest.approx(1.34, abs=4 * 0.26 / np.sqrt(n))
    assert speeds.std() == pytest.approx(0.26, abs=4 * 0.26 / np.sqrt(2 * n))
    approaching = np.mean([m.path.x_m[0] > 0 for m in movers])
    assert approaching == pytest.approx(0.7, abs=4 * np.sqrt(0.21 / n))
    headways = np.diff([m.path.crossings_s()[0] for m in movers])
    # Exponential: the standard deviation is the mean (18 s), P(h < 2 s) = 1 - exp(-2/18) = 0.1052.
    assert headways.std() == pytest.approx(18.0, rel=0.12)
    assert np.mean(headways < 2.0) == pytest.approx(0.1052, abs=0.03)


@pytest.mark.trajectories
@pytest.mark.skipif(not WALKS.is_dir(), reason="real walks not at ../shared/trajectories")
def test_real_walks_cross_25_each_way() -> None:
    rows = np.loadtxt(WALKS / "hermes_boa-300-frei.txt.gz")
    movers = []
    for person in np.unique(rows[:, 0]):
        own = rows[rows[:, 0] == person]
        movers.append(follow(own[:, 1] / 16, 5.5 + own[:, 3] / 100, own[:, 2] / 100 - 1.5, seed=int(person)))
    scene = Scene(sensor=Sensor(name="s"), duration_s=340, movers=tuple(movers), ends_at_sensor=True)
    truth = scene.truth()
    assert [true.story for true in truth] == [Story.PASSAGE] * 50
    assert [true.direction for true in truth] == [Direction.APPROACHING] * 25 + [Direction.RECEDING] * 25
    assert all(0.8 < true.mean_speed_mps < 2.5 for true in truth)


def test_a_meander_bends_the_way_and_keeps_the_pace() -> None:
    straight = constant_speed(crossed_s=20.0, speed_mps=1.5, direction=Direction.APPROACHING, y_m=0.2)
    bent = meandering(straight, drift_per_m=0.1, swing_m=0.3, wave_m=8.0)
    times_s = np.linspace(bent.started_s, bent.ended_s, 200)
    assert bent.crossings_s() == pytest.approx([20.0])
    x_m, y_m = bent.spline()(times_s).T
    assert x_m == pytest.approx(straight.spline()(times_s)[:, 0], abs=1e-6)
    # x = 10: a metre of drift, and a wave and a quarter of it: 0.2 + 1.0 + 0.3.
    assert float(np.interp(10.0, x_m[::-1], y_m[::-1])) == pytest.approx(1.5, abs=1e-3)
