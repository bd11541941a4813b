"""I/Q balance: the image of a known imbalance is estimated and removed; symmetric lines do not mislead it.

Image rejection of a pair with amplitude ratio g and phase error phi, a standard formula:
IRR = (1 + 2 g cos phi + g^2) / (1 - 2 g cos phi + g^2). Its values below were worked out apart from this code
(1 dB and 5 degrees confirmed by an FFT there).
"""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.doppler.frontend import FrontEnd
from ginnel.doppler.iq_balance import IqBalance
from ginnel.words import Channels, Mounting, Sensor

RATE_HZ = 2000.0
SENSOR = Sensor(name="s", channels=Channels.IQ, mounting=Mounting(tilt_deg=15.0))

Signal = np.ndarray[tuple[int], np.dtype[np.complex128]]


def imbalanced(z: Signal, gain_db: float, phase_deg: float) -> Signal:
    """I + jQ of a pair whose Q is gain_db up and phase_deg off."""
    gain, phase = 10 ** (gain_db / 20), np.deg2rad(phase_deg)
    return np.asarray(z.real + 1j * gain * (z.imag * np.cos(phase) + z.real * np.sin(phase)))


def noise(n: int, rms: float, seed: int) -> Signal:
    rng = np.random.default_rng(seed)
    return np.asarray(rms * (rng.standard_normal(n) + 1j * rng.standard_normal(n)))


def sweep(duration_s: float, from_s: float, up_hz: tuple[float, float] = (60.0, 300.0)) -> Signal:
    """Silence, then a line that rises and falls between two frequencies, once in four seconds."""
    t = np.arange(round(duration_s * RATE_HZ)) / RATE_HZ
    frequency_hz = up_hz[0] + (up_hz[1] - up_hz[0]) * np.abs((t / 4) % 1 * 2 - 1)
    return np.asarray(np.exp(2j * np.pi * np.cumsum(frequency_hz) / RATE_HZ) * (t >= from_s))


def heard(samples: Signal) -> tuple[FrontEnd, np.ndarray[tuple[int, int], np.dtype[np.float32]]]:
    front = FrontEnd(SENSOR, RATE_HZ)
    batches = front.push(samples.astype(np.complex64)) + front.finish()
    return front, np.concatenate([batch.power for batch in batches])


def rejection_db(power: np.ndarray[tuple[int, int], np.dtype[np.float32]]) -> float:
    """Power at positive over power at negative frequencies, away from zero."""
    middle = power.shape[1] // 2
    return float(10 * np.log10(power[:, middle + 4 :].sum() / power[:, : middle - 3].sum()))


IMBALANCE = [(0.0, 5.0, 27.20), (0.5, 3.0, 28.20), (1.0, 5.0, 22.83), (2.0, 10.0, 16.82), (3.0, 20.0, 12.20)]


@pytest.mark.parametrize(("gain_db", "phase_deg", "irr_db"), IMBALANCE)
def test_a_known_imbalance_is_estimated_and_its_image_removed(
    gain_db: float, phase_deg: float, irr_db: float
) -> None:
    z = imbalanced(sweep(60.0, 12.0) * 0.1, gain_db, phase_deg) + noise(round(60 * RATE_HZ), 1e-5, 1)
    front, power = heard(z)
    balance = front._balance
    assert -balance.image_db == pytest.approx(irr_db, abs=0.3)
    # I + jQ with Q' = g (Q cos phi + I sin phi) is z (1 + t) / 2 + z* (1 - t*) / 2, t = g e^(j phi).
    turn = 10 ** (gain_db / 20) * np.exp(1j * np.deg2rad(phase_deg))
    expected = (1 - np.conj(turn)) / (1 + np.conj(turn))
    assert abs(balance.image_ratio - expected) < 0.1 * abs(expected)
    settled = power[-round(20 * front.plan.frame_rate_hz) :]
    assert rejection_db(settled) > 40


def test_the_image_is_there_before_it_is_learnt() -> None:
    # Without this the test above could pass with a stage that hears nothing.
    z = imbalanced(sweep(4.0, 0.0) * 0.1, 1.0, 5.0) + noise(round(4 * RATE_HZ), 1e-5, 1)
    assert rejection_db(heard(z)[1]) == pytest.approx(22.83, abs=0.2)


@pytest.mark.parametrize("lamps_from_s", [0.0, 20.0])
def test_lamps_do_not_pass_for_an_imbalance(lamps_from_s: float) -> None:
    # A lamp's line is the same on both sides of zero: one phase, a real modulation.
    t = np.arange(round(60 * RATE_HZ)) / RATE_HZ
    lamps = 0.02 * np.exp(0.6j) * np.cos(2 * np.pi * 100 * t) * (t >= lamps_from_s)
    front, _ = heard(lamps + noise(len(t), 1e-4, 2))
    assert abs(front._balance.image_ratio) < 0.01


@pytest.mark.parametrize("lamps_from_s", [0.0, 20.0])
def test_a_mover_under_lamps_gives_the_imbalance_nevertheless(lamps_from_s: float) -> None:
    t = np.arange(round(80 * RATE_HZ)) / RATE_HZ
    lamps = 0.02 * np.exp(0.6j) * np.cos(2 * np.pi * 100 * t) * (t >= lamps_from_s)
    z = imbalanced(lamps + 0.1 * sweep(80.0, 30.0), 1.0, 5.0) + noise(len(t), 1e-5, 3)
    front, _ = heard(z)
    assert -front._balance.image_db == pytest.approx(22.83, abs=0.5)


def test_noise_alone_teaches_nothing() -> None:
    front, _ = heard(noise(round(120 * RATE_HZ), 1e-3, 4))
    assert abs(front._balance.image_ratio) < 0.003


def test_a_gain_step_teaches_nothing() -> None:
    n = round(60 * RATE_HZ)
    step = np.where(np.arange(n) < n // 2, 1.0, 30.0)
    front, _ = heard(noise(n, 1e-3, 5) * step)
    assert abs(front._balance.image_ratio) < 0.003


def test_movers_both_ways_do_not_mislead_each_other() -> None:
    there = sweep(60.0, 12.0)
    back = np.conj(sweep(60.0, 12.0, up_hz=(90.0, 330.0)))
    z = imbalanced(0.1 * there + 0.08 * back, 1.0, 5.0) + noise(len(there), 1e-5, 6)
    front, _ = heard(z)
    assert -front._balance.image_db == pytest.approx(22.83, abs=1.5)


def test_an_untaught_balance_leaves_spectra_alone() -> None:
    rng = np.random.default_rng(7)
    spectra = (rng.standard_normal((4, 9)) + 1j * rng.standard_normal((4, 9))).astype(np.complex64)
    balance = IqBalance()
    np.testing.assert_array_equal(balance.correct(spectra), spectra)
    assert balance.image_db == -np.inf
