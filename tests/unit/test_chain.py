"""The chain as one object: nothing that moves, odd inputs, times, flags.

Simulated scenes have known truth; false friends are those of the issue: noise, lamps, hum, gain steps.
"""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.chain import Chain
from ginnel.sim import Hum, Lamps, Scene, walker
from ginnel.words import Channels, Direction, Flag, Mounting, Passage, SampleArray, Sensor, Story

CORRIDOR = Mounting(tilt_deg=15.0)
RATE_HZ = 2000.0
STARTED_US = 1_700_000_000_000_000


def sensor(channels: Channels = Channels.MONO) -> Sensor:
    return Sensor(name="s", channels=channels, mounting=CORRIDOR)


def noise(duration_s: float, channels: Channels, seed: int, rms: float = 0.01) -> SampleArray:
    rng = np.random.default_rng(seed)
    n = round(duration_s * RATE_HZ)
    if channels is Channels.MONO:
        return (rms * rng.standard_normal(n)).astype(np.float32)
    return (rms * (rng.standard_normal(n) + 1j * rng.standard_normal(n))).astype(np.complex64)


def passages(samples: SampleArray, channels: Channels, rate_hz: float = RATE_HZ) -> list[Passage]:
    chain = Chain(sensor(channels), rate_hz, STARTED_US)
    return chain.push(samples) + chain.finish()


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("seed", range(3))
def test_ten_minutes_of_noise_give_no_passage(channels: Channels, seed: int) -> None:
    assert passages(noise(600, channels, seed), channels) == []


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("duration_s", [0.0, 0.01, 0.09, 0.5, 1.5, 3.0, 3.1, 6.0, 9.0, 20.0])
def test_short_spans_of_noise_give_no_passage(channels: Channels, duration_s: float) -> None:
    for seed in range(5):
        assert passages(noise(duration_s, channels, seed), channels) == []


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("seed", range(2))
def test_ten_minutes_of_lamps_and_hum_give_no_passage(channels: Channels, seed: int) -> None:
    scene = Scene(
        sensor=sensor(channels),
        duration_s=600,
        sample_rate_hz=RATE_HZ,
        nuisances=(Lamps(), Hum()),
        seed=seed,
    )
    assert passages(scene.samples(), channels) == []


@pytest.mark.parametrize("channels", list(Channels))
def test_a_lamp_switched_on_gives_no_stream_of_passages(channels: Channels) -> None:
    scene = Scene(
        sensor=sensor(channels),
        duration_s=300,
        sample_rate_hz=RATE_HZ,
        nuisances=(Lamps(on_s=((100, 300),)), Hum()),
    )
    assert len(passages(scene.samples(), channels)) <= 2


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize(("before", "after"), [(0.0, 0.01), (0.01, 0.1), (0.1, 0.01), (0.01, 0.0)])
def test_a_gain_step_and_a_plug_pushed_in_or_pulled_give_no_passage(
    channels: Channels, before: float, after: float
) -> None:
    samples = noise(300, channels, seed=3, rms=1.0)
    rms = np.where(np.arange(len(samples)) < len(samples) // 2, before, after)
    assert passages((samples * rms).astype(samples.dtype), channels) == []


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("value", [0.0, 0.3, 1.0, -1.0])
def test_an_input_that_stands_still_gives_no_passage(channels: Channels, value: float) -> None:
    samples = np.full(round(120 * RATE_HZ), value, np.complex64 if channels is Channels.IQ else np.float32)
    assert passages(samples, channels) == []


@pytest.mark.parametrize("channels", list(Channels))
def test_noise_that_clips_all_the_time_gives_no_passage(channels: Channels) -> None:
    samples = noise(120, channels, seed=4, rms=3.0)
    clipped = np.clip(samples.view(np.float32), -1, 1).view(samples.dtype)
    assert passages(clipped, channels) == []


Walk = tuple[Channels, SampleArray, list[Passage]]


@pytest.fixture(scope="module", params=list(Channels))
def walk(request: pytest.FixtureRequest) -> Walk:
    """Two who walk through, one each way, and what the chain makes of them."""
    scene = Scene(
        sensor=sensor(request.param),
        duration_s=58,
        sample_rate_hz=RATE_HZ,
        movers=(
            walker(crossed_s=20.0, speed_mps=1.3, far_m=10.0),
            walker(crossed_s=40.0, speed_mps=1.1, far_m=10.0, direction=Direction.RECEDING, seed=1),
        ),
        peak_snr_db=28.0,
    )
    samples = scene.samples()
    return request.param, samples, passages(samples, request.param)


def test_who_walks_through_is_a_passage_with_time_direction_and_speed(
    walk: Walk,
) -> None:
    _, _, whole = walk
    found = [p for p in whole if p.story is Story.PASSAGE]
    assert [p.direction for p in found] == [Direction.APPROACHING, Direction.RECEDING]
    for passage, crossed_s, speed_mps in zip(found, [20.0, 40.0], [1.3, 1.1], strict=True):
        assert passage.crossed_us == pytest.approx(STARTED_US + crossed_s * 1e6, abs=0.4e6)
        assert passage.speed_mps == pytest.approx(speed_mps, rel=0.06)
        assert passage.speed_se_mps is not None
        assert 0 < passage.speed_se_mps < 0.1
        assert passage.started_us < passage.ended_us
        assert passage.direction_confidence is not None
        assert 0.9 < passage.direction_confidence < 1
        assert Flag.CUT not in passage.flags


def test_times_are_counted_from_the_spans_start(walk: Walk) -> None:
    channels, samples, whole = walk
    chain = Chain(sensor(channels), RATE_HZ, 0)
    moved = chain.push(samples) + chain.finish()
    assert [p.crossed_us + STARTED_US for p in moved] == [p.crossed_us for p in whole]
    assert chain.listened_until_us == 58_000_000


def test_passages_come_in_order_of_their_crossing_and_none_after_it_was_called_settled(
    walk: Walk,
) -> None:
    channels, samples, _ = walk
    chain = Chain(sensor(channels), RATE_HZ, STARTED_US)
    settled_us = STARTED_US
    crossed: list[int] = []
    for at in range(0, len(samples), 500):
        for passage in chain.push(samples[at : at + 500]):
            assert passage.crossed_us >= settled_us
            crossed.append(passage.crossed_us)
        assert settled_us <= max(STARTED_US, chain.settled_us) <= chain.listened_until_us
        settled_us = max(STARTED_US, chain.settled_us)
    for passage in chain.finish():
        assert passage.crossed_us >= settled_us
        crossed.append(passage.crossed_us)
    assert crossed == sorted(set(crossed))


@pytest.mark.parametrize("which", ["begins", "ends"])
def test_who_is_cut_by_the_spans_edge_is_flagged(walk: Walk, which: str) -> None:
    channels, samples, _ = walk
    at = round(17.5 * RATE_HZ)
    part = samples[at : round(32 * RATE_HZ)] if which == "begins" else samples[: round(19.5 * RATE_HZ)]
    found = [p for p in passages(part, channels) if Flag.CUT in p.flags]
    assert len(found) == 1


def test_who_overdrives_the_input_is_flagged(walk: Walk) -> None:
    channels, samples, whole = walk
    # Loud enough to clip beside the sensor only.
    louder = np.clip(samples.view(np.float32) * 30, -1, 1).view(samples.dtype)
    found = passages(louder[: round(30 * RATE_HZ)], channels)
    assert any(Flag.CLIPPED in p.flags for p in found)
    assert not any(Flag.CLIPPED in p.flags for p in whole)
