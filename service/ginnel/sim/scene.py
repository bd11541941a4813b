"""A whole scene: a sensor, who passes it, what disturbs it; samples out, and the truth.

How strong things are
---------------------
``peak_snr_db`` is what a reference walker gives: a 1 m^2 torso at `BODY_CENTRE_M` on the middle of the
path (y = the mounting's ``offset_m``). It is its power where that is greatest (not nearer than 1 m) over the
white noise's, in the peak bin of a 100 ms Hann frame in which it stood still in frequency:

    mono A^2 n / (6 s^2),    I/Q A^2 n / (3 s^2),

A its amplitude, s the rms of the noise in one channel, n the samples of a frame. Other bodies are
stronger or weaker by their ``power_db``; a moving torso smears over several bins and shows less. Flicker
noise, hum and the rest come on top. ``peak_level`` is A in full scale.

There is no anti-alias filter: sample at more than twice the fastest Doppler (a foot swings at four times
the walking speed: 600 Hz for a brisk walker at 10.525 GHz, 1,400 Hz at 24.125 GHz).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.kinematics import BODY_CENTRE_M
from ginnel.sim.echoes import Hearing, Stage
from ginnel.sim.movers import Mover, TrueMover, true_mover
from ginnel.sim.nuisance import FRAME_S, Nuisance, Room
from ginnel.sim.receiver import Receiver, flicker_sections, highpass_sections, streaming
from ginnel.sim.sensor import Beam, Mirror, echo_paths
from ginnel.words import Channels, SampleArray, Sensor

_REFERENCE_NEAREST_M = 1.0  # where somebody would walk into the sensor, the peak means nothing
_CHUNK_CELLS = 512  # coarse grid points rendered at once, a little over a second


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Scene:
    """What a sensor hears for a while, the same for the same seed.

    ``ends_at_sensor``: there is a wall behind the sensor, and movers vanish at x <= 0.
    """

    sensor: Sensor
    duration_s: float
    sample_rate_hz: float = 8000.0
    movers: tuple[Mover, ...] = ()
    nuisances: tuple[Nuisance, ...] = ()
    receiver: Receiver = field(default_factory=Receiver)
    beam: Beam = field(default_factory=Beam)
    walls: tuple[Mirror, ...] = ()
    ends_at_sensor: bool = False
    peak_snr_db: float = 30.0
    peak_level: float = 0.05
    seed: int = 0

    def __post_init__(self) -> None:
        if not (self.duration_s > 0 and self.sample_rate_hz > 0):
            raise ValueError(f"scene: {self.duration_s=} and {self.sample_rate_hz=} must be positive")

    @property
    def n_samples(self) -> int:
        """Samples in the whole scene."""
        return round(self.duration_s * self.sample_rate_hz)

    @property
    def noise_rms(self) -> float:
        """White noise of one channel, rms, full scale."""
        divisor = 3.0 if self.sensor.channels is Channels.IQ else 6.0
        n = FRAME_S * self.sample_rate_hz
        return float(self.peak_level * np.sqrt(n / divisor) * 10 ** (-self.peak_snr_db / 20))

    def hearing(self) -> Hearing:
        """How this scene turns movers into echoes."""
        mounting = self.sensor.mounting
        x_m = np.arange(0.0 if self.ends_at_sensor else -100.0, 100.0, 0.02)
        places = np.stack(
            [x_m, np.full_like(x_m, mounting.offset_m), np.full_like(x_m, BODY_CENTRE_M)], axis=-1
        )
        ranges_m, levels = echo_paths(places[None], np.ones((1, len(x_m))), mounting, self.beam, ())
        levels = levels[ranges_m >= _REFERENCE_NEAREST_M]
        return Hearing(
            sensor=self.sensor,
            beam=self.beam,
            walls=self.walls,
            ends_at_sensor=self.ends_at_sensor,
            sample_rate_hz=self.sample_rate_hz,
            scale=self.peak_level / float(levels.max()),
        )

    def truth(self) -> list[TrueMover]:
        """Tell what really happened, by crossing time (by start for those who did not cross)."""
        told = [
            true_mover(mover, duration_s=self.duration_s, ends_at_sensor=self.ends_at_sensor)
            for mover in self.movers
        ]
        found = [true for true in told if true is not None]
        return sorted(found, key=lambda true: true.started_s if true.crossed_s is None else true.crossed_s)

    def samples(self) -> SampleArray:
        """All samples at once: float32 (mono) or complex64 (I/Q), shape (n_samples,)."""
        return np.concatenate(list(self.blocks(self.n_samples)))

    def blocks(self, block_samples: int = 65536) -> Iterator[SampleArray]:
        """Consecutive blocks; the last may be shorter. Memory does not grow with the scene."""
        if block_samples < 1:
            raise ValueError(f"{block_samples=} must be at least 1")
        held: list[NDArray[Any]] = []
        n_held = 0
        for chunk in self._chunks():
            held.append(chunk)
            n_held += len(chunk)
            if n_held < block_samples:
                continue
            joined = np.concatenate(held)
            whole = n_held - n_held % block_samples
            for begin in range(0, whole, block_samples):
                yield joined[begin : begin + block_samples]
            held, n_held = [joined[whole:]], n_held - whole
        if n_held:
            yield np.concatenate(held)

    def _chunks(self) -> Iterator[NDArray[Any]]:
        """Yield samples cut at fixed places: all state and all random numbers go by these."""
        hearing, receiver = self.hearing(), self.receiver
        is_iq = self.sensor.channels is Channels.IQ
        rate_hz, step = self.sample_rate_hz, hearing.step_samples
        stage = Stage(self.movers, hearing, is_complex=is_iq)
        seeds = np.random.SeedSequence([self.seed, 0x5CE]).spawn(len(self.nuisances) + 1)
        noise_rng = np.random.default_rng(seeds[-1])
        players = [
            nuisance.player(Room(hearing=hearing, noise_rms=self.noise_rms, rng=np.random.default_rng(seed)))
            for nuisance, seed in zip(self.nuisances, seeds[:-1], strict=True)
        ]
        corner_hz = receiver.flicker_corner_hz
        colour = streaming(flicker_sections(corner_hz, rate_hz) if corner_hz > 0 else None, is_iq=is_iq)
        highpass_hz = self.sensor.highpass_hz
        amplifier = streaming(highpass_sections(highpass_hz, rate_hz) if highpass_hz else None, is_iq=is_iq)
        chunk_samples = _CHUNK_CELLS * step
        for begin in range(0, self.n_samples, chunk_samples):
            times_s = np.arange(begin, begin + chunk_samples) / rate_hz
            air = stage.push(_CHUNK_CELLS)
            wire = self.noise_rms * noise_rng.standard_normal((2 if is_iq else 1, chunk_samples))
            noise = colour(wire[0] + 1j * wire[1] if is_iq else wire[0])
            added = [
                (nuisance.in_air, push(chunk_samples))
                for nuisance, push in zip(self.nuisances, players, strict=True)
            ]
            for in_air, wave in added:
                if in_air:
                    air = air + (wave if is_iq else wave.real)
            if is_iq:
                air = receiver.iq.apply(air, times_s)
            wave = air + noise
            for in_air, by_wire in added:
                if not in_air:
                    wave = wave + (by_wire if is_iq else by_wire.real)
            wave = receiver.convert(amplifier(wave), times_s)
            yield wave[: self.n_samples - begin].astype(np.complex64 if is_iq else np.float32)
