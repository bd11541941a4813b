"""False friends: what a sensor hears that is nobody.

Levels are given against the white noise of one channel: ``level_db`` of a line is its power over
the noise power in one bin of a 100 ms Hann frame; of clutter, its spectral density over the noise's.

Each nuisance is a frozen description; ``player`` gives an object whose ``push(n)`` returns the next n
samples. What comes through the air (``in_air``) passes the mixer's I/Q errors, what comes by wire does not.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import ClassVar, Protocol

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.kinematics import hz_per_mps, wavelength_m
from ginnel.sim.echoes import Hearing
from ginnel.sim.sensor import echo_paths
from ginnel.words import FloatArray

ComplexArray = NDArray[np.complex128]
Push = Callable[[int], ComplexArray]
FRAME_S = 0.1  # the frame in which signal to noise is defined


@dataclass(frozen=True, slots=True, kw_only=True)
class Room:
    """What a nuisance needs to know: the sensor, the noise of one channel (rms), random numbers."""

    hearing: Hearing
    noise_rms: float
    rng: np.random.Generator

    def line_amplitude(self, level_db: float) -> float:
        """Amplitude of a real sine whose bin in a 100 ms Hann frame stands level_db over the noise.

        For n samples: signal (A n / 4)^2, noise rms^2 (3 n / 8), so A = rms sqrt(6 / n) at 0 dB.
        """
        n = FRAME_S * self.hearing.sample_rate_hz
        return float(self.noise_rms * np.sqrt(6.0 / n) * 10 ** (level_db / 20))


class Nuisance(Protocol):
    """Anything that adds to what the sensor hears."""

    in_air: ClassVar[bool]

    def player(self, room: Room) -> Push:
        """Start playing from the scene's beginning."""


def _clock(room: Room) -> Callable[[int], FloatArray]:
    """Return a clock: each call gives the times of the next n samples, s."""
    at = 0
    rate_hz = room.hearing.sample_rate_hz

    def take(n: int) -> FloatArray:
        nonlocal at
        times_s = np.arange(at, at + n) / rate_hz
        at += n
        return times_s

    return take


def _is_on(times_s: FloatArray, on_s: tuple[tuple[float, float], ...] | None) -> FloatArray:
    if on_s is None:
        return np.ones_like(times_s)
    within = [(times_s >= begin) & (times_s < end) for begin, end in on_s]
    return np.asarray(np.any(within, axis=0), dtype=np.float64)


def _mains_turns(room: Room, wander_hz: float) -> Callable[[FloatArray], FloatArray]:
    """Return the turns of the mains over time: its frequency wanders slowly by about wander_hz."""
    mains_hz = room.hearing.sensor.mains_hz
    slow_hz = room.rng.uniform(0.003, 0.03, size=3)
    angle = room.rng.uniform(0, 2 * np.pi, size=3)

    def turns(times_s: FloatArray) -> FloatArray:
        # So slow a wander is computed at a few knots only: straight between them to some 1e-6 turns.
        knots_s = np.linspace(times_s[0], times_s[-1], 33)
        wander = np.zeros(33)
        for rate_hz, start in zip(slow_hz, angle, strict=True):
            # The integral of a sine of size wander_hz * sqrt(2/3).
            swing = wander_hz * np.sqrt(2 / 3) / (2 * np.pi * rate_hz)
            wander += swing * np.sin(2 * np.pi * rate_hz * knots_s + start)
        return np.asarray(mains_hz * times_s + np.interp(times_s, knots_s, wander))

    return turns


@dataclass(frozen=True, slots=True, kw_only=True)
class Hum:
    """Mains hum by wire: the mains frequency and its odd harmonics, each ``fall_db`` below the last."""

    in_air: ClassVar[bool] = False
    level_db: float = 25.0
    harmonics: int = 3
    fall_db: float = 6.0
    wander_hz: float = 0.05

    def player(self, room: Room) -> Push:
        """Start playing."""
        take, turns = _clock(room), _mains_turns(room, self.wander_hz)
        starts = room.rng.uniform(size=self.harmonics)

        def push(n: int) -> ComplexArray:
            phase = turns(take(n))
            total = np.zeros(n)
            for number in range(self.harmonics):
                size = room.line_amplitude(self.level_db - self.fall_db * number)
                total += size * np.cos(2 * np.pi * ((2 * number + 1) * phase + starts[number]))
            return np.asarray(total * (1 + 0.8j))  # the two wires pick it up alike, not quite equally

        return push


