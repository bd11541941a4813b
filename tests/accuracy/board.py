"""The scoreboard: all rows, and their table in Markdown."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import binomtest
from tests.accuracy import days, nobody, people, roads, trouble
from tests.accuracy.cases import Row
from tests.accuracy.hardness import hard
from tests.accuracy.scoring import Outcome

from ginnel.words import Direction

_SCENES = (*people.ROWS, *roads.ROWS, *days.ROWS)
#: Each scene with its hard variant behind it; a sensor in trouble and disturbances have none.
ROWS: tuple[Row, ...] = (
    *(one for row in _SCENES for one in (row, hard(row))),
    *trouble.ROWS,
    *nobody.ROWS,
)

_HEAD = (
    "scenario",
    "passages",
    "recall",
    "precision",
    "direction right",
    "wrong / unknown",
    "speed bias %",
    "speed MAE %",
    "p95 %",
    "false /h (h)",
    "doubles",
    "also",
)


@dataclass(frozen=True, kw_only=True)
class Verdict:
    """A figure beside its goal. ``is_sure``: the other verdict is excluded at 95 %."""

    text: str
    is_met: bool | None = None
    is_sure: bool = True

    def __str__(self) -> str:
        """The figure with its mark, as it stands in the table."""
        if self.is_met is None:
            return self.text
        mark = ("met" if self.is_met else "**missed**") + ("" if self.is_sure else "?")
        return f"{self.text} {mark}"


def share(right: int, n: int, goal: float | None) -> Verdict:
    """A share against a goal that it should reach, unsure where its 95 % Wilson interval holds the goal."""
    if n == 0:
        return Verdict(text="" if goal is None else "none", is_met=None if goal is None else False)
    if goal is None:
        return Verdict(text=f"{right / n:.3f}")
    interval = binomtest(right, n).proportion_ci(method="wilson")
    met = right / n >= goal
    return Verdict(
        text=f"{right / n:.3f} (>= {goal:g})",
        is_met=met,
        is_sure=bool(interval.low >= goal) if met else bool(interval.high < goal),
    )


def at_most(value: float, goal: float | None, form: str = ".1f") -> Verdict:
    """A size against a goal that it should keep below."""
    if not np.isfinite(value):
        return Verdict(text="")
    if goal is None:
        return Verdict(text=f"{value:{form}}")
    return Verdict(text=f"{value:{form}} (<= {goal:g})", is_met=abs(value) <= goal)


def false_rate(outcome: Outcome, per_day: float | None) -> Verdict:
    """False passages an hour; a goal for a day is unsure unless so many hours tell (3 / n rule, Poisson)."""
    hours = outcome.listened_s / 3600.0
    n = len(outcome.false_s)
    text = f"{n / hours:.2f} ({hours:.1f})" if hours else ""
    if per_day is None or not hours:
        return Verdict(text=text)
    met = n / hours * 24.0 <= per_day
    return Verdict(
        text=f"{text} (<= {per_day:g}/day)", is_met=met, is_sure=not met or 72.0 / hours <= per_day
    )


def verdicts(row: Row, outcome: Outcome) -> list[Verdict]:
    """All figures of a row, in the order of the table's columns after the first."""
    goals = row.goals
    right, wrong, unknown = outcome.directions()
    errors = outcome.speed_errors_percent()
    some = len(errors) > 0
    also = []
    if outcome.n_others:
        also.append(share_below(outcome.n_others_counted, outcome.n_others, goals.counted_share))
    if goals.is_day and outcome.quarters:
        also += day_verdicts(outcome)
    if outcome.n_unsettled:
        also.append(Verdict(text=f"{outcome.n_unsettled} flagged unsettled"))
    return [
        Verdict(text=str(outcome.n_true) if outcome.n_true else ""),
        share(len(outcome.pairs), outcome.n_true, goals.recall),
        share(len(outcome.pairs), outcome.n_found, goals.precision) if outcome.n_true else Verdict(text=""),
        share(right, len(outcome.pairs), goals.direction),
        Verdict(text=f"{wrong} / {unknown}" if outcome.n_true else ""),
        at_most(float(errors.mean()) if some else np.nan, goals.bias_percent, "+.1f"),
        at_most(float(np.abs(errors).mean()) if some else np.nan, goals.mae_percent),
        at_most(float(np.percentile(np.abs(errors), 95)) if some else np.nan, None),
        false_rate(outcome, goals.false_per_day),
        Verdict(text=str(outcome.n_doubles)),
        Verdict(text="; ".join(str(one) for one in also)),
    ]


def share_below(n_counted: int, n: int, goal: float | None) -> Verdict:
    """Those who did not pass and were counted."""
    text = f"{n_counted} of {n} who did not pass were counted"
    if goal is None:
        return Verdict(text=text)
    return Verdict(text=f"{text} (<= {goal:.0%})", is_met=n_counted / n <= goal)


def day_verdicts(outcome: Outcome) -> list[Verdict]:
    """Counts of 15 minutes, direction split and 85th percentile against the truth of the whole stretch."""
    true_n, found_n = np.array(outcome.quarters).T
    off_each = np.abs(found_n - true_n)
    off_sum_percent = 100.0 * abs(found_n.sum() / true_n.sum() - 1.0)
    within = (off_each <= np.maximum(1, 0.06 * true_n)).sum()
    true_share, found_share = (
        100.0 * np.mean([way is Direction.APPROACHING for way in ways])
        for ways in (outcome.true_ways, outcome.found_ways)
    )
    true_p85, found_p85 = (np.percentile(s, 85) for s in (outcome.true_speeds_mps, outcome.found_speeds_mps))
    return [
        Verdict(text=f"sum off {off_sum_percent:.1f} % (<= 3)", is_met=off_sum_percent <= 3.0),
        Verdict(text=f"{within} of {len(true_n)} quarters within 6 % or one", is_met=within == len(true_n)),
        at_most_of("direction split off by points", float(abs(found_share - true_share)), 2.0),
        at_most_of("85th percentile off by %", 100.0 * abs(float(found_p85 / true_p85) - 1.0), 2.0),
    ]


def at_most_of(what: str, value: float, goal: float) -> Verdict:
    """A named size against a goal that it should keep below."""
    return replace(at_most(value, goal), text=f"{what} {at_most(value, goal).text}")


def table(results: Sequence[tuple[Row, Outcome]]) -> str:
    """The scoreboard in Markdown."""
    lines = [f"| {' | '.join(_HEAD)} |", f"| {' | '.join(['---'] * len(_HEAD))} |"]
    lines += [
        f"| {row.title} | {' | '.join(str(one) for one in verdicts(row, outcome))} |"
        for row, outcome in results
    ]
    return "\n".join(lines)
