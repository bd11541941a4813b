"""Passages as columns say the same as passages one by one, on both databases."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest

from ginnel.errors import StoreError
from ginnel.store import PassageColumns, Store, iter_passage_columns, iter_passages, record_span
from ginnel.words import Direction, Flag, MoverKind, Passage, Sensor, Span, Story

S = 1_000_000
AT_ONCE = 50
N = 270  # more of each sensor than are read at once


@pytest.fixture
def filled(store: Store, monkeypatch: pytest.MonkeyPatch) -> Store:
    monkeypatch.setattr("ginnel.store.columns.ROWS_AT_ONCE", AT_ONCE)
    rng = np.random.default_rng(7)
    for name in ("a", "b"):
        times = np.sort(rng.choice(2 * N, N, replace=False)) * S  # half of them at both sensors
        passages = [_any(rng, us) for us in times.tolist()]
        span = Span(started_us=0, ended_us=3 * N * S, sample_rate_hz=8000.0)
        record_span(store, Sensor(name=name), span, passages, "1")
    return store


def _any(rng: np.random.Generator, crossed_us: int) -> Passage:
    direction = list(Direction)[rng.integers(3)]
    return Passage(
        started_us=crossed_us,
        crossed_us=crossed_us,
        ended_us=crossed_us + S,
        story=list(Story)[rng.integers(3)],
        direction=direction,
        direction_confidence=None if direction is Direction.UNKNOWN else 0.75,
        speed_mps=None if rng.random() < 0.2 else int(rng.integers(3_000_000)) / 1e6,
        speed_se_mps=0.01,
        snr_db=int(rng.integers(-9_000, 30_000)) / 1e3,
        mover=[None, MoverKind.ON_FOOT, MoverKind.ON_WHEELS][rng.integers(3)],
        flags=frozenset(flag for flag in Flag if rng.random() < 0.3),
    )


def _rows(tables: Iterator[PassageColumns]) -> Iterator[tuple[object, ...]]:
    for some in tables:
        for i in range(len(some.crossed_us)):
            speed = some.speed_mps[i]
            yield (
                some.sensor.words[some.sensor.codes[i]],
                int(some.crossed_us[i]),
                int(some.ended_us[i]),
                some.direction.words[some.direction.codes[i]],
                some.mover.words[some.mover.codes[i]],
                some.flags.words[some.flags.codes[i]],
                None if np.isnan(speed) else float(speed),
                float(some.snr_db[i]),
            )


@pytest.mark.parametrize("with_uncounted", [False, True])
def test_columns_and_passages_agree(filled: Store, with_uncounted: bool) -> None:
    window = (20 * S, (2 * N - 20) * S)
    wanted = []
    for logged in iter_passages(filled, None, *window, with_uncounted=with_uncounted):
        one = logged.passage
        flags = [flag.value for flag in Flag if flag in one.flags]
        wanted.append(
            (
                logged.sensor,
                one.crossed_us,
                one.ended_us,
                one.direction.value,
                one.mover or "",
                ";".join(flags if one.story is Story.PASSAGE else [one.story.value, *flags]),
                one.speed_mps,
                one.snr_db,
            )
        )
    assert list(_rows(iter_passage_columns(filled, None, *window, with_uncounted=with_uncounted))) == wanted


def test_one_sensor_or_an_unknown_one(filled: Store) -> None:
    assert {row[0] for row in _rows(iter_passage_columns(filled, "b"))} == {"b"}
    with pytest.raises(StoreError, match="no sensor 'c'; it knows: a, b"):
        next(iter_passage_columns(filled, "c"))


def test_an_empty_store_has_no_columns(store: Store) -> None:
    assert list(iter_passage_columns(store)) == []