@dataclass(frozen=True, slots=True, kw_only=True)
class Lamps:
    """Lamps that modulate their own reflection at twice the mains frequency, with harmonics.

    A still reflection whose size changes has one phase: its lines are symmetric in I/Q. ``on_s`` are
    the times at which they burn (None: always).
    """

    in_air: ClassVar[bool] = True
    level_db: float = 20.0
    harmonics: int = 4
    fall_db: float = 5.0
    wander_hz: float = 0.05
    on_s: tuple[tuple[float, float], ...] | None = None

    def player(self, room: Room) -> Push:
        """Start playing."""
        take, turns = _clock(room), _mains_turns(room, self.wander_hz)
        starts = room.rng.uniform(size=self.harmonics)
        phase_rad = room.rng.uniform(-np.pi / 4, np.pi / 4)
        towards = 1 + 1j * np.tan(phase_rad)  # of that phase, and at its level in I

        def push(n: int) -> ComplexArray:
            times_s = take(n)
            phase = turns(times_s)
            total = np.zeros(n)
            for number in range(self.harmonics):
                size = room.line_amplitude(self.level_db - self.fall_db * number)
                total += size * np.cos(2 * np.pi * (2 * (number + 1) * phase + starts[number]))
            return np.asarray(towards * total * _is_on(times_s, self.on_s))

        return push


@dataclass(frozen=True, slots=True, kw_only=True)
class Fan:
    """A fan in view: blades that come and go at up to ``tip_mps``; ``level_db`` of all blades together."""

    in_air: ClassVar[bool] = True
    level_db: float = 15.0
    turns_hz: float = 2.5
    blades: int = 3
    tip_mps: float = 2.0
    on_s: tuple[tuple[float, float], ...] | None = None

    def player(self, room: Room) -> Push:
        """Start playing."""
        take = _clock(room)
        reach_m = self.tip_mps / (2 * np.pi * self.turns_hz)
        per_m = 4 * np.pi / wavelength_m(room.hearing.sensor.carrier_hz)
        size = room.line_amplitude(self.level_db) / self.blades

        def push(n: int) -> ComplexArray:
            times_s = take(n)
            total = np.zeros(n, dtype=np.complex128)
            for blade in range(self.blades):
                turn = 2 * np.pi * (self.turns_hz * times_s + blade / self.blades)
                # A blade reflects best when it stands broadside, twice a turn.
                total += np.cos(turn) ** 2 * np.exp(1j * per_m * reach_m * np.sin(turn))
            return np.asarray(size * total * _is_on(times_s, self.on_s))

        return push


@dataclass(frozen=True, slots=True, kw_only=True)
class Clutter:
    """Many small things that move: noise of a narrow band of speeds that swells and sinks in gusts.

    ``centre_mps`` and ``width_mps`` place the band (radial speed; both signs if ``two_sided``),
    ``gust_db`` is the standard deviation of its level, ``gust_s`` how long a gust lasts.
    """

    in_air: ClassVar[bool] = True
    level_db: float = 10.0
    centre_mps: float = 0.0
    width_mps: float = 0.4
    two_sided: bool = True
    gust_db: float = 4.0
    gust_s: float = 5.0
    on_s: tuple[tuple[float, float], ...] | None = None

    def player(self, room: Room) -> Push:
        """Start playing."""
        from scipy.signal import butter, sosfilt

        take = _clock(room)
        rate_hz = room.hearing.sample_rate_hz
        per_mps = hz_per_mps(room.hearing.sensor.carrier_hz)
        sos = butter(2, self.width_mps * per_mps, fs=rate_hz, output="sos")
        state = np.zeros((len(sos), 2), dtype=np.complex128)
        gust_hz = room.rng.uniform(0.3, 1.5, size=4) / (2 * self.gust_s)
        starts = room.rng.uniform(0, 2 * np.pi, size=4)
        # Complex noise with the density of one channel's noise on both sides.
        size = room.noise_rms * 10 ** (self.level_db / 20)

        def push(n: int) -> ComplexArray:
            nonlocal state
            times_s = take(n)
            noise = room.rng.normal(size=n) + 1j * room.rng.normal(size=n)
            narrow, state = sosfilt(sos, noise, zi=state)
            waves = [np.sin(2 * np.pi * hz * times_s + at) for hz, at in zip(gust_hz, starts, strict=True)]
            gust = 10 ** (self.gust_db / np.sqrt(2) * np.sum(waves, axis=0) / 20)
            turn = 2 * np.pi * self.centre_mps * per_mps * times_s
            shift = 2 * np.cos(turn) if self.two_sided and self.centre_mps else np.exp(1j * turn)
            return np.asarray(size * gust * narrow * shift * _is_on(times_s, self.on_s))

        return push


