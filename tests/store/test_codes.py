"""Codes on disk: every word has one, none changes."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.store import codes
from ginnel.words import Direction, Flag, MoverKind, Passage, Story


def test_every_word_has_its_own_code() -> None:
    for words, table in (
        (Story, codes.STORY_CODES),
        (Direction, codes.DIRECTION_CODES),
        (MoverKind, codes.MOVER_CODES),
        (Flag, codes.FLAG_BITS),
    ):
        assert set(table) == set(words)
        assert len(set(table.values())) == len(table)
    assert all(bit & (bit - 1) == 0 for bit in codes.FLAG_BITS.values())


def test_codes_that_lie_on_disks_stay_what_they_were() -> None:
    # fixed by the first published store; a change would misread every log there is
    assert {word.value: code for word, code in codes.STORY_CODES.items()} == {
        "passage": 0,
        "turn-back": 1,
        "fidget": 2,
    }
    assert codes.DIRECTION_CODES[Direction.UNKNOWN] == 0
    assert codes.DIRECTION_CODES[Direction.APPROACHING] == 1
    assert codes.DIRECTION_CODES[Direction.RECEDING] == 2
    assert [codes.FLAG_BITS[Flag(name)] for name in ("clipped", "cut", "overlapping", "low-confidence")] == [
        1,
        2,
        4,
        8,
    ]


measure = st.none() | st.floats(-2000, 2000)


@given(measure, measure, measure, st.floats(0.5, 1), st.sets(st.sampled_from(Flag)))
def test_there_and_back_is_within_half_a_unit_and_then_stays(
    speed: float | None, error: float | None, snr: float | None, confidence: float, flags: set[Flag]
) -> None:
    first = Passage(
        started_us=1,
        crossed_us=2,
        ended_us=3,
        direction=Direction.RECEDING,
        direction_confidence=confidence,
        speed_mps=speed,
        speed_se_mps=error,
        snr_db=snr,
        flags=frozenset(flags),
    )
    back = codes.decode(codes.encode(first))
    for given_value, got, unit in (
        (speed, back.speed_mps, 1e-6),
        (error, back.speed_se_mps, 1e-6),
        (snr, back.snr_db, 1e-3),
        (confidence, back.direction_confidence, 1e-6),
    ):
        assert (given_value is None) == (got is None)
        assert given_value is None or got == pytest.approx(given_value, abs=0.5000001 * unit)
    assert back.flags == flags
    assert codes.encode(back) == codes.encode(first)
