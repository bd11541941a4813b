"""Rows about walkers heard by a sensor in trouble: it clips, has few bits, changes its gain, has a hole."""

from __future__ import annotations

from functools import partial
from typing import Literal

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case, Goals, Row

from ginnel import sim

_HOLE_S = 20.0
Trouble = Literal["clips", "12 bits", "gain step", "hole"]


def troubled(seed: int, *, trouble: Trouble, n: int = 16) -> Case:
    """Walkers one at a time."""
    rng = np.random.default_rng([seed, 13])
    first, learnt_s = places.learnt(rng)
    movers, until_s = places.one_by_one(rng, n, from_s=learnt_s)
    middle_s = (learnt_s + until_s) / 2
    receiver, level = sim.Receiver(), 0.05
    holes_s: tuple[tuple[float, float], ...] = ()
    if trouble == "clips":
        level = 4.0  # who comes near is far beyond the rails
    elif trouble == "12 bits":
        receiver, level = sim.Receiver(bits=12, flicker_corner_hz=20.0), 0.002
    elif trouble == "gain step":
        receiver = sim.Receiver(gain_steps=((middle_s, float(rng.choice([-10.0, -6.0, 6.0, 10.0]))),))
    else:
        holes_s = ((middle_s, middle_s + _HOLE_S),)
    case = places.corridor_case(
        first + movers, until_s, seed=seed, learnt_s=learnt_s, peak_level=level, receiver=receiver
    )
    return Case(scene=case.scene, told=case.told, learnt_s=case.learnt_s, holes_s=holes_s)


_GOALS = Goals(recall=0.97, precision=0.97, direction=0.97)
_NAMES: tuple[tuple[str, Trouble], ...] = (
    ("near passes that clip", "clips"),
    ("12-bit converter", "12 bits"),
    ("gain step", "gain step"),
    ("20 s hole", "hole"),
)

ROWS = tuple(
    Row(name=name, make=partial(troubled, trouble=trouble), goals=_GOALS) for name, trouble in _NAMES
)
