"""Gives live samples their time: dated by the wall clock once, advanced by the sample clock.

A sample cannot be heard before it was taken, only later, by as much as some buffer holds it back. So the
earliest of many arrivals, each less the samples before it, tells when the first sample was taken; and how
that bound moves over minutes tells how the two clocks drift apart.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from ginnel.capture.live import Break, Dated, Heard
from ginnel.clock import ClockReading
from ginnel.words import US_PER_S, Block, SampleArray

#: Arrivals are watched for so long before a span is dated.
SETTLE_US = 3 * US_PER_S
#: And for so long where the rate has been wrong before.
_DOUBT_US = 15 * US_PER_S
#: The wall clock may stray so far from the steady one between two arrivals before it is a step.
_STEP_US = US_PER_S // 4
#: Arrivals are compared over windows of this length.
_WINDOW_US = 10 * US_PER_S
#: A span ends when its two clocks are this far apart; the next one is dated anew.
MOST_DRIFT_US = US_PER_S
#: Clocks that part faster than this do not drift: the rate is not what the settings say.
_WRONG_RATE = 0.01
#: The drift of a span this short says nothing.
_DRIFT_KNOWN_US = 600 * US_PER_S
#: An input that does not move by one bit for so long is dead.
_STUCK_S = 5.0


class Dating:
    """Arrivals of one source in; blocks, breaks and new dates out.

    Parameters
    ----------
    sample_rate_hz : float, Hz, as the settings say
    not_before_us : end of what is in the log already; earlier samples cannot be told from those
    """

    def __init__(self, sample_rate_hz: float, not_before_us: int | None = None) -> None:
        self._rate_hz = sample_rate_hz
        self._not_before_us = not_before_us
        self._untrusted_until_us: int | None = None
        self._before: ClockReading | None = None
        self._is_rate_doubted = False
        self._n_still = 0
        self._still_value: np.inexact | None = None
        #: Why nothing can be heard, in a few words.
        self.fault: str | None = None
        self.is_trusted = True
        self._started_us: int | None = None
        self._n = 0  # samples since the span's first, or since the first that is held
        self._n_given = 0
        self._n_since = 0  # of those that are held, without the first arrival
        self._held: list[SampleArray] = []
        self._held_from_us: int | None = None
        self._low_us = math.inf  # the earliest that the first sample can have been taken, steady clock
        self._first_us = math.inf
        self._low_before_us: float | None = None
        self._dated_us = self._window_from_us = 0

    @property
    def drift_ppm(self) -> float | None:
        """Of the wall clock against the sample clock; positive: samples come slow. None: too early."""
        lasted_us = self._n * US_PER_S / self._rate_hz
        if self._low_before_us is None or lasted_us < _DRIFT_KNOWN_US:
            return None
        return (self._low_before_us - self._first_us) / lasted_us * 1e6

    def push(self, samples: SampleArray, at: ClockReading) -> list[Heard]:
        """Take samples, the last of which has just arrived."""
        heard = self._compare_clocks(at)
        if self._is_still(samples):
            heard += self.cut("the input does not move: is the module powered and plugged in?")
            self.fault = "the input does not move"
            return heard
        if not np.isfinite(samples).all():
            heard += self.cut("samples that are no numbers", len(samples))
            return heard
        self._n += len(samples)
        arrived_us = at.steady_us - self._length_us(self._n)
        if self._started_us is None:
            self._held.append(samples)
            if self._held_from_us is None:
                self._held_from_us = at.steady_us
            else:
                self._n_since += len(samples)
            self._low_us = min(self._low_us, arrived_us)
            if at.steady_us - self._held_from_us >= (_DOUBT_US if self._is_rate_doubted else SETTLE_US):
                heard += self._begin(at)
            return heard
        if (fault := self._look_at_drift(arrived_us, at.steady_us)) is not None:
            heard += self.cut(fault, len(samples))
            return heard
        heard += self._trust(at)
        if self._started_us is not None:  # `_trust` may have ended it
            heard.append(self._block(samples, self._n - len(samples)))
        return heard

    def cut(self, reason: str, dropped_samples: int = 0) -> list[Heard]:
        """End the span, if there is one; what follows begins another."""
        heard: list[Heard] = []
        if self._started_us is not None:
            ended_us = self._started_us + round(self._length_us(self._n_given))
            if self.is_trusted:
                self._not_before_us = ended_us
            else:
                self._untrusted_until_us = ended_us
        if self._started_us is not None or dropped_samples:
            heard.append(Break(reason=reason, dropped_samples=dropped_samples))
        self._restart()
        return heard

    def finish(self) -> list[Heard]:
        """Give what is held although too little is known of its date; nothing follows."""
        if self._started_us is None and self._held and self._before is not None:
            return self._begin(self._before)
        return []

    def _restart(self) -> None:
        self._started_us, self._held_from_us, self._low_before_us = None, None, None
        self._n = self._n_given = self._n_since = 0
        self._held = []
        self._low_us = self._first_us = math.inf

    def _length_us(self, n: int) -> float:
        return n * US_PER_S / self._rate_hz

    def _compare_clocks(self, at: ClockReading) -> list[Heard]:
        """See whether the wall clock has stepped, or the machine slept, since the last arrival."""
        before, self._before = self._before, at
        if before is None:
            return []
        if at.asleep_us - before.asleep_us > _STEP_US:
            return self.cut("the machine slept")
        stepped_us = (at.wall_us - at.steady_us) - (before.wall_us - before.steady_us)
        if abs(stepped_us) <= _STEP_US:
            return []
        if self._started_us is None or (at.is_set and not self.is_trusted):
            return []  # not dated yet, or about to be given its true date
        way = "forward" if stepped_us > 0 else "back"
        return self.cut(f"the clock was set {way} by {abs(stepped_us) / US_PER_S:.1f} s")

    def _begin(self, at: ClockReading) -> list[Heard]:
        """Date what is held, and give it."""
        if self._is_rate_doubted:
            error = self._rate_error(at)
            if abs(error) > _WRONG_RATE:
                return self._refuse(self._rate_text(error))
        started_us = round(self._low_us + at.wall_us - at.steady_us)
        samples = _joined(self._held)
        if not at.is_set:  # no time is better than another, so one that the log has room for
            started_us = max(started_us, self._not_before_us or 0, self._untrusted_until_us or 0)
        elif self._not_before_us is not None and started_us < self._not_before_us:
            early = math.ceil((self._not_before_us - started_us) * self._rate_hz / US_PER_S)
            if early >= len(samples):
                return self._refuse("the clock is behind what is in the log already")
            started_us += round(self._length_us(early))
            self._low_us += self._length_us(early)
            samples = samples[early:]
        self._started_us, self.is_trusted = started_us, at.is_set
        self._n, self._held = len(samples), []
        self._first_us = self._low_us
        self._dated_us = self._window_from_us = at.steady_us
        self._low_us = math.inf
        self._is_rate_doubted, self.fault = False, None
        return [self._block(samples, 0)]

    def _refuse(self, fault: str) -> list[Heard]:
        """Let go of what is held."""
        n_held = self._n
        self.fault = fault
        self._restart()
        return [Break(reason=fault, dropped_samples=n_held)]

    def _rate_error(self, at: ClockReading) -> float:
        lasted_us = max(at.steady_us - (self._held_from_us or 0), 1)
        return self._length_us(self._n_since) / lasted_us - 1

    def _rate_text(self, error: float) -> str:
        how = "faster" if error > 0 else "slower"
        return f"samples come {abs(error):.0%} {how} than rate_hz = {self._rate_hz:g} says"

    def _look_at_drift(self, arrived_us: float, now_us: int) -> str | None:
        """Say why the span must end, if its clocks have come too far apart."""
        self._low_us = min(self._low_us, arrived_us)
        drift_us = arrived_us - self._first_us
        if drift_us > -MOST_DRIFT_US:
            if now_us - self._window_from_us < _WINDOW_US:
                return None
            drift_us = self._low_us - self._first_us  # one arrival may be late, a whole window of them not
            self._low_before_us, self._low_us, self._window_from_us = self._low_us, math.inf, now_us
            if drift_us < MOST_DRIFT_US:
                return None
        error = -drift_us / max(now_us - self._dated_us, 1)
        if abs(error) > _WRONG_RATE:
            self._is_rate_doubted = True
            self.fault = self._rate_text(error)
            return self.fault
        return f"the sample clock is {abs(drift_us) / US_PER_S:.1f} s off: the span is dated anew"

    def _trust(self, at: ClockReading) -> list[Heard]:
        """Give the span its true date as soon as the clock is set."""
        if self.is_trusted or not at.is_set or self._started_us is None:
            return []
        low_us = min(self._low_us, self._low_before_us or math.inf, self._first_us)
        started_us = round(low_us + at.wall_us - at.steady_us)
        if self._not_before_us is not None and started_us < self._not_before_us:
            return self.cut("the clock was set to before what is in the log already")
        moved_by_us = started_us - self._started_us
        self._started_us, self.is_trusted = started_us, True
        return [Dated(moved_by_us=moved_by_us)]

    def _block(self, samples: SampleArray, index: int) -> Block:
        assert self._started_us is not None  # noqa: S101 (callers have looked)
        self._n_given = index + len(samples)
        started_us = self._started_us + round(self._length_us(index))
        return Block(started_us=started_us, sample_rate_hz=self._rate_hz, samples=samples)

    def _is_still(self, samples: SampleArray) -> bool:
        """Whether the input has not moved for too long."""
        if not len(samples):
            return self._n_still >= _STUCK_S * self._rate_hz
        moved = np.flatnonzero(samples != samples[-1])
        if len(moved) or samples[-1] != self._still_value:
            self._n_still = len(samples) - (int(moved[-1]) + 1 if len(moved) else 0)
            self._still_value = samples[-1]
        else:
            self._n_still += len(samples)
        return self._n_still >= _STUCK_S * self._rate_hz


def _joined(parts: Sequence[SampleArray]) -> SampleArray:
    return parts[0] if len(parts) == 1 else np.concatenate(parts)
