"""The row about a working day: two hours of people both ways, 60 to 300 an hour, and 15-minute counts."""

from __future__ import annotations

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case, Goals, Row

_QUARTER_S = 900.0


def working_day(seed: int, *, per_hour: tuple[float, ...] = (60, 120, 200, 300, 240, 150, 90, 60)) -> Case:
    """Eight quarters of an hour, each with its own stream; people hardly ever come abreast, but do follow."""
    rng = np.random.default_rng([seed, 14])
    first, learnt_s = places.learnt(rng)
    movers = list(first)
    for quarter, rate in enumerate(per_hour):
        begin_s = learnt_s + quarter * _QUARTER_S
        at_s = begin_s + float(rng.exponential(3600.0 / rate))
        while at_s < begin_s + _QUARTER_S:
            movers.append(places.walks(rng, at_s))
            at_s += float(rng.exponential(3600.0 / rate))
    return places.corridor_case(
        sorted(movers, key=lambda mover: mover.path.started_s),
        learnt_s + len(per_hour) * _QUARTER_S,
        seed=seed,
        learnt_s=learnt_s,
    )


ROWS = (
    Row(
        name="two hours of a working day, 60 to 300 an hour",
        make=working_day,
        goals=Goals(is_day=True),
        seeds=1,
    ),
)
