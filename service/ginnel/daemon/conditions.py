"""Named conditions: when one is raised and when it is cleared again.

A finding says for one minute that something is bad, good, or neither (between the two thresholds, or not
known). A condition is raised after some bad minutes in a row and cleared after some good ones, so that
nothing flickers.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

from ginnel.words import Condition, Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class Rule:
    """How a kind of condition behaves, and what to do about it."""

    severity: Severity
    raise_min: int  # bad minutes in a row
    clear_min: int  # good minutes in a row
    advice: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """What one minute says of one kind of condition."""

    kind: str
    sensor: str | None  # None: it concerns all
    is_bad: bool | None  # None: neither bad nor good
    sentence: str


_FAILURE, _WARNING = Severity.FAILURE, Severity.WARNING

#: Every condition there is. The kinds are stored and watched by other programs: they are never renamed.
RULES = {
    "source-lost": Rule(
        severity=_FAILURE,
        raise_min=1,
        clear_min=1,
        advice="Look at the cable, the power and what [sensor.source] names; Ginnel goes on trying.",
    ),
    "no-samples": Rule(
        severity=_FAILURE,
        raise_min=3,
        clear_min=1,
        advice="Look whether the source sends at all; if it seems to, start Ginnel again.",
    ),
    "input-dead": Rule(
        severity=_FAILURE,
        raise_min=3,
        clear_min=2,
        advice="Is the module powered, is its cable in the input that is recorded, is that input's gain up?",
    ),
    "input-clips": Rule(
        severity=_WARNING,
        raise_min=3,
        clear_min=10,
        advice="Turn the gain down until the loudest passage stays below full scale.",
    ),
    "lamp-line": Rule(
        severity=_WARNING,
        raise_min=10,
        clear_min=10,
        advice="Move the sensor or shade it from the lamp, or feed it from a cleaner supply; movers at this "
        "very speed are heard worse.",
    ),
    "mains-hum": Rule(
        severity=_WARNING,
        raise_min=10,
        clear_min=10,
        advice="Try another supply, a shorter or screened cable, or one earth only.",
    ),
    "only-noise": Rule(
        severity=_WARNING,
        raise_min=1,
        clear_min=1,
        advice="If the place was not simply empty, look whether the sensor still points at the path; "
        "walk past and see whether it is logged.",
    ),
    "quieter-than-usual": Rule(
        severity=_WARNING,
        raise_min=10,
        clear_min=5,
        advice="A module without power, a loose cable or a changed gain sounds like this.",
    ),
    "samples-dropped": Rule(
        severity=_WARNING,
        raise_min=1,
        clear_min=10,
        advice="Is the computer overloaded, or a USB plug loose? What is missing shows as lost coverage.",
    ),
    "lagging": Rule(
        severity=_WARNING,
        raise_min=3,
        clear_min=3,
        advice="The computer is too slow for this: take a lower sample rate, or stop other programs.",
    ),
    "clock-not-set": Rule(
        severity=_WARNING,
        raise_min=2,
        clear_min=1,
        advice="Give it a network or a clock battery; times are put right once the clock is set.",
    ),
    "disk-nearly-full": Rule(
        severity=_WARNING,
        raise_min=1,
        clear_min=2,
        advice="Make room, or keep less: see [retention] and [backup].",
    ),
    "disk-full": Rule(
        severity=_FAILURE,
        raise_min=1,
        clear_min=2,
        advice="Make room now: roll-ups and backups have stopped, and soon nothing can be logged.",
    ),
    "store-unreachable": Rule(
        severity=_FAILURE,
        raise_min=1,
        clear_min=1,
        advice="Listening goes on, and what is heard waits on this disk; bring the store back.",
    ),
    "store-damaged": Rule(
        severity=_FAILURE,
        raise_min=1,
        clear_min=1,
        advice="Stop Ginnel and run `ginnel store check`; `ginnel store restore` takes the last backup.",
    ),
    "backup-failed": Rule(
        severity=_WARNING,
        raise_min=1,
        clear_min=1,
        advice="Look at the folder named in [backup], then run `ginnel store backup`.",
    ),
    "job-failed": Rule(
        severity=_WARNING, raise_min=1, clear_min=1, advice="It is tried again; look at the log for more."
    ),
    "too-hot": Rule(
        severity=_WARNING,
        raise_min=5,
        clear_min=5,
        advice="Give the computer air or shade: hot ones slow down, and their cards fail.",
    ),
}


class ConditionWatch:
    """Keeps count of bad and good minutes, and of what is raised."""

    def __init__(self) -> None:
        self._raised: dict[tuple[str, str | None], Condition] = {}
        self._in_a_row: dict[tuple[str, str | None], tuple[bool, int]] = {}

    @property
    def raised(self) -> list[Condition]:
        """What is wrong now, the oldest first."""
        return sorted(self._raised.values(), key=lambda one: one.raised_us)

    def push(self, at_us: int, findings: Iterable[Finding]) -> list[Condition]:
        """Take a minute's findings; gives what they raised or cleared."""
        changes = []
        for finding in findings:
            key, rule = (finding.kind, finding.sensor), RULES[finding.kind]
            if finding.is_bad is None:
                continue
            was_bad, n = self._in_a_row.get(key, (finding.is_bad, 0))
            n = n + 1 if was_bad == finding.is_bad else 1
            self._in_a_row[key] = (finding.is_bad, n)
            if finding.is_bad and key not in self._raised and n >= rule.raise_min:
                self._raised[key] = Condition(
                    kind=finding.kind,
                    sensor=finding.sensor,
                    severity=rule.severity,
                    raised_us=at_us,
                    sentence=finding.sentence,
                    advice=rule.advice,
                )
                changes.append(self._raised[key])
            elif not finding.is_bad and key in self._raised and n >= rule.clear_min:
                changes.append(self._cleared(key, at_us))
        return changes

    def adopt(self, raised: Iterable[Condition]) -> None:
        """Take over what was raised before this program started."""
        self._raised |= {(one.kind, one.sensor): one for one in raised}

    def forget(self, at_us: int, sensors: Iterable[str]) -> list[Condition]:
        """Clear what concerns sensors other than these: they are not listened to any more."""
        known = {*sensors, None}
        return [self._cleared(key, at_us) for key in list(self._raised) if key[1] not in known]

    def _cleared(self, key: tuple[str, str | None], at_us: int) -> Condition:
        one = self._raised.pop(key)
        return replace(one, cleared_us=max(at_us, one.raised_us))
