"""Who comes when: Poisson arrivals in both directions with walking speeds as measured."""

from __future__ import annotations

import numpy as np

from ginnel.sim.movers import Mover, walker
from ginnel.words import Direction

#: Free walking speed, mean and standard deviation, m/s: Weidmann (ETH IVT 90, 1993).
WALKING_SPEED_MPS = (1.34, 0.26)


def poisson_walkers(
    *,
    duration_s: float,
    per_hour: float,
    share_approaching: float = 0.5,
    speed_mps: tuple[float, float] = WALKING_SPEED_MPS,
    power_db: tuple[float, float] = (-1.0, 1.5),
    spread_m: float = 0.4,
    centre_m: float = 0.0,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    edge_s: float = 0.0,
    unsteady: float = 0.03,
    seed: int = 0,
) -> tuple[Mover, ...]:
    """Walkers whose crossings are a Poisson process, in order of crossing.

    Parameters
    ----------
    duration_s : float, s
    per_hour : float, mean number of crossings an hour, both directions together
    speed_mps, power_db : (mean, standard deviation); speeds are kept within 0.4 and 2.5 m/s
    spread_m : float, standard deviation of the lines walked about y = centre_m, kept within three
    unsteady : float, share by which each one's pace varies slowly; common practice, no source
    edge_s : float, time without crossings at either end of the scene, so that no mover is cut
    """
    rng = np.random.default_rng([seed, 0xA1])
    span_s = duration_s - 2 * edge_s
    if span_s <= 0:
        raise ValueError(f"{duration_s=} leaves nothing between two edges of {edge_s=}")
    n = rng.poisson(per_hour * span_s / 3600.0)
    crossed_s = edge_s + np.sort(rng.uniform(0.0, span_s, size=n))
    speeds = np.clip(rng.normal(*speed_mps, size=n), 0.4, 2.5)
    powers = rng.normal(*power_db, size=n)
    lines = centre_m + spread_m * np.clip(rng.normal(size=n), -3, 3)
    statures = np.clip(rng.normal(1.72, 0.09, size=n), 1.5, 2.0)  # common practice, no source
    approaching = rng.uniform(size=n) < share_approaching
    return tuple(
        walker(
            crossed_s=float(crossed_s[i]),
            speed_mps=float(speeds[i]),
            direction=Direction.APPROACHING if approaching[i] else Direction.RECEDING,
            far_m=far_m,
            behind_m=behind_m,
            y_m=float(lines[i]),
            stature_m=float(statures[i]),
            unsteady=unsteady,
            power_db=float(powers[i]),
            seed=int(rng.integers(2**31)),
        )
        for i in range(n)
    )
