"""Cuts a span into stretches of activity: whatever happens in one does not depend on another.

Works on frame numbers of the span only. A stretch that never falls quiet is cut at its quietest
moment once it is long enough; both halves then see the other's frames near the cut, and a mover
belongs to the half in which it crosses.
"""

from __future__ import annotations

import math
from collections import deque
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.frontend import SpectrumBatch

#: Detections are summed over so long.
_WINDOW_S = 0.5
#: Chance that noise alone makes a window active: about one false stretch a day.
_WINDOW_FALSE_ALARM_RATE = 1e-5
#: Quiet of this length ends a stretch; a walker who stops for longer comes back as a new leg.
_QUIET_S = 2.0
#: Frames before the first and after the last detection that belong to a stretch: faint tails.
_LEAD_S, _TAIL_S = 3.0, 1.5
#: A stretch longer than this is cut, no earlier than after half of it.
_LONGEST_S = 40.0
#: Both sides of a cut see so much of the other side.
_OVERLAP_S = 8.0


@dataclass(frozen=True, slots=True)
class Stretch:
    """Frames of one stretch of activity.

    Movers that cross in [own_first, own_last) frames belong to it; others are its neighbours'.
    """

    first_frame_idx: int
    power: NDArray[np.float32]
    background: NDArray[np.float32]
    is_clipped: NDArray[np.bool_]
    own_first: float
    own_last: float


class ActivityStage:
    """Batches of judged frames in, stretches of activity out."""

    def __init__(self, frame_rate_hz: float, cell_false_alarm_rate: float, n_watched: int) -> None:
        def frames(seconds: float) -> int:
            return max(1, round(seconds * frame_rate_hz))

        self._window = frames(_WINDOW_S)
        self._needed = _count_needed(self._window * n_watched * cell_false_alarm_rate)
        self._quiet, self._lead, self._tail = frames(_QUIET_S), frames(_LEAD_S), frames(_TAIL_S)
        self._longest, self._overlap = frames(_LONGEST_S), frames(_OVERLAP_S)
        self._batches: deque[SpectrumBatch] = deque()
        self._recent: deque[int] = deque(maxlen=self._window)
        self._n_seen = 0
        self._started: int | None = None
        self._last_active = 0
        self._own_first = -math.inf
        self._free_from = 0
        self._in_window: list[int] = []  # detections in the window that ends at each frame of the stretch

    @property
    def settled_frame_idx(self) -> float:
        """Stretches that begin before this frame have been handed on."""
        if self._started is None:  # a stretch that begins now reaches back this far
            return float(self._n_seen - self._window - self._lead)
        return max(self._own_first, float(self._started - self._lead))

    def push(self, batch: SpectrumBatch) -> list[Stretch]:
        """Take the next batch."""
        self._batches.append(batch)
        out: list[Stretch] = []
        for n_detected in batch.n_detected:
            out += self._step(int(n_detected))
        self._forget()
        return out

    def finish(self) -> list[Stretch]:
        """End the span: an open stretch ends with it."""
        if self._started is None:
            return []
        stretch = self._cut(self._first_frame(), min(self._n_seen, self._last_active + self._tail), math.inf)
        self._started = None
        return [stretch]

    def _step(self, n_detected: int) -> list[Stretch]:
        self._recent.append(n_detected)
        frame = self._n_seen
        self._n_seen += 1
        in_window = sum(self._recent)
        if in_window >= self._needed:
            if self._started is None:
                self._started = max(0, frame - self._window)
                self._own_first = -math.inf
                self._in_window = []
            self._last_active = frame
        if self._started is None:
            return []
        self._in_window.append(in_window)
        if frame - self._last_active >= self._quiet:
            end = self._last_active + self._tail
            stretch = self._cut(self._first_frame(), end, math.inf)
            self._started, self._free_from = None, end
            return [stretch]
        if len(self._in_window) >= self._longest:
            return [self._cut_in_two(frame)]
        return []

    def _cut_in_two(self, frame: int) -> Stretch:
        """End a stretch at the quietest moment of its second half, early enough to see beyond it."""
        half = self._longest // 2
        candidates = np.array(self._in_window[half : self._longest - self._overlap])
        quietest = half + int(np.argmin(candidates))
        cut = frame - len(self._in_window) + 1 + quietest
        stretch = self._cut(self._first_frame(), cut + self._overlap, float(cut))
        self._own_first = float(cut)
        self._started = cut
        self._free_from = cut - self._overlap
        self._in_window = self._in_window[quietest:]
        return stretch

    def _first_frame(self) -> int:
        assert self._started is not None  # noqa: S101 - callers have looked
        if math.isfinite(self._own_first):
            return max(0, self._started - self._overlap)
        return max(self._free_from, self._started - self._lead, 0)

    def _cut(self, first: int, end: int, own_last: float) -> Stretch:
        end = min(end, self._n_seen)
        power, clipped = [], []
        background = self._batches[-1].background
        for batch in self._batches:
            low = max(0, first - batch.first_frame_idx)
            high = min(len(batch.power), end - batch.first_frame_idx)
            if high > low:
                power.append(batch.power[low:high])
                clipped.append(batch.is_clipped[low:high])
        return Stretch(
            first, np.concatenate(power), background, np.concatenate(clipped), self._own_first, own_last
        )

    def _forget(self) -> None:
        oldest_needed = (
            self._n_seen - self._lead - self._window if self._started is None else self._first_frame()
        )
        while len(self._batches) > 1 and self._batches[1].first_frame_idx <= oldest_needed:
            self._batches.popleft()


def _count_needed(expected: float) -> int:
    """Smallest count that a Poisson variable reaches with at most the window's false alarm rate."""
    count, term, tail = 0, math.exp(-expected), 1.0
    while tail > _WINDOW_FALSE_ALARM_RATE or count < 3:
        tail -= term
        count += 1
        term *= expected / count
    return count
