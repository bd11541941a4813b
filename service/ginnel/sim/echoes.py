"""From movers to samples: kinematics at a few hundred points a second, phases at every sample.

Work goes by chunks cut at absolute sample numbers, so that what comes out never depends on how it
is asked for. Within a chunk, places are computed on a coarse grid, and lengths of echo paths are
carried to every sample by a four-point Lagrange polynomial: exact to about 0.01 mm for a wheel's rim.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.kinematics import wavelength_m
from ginnel.sim.movers import Mover
from ginnel.sim.sensor import Beam, Mirror, echo_paths
from ginnel.words import FloatArray, MoverKind, Sensor

_GRID_HZ = 400.0
_STANDING_MPS = 0.15  # slower than this the way does not tell where a body faces
_FADE_M = 0.1  # over this stretch behind the sensor line a mover vanishes where the path ends there
_FADE_S = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Hearing:
    """All that turns a mover into an echo."""

    sensor: Sensor
    beam: Beam
    walls: tuple[Mirror, ...]
    ends_at_sensor: bool
    sample_rate_hz: float
    scale: float  # full scale for a 1 m^2 scatterer at 1 m on the axis

    @property
    def step_samples(self) -> int:
        """Samples between two points of the coarse grid."""
        return max(1, round(self.sample_rate_hz / _GRID_HZ))


def lagrange_weights(n: int) -> FloatArray:
    """Weights, shape (4, n), of points -1, 0, 1, 2 for the places 0, 1/n, ... between 0 and 1."""
    t = np.arange(n) / n
    return np.stack(
        [
            -t * (t - 1) * (t - 2) / 6,
            (t + 1) * (t - 1) * (t - 2) / 2,
            -(t + 1) * t * (t - 2) / 2,
            (t + 1) * t * (t - 1) / 6,
        ]
    )


def _headings(knots_s: FloatArray, velocity_mps: FloatArray) -> FloatArray:
    """Where a body faces, rad: along its way, and who stands turns steadily to where the next steps lead."""
    goes = np.hypot(velocity_mps[:, 0], velocity_mps[:, 1]) > _STANDING_MPS
    if not goes.any():
        return np.full(len(knots_s), np.pi)  # towards the sensor
    ways = np.unwrap(np.arctan2(velocity_mps[goes, 1], velocity_mps[goes, 0]))
    turns = np.interp(knots_s, knots_s[goes], ways)
    return np.asarray(np.convolve(np.pad(turns, 2, mode="edge"), np.full(5, 0.2), mode="valid"))


def _per_step_db(mover: Mover, n_cycles: float) -> FloatArray:
    """How strong the whole body is at each step (half a cycle), against its mean."""
    rng = np.random.default_rng([mover.seed, 0x57E9])
    return np.asarray(mover.stride_db * rng.standard_normal(int(2 * n_cycles) + 3))


class MoverEcho:
    """One mover as heard by one sensor; made when it comes into view, dropped after."""

    def __init__(self, mover: Mover, hearing: Hearing) -> None:
        from scipy.interpolate import CubicSpline

        self._mover, self._hearing = mover, hearing
        path = mover.path
        self._spline = path.spline()
        n = max(4, round((path.ended_s - path.started_s) / 0.05))
        knots_s = np.linspace(path.started_s, path.ended_s, n)
        velocity = self._spline(knots_s, 1)
        rates_hz = mover.body.cycle_rate_hz(np.hypot(velocity[:, 0], velocity[:, 1]))
        self._heading = CubicSpline(knots_s, _headings(knots_s, velocity))
        rng = np.random.default_rng([mover.seed, 0xB0D])
        turns = np.concatenate([[0.0], np.cumsum(0.5 * (rates_hz[1:] + rates_hz[:-1]) * np.diff(knots_s))])
        self._first_phase = rng.uniform()
        self._phase = CubicSpline(knots_s, self._first_phase + turns)
        n_echoes = len(mover.body.powers(np.zeros(1))) * (1 + len(hearing.walls))
        self._flicker_hz = rng.uniform(0.2, 1.5, size=(4, n_echoes, 1))
        self._flicker_turns = rng.uniform(size=(4, n_echoes, 1))
        self._sway_turns = rng.uniform(size=3)
        self._stride_db = _per_step_db(mover, float(turns[-1]))
        step = hearing.step_samples
        self._weights = lagrange_weights(step)
        grid_hz = hearing.sample_rate_hz / step
        self._first_cell = int(np.floor(path.started_s * grid_hz))
        self._last_cell = int(np.ceil(path.ended_s * grid_hz))

    @property
    def last_cell(self) -> int:
        """Coarse grid point after which nothing more is heard."""
        return self._last_cell

    def add_to(self, field: NDArray[Any], first_cell: int) -> None:
        """Add the echo to a chunk, float32 or complex64, that begins at a coarse grid point."""
        hearing = self._hearing
        step = hearing.step_samples
        begin = max(first_cell, self._first_cell)
        end = min(first_cell + len(field) // step, self._last_cell)
        if begin >= end:
            return
        ranges_m, levels = self._grid(np.arange(begin - 1, end + 2) * (step / hearing.sample_rate_hz))
        audible = (levels.max(axis=1) > 0).nonzero()[0]
        if not len(audible):
            return
        turns = ranges_m[audible] * (2.0 / wavelength_m(hearing.sensor.carrier_hz))
        # Whole turns go before the cast: single precision must only hold the fraction.
        windows = np.lib.stride_tricks.sliding_window_view(turns, 4, axis=1)
        windows = windows - np.rint(windows[..., 1:2])
        angles = np.matmul(windows, 2 * np.pi * self._weights).astype(np.float32)
        level_windows = np.lib.stride_tricks.sliding_window_view(
            levels[audible].astype(np.float32), 4, axis=1
        )
        sizes = np.matmul(level_windows, self._weights.astype(np.float32))
        part = field[(begin - first_cell) * step : (end - first_cell) * step]
        part.real += np.einsum("scj,scj->cj", sizes, np.cos(angles)).reshape(-1)
        if np.iscomplexobj(field):
            part.imag -= np.einsum("scj,scj->cj", sizes, np.sin(angles)).reshape(-1)

    def _grid(self, times_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Lengths and levels of all echo paths on the coarse grid."""
        mover, hearing = self._mover, self._hearing
        path = mover.path
        inside_s = np.clip(times_s, path.started_s, path.ended_s)
        place, velocity = self._spline(inside_s), self._spline(inside_s, 1)
        # The path goes on in a straight line for the few grid points beyond its ends.
        place = place + velocity * (times_s - inside_s)[:, None]
        speed = np.hypot(velocity[:, 0], velocity[:, 1])
        turn = self._heading(inside_s)
        heading = np.stack([np.cos(turn), np.sin(turn)], axis=-1)
        plan_m = np.maximum(np.hypot(place[:, 0], place[:, 1]), 1e-6)
        facing = -(heading * place).sum(axis=1) / plan_m
        phase = self._phase(inside_s)
        offsets = mover.body.places_m(phase, speed)
        places = np.empty_like(offsets)
        places[..., 0] = place[:, 0] + offsets[..., 0] * heading[:, 0] - offsets[..., 1] * heading[:, 1]
        places[..., 1] = place[:, 1] + offsets[..., 0] * heading[:, 1] + offsets[..., 1] * heading[:, 0]
        places[..., 2] = offsets[..., 2]
        if mover.kind is MoverKind.ON_FOOT:
            places[..., :2] += self._sway_m(times_s)
        amplitudes = np.sqrt(mover.body.powers(facing) * 10 ** (mover.power_db / 10))
        ranges_m, levels = echo_paths(
            places, amplitudes, hearing.sensor.mounting, hearing.beam, hearing.walls
        )
        turns = self._flicker_hz * times_s + self._flicker_turns
        flicker_db = mover.flicker_db / np.sqrt(2) * np.sin(2 * np.pi * turns).sum(axis=0)
        if mover.stride_db:
            steps = 2 * (phase - self._first_phase)
            flicker_db = flicker_db + np.interp(steps, np.arange(len(self._stride_db)), self._stride_db)
        levels = levels * hearing.scale * 10 ** (flicker_db / 20)
        levels *= np.clip(np.minimum(times_s - path.started_s, path.ended_s - times_s) / _FADE_S, 0, 1)
        if hearing.ends_at_sensor:
            hidden = np.clip(1 + places[..., 0] / _FADE_M, 0, 1)
            levels *= np.concatenate([hidden] * (1 + len(hearing.walls)))
        return ranges_m, levels

    def _sway_m(self, times_s: FloatArray) -> FloatArray:
        """Nobody stands quite still: breath and balance, a few millimetres (common practice, no source)."""
        a, b, c = self._sway_turns
        breath = 0.003 * np.sin(2 * np.pi * (0.27 * times_s + a))
        x = breath + 0.006 * np.sin(2 * np.pi * (0.4 * times_s + b))
        return np.stack([x, 0.006 * np.sin(2 * np.pi * (0.31 * times_s + c))], axis=-1)


class Stage:
    """All movers of a scene; ``push`` gives the next chunk of their summed echoes."""

    def __init__(self, movers: tuple[Mover, ...], hearing: Hearing, *, is_complex: bool) -> None:
        self._waiting = sorted(movers, key=lambda mover: mover.path.started_s, reverse=True)
        self._hearing, self._dtype = hearing, np.complex64 if is_complex else np.float32
        self._on: list[MoverEcho] = []
        self._cell = 0

    def push(self, n_cells: int) -> NDArray[Any]:
        """Echoes of the next n_cells points of the coarse grid, at the sample rate."""
        step = self._hearing.step_samples
        field: NDArray[Any] = np.zeros(n_cells * step, dtype=self._dtype)
        until_s = (self._cell + n_cells) * step / self._hearing.sample_rate_hz
        while self._waiting and self._waiting[-1].path.started_s < until_s:
            self._on.append(MoverEcho(self._waiting.pop(), self._hearing))
        for echo in self._on:
            echo.add_to(field, self._cell)
        self._cell += n_cells
        self._on = [echo for echo in self._on if echo.last_cell > self._cell]
        return field
