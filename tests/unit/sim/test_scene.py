"""Scenes: levels as defined, truth, determinism, memory."""

from __future__ import annotations

import tracemalloc
from dataclasses import replace

import numpy as np
import pytest

from ginnel.sim import (
    Beam,
    Clicks,
    Lamps,
    Receiver,
    Scene,
    Walker,
    loiterer,
    stopper,
    turner,
    vehicle,
    walker,
)
from ginnel.sim.bodies import cycle_s
from ginnel.sim.echoes import MoverEcho
from ginnel.words import Channels, Direction, FloatArray, Mounting, Sensor, Story

CORRIDOR = Mounting(tilt_deg=15.0)


def sensor(channels: Channels = Channels.MONO) -> Sensor:
    return Sensor(name="s", channels=channels, mounting=CORRIDOR)


@pytest.mark.parametrize("channels", list(Channels))
def test_peak_snr_is_what_a_hann_frame_of_100_ms_shows(channels: Channels) -> None:
    scene = Scene(sensor=sensor(channels), duration_s=40, peak_snr_db=25.0, receiver=Receiver(bits=None))
    frames = scene.samples().reshape(-1, 800).astype(np.complex128)
    window = np.hanning(801)[:-1]
    noise_bin = (np.abs(np.fft.fft(frames * window)[:, 50:350]) ** 2).mean()
    # A tone of the reference walker's amplitude, centred on a bin.
    turn = 2 * np.pi * 100 * np.arange(800) / 800
    tone = 0.05 * (np.exp(1j * turn) if channels is Channels.IQ else np.cos(turn))
    signal_bin = np.abs(np.fft.fft(tone * window)[100]) ** 2
    assert 10 * np.log10(signal_bin / noise_bin) == pytest.approx(25.0, abs=0.2)


class TorsoOnly(Walker):
    """A walker of whom only the torso reflects."""

    def powers(self, facing: FloatArray) -> FloatArray:
        powers = super().powers(facing)
        powers[1:] = 0.0
        return powers


def test_the_reference_walker_peaks_at_the_stated_level() -> None:
    mover = replace(walker(crossed_s=12.0), body=TorsoOnly(), flicker_db=0.0)
    scene = Scene(
        sensor=sensor(Channels.IQ),
        duration_s=14,
        movers=(mover,),
        peak_snr_db=200.0,
        receiver=Receiver(bits=None),
        peak_level=0.05,
        ends_at_sensor=True,
    )
    # The model's torso is 0.16 m higher than the reference, so a little nearer and off the axis.
    assert np.abs(scene.samples()).max() == pytest.approx(0.05, rel=0.3)


def test_a_sensor_at_body_height_still_hears_a_walker_from_afar() -> None:
    # By the range law alone: 1 m^2 at 10 m is 40 dB below the peak, which is taken at 1 m.
    low = Sensor(name="s", mounting=Mounting(height_m=1.0))
    hearing = Scene(sensor=low, duration_s=1, beam=Beam(floor_db=-200.0)).hearing()
    assert hearing.scale / 10.0**2 == pytest.approx(0.05 * 1e-2, rel=0.05)


def test_power_of_a_mover_is_in_db() -> None:
    def peak(power_db: float) -> float:
        scene = Scene(
            sensor=sensor(),
            duration_s=14,
            movers=(walker(crossed_s=12.0, power_db=power_db),),
            peak_snr_db=200.0,
            receiver=Receiver(bits=None),
        )
        return float(np.abs(scene.samples()).max())

    assert 20 * np.log10(peak(3.0) / peak(-3.0)) == pytest.approx(6.0, abs=1e-3)


def test_nothing_is_heard_behind_the_sensor_where_the_path_ends_there() -> None:
    movers = (walker(crossed_s=10.0, behind_m=5.0),)
    ends = Scene(sensor=sensor(), duration_s=14, movers=movers, ends_at_sensor=True, peak_snr_db=200.0)
    goes_on = replace(ends, ends_at_sensor=False)
    after = slice(round(11.0 * 8000), None)
    assert np.abs(ends.samples()[after]).max() == 0.0
    assert np.abs(goes_on.samples()[after]).max() > 0.0


def test_a_scene_repeats_itself_and_another_seed_does_not() -> None:
    scene = Scene(
        sensor=sensor(Channels.IQ), duration_s=3, nuisances=(Lamps(), Clicks(per_hour=5000)), seed=4
    )
    first = scene.samples()
    np.testing.assert_array_equal(first, scene.samples())
    assert not np.array_equal(first, replace(scene, seed=5).samples())


@pytest.mark.parametrize(("channels", "dtype"), [(Channels.MONO, np.float32), (Channels.IQ, np.complex64)])
def test_blocks_have_the_agreed_types_and_lengths(channels: Channels, dtype: type) -> None:
    scene = Scene(sensor=sensor(channels), duration_s=2.01)
    blocks = list(scene.blocks(3000))
    assert [len(block) for block in blocks] == [3000] * 5 + [1080]
    assert {block.dtype.type for block in blocks} == {dtype}


