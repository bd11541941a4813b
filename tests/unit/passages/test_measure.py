"""Direction and speed as told: confidence grows with evidence, errors have a floor."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.passages.explained import Explained
from ginnel.passages.fit import Fit
from ginnel.passages.measure import measure
from ginnel.passages.mover import Mover
from ginnel.passages.pace import Pace
from ginnel.passages.site import N_ZONES
from ginnel.words import Direction

PACE = Pace(1.3, 0.01)


def explained(margin: float, *, sign: int = 1, speed_mps: float = 1.3, score: float = 300.0) -> Explained:
    mover = Mover(crossed_s=5.0, speed_mps=speed_mps, sign=sign, offset_m=1.4, level=np.zeros(N_ZONES))
    return Explained(
        fit=Fit(mover, score, np.zeros((3 + 2 * N_ZONES, 3 + 2 * N_ZONES))),
        rival_score=score - margin,
        first_frame=0,
        last_frame=100,
        near_m=0.0,
        far_m=8.0,
        lost_near=0.0,
        lost_far=0.0,
        snr_db=15.0,
        mean_speed_mps=speed_mps,
        zone_gain=np.zeros(N_ZONES),
        claim=np.zeros((1, 1)),
    )


@given(margins=st.lists(st.floats(0, 1e4), min_size=2, max_size=10))
def test_more_evidence_never_means_less_confidence(margins: list[float]) -> None:
    told = [measure(explained(margin), PACE).confidence or 0.5 for margin in sorted(margins)]
    assert told == sorted(told)
    assert all(0.5 <= one < 1 for one in told)


@pytest.mark.parametrize("sign", [1, -1])
def test_without_evidence_the_direction_is_unknown(sign: int) -> None:
    told = measure(explained(0.0, sign=sign), PACE)
    assert (told.direction, told.confidence) == (Direction.UNKNOWN, None)


@pytest.mark.parametrize(("sign", "direction"), [(1, Direction.APPROACHING), (-1, Direction.RECEDING)])
def test_strong_evidence_is_told(sign: int, direction: Direction) -> None:
    told = measure(explained(500.0, sign=sign), PACE)
    assert told.direction is direction
    assert told.confidence is not None
    assert told.confidence > 0.99


def test_no_confidence_is_certainty() -> None:
    assert measure(explained(1e6), PACE).confidence == 0.9999


def test_the_paces_error_and_the_models_error_add_in_squares() -> None:
    # 0.04 m/s from the pace and 2 % of 1.5 m/s from the model: a 3-4-5 triangle.
    assert measure(explained(100.0), Pace(1.5, 0.04)).speed_se_mps == pytest.approx(0.05)