def leaves(level_db: float = 15.0, *, on_s: tuple[tuple[float, float], ...] | None = None) -> Clutter:
    """Leaves and twigs that the wind stirs: slow, to and fro, in gusts."""
    return Clutter(level_db=level_db, width_mps=0.35, gust_db=5.0, gust_s=6.0, on_s=on_s)


def rain(level_db: float = 6.0, *, on_s: tuple[tuple[float, float], ...] | None = None) -> Clutter:
    """Rain: falling drops seen at a slant, a broad band of speeds, steadier than leaves."""
    return Clutter(level_db=level_db, centre_mps=2.5, width_mps=1.5, gust_db=2.0, gust_s=10.0, on_s=on_s)


@dataclass(frozen=True, slots=True, kw_only=True)
class Door:
    """A door on its hinge at (x_m, y_m): opens at each time of ``opens_s``, stays, and closes again."""

    in_air: ClassVar[bool] = True
    opens_s: tuple[float, ...]
    x_m: float = 5.0
    y_m: float = 1.2
    leaf_m: float = 0.9
    swing_deg: float = 90.0
    swing_s: float = 1.6
    stays_s: float = 1.5
    power_db: float = 0.0

    def player(self, room: Room) -> Push:
        """Start playing."""
        take = _clock(room)
        hearing = room.hearing
        per_m = 4 * np.pi / wavelength_m(hearing.sensor.carrier_hz)
        shares = np.array([0.4, 0.7, 1.0])[:, None]
        lasts_s = 2 * self.swing_s + self.stays_s

        def push(n: int) -> ComplexArray:
            times_s = take(n)
            total = np.zeros(n, dtype=np.complex128)
            for opens_s in self.opens_s:
                now = (times_s >= opens_s) & (times_s < opens_s + lasts_s)
                if not now.any():
                    continue
                since_s = times_s[now] - opens_s
                ajar = np.minimum(since_s, lasts_s - since_s) / self.swing_s
                turn = np.deg2rad(self.swing_deg) * (0.5 - 0.5 * np.cos(np.pi * np.clip(ajar, 0, 1)))
                places = np.stack(
                    [
                        self.x_m + self.leaf_m * shares * np.sin(turn),
                        self.y_m - self.leaf_m * shares * np.cos(turn),
                        np.ones_like(shares * turn),
                    ],
                    axis=-1,
                )
                sizes = np.sqrt(10 ** (self.power_db / 10) / 3) * np.ones(places.shape[:2])
                ranges_m, levels = echo_paths(places, sizes, hearing.sensor.mounting, hearing.beam, ())
                fade = np.clip(np.minimum(since_s, lasts_s - since_s) / 0.05, 0, 1)
                total[now] += (hearing.scale * fade * levels * np.exp(-1j * per_m * ranges_m)).sum(axis=0)
            return total

        return push


@dataclass(frozen=True, slots=True, kw_only=True)
class Clicks:
    """Relays and switches nearby: short ringing knocks, at random or at given times, by wire."""

    in_air: ClassVar[bool] = False
    per_hour: float = 0.0
    at_s: tuple[float, ...] = ()
    size: float = 0.3  # of full scale
    ring_hz: float = 900.0
    decay_s: float = 0.004

    def player(self, room: Room) -> Push:
        """Start playing."""
        take = _clock(room)
        pending = sorted(self.at_s)
        next_s = room.rng.exponential(3600 / self.per_hour) if self.per_hour > 0 else np.inf

        def push(n: int) -> ComplexArray:
            nonlocal next_s
            times_s = take(n)
            while next_s < times_s[-1]:
                pending.append(next_s)
                next_s += room.rng.exponential(3600 / self.per_hour)
            total = np.zeros(n)
            for click_s in pending:
                since_s = np.maximum(times_s - click_s, 0.0)
                ring = np.exp(-since_s / self.decay_s) * np.cos(2 * np.pi * self.ring_hz * since_s)
                total += self.size * np.where(times_s >= click_s, ring, 0.0)
            pending[:] = [at for at in pending if times_s[-1] - at < 20 * self.decay_s]
            return np.asarray(total * (1 + 0.7j))

        return push
