"""The measuring chain as one object: blocks of samples in, passages out."""

from __future__ import annotations

import math
from collections import deque

import numpy as np

from ginnel.doppler.frontend import CELL_FALSE_ALARM_RATE, FrontEnd, SpectrumBatch
from ginnel.passages.activity import ActivityStage, Stretch
from ginnel.passages.cluster import Cluster
from ginnel.passages.explain import explain
from ginnel.passages.measure import measure
from ginnel.passages.pace import pace_of
from ginnel.passages.site import Site
from ginnel.passages.stops import LONGEST_STOP_S, Held, joined, leg_of, may_have_stopped, stopped_leg
from ginnel.passages.stories import Told, tell
from ginnel.words import US_PER_S, Direction, Flag, Passage, SampleArray, Sensor, Story

#: Named by every passage; changes whenever the same samples could give other passages.
CHAIN_VERSION = "3"

#: Heard this near to the span's end or beginning: the span cut it.
_CUT_S = 0.5
_LOW_CONFIDENCE = 0.9
#: So far apart may two fits of one mover on both sides of a cut put its crossing.
_SEAM_S = 1.0


class Chain:
    """One span of one sensor. ``push`` and ``finish`` give the passages of each stretch of activity in order.

    The size of the blocks pushed in never changes what comes out.
    """

    def __init__(self, sensor: Sensor, sample_rate_hz: float, started_us: int) -> None:
        self._front = FrontEnd(sensor, sample_rate_hz)
        self._site = Site(sensor, self._front.plan)
        self._activity = ActivityStage(
            self._front.plan.frame_rate_hz,
            CELL_FALSE_ALARM_RATE,
            int(np.count_nonzero(self._front.watched)),
        )
        self._sample_rate_hz = sample_rate_hz
        self._started_us = started_us
        self._n_samples = 0
        self._crossed_us: deque[int] = deque(maxlen=64)
        self._given: deque[tuple[float, int]] = deque(maxlen=16)
        self._recent: deque[Held] = deque(maxlen=16)
        self._held: list[Held] = []

    @property
    def settled_us(self) -> int:
        """Stretches of activity that began before this have all been read, and their passages given out."""
        held_us = (min(held.passage.started_us, held.passage.crossed_us) for held in self._held)
        return min(self._time_us(self._activity.settled_frame_idx), self.listened_until_us, *held_us)

    @property
    def listened_until_us(self) -> int:
        """Time after the last sample taken."""
        return self._started_us + round(self._n_samples * US_PER_S / self._sample_rate_hz)

    def push(self, samples: SampleArray) -> list[Passage]:
        """Take the next samples of the span, float32 or complex64, any number of them."""
        self._n_samples += len(samples)
        return self._passages(self._front.push(samples))

    def finish(self) -> list[Passage]:
        """End the span."""
        passages = self._passages(self._front.finish())
        for stretch in self._activity.finish():
            passages += self._read(stretch)
        return passages + self._released(math.inf)

    def _passages(self, batches: list[SpectrumBatch]) -> list[Passage]:
        passages: list[Passage] = []
        for batch in batches:
            for stretch in self._activity.push(batch):
                passages += self._read(stretch)
            passages += self._released(self._activity.settled_frame_idx)
        return passages

    def _read(self, stretch: Stretch) -> list[Passage]:
        cluster = Cluster(
            self._site, stretch.first_frame_idx, stretch.power, stretch.background, self._front.watched
        )
        passages: list[Passage] = []
        for told in tell(self._site, explain(cluster)):
            crossed_frame = told.one.mover.crossed_s * self._site.frame_rate_hz
            if self._belongs(stretch, told, crossed_frame):
                self._given.append((crossed_frame, told.one.mover.sign))
                passage = self._passage(stretch, cluster, told, crossed_frame)
                passages += self._sorted_out(Held(passage, leg_of(stretch.first_frame_idx, told.one)))
        return passages

    def _sorted_out(self, new: Held) -> list[Passage]:
        """Give a passage out, unless it is the rest of one who stopped, or may be the first part of one."""
        before = stopped_leg(self._site, [recent.leg for recent in self._recent], new.leg)
        recent = None if before is None else self._recent[before]
        self._recent.append(new)
        if recent is not None and {new.passage.story, recent.passage.story} == {Story.PASSAGE}:
            self._held = [joined(recent, new) if held is recent else held for held in self._held]
            return []
        if new.passage.story is Story.PASSAGE and may_have_stopped(self._site, new.leg):
            self._held.append(new)
            return []
        return [new.passage]

    def _released(self, settled_frame_idx: float) -> list[Passage]:
        """Give out held passages whose continuation would have been read by now."""
        stop = LONGEST_STOP_S * self._site.frame_rate_hz
        out = [held for held in self._held if held.leg.last_frame + stop < settled_frame_idx]
        self._held = [held for held in self._held if held.leg.last_frame + stop >= settled_frame_idx]
        return [held.passage for held in out]

    def _belongs(self, stretch: Stretch, told: Told, crossed_frame: float) -> bool:
        """Whether a mover belongs to this stretch, or to its neighbour beyond a cut.

        Two fits of one mover near a cut may put its crossing on either side: whichever stretch
        comes second looks at what the first gave out.
        """
        seam = _SEAM_S * self._site.frame_rate_hz
        if not stretch.own_first - seam <= crossed_frame < stretch.own_last:
            return False
        return crossed_frame >= stretch.own_first + seam or not any(
            sign == told.one.mover.sign and abs(crossed_frame - given) < seam for given, sign in self._given
        )

    def _passage(self, stretch: Stretch, cluster: Cluster, told: Told, crossed_frame: float) -> Passage:
        one = told.one
        measured = measure(one, pace_of(cluster, one))
        started_us = self._time_us(stretch.first_frame_idx + one.first_frame)
        ended_us = self._time_us(stretch.first_frame_idx + one.last_frame)
        crossed_us = self._time_us(crossed_frame)
        while crossed_us in self._crossed_us:  # a passage's key: two never share a moment
            crossed_us += 1
        self._crossed_us.append(crossed_us)
        flags = set()
        if stretch.is_clipped[one.first_frame : one.last_frame + 1].any():
            flags.add(Flag.CLIPPED)
        if told.overlapping:
            flags.add(Flag.OVERLAPPING)
        if measured.direction is Direction.UNKNOWN or (measured.confidence or 0.0) < _LOW_CONFIDENCE:
            flags.add(Flag.LOW_CONFIDENCE)
        edge_us = round(_CUT_S * US_PER_S)
        if started_us < self._started_us + edge_us or ended_us > self.listened_until_us - edge_us:
            flags.add(Flag.CUT)
        return Passage(
            started_us=started_us,
            crossed_us=crossed_us,
            ended_us=ended_us,
            story=told.story,
            direction=measured.direction,
            direction_confidence=measured.confidence,
            speed_mps=measured.speed_mps,
            speed_se_mps=measured.speed_se_mps,
            snr_db=one.snr_db,
            flags=frozenset(flags),
        )

    def _time_us(self, frame_idx: float) -> int:
        sample = self._front.frame_centre_samples(frame_idx)
        return self._started_us + round(float(sample) * US_PER_S / self._sample_rate_hz)
