"""Where a mover is: paths over the floor as functions of time.

The path of the site runs along x with the sensor line at x = 0; y is sideways. A ``Path`` is a
list of places with times, joined by a cubic spline, so that made-up and recorded walks are one thing.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from ginnel.words import Direction, FloatArray

if TYPE_CHECKING:
    from scipy.interpolate import CubicSpline

_KNOT_S = 0.05  # spacing of the knots of made-up paths: finer than any step in speed below
_RAMP_S = 0.8  # time to stop or start walking; common practice, no source


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Path:
    """Places with times; the mover exists from the first to the last of them.

    Attributes
    ----------
    times_s, x_m, y_m : arrays, shape (n,), n >= 2, times ascending, seconds since the scene's start
    """

    times_s: FloatArray
    x_m: FloatArray
    y_m: FloatArray

    def __post_init__(self) -> None:
        for name in ("times_s", "x_m", "y_m"):
            values = np.array(getattr(self, name), dtype=np.float64)
            if values.ndim != 1 or not np.isfinite(values).all():
                raise ValueError(f"path: {name} must be a row of finite numbers")
            values.setflags(write=False)
            object.__setattr__(self, name, values)
        if not len(self.times_s) == len(self.x_m) == len(self.y_m) >= 2:
            raise ValueError("path: times_s, x_m and y_m must have one length of at least 2")
        if not (np.diff(self.times_s) > 0).all():
            raise ValueError("path: times_s must ascend")

    @property
    def started_s(self) -> float:
        """When the mover comes into being."""
        return float(self.times_s[0])

    @property
    def ended_s(self) -> float:
        """When the mover is gone."""
        return float(self.times_s[-1])

    def spline(self) -> CubicSpline:
        """Cubic spline t -> (x, y), made anew at each call."""
        from scipy.interpolate import CubicSpline

        return CubicSpline(self.times_s, np.column_stack([self.x_m, self.y_m]), axis=0)

    def crossings_s(self) -> list[float]:
        """Find the times at which x passes 0, in order; touching without passing does not count."""
        from scipy.interpolate import CubicSpline

        if (self.x_m > 0).all() or (self.x_m < 0).all():
            return []
        along = CubicSpline(self.times_s, self.x_m)
        if len(self.times_s) == 2:  # a straight line, whose spline has no cubic part to solve
            (t0, t1), (x0, x1) = self.times_s, self.x_m
            return [float(t0 - x0 * (t1 - t0) / (x1 - x0))] if x0 * x1 < 0 else []
        step_s = 1e-6
        roots = along.solve(0.0, extrapolate=False)
        return [float(t) for t in roots if along(t - step_s) * along(t + step_s) < 0]


def _sign(direction: Direction) -> float:
    if direction is Direction.UNKNOWN:
        raise ValueError("a path goes one way: direction must be approaching or receding")
    return -1.0 if direction is Direction.APPROACHING else 1.0


def constant_speed(
    *,
    crossed_s: float,
    speed_mps: float,
    direction: Direction,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
    unsteady: float = 0.0,
    seed: int = 0,
) -> Path:
    """Walk straight through at one speed, between x = far_m and x = -behind_m.

    ``unsteady`` is the standard deviation of a slow change of pace (over about five seconds), as a share of
    the speed; its course is drawn from ``seed``.
    """
    if speed_mps <= 0:
        raise ValueError(f"{speed_mps=} must be positive; the direction says which way")
    if not 0 <= unsteady <= 0.3:
        raise ValueError(f"{unsteady=} must be 0 to 0.3 of the speed")
    sign = _sign(direction)
    if not unsteady:
        x_m = np.array([far_m, -behind_m]) if sign < 0 else np.array([-behind_m, far_m])
        return Path(times_s=crossed_s + sign * x_m / speed_mps, x_m=x_m, y_m=np.full(2, y_m))
    rng = np.random.default_rng([seed, 0x9ACE])
    before_m, after_m = (far_m, behind_m) if sign < 0 else (behind_m, far_m)
    from_s, to_s = -1.5 * before_m / speed_mps - 1, 1.5 * after_m / speed_mps + 1  # more than enough
    times_s = np.arange(from_s, to_s, _KNOT_S)
    way_m = speed_mps * times_s
    for rate_hz, start in zip(rng.uniform(0.1, 0.3, size=2), rng.uniform(0, 2 * np.pi, size=2), strict=True):
        swing_m = unsteady * speed_mps / (2 * np.pi * rate_hz)
        way_m += swing_m * (np.sin(2 * np.pi * rate_hz * times_s + start) - np.sin(start))
    x_m = sign * way_m
    inside = (x_m >= -behind_m) & (x_m <= far_m)
    return Path(times_s=crossed_s + times_s[inside], x_m=x_m[inside], y_m=np.full(int(inside.sum()), y_m))


def meandering(
    path: Path,
    *,
    drift_per_m: float = 0.0,
    swing_m: float = 0.0,
    wave_m: float = 12.0,
    start_turns: float = 0.0,
) -> Path:
    """Bend a path sideways: a slant, and a wave along x; how fast x changes stays as it was.

    Parameters
    ----------
    drift_per_m : float, metres sideways for each metre along x
    swing_m, wave_m : float, m, how far the wave goes to either side, and its length along x
    start_turns : float, where in the wave x = 0 lies; there the path is moved sideways, if at all, by it
    """
    n = max(len(path.times_s), 2 + round((path.ended_s - path.started_s) / _KNOT_S))
    times_s = np.linspace(path.started_s, path.ended_s, n)
    x_m, y_m = path.spline()(times_s).T
    bend_m = drift_per_m * x_m + swing_m * np.sin(2 * np.pi * (x_m / wave_m + start_turns))
    return Path(times_s=times_s, x_m=x_m, y_m=y_m + bend_m)


def _from_speeds(started_s: float, x0_m: float, speeds_mps: FloatArray, y_m: float) -> Path:
    """Path from signed speeds at knots, integrated by the trapezium rule."""
    steps = (speeds_mps[1:] + speeds_mps[:-1]) * (_KNOT_S / 2)
    x_m = x0_m + np.concatenate([[0.0], np.cumsum(steps)])
    times_s = started_s + _KNOT_S * np.arange(len(speeds_mps))
    return Path(times_s=times_s, x_m=x_m, y_m=np.full(len(x_m), y_m))


def _walk_n(distance_m: float, speed_mps: float) -> int:
    """Knots of level walking, so that with half of a ramp the distance is covered."""
    level_s = distance_m / speed_mps - _RAMP_S / 2
    if level_s < _KNOT_S:
        raise ValueError(f"{distance_m=} is too short to walk and stop in at {speed_mps=}")
    return round(level_s / _KNOT_S)


def _ramp() -> FloatArray:
    """From 1 down to 0 over the stopping time, smoothly."""
    n = round(_RAMP_S / _KNOT_S)
    return np.asarray(0.5 + 0.5 * np.cos(np.pi * np.arange(n + 1) / n))


def stop_and_go(
    *,
    started_s: float,
    speed_mps: float,
    direction: Direction,
    stop_at_m: float,
    dwell_s: float,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
) -> Path:
    """Walk up to x = stop_at_m, stand there for a while, walk on and out."""
    sign = _sign(direction)
    x0_m, x1_m = (far_m, -behind_m) if sign < 0 else (-behind_m, far_m)
    ramp = _ramp()
    before = np.ones(_walk_n(abs(stop_at_m - x0_m), speed_mps))
    after = np.ones(_walk_n(abs(x1_m - stop_at_m), speed_mps))
    still = np.zeros(max(1, round(dwell_s / _KNOT_S)))
    speeds = np.concatenate([before, ramp, still, ramp[::-1], after])
    return _from_speeds(started_s, x0_m, sign * speed_mps * speeds, y_m)


def turn_back(
    *,
    started_s: float,
    speed_mps: float,
    turn_at_m: float,
    dwell_s: float = 0.5,
    from_m: float = 15.0,
    y_m: float = 0.0,
) -> Path:
    """Walk from x = from_m to x = turn_at_m, stand for a while, go back."""
    sign = 1.0 if turn_at_m > from_m else -1.0
    ramp = _ramp()
    level = np.ones(_walk_n(abs(turn_at_m - from_m), speed_mps))
    still = np.zeros(max(1, round(dwell_s / _KNOT_S)))
    speeds = np.concatenate([level, ramp, still, -ramp[::-1], -level])
    return _from_speeds(started_s, from_m, sign * speed_mps * speeds, y_m)


def loiter(
    *,
    started_s: float,
    duration_s: float,
    at_m: float,
    reach_m: float = 0.4,
    y_m: float = 0.0,
    seed: int = 0,
) -> Path:
    """Fidget about one place: slow, aimless shifting within about reach_m of it."""
    rng = np.random.default_rng(seed)
    times_s = np.linspace(0.0, duration_s, max(4, round(duration_s / 0.1)))
    place = np.zeros((2, len(times_s)))
    for axis, share in ((0, 1.0), (1, 0.6)):
        rates_hz = rng.uniform(0.03, 0.35, size=5)
        sizes = rng.uniform(0.3, 1.0, size=5)
        angles = rng.uniform(0, 2 * np.pi, size=5)
        waves = sizes[:, None] * np.sin(2 * np.pi * rates_hz[:, None] * times_s + angles[:, None])
        place[axis] = share * reach_m * waves.sum(axis=0) / sizes.sum()
    return Path(times_s=started_s + times_s, x_m=at_m + place[0], y_m=y_m + place[1])


def sampled(times_s: FloatArray, x_m: FloatArray, y_m: FloatArray, *, smoothing_s: float = 0.2) -> Path:
    """Path of a recorded walk.

    Parameters
    ----------
    times_s, x_m, y_m : arrays, shape (n,), evenly spaced or nearly so, s and m
    smoothing_s : float, s
        Standard deviation of a Gaussian that smooths the places; 0 keeps them as they are. Tracked
        heads sway with the gait, and the simulated body adds a gait of its own: 0.2 s takes the
        recorded sway away (6 % left at 1.86 steps a second) and keeps the changes of speed.
    """
    times_s, x_m, y_m = (np.asarray(a, dtype=np.float64) for a in (times_s, x_m, y_m))
    if smoothing_s <= 0:
        return Path(times_s=times_s, x_m=x_m, y_m=y_m)
    # A local straight line under Gaussian weights: unlike a plain mean it has no pull at the ends.
    lag_s = times_s[None, :] - times_s[:, None]
    weights = np.exp(-0.5 * (lag_s / smoothing_s) ** 2)
    s0, s1, s2 = weights.sum(1), (weights * lag_s).sum(1), (weights * lag_s**2).sum(1)
    det = s0 * s2 - s1**2

    def smooth(values: FloatArray) -> FloatArray:
        return np.asarray((s2 * (weights @ values) - s1 * ((weights * lag_s) @ values)) / det)

    return Path(times_s=times_s, x_m=smooth(x_m), y_m=smooth(y_m))
