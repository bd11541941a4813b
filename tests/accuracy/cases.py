"""What a row of the scoreboard is made of: scenes with known truth, and the goals that it is held to."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum

from ginnel import sim
from ginnel.words import Sensor


class Kindness(StrEnum):
    """Whether a scene is as the simulator likes it, or as places are (see `hardness`)."""

    KIND = "kind"
    HARD = "hard"


@dataclass(frozen=True, kw_only=True, eq=False)
class Case:
    """A scene as it is, and the sensor as the chain is told that it is.

    Nobody who crosses before ``learnt_s`` is scored: the site is being learnt. In each of ``holes_s`` nothing
    is recorded: a new span begins after it.
    """

    scene: sim.Scene
    told: Sensor
    learnt_s: float = 0.0
    holes_s: tuple[tuple[float, float], ...] = ()

    @property
    def spans_s(self) -> list[tuple[float, float]]:
        """Stretches that were recorded."""
        begins = [0.0, *(end_s for _, end_s in self.holes_s)]
        ends = [*(begin_s for begin_s, _ in self.holes_s), self.scene.duration_s]
        return list(zip(begins, ends, strict=True))


@dataclass(frozen=True, kw_only=True)
class Goals:
    """What a row is to reach; None where nothing is asked. Shares are 0 to 1, speeds in per cent."""

    recall: float | None = None
    precision: float | None = None
    direction: float | None = None
    bias_percent: float | None = None
    mae_percent: float | None = None
    false_per_day: float | None = None
    counted_share: float | None = None  # of those who did not pass
    is_day: bool = False  # counts of 15 minutes, direction split and 85th percentile, as `days` says


@dataclass(frozen=True, kw_only=True)
class Row:
    """A line of the scoreboard: how to make its cases, how many, and its goals."""

    name: str
    make: Callable[[int], Case]  # of a seed
    goals: Goals
    seeds: int = 2
    kindness: Kindness = Kindness.KIND

    @property
    def title(self) -> str:
        """The row's name on the board."""
        return f"{self.name}, hard" if self.kindness is Kindness.HARD else self.name
