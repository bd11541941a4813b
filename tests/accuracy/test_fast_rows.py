"""A few rows of the scoreboard, shortened, whose bars hold in CI; the whole is `python -m tests.accuracy`.

The bars stand a passage or two below what holds today, the goals are in `board`: whoever makes the chain
better raises them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np
import pytest
from tests.accuracy import nobody, people
from tests.accuracy.board import verdicts
from tests.accuracy.cases import Case, Goals, Row
from tests.accuracy.hardness import Hardened
from tests.accuracy.scoring import score

from ginnel.words import Channels

MONO, IQ = Channels.MONO, Channels.IQ


@dataclass(frozen=True)
class Bar:
    """What must hold: how many may be missed, false or the wrong way, and how far speeds are off."""

    name: str
    make: Callable[[int], Case]
    missed: int = 0
    false: int = 0
    not_right: int = 0
    mae_percent: float = 3.0


BARS = (
    Bar("single walkers, mono", partial(people.singles, snr_db=(22.0, 22.0), n=8), missed=0, false=1),
    Bar(
        "crossing each other, I/Q",
        partial(people.opposing, channels=IQ, n=4),
        missed=1,
        false=1,
        mae_percent=5.0,
    ),
    Bar(
        "single walkers, mono, hard",
        Hardened(partial(people.singles, snr_db=(25.0, 25.0), n=8)),
        missed=1,
        false=2,
        mae_percent=5.0,
    ),
    Bar("lamps and hum", nobody.lamps),
    Bar("doors", nobody.doors, false=1),
)


@pytest.mark.slow
@pytest.mark.parametrize("bar", BARS, ids=lambda bar: bar.name)
def test_a_row_holds_its_bar(bar: Bar, record_property: Callable[[str, object], None]) -> None:
    outcome = score(bar.make(0))
    row = Row(name=bar.name, make=bar.make, goals=Goals())
    record_property("table", f"{bar.name}: {' | '.join(str(one) for one in verdicts(row, outcome))}")
    assert len(outcome.missed_s) <= bar.missed, outcome.missed_s
    assert len(outcome.false_s) <= bar.false, outcome.false_s
    assert outcome.n_true - len(outcome.missed_s) - outcome.directions()[0] <= bar.not_right
    if outcome.pairs:
        assert np.abs(outcome.speed_errors_percent()).mean() <= bar.mae_percent