def test_memory_does_not_grow_with_the_length_of_a_scene() -> None:
    def peak_bytes(duration_s: float) -> int:
        scene = Scene(sensor=sensor(), duration_s=duration_s, sample_rate_hz=4000)
        for _ in scene.blocks(4096):  # warm up imports
            break
        tracemalloc.start()
        for _ in scene.blocks(4096):
            pass
        peak = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return peak

    assert peak_bytes(200) < 1.2 * peak_bytes(20)


def test_truth_tells_passages_turn_backs_and_fidgeting_apart() -> None:
    scene = Scene(
        sensor=sensor(),
        duration_s=80,
        movers=(
            loiterer(started_s=60, duration_s=10),
            turner(started_s=30, turn_at_m=2.0),
            walker(crossed_s=12.5, speed_mps=1.2, direction=Direction.RECEDING),
            stopper(started_s=5, stop_at_m=4.0, dwell_s=6.0, speed_mps=1.5),
        ),
        ends_at_sensor=True,
    )
    truth = scene.truth()
    assert [true.story for true in truth] == [Story.PASSAGE, Story.PASSAGE, Story.TURN_BACK, Story.FIDGET]
    assert [true.direction for true in truth[:2]] == [Direction.RECEDING, Direction.APPROACHING]
    assert truth[0].crossed_s == pytest.approx(12.5, abs=1e-6)
    assert truth[0].mean_speed_mps == pytest.approx(1.2, abs=1e-6)
    # By hand: 15 m at 1.5 m/s take 10 s, the dwell 6 s, both ramps half of 0.8 s each.
    assert truth[1].crossed_s == pytest.approx(5 + 10 + 6 + 0.8, abs=0.1)
    assert truth[2].crossed_s is None
    assert not any(true.cut for true in truth)


def test_who_goes_through_and_comes_back_is_no_passage() -> None:
    there_and_back = turner(started_s=1.0, from_m=6.0, turn_at_m=-4.0, dwell_s=2.0)
    (true,) = Scene(sensor=sensor(), duration_s=40, movers=(there_and_back,)).truth()
    assert (true.story, true.crossed_s) == (Story.TURN_BACK, None)


def test_truth_marks_who_is_cut_by_the_scene_and_leaves_out_who_never_comes() -> None:
    scene = Scene(sensor=sensor(), duration_s=20, movers=(walker(crossed_s=3.0), walker(crossed_s=100.0)))
    (true,) = scene.truth()
    assert true.cut
    assert true.started_s == 0.0


def test_a_road_scene_at_44100_hz_has_the_tabled_doppler_of_25_mps() -> None:
    # 160.94468 Hz per m/s at 24.125 GHz: 4023.6 Hz; the body's four places share it.
    road = Sensor(
        name="r", carrier_hz=24.125e9, channels=Channels.IQ, mounting=Mounting(height_m=1.5, offset_m=3.0)
    )
    scene = Scene(
        sensor=road,
        duration_s=6,
        sample_rate_hz=44_100,
        movers=(vehicle(crossed_s=4.0, speed_mps=25.0, y_m=3.0),),
        beam=Beam(),
        peak_snr_db=40.0,
    )
    part = scene.samples()[44_100 * 2 : 44_100 * 2 + 8192]
    spectrum = np.abs(np.fft.fft(part * np.hanning(8192)))
    peak_hz = np.fft.fftfreq(8192, 1 / 44_100)[spectrum.argmax()]
    assert peak_hz == pytest.approx(4023.6, abs=15.0)


def test_bad_scenes_are_refused() -> None:
    with pytest.raises(ValueError, match="must be positive"):
        Scene(sensor=sensor(), duration_s=0)
    with pytest.raises(ValueError, match="block_samples"):
        next(Scene(sensor=sensor(), duration_s=1).blocks(0))


def test_a_body_that_changes_from_step_to_step_does_so_by_its_standard_deviation() -> None:
    """Levels of one walker who differs in nothing else, at the middle of each step; and in any blocks."""
    steady = replace(walker(crossed_s=300.0, speed_mps=1.34, far_m=390.0), flicker_db=0.0)
    lively = replace(steady, stride_db=2.0)
    hearing = Scene(sensor=sensor(), duration_s=1.0).hearing()
    half_cycle_s = cycle_s(1.34) / 2
    times_s = np.arange(20.0, 290.0, half_cycle_s / 20)
    change_db = 20 * np.log10(
        MoverEcho(lively, hearing)._grid(times_s)[1][0] / MoverEcho(steady, hearing)._grid(times_s)[1][0]
    )
    # Straight between independent values of one a step: two thirds of their variance on average.
    assert change_db.std() == pytest.approx(2.0 * np.sqrt(2 / 3), rel=0.1)
    assert change_db.mean() == pytest.approx(0.0, abs=0.3)
    scene = Scene(sensor=sensor(), duration_s=2.0, movers=(replace(lively, path=lively.path),))
    assert np.array_equal(np.concatenate(list(scene.blocks(777))), scene.samples())
