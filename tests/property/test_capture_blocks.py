"""Laws of reading: block size changes no sample and no time; files cut anywhere join to the same span."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
import sigmf
import soundfile
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.capture import Recording, arrange, open_recording
from ginnel.words import Block, Channels, Sensor

MONO = Sensor(name="north")
PAIR = Sensor(name="north", channels=Channels.IQ)
N, RATE_HZ = 4321, 11_025
WAVE = np.random.default_rng(9).uniform(-1, 1, size=(N, 2))

BLOCKS = st.one_of(st.sampled_from([1, 7, N - 1, N, N + 1]), st.integers(1, 2 * N))


@pytest.fixture(scope="module")
def recordings(tmp_path_factory: pytest.TempPathFactory) -> list[Recording]:
    folder = tmp_path_factory.mktemp("captures")
    soundfile.write(folder / "a.wav", WAVE, RATE_HZ, subtype="PCM_24")
    soundfile.write(folder / "a.flac", WAVE, RATE_HZ)
    (WAVE * 32767).astype("<i2").tofile(folder / "a.sigmf-data")
    described = sigmf.SigMFFile(
        data_file=str(folder / "a.sigmf-data"),
        global_info={"core:datatype": "ci16_le", "core:sample_rate": RATE_HZ},
    )
    described.add_capture(0, metadata={"core:datetime": "2026-03-02T08:15:00Z"})
    described.tofile(str(folder / "a.sigmf-meta"))
    names = ("a.wav", "a.flac", "a.sigmf-meta")
    return [open_recording(folder / name, PAIR, started_us=77).check() for name in names]


@settings(max_examples=25, deadline=None)
@given(block_samples=BLOCKS)
def test_block_size_changes_nothing(recordings: list[Recording], block_samples: int) -> None:
    for recording in recordings:
        (whole,) = recording.iter_blocks(10 * N)
        assert isinstance(whole, Block)
        at = 0
        parts = []
        for block in recording.iter_blocks(block_samples):
            assert isinstance(block, Block)
            assert block.started_us == 77 + round(at * 1e6 / RATE_HZ)
            at += len(block.samples)
            parts.append(block.samples)
        np.testing.assert_array_equal(np.concatenate(parts), whole.samples)


@settings(max_examples=15, deadline=None)
@given(
    cuts=st.lists(st.integers(1, N - 1), max_size=4, unique=True).map(sorted),
    block_samples=st.integers(100, 5000),
    order=st.randoms(use_true_random=False),
)
def test_a_recording_cut_into_files_is_the_same_span(
    tmp_path_factory: pytest.TempPathFactory, cuts: list[int], block_samples: int, order: object
) -> None:
    folder: Path = tmp_path_factory.mktemp("cut")
    edges = [0, *cuts, N]
    parts = []
    for begin, end in pairwise(edges):
        path = folder / f"{begin}.wav"
        soundfile.write(path, WAVE[begin:end, 0], RATE_HZ, subtype="PCM_16")
        parts.append(open_recording(path, MONO, started_us=77 + round(begin * 1e6 / RATE_HZ)))
    order.shuffle(parts)  # type: ignore[attr-defined]  # hypothesis gives a random.Random
    (span,) = arrange(parts).spans
    assert (span.started_us, span.ended_us) == (77, 77 + round(N * 1e6 / RATE_HZ))
    soundfile.write(folder / "whole.wav", WAVE[:, 0], RATE_HZ, subtype="PCM_16")
    (whole,) = open_recording(folder / "whole.wav", MONO, started_us=77).iter_blocks(10 * N)
    assert isinstance(whole, Block)
    got = np.concatenate([block.samples for block in span.iter_blocks(block_samples)])
    np.testing.assert_array_equal(got, whole.samples)
