"""Who is in a scene: a body on a path, and what is true of it.

The makers below (`walker`, `vehicle`, ...) cover the usual cases; a ``Mover`` can be made of any
``Path`` and ``Body``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.sim.bodies import CAR, Body, Cyclist, Trolley, Vehicle, Walker
from ginnel.sim.motion import Path, constant_speed, loiter, sampled, stop_and_go, turn_back
from ginnel.words import Direction, FloatArray, MoverKind, Story

_MOVING_MPS = 0.1  # slower than this is standing; it does not count towards a mean speed
_FIDGET_M = 1.5  # who keeps within this stretch of path goes nowhere


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Mover:
    """A body on a path.

    ``power_db`` is the strength of the whole body against its model (1 m^2 torso for people);
    ``flicker_db`` is the standard deviation of each scatterer's slow fluctuation, ``stride_db`` that of the
    whole body from step to step (half a cycle); both are drawn from ``seed``.
    """

    path: Path
    body: Body
    kind: MoverKind = MoverKind.ON_FOOT
    power_db: float = 0.0
    flicker_db: float = 1.5
    stride_db: float = 0.0
    seed: int = 0
    name: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class TrueMover:
    """What a mover really did, in seconds since the scene's start.

    ``started_s`` and ``ended_s`` bound the time in which it could be heard at all; ``crossed_s`` is
    when its centre passed x = 0 for good (None if it did not). ``mean_speed_mps`` is along the path,
    standing left out. ``cut`` is set where the scene begins or ends in the middle of it.
    """

    started_s: float
    crossed_s: float | None
    ended_s: float
    direction: Direction
    mean_speed_mps: float
    story: Story
    kind: MoverKind
    power_db: float
    cut: bool
    name: str = ""


def true_mover(mover: Mover, *, duration_s: float, ends_at_sensor: bool) -> TrueMover | None:
    """Truth about one mover; None if it is never in the scene."""
    path = mover.path
    spline = path.spline()
    times_s = np.linspace(path.started_s, path.ended_s, max(3, round((path.ended_s - path.started_s) / 0.02)))
    x_m = spline(times_s)[:, 0]
    seen = x_m > 0 if ends_at_sensor else np.ones(len(x_m), dtype=bool)
    if not seen.any():
        return None
    started_s, ended_s = float(times_s[seen][0]), float(times_s[seen][-1])
    if ended_s <= 0 or started_s >= duration_s:
        return None
    crossings_s = path.crossings_s()
    speeds_mps = np.abs(spline(times_s, 1)[:, 0])
    moving = seen & (speeds_mps > _MOVING_MPS)
    passed = len(crossings_s) % 2 == 1
    if passed:
        story = Story.PASSAGE
        direction = Direction.APPROACHING if x_m[0] > x_m[-1] else Direction.RECEDING
    else:
        story = Story.FIDGET if np.ptp(x_m[seen]) < _FIDGET_M else Story.TURN_BACK
        direction = Direction.UNKNOWN
    return TrueMover(
        started_s=max(0.0, started_s),
        crossed_s=crossings_s[-1] if passed else None,
        ended_s=min(duration_s, ended_s),
        direction=direction,
        mean_speed_mps=float(speeds_mps[moving].mean()) if moving.any() else 0.0,
        story=story,
        kind=mover.kind,
        power_db=mover.power_db,
        cut=started_s < 0 or ended_s > duration_s,
        name=mover.name,
    )


def walker(
    *,
    crossed_s: float,
    speed_mps: float = 1.34,
    direction: Direction = Direction.APPROACHING,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
    stature_m: float = 1.75,
    unsteady: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who walks straight through; ``unsteady`` as in `motion.constant_speed`."""
    path = constant_speed(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        direction=direction,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
        unsteady=unsteady,
        seed=seed,
    )
    return Mover(path=path, body=Walker(stature_m=stature_m), power_db=power_db, seed=seed, name="walker")


