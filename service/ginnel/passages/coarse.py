"""A quick look at the whole cluster: which crossing times, speeds and ways are worth fitting.

For every level a table holds the gain of each cell for a line of that level through it; a mover's
score is a sum of table cells along its curve, for all crossing times at once. Far from the sensor,
where the line is straight, steps are taken four at a time.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.passages.cluster import Cluster
from ginnel.passages.fit import SATURATION
from ginnel.passages.mover import Mover
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB
from ginnel.words import FloatArray

_LEVEL_STEP_DB = 5.0
_SIZE_STEP_DB = 8.0
_SPEED_STEP = 0.09  # natural log: a bin's width at walking speed
#: Wider than the fit's own: levels are looked up in steps here.
_AGREEMENT_DB = 12.0
_STRIDE = 4
_N_SINGLE_STEPS = 24
_LEAST_SCORE = 10.0
_MOST_STARTS = 40
#: Neighbouring frames share half their samples, and a table cell spreads over its neighbours.
_LOOKS_SHARE = 0.7
_BINS_WANTED = 60
_KERNEL = np.array([0.05, 0.25, 0.40, 0.25, 0.05])
_KERNEL_MERGED = np.array([0.1, 0.8, 0.1])


@dataclass(frozen=True, slots=True)
class _Tables:
    """Gains, shape (n_levels, n_bins, n_times): single steps, and sums over a stride."""

    single: NDArray[np.float32]
    strided: NDArray[np.float32]
    step_s: float
    start_s: float
    bins_merged: int
    first_bin: float


def find_starts(cluster: Cluster) -> list[tuple[float, Mover]]:
    """Movers worth refining with their coarse scores, best first."""
    site, sensor = cluster.site, cluster.site.sensor
    tables = _make_tables(cluster)
    speeds = (
        sensor.min_speed_mps
        / 1.1
        * np.exp(
            _SPEED_STEP
            * np.arange(1 + int(np.log(1.2 * sensor.max_speed_mps / sensor.min_speed_mps) / _SPEED_STEP))
        )
    )
    found: list[tuple[float, float, float, int, float]] = []
    for speed_mps in speeds:
        curve = _Curve(cluster, tables, float(speed_mps))
        for size_db in np.arange(5.0, max(cluster.strongest_db, 5.0) + 1.0, _SIZE_STEP_DB):
            for sign in (1, -1):
                for score, crossed_s in curve.peaks(float(size_db), sign):
                    found.append((score, crossed_s, float(speed_mps), sign, float(size_db)))
    found.sort(reverse=True)
    kept: list[tuple[float, float, float, int, float]] = []
    for start in found:
        if len(kept) == _MOST_STARTS:
            break
        if not any(_same(start, other) for other in kept):
            kept.append(start)
    return [
        (
            score,
            Mover(
                crossed_s=crossed_s,
                speed_mps=speed_mps,
                sign=sign,
                offset_m=site.offset_m,
                level=np.full(N_ZONES, size_db * NEPERS_PER_DB),
            ),
        )
        for score, crossed_s, speed_mps, sign, size_db in kept
    ]


def _same(a: tuple[float, float, float, int, float], b: tuple[float, float, float, int, float]) -> bool:
    return a[3] == b[3] and abs(a[1] - b[1]) < 0.4 and abs(np.log(a[2] / b[2])) < 1.4 * _SPEED_STEP


class _Curve:
    """Where a mover of one speed is looked up in the tables."""

    def __init__(self, cluster: Cluster, tables: _Tables, speed_mps: float) -> None:
        site = cluster.site
        self._tables = tables
        self._is_iq = site.is_iq
        n_bins, n_times = tables.single.shape[1:]
        reach_m = min(site.body.reach_m, 40.0 * speed_mps)
        self._n_steps = n_steps = min(int(reach_m / speed_mps / tables.step_s) + 1, n_times)
        near = np.arange(min(n_steps, _N_SINGLE_STEPS))
        far = np.arange(_N_SINGLE_STEPS, n_steps, _STRIDE) + _STRIDE // 2
        self._steps = np.concatenate([near, far])
        self._n_single = len(near)
        x = speed_mps * (self._steps + 0.25) * tables.step_s
        log_range = np.log(np.hypot(x, site.offset_m))
        self._bins = speed_mps * x / np.exp(log_range) * site.bins_per_mps / tables.bins_merged
        self._level_db = site.nominal_level(x) / NEPERS_PER_DB
        self._zone = np.clip(np.searchsorted(site.zone_edges, log_range) - 1, 0, N_ZONES - 1)
        self._n_bins, self._n_times = n_bins, n_times

    def peaks(self, size_db: float, sign: int) -> list[tuple[float, float]]:
        """Scores and crossing times of the best movers of one size and way."""
        tables, n_times = self._tables, self._n_times
        level = np.round((size_db + self._level_db) / _LEVEL_STEP_DB).astype(int)
        level = np.minimum(level, len(tables.single) - 1)
        margin = self._n_steps + _STRIDE
        score = np.zeros(n_times + 2 * margin, dtype=np.float32)
        zone_score = np.zeros_like(score)
        zone = -1
        for i in np.nonzero(level >= 0)[0]:
            column = round(float(self._bins[i] * (sign if self._is_iq else 1) - tables.first_bin))
            if not 0 <= column < self._n_bins:
                continue
            if self._zone[i] != zone:
                score += _saturated(zone_score)
                zone_score[:] = 0
                zone = self._zone[i]
            table = tables.single if i < self._n_single else tables.strided
            first = margin + self._steps[i] * sign
            zone_score[first : first + n_times] += table[level[i], column]
        score += _saturated(zone_score)
        inner = score[1:-1]
        tops = np.nonzero((inner >= score[:-2]) & (inner > score[2:]) & (inner > _LEAST_SCORE))[0] + 1
        return [(float(score[i]), tables.start_s + (i - margin) * tables.step_s) for i in tops]


def _saturated(zone_score: NDArray[np.float32]) -> NDArray[np.float32]:
    positive = np.maximum(zone_score, 0)
    return np.where(zone_score > 0, SATURATION * np.log1p(positive / SATURATION), zone_score).astype(
        np.float32
    )


def _make_tables(cluster: Cluster) -> _Tables:
    site = cluster.site
    merge_t = 2 if site.frame_rate_hz < 40 else 3
    sides = 2 if site.is_iq else 1
    merge_f = max(1, round(cluster.n_bins / sides / _BINS_WANTED))
    whitened = _merged(cluster.whitened, merge_t, merge_f)
    reference = _merged(cluster.reference, merge_t, merge_f)
    kernel = _KERNEL if merge_f == 1 else _KERNEL_MERGED
    looks = merge_t * merge_f * _LOOKS_SHARE
    levels_db = np.arange(0.0, cluster.strongest_db + _LEVEL_STEP_DB, _LEVEL_STEP_DB)
    heard_db = _heard_db(whitened, reference, len(kernel) // 2, merge_f)
    single = np.zeros((len(levels_db), *whitened.T.shape), dtype=np.float32)
    whitened_looks = np.ascontiguousarray(looks * whitened.T, dtype=np.float32)
    reference_t = np.ascontiguousarray(reference.T, dtype=np.float32)
    half = len(kernel) // 2
    for table, level_db in zip(single, levels_db, strict=True):
        for share in np.unique(kernel):
            power = np.float32(10 ** (level_db / 10) / merge_f * share) * reference_t
            gain = whitened_looks * (power / (1 + power)) - np.float32(looks) * np.log1p(power)
            for offset in np.nonzero(kernel == share)[0] - half:
                _add_shifted(table, gain, int(offset))
        stronger_db = heard_db - level_db
        agreement = 1 - (stronger_db / _AGREEMENT_DB) ** 2
        factor = np.clip(agreement, np.where(stronger_db > 0, -0.5, -1.0), 1.0)
        np.multiply(table, factor, out=table, where=table > 0)
    total = np.cumsum(single, axis=2, dtype=np.float64)
    total = np.concatenate([np.zeros((*total.shape[:2], 1)), total], axis=2)
    centre = np.arange(single.shape[2])
    low, high = np.maximum(centre - _STRIDE // 2, 0), np.minimum(centre + _STRIDE // 2, single.shape[2])
    strided = (total[:, :, high] - total[:, :, low]).astype(np.float32)
    return _Tables(
        single=single,
        strided=strided,
        step_s=merge_t / site.frame_rate_hz,
        start_s=float(cluster.t_s[0]) + 0.5 * (merge_t - 1) / site.frame_rate_hz,
        bins_merged=merge_f,
        first_bin=site.plan.first_bin_idx / merge_f,
    )


def _merged(cells: FloatArray, merge_t: int, merge_f: int) -> FloatArray:
    n_t, n_f = cells.shape[0] // merge_t, cells.shape[1] // merge_f
    cut = cells[: n_t * merge_t, : n_f * merge_f]
    return np.asarray(cut.reshape(n_t, merge_t, n_f, merge_f).mean(axis=(1, 3)))


def _heard_db(whitened: FloatArray, reference: FloatArray, half: int, merge_f: int) -> FloatArray:
    """Power about each cell in units of reference noise, dB, over a line's width and three steps."""
    excess = np.divide(
        np.maximum(whitened - 1, 0), reference, out=np.zeros_like(whitened), where=reference > 0
    )
    across = np.zeros_like(excess)
    for offset in range(-half, half + 1):
        _add_shifted(across.T, excess.T, offset)
    along = across.copy()
    along[1:] += across[:-1]
    along[:-1] += across[1:]
    return np.asarray(10 * np.log10(along.T * (merge_f / 3) + 1e-3))


def _add_shifted(target: FloatArray, source: FloatArray, offset: int) -> None:
    """Add rows of source to the rows of target that lie ``offset`` lower."""
    if offset < 0:
        target[-offset:] += source[:offset]
    elif offset > 0:
        target[:-offset] += source[offset:]
    else:
        target += source
