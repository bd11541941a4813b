"""Rows about places in which nobody is, and modules that are deaf: whatever is counted there is false."""

from __future__ import annotations

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case, Goals, Row

from ginnel import sim

_MINUTES = 60.0
_AMPLIFIER = sim.Receiver(flicker_corner_hz=10.0)


def _empty(seed: int, *nuisances: sim.Nuisance, minutes: float = _MINUTES, **changes: object) -> Case:
    return places.corridor_case(
        (),
        60.0 * minutes,
        seed=seed,
        nuisances=nuisances,
        **{"receiver": _AMPLIFIER, **changes},  # type: ignore[arg-type]
    )


def _rng(seed: int) -> np.random.Generator:
    return np.random.default_rng([seed, 12])


def _on_and_off(rng: np.random.Generator) -> tuple[tuple[float, float], ...]:
    """Half of the time, in stretches of some minutes."""
    edges_s = np.cumsum(rng.uniform(120.0, 600.0, size=40))
    return tuple((float(a), float(b)) for a, b in zip(edges_s[::2], edges_s[1::2], strict=True))


def lamps(seed: int) -> Case:
    """Lamps that are switched, and hum."""
    rng = _rng(seed)
    return _empty(
        seed,
        sim.Lamps(level_db=float(rng.uniform(10.0, 30.0)), on_s=_on_and_off(rng)),
        sim.Hum(level_db=float(rng.uniform(10.0, 35.0))),
    )


def fan(seed: int) -> Case:
    """A fan that runs some of the time."""
    rng = _rng(seed)
    return _empty(
        seed,
        sim.Fan(
            level_db=float(rng.uniform(8.0, 20.0)),
            turns_hz=float(rng.uniform(1.5, 5.0)),
            tip_mps=float(rng.uniform(1.0, 3.0)),
            on_s=_on_and_off(rng),
        ),
    )


def weather(seed: int) -> Case:
    """Showers with gusts in the leaves; a quarter of an hour of it, since it is busy all the time."""
    rng = _rng(seed)
    return _empty(
        seed,
        sim.rain(float(rng.uniform(2.0, 8.0)), on_s=((120.0, 700.0),)),
        sim.leaves(float(rng.uniform(8.0, 18.0))),
        minutes=20.0,
    )


def doors(seed: int) -> Case:
    """A door beside the path, opened and closed 40 times an hour."""
    rng = _rng(seed)
    opens_s = np.cumsum(rng.uniform(20.0, 160.0, size=40))
    return _empty(
        seed,
        sim.Door(
            opens_s=tuple(float(at_s) for at_s in opens_s),
            x_m=float(rng.uniform(2.0, 8.0)),
            y_m=float(rng.choice([-1.2, 1.2])),
            swing_s=float(rng.uniform(1.2, 2.5)),
            stays_s=float(rng.uniform(0.5, 4.0)),
        ),
    )


def relays(seed: int) -> Case:
    """A relay nearby that clicks 240 times an hour."""
    rng = _rng(seed)
    return _empty(
        seed,
        sim.Clicks(
            per_hour=240.0, size=float(rng.uniform(0.1, 0.6)), ring_hz=float(rng.uniform(200.0, 900.0))
        ),
    )


def unplugged(seed: int) -> Case:
    """A cable without a module: hum with all its harmonics and clicks, on 12 bits; then nothing at all."""
    rng = _rng(seed)
    return _empty(
        seed,
        sim.Hum(level_db=float(rng.uniform(30.0, 60.0)), harmonics=9, fall_db=3.0, wander_hz=0.1),
        sim.Clicks(per_hour=20.0, size=0.2),
        receiver=sim.Receiver(bits=12, dead_s=((1200.0, 1320.0), (2400.0, 3700.0)), flicker_corner_hz=30.0),
    )


def dead_module(seed: int) -> Case:
    """A module without supply: an offset, and noise of far less than a converter's step to a few of them."""
    rng = _rng(seed)
    return _empty(
        seed,
        peak_level=float(10 ** rng.uniform(-5.0, -2.0)),  # noise of 0.007 to 7 steps of 1 / 2048
        receiver=sim.Receiver(bits=12, offset=float(rng.uniform(-0.02, 0.02)), flicker_corner_hz=30.0),
    )


def _row(name: str, make: object, false_per_day: float, seeds: int = 3) -> Row:
    return Row(name=name, make=make, goals=Goals(false_per_day=false_per_day), seeds=seeds)  # type: ignore[arg-type]


ROWS = (
    _row("nobody: lamps and hum", lamps, 1.0),
    _row("nobody: fan", fan, 2.0),
    _row("nobody: rain and leaves", weather, 2.0),
    _row("nobody: doors", doors, 4.0),
    _row("nobody: relay clicks", relays, 1.0),
    _row("nobody: unplugged", unplugged, 0.0, 2),
    _row("nobody: dead module", dead_module, 0.0, 3),
)