def runner(
    *,
    crossed_s: float,
    speed_mps: float = 3.0,
    direction: Direction = Direction.APPROACHING,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who runs straight through."""
    path = constant_speed(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        direction=direction,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
    )
    return Mover(path=path, body=Walker(running=True), power_db=power_db, seed=seed, name="runner")


def trolley(
    *,
    crossed_s: float,
    speed_mps: float = 1.1,
    direction: Direction = Direction.APPROACHING,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who pushes a load on wheels through."""
    path = constant_speed(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        direction=direction,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
    )
    return Mover(path=path, body=Trolley(), power_db=power_db, seed=seed, name="trolley")


def cyclist(
    *,
    crossed_s: float,
    speed_mps: float = 5.0,
    direction: Direction = Direction.APPROACHING,
    far_m: float = 30.0,
    behind_m: float = 1.0,
    y_m: float = 0.0,
    power_db: float = 2.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who rides through."""
    path = constant_speed(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        direction=direction,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
    )
    return Mover(
        path=path, body=Cyclist(), kind=MoverKind.ON_WHEELS, power_db=power_db, seed=seed, name="cyclist"
    )


def vehicle(
    *,
    crossed_s: float,
    speed_mps: float = 12.0,
    direction: Direction = Direction.APPROACHING,
    far_m: float = 80.0,
    behind_m: float = 80.0,
    y_m: float = 0.0,
    body: Vehicle = CAR,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make a motor vehicle that drives through; see `bodies` for MOTORCYCLE, CAR, VAN and BUS."""
    path = constant_speed(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        direction=direction,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
    )
    return Mover(path=path, body=body, kind=MoverKind.ON_WHEELS, power_db=power_db, seed=seed, name="vehicle")


def stopper(
    *,
    started_s: float,
    speed_mps: float = 1.34,
    direction: Direction = Direction.APPROACHING,
    stop_at_m: float = 4.0,
    dwell_s: float = 5.0,
    far_m: float = 15.0,
    behind_m: float = 0.5,
    y_m: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who stops in the beam and walks on: a passage."""
    path = stop_and_go(
        started_s=started_s,
        speed_mps=speed_mps,
        direction=direction,
        stop_at_m=stop_at_m,
        dwell_s=dwell_s,
        far_m=far_m,
        behind_m=behind_m,
        y_m=y_m,
    )
    return Mover(path=path, body=Walker(), power_db=power_db, seed=seed, name="stopper")


def turner(
    *,
    started_s: float,
    speed_mps: float = 1.34,
    turn_at_m: float = 3.0,
    dwell_s: float = 0.5,
    from_m: float = 15.0,
    y_m: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who comes, turns and goes back: no passage."""
    path = turn_back(
        started_s=started_s,
        speed_mps=speed_mps,
        turn_at_m=turn_at_m,
        dwell_s=dwell_s,
        from_m=from_m,
        y_m=y_m,
    )
    return Mover(path=path, body=Walker(), power_db=power_db, seed=seed, name="turner")


def loiterer(
    *,
    started_s: float,
    duration_s: float = 20.0,
    at_m: float = 4.0,
    reach_m: float = 0.4,
    y_m: float = 0.0,
    power_db: float = 0.0,
    seed: int = 0,
) -> Mover:
    """Make somebody who stands about and fidgets: no passage."""
    path = loiter(started_s=started_s, duration_s=duration_s, at_m=at_m, reach_m=reach_m, y_m=y_m, seed=seed)
    return Mover(path=path, body=Walker(), power_db=power_db, seed=seed, name="loiterer")


def follow(
    times_s: FloatArray,
    x_m: FloatArray,
    y_m: FloatArray,
    *,
    smoothing_s: float = 0.2,
    stature_m: float = 1.75,
    power_db: float = 0.0,
    seed: int = 0,
    name: str = "",
) -> Mover:
    """Make somebody who walks along a recorded trajectory (see `motion.sampled`)."""
    path = sampled(times_s, x_m, y_m, smoothing_s=smoothing_s)
    return Mover(path=path, body=Walker(stature_m=stature_m), power_db=power_db, seed=seed, name=name)
