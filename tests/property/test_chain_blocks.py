"""The size of the blocks pushed in never changes what comes out: front end, activity, whole chain.

Grouped: the front end's batches to the bit, stretches of activity however batches are cut, passages.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import astuple
from functools import cache
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.chain import Chain
from ginnel.doppler.decimation import Decimator
from ginnel.doppler.frames import FrameStage, plan_frames
from ginnel.doppler.frontend import FrontEnd, SpectrumBatch
from ginnel.passages.activity import ActivityStage
from ginnel.sim import Hum, Lamps, Receiver, Scene, walker
from ginnel.words import Channels, Direction, Mounting, Passage, SampleArray, Sensor

RATE_HZ = 4000.0
SENSOR = {
    channels: Sensor(name="s", channels=channels, mounting=Mounting(tilt_deg=15.0)) for channels in Channels
}
PLAN = plan_frames(SENSOR[Channels.MONO], RATE_HZ)
HOP = PLAN.hop_len * PLAN.factor
#: Cuts that have caught mistakes elsewhere: none, one, few samples, about a hop, about a batch, all.
ODD_SIZES = (0, 1, 7, HOP - 1, HOP, HOP + 1, 32 * HOP - 1, 32 * HOP, 32 * HOP + 1, 10**6)


@cache
def samples(channels: Channels) -> SampleArray:
    """Two walkers, one after the other, under lamps; loud enough to clip beside the sensor."""
    scene = Scene(
        sensor=SENSOR[channels],
        duration_s=33.7,
        sample_rate_hz=RATE_HZ,
        movers=(
            walker(crossed_s=13.0, far_m=8.0),
            walker(crossed_s=19.0, far_m=9.0, direction=Direction.RECEDING, speed_mps=1.6, seed=1),
        ),
        nuisances=(Lamps(), Hum()),
        receiver=Receiver(clip_level=1.0),
        peak_snr_db=25.0,
        peak_level=0.6,
    )
    return scene.samples()


def cut(whole: SampleArray, sizes: list[int]) -> Iterator[SampleArray]:
    """Pieces of these sizes in turn, again and again; a row of zeros alone ends with all the rest."""
    at = 0
    while at < len(whole):
        for size in sizes if any(sizes) else [*sizes, len(whole)]:
            yield whole[at : at + size]
            at += size


def front_end(channels: Channels, sizes: list[int]) -> list[SpectrumBatch]:
    front = FrontEnd(SENSOR[channels], RATE_HZ)
    return [b for piece in cut(samples(channels), sizes) for b in front.push(piece)] + front.finish()


@cache
def whole_front_end(channels: Channels) -> list[SpectrumBatch]:
    return front_end(channels, [10**9])


def passages(channels: Channels, sizes: list[int]) -> list[Passage]:
    chain = Chain(SENSOR[channels], RATE_HZ, started_us=1_700_000_000_000_000)
    return [p for piece in cut(samples(channels), sizes) for p in chain.push(piece)] + chain.finish()


@cache
def whole_passages(channels: Channels) -> list[Passage]:
    return passages(channels, [10**9])


def assert_same(found: list[SpectrumBatch], expected: list[SpectrumBatch]) -> None:
    assert len(found) == len(expected)
    for one, other in zip(found, expected, strict=True):
        for ours, theirs in zip(astuple(one), astuple(other), strict=True):
            np.testing.assert_array_equal(ours, theirs)


block_sizes = st.lists(st.one_of(st.sampled_from(ODD_SIZES), st.integers(0, 20_000)), min_size=1, max_size=6)


@pytest.mark.parametrize("channels", list(Channels))
@settings(max_examples=12, deadline=None)
@given(sizes=block_sizes.filter(lambda sizes: max(sizes) > 300 or not any(sizes)))
def test_block_size_never_changes_a_bit_of_the_spectrogram(channels: Channels, sizes: list[int]) -> None:
    assert_same(front_end(channels, sizes), whole_front_end(channels))


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("size", [size for size in ODD_SIZES if size])
def test_odd_block_sizes_never_change_a_bit_of_the_spectrogram(channels: Channels, size: int) -> None:
    assert_same(front_end(channels, [size]), whole_front_end(channels))


def test_the_scene_clips_detects_and_lasts_for_many_batches() -> None:
    # Else the laws here would hold for want of anything to go wrong.
    for channels in Channels:
        batches = whole_front_end(channels)
        assert len(batches) > 15
        assert any(batch.is_clipped.any() for batch in batches)
        assert sum(batch.n_detected.sum() for batch in batches) > 100
        assert len(whole_passages(channels)) >= 2


@settings(max_examples=20, deadline=None)
@given(
    factor=st.integers(2, 9),
    cuts=st.lists(st.integers(0, 300), max_size=8),
    is_iq=st.booleans(),
)
def test_batches_of_one_size_decimate_as_one(factor: int, cuts: list[int], is_iq: bool) -> None:
    dtype: np.dtype[np.inexact] = np.dtype(np.complex64) if is_iq else np.dtype(np.float32)
    whole = samples(Channels.IQ if is_iq else Channels.MONO)[: 300 * factor]
    reference = Decimator(factor, dtype).push(whole)
    stage = Decimator(factor, dtype)
    edges = [0, *sorted(cuts), 300]
    parts = [stage.push(whole[a * factor : b * factor]) for a, b in pairwise(edges)]
    # Products of other sizes may round otherwise: equal to single precision, not to the bit.
    np.testing.assert_allclose(np.concatenate(parts), reference, atol=2e-6)


@settings(max_examples=20, deadline=None)
@given(cuts=st.lists(st.integers(0, 5000), max_size=10))
def test_frames_do_not_depend_on_the_cuts(cuts: list[int]) -> None:
    whole = samples(Channels.MONO)[:5000]
    reference = FrameStage(PLAN).push(whole)
    stage = FrameStage(PLAN)
    parts = [stage.push(whole[a:b]) for a, b in pairwise([0, *sorted(cuts), 5000])]
    np.testing.assert_array_equal(np.concatenate(parts), reference)


@settings(max_examples=50, deadline=None)
@given(
    counts=st.lists(st.sampled_from([0, 0, 0, 0, 1, 6]), min_size=1, max_size=40),
    cuts=st.lists(st.integers(1, 799), max_size=10),
)
def test_stretches_do_not_depend_on_how_frames_are_batched(counts: list[int], cuts: list[int]) -> None:
    # Each count is held for a second at 20 frames a second.
    n_detected = np.repeat(counts, 20)
    n = len(n_detected)
    power = np.arange(n, dtype=np.float32)[:, None] * np.ones((1, 3), dtype=np.float32)

    def stretches(edges: list[int]) -> list[tuple[int, float, float, list[float]]]:
        stage = ActivityStage(20.0, 1e-4, 40)
        out = []
        for a, b in pairwise(edges):
            batch = SpectrumBatch(a, power[a:b], np.ones(3, np.float32), n_detected[a:b], n_detected[a:b] > 5)
            out += stage.push(batch)
        out += stage.finish()
        return [(s.first_frame_idx, s.own_first, s.own_last, s.power[:, 0].tolist()) for s in out]

    edges = sorted({0, n, *(c for c in cuts if c < n)})
    found = stretches(edges)
    assert found == stretches([0, n]) == stretches(list(range(n + 1)))
    for first, _, _, rows in found:
        assert rows == list(range(first, first + len(rows)))


@pytest.mark.parametrize("channels", list(Channels))
@settings(max_examples=4, deadline=None)
@given(sizes=block_sizes.filter(lambda sizes: max(sizes) > 1000 or not any(sizes)))
def test_block_size_never_changes_a_passage(channels: Channels, sizes: list[int]) -> None:
    assert passages(channels, sizes) == whole_passages(channels)


@pytest.mark.parametrize("size", [7, HOP - 1, HOP, HOP + 1])
def test_odd_block_sizes_never_change_a_passage(size: int) -> None:
    assert passages(Channels.MONO, [size]) == whole_passages(Channels.MONO)
