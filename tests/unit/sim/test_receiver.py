"""Electronics: I/Q errors against the image rejection table, 1/f, high-pass, converter.

Image rejection: IRR = (1 + 2 g cos p + g^2) / (1 - 2 g cos p + g^2), rows recomputed from that formula.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import sosfreqz

from ginnel.sim import IqError, Receiver, Scene
from ginnel.sim.receiver import flicker_sections, highpass_sections
from ginnel.words import Channels, Sensor


@pytest.mark.parametrize(
    ("gain_db", "phase_deg", "rejection_db"),
    [(0.0, 1.0, 41.18), (0.5, 0.0, 30.82), (1.0, 5.0, 22.83), (0.25, 3.0, 30.49), (3.0, 30.0, 9.96)],
)
def test_an_iq_error_mirrors_a_line_by_the_tabled_ratio(
    gain_db: float, phase_deg: float, rejection_db: float
) -> None:
    times_s = np.arange(4000) / 4000
    tone = np.exp(2j * np.pi * 200 * times_s)
    spectrum = np.abs(np.fft.fft(IqError(gain_db=gain_db, phase_deg=phase_deg).apply(tone, times_s)))
    assert 20 * np.log10(spectrum[200] / spectrum[-200]) == pytest.approx(rejection_db, abs=0.01)


def test_iq_errors_drift_by_the_hour() -> None:
    error = IqError(gain_drift_db=2.0)
    field = np.full(2, 1j)
    out = error.apply(field, np.array([0.0, 1800.0]))
    assert 20 * np.log10(out[1].imag / out[0].imag) == pytest.approx(1.0)


@pytest.mark.parametrize("corner_hz", [20.0, 100.0, 400.0])
def test_flicker_noise_falls_10_db_a_decade_to_its_corner_and_ends_white(corner_hz: float) -> None:
    sections = flicker_sections(corner_hz, 8000.0)
    freqs_hz = np.geomspace(0.05, corner_hz / 2, 60)
    _, response = sosfreqz(sections, freqs_hz, fs=8000.0)
    power_db = 20 * np.log10(np.abs(response))
    np.testing.assert_allclose(power_db, 10 * np.log10(corner_hz / freqs_hz), atol=1.5)
    _, far = sosfreqz(sections, np.array([3900.0]), fs=8000.0)
    assert 20 * np.log10(abs(far[0])) == pytest.approx(0.0, abs=0.3)


def test_the_amplifier_is_3_db_down_at_its_corner() -> None:
    _, response = sosfreqz(highpass_sections(8.0, 8000.0), np.array([0.8, 8.0, 800.0]), fs=8000.0)
    assert 20 * np.log10(np.abs(response)) == pytest.approx([-20.04, -3.01, 0.0], abs=0.02)


def test_converter_rounds_to_its_bits_and_clips_at_the_rails() -> None:
    wave = np.linspace(-2, 2, 4001)
    out = Receiver(bits=8, clip_level=0.9).convert(wave, np.zeros(4001))
    assert np.array_equal(out * 128, np.rint(out * 128))
    assert out.max() == pytest.approx(0.9, abs=1 / 128)
    assert out.min() == pytest.approx(-0.9, abs=1 / 128)
    assert np.abs(out[1200:2800] - wave[1200:2800]).max() <= 0.5 / 128 + 1e-12
    assert Receiver(bits=16).convert(np.array([5.0]), np.zeros(1))[0] == 32767 / 32768


def test_gain_steps_offsets_and_dead_input_show() -> None:
    receiver = Receiver(gain_steps=((2.0, 6.0),), dead_s=((4.0, 5.0),), offset=0.01 - 0.02j)
    scene = Scene(sensor=Sensor(name="s", channels=Channels.IQ), duration_s=6, receiver=receiver)
    seconds = scene.samples().reshape(6, -1)
    assert 20 * np.log10(seconds[2].std() / seconds[1].std()) == pytest.approx(6.0, abs=0.2)
    assert not seconds[4].any()
    assert seconds[0].mean() == pytest.approx(0.01 - 0.02j, abs=2e-3)


def test_an_offset_drifts_by_the_hour() -> None:
    receiver = Receiver(bits=None, offset=0.1 + 0.2j, offset_drift=0.2 - 0.1j)
    after = receiver.convert(np.zeros(2, dtype=complex), np.array([0.0, 1800.0]))
    assert after == pytest.approx(np.array([0.1 + 0.2j, 0.2 + 0.15j]))
