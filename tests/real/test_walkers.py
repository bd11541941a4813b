"""One person walking or running to and fro in a room, recorded at 24 GHz in one channel: 14 legs.

Nobody passes: each leg begins or ends with a turn. Directions and torso speeds of the legs must be
right all the same, and the log must not count a stream of passages.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from tests.real.conftest import read_labels, replayed, since_start_s

from ginnel.words import Direction, Mounting, Passage, Sensor, Story

SENSOR = Sensor(
    name="room",
    carrier_hz=24.125e9,
    mounting=Mounting(height_m=1.0, offset_m=0.5),
)
WITHIN_SPEED = 0.12
LEAST_RIGHT = 13

pytestmark = pytest.mark.recordings


@dataclass(frozen=True)
class Leg:
    """One label and the leg that was logged for most of its time."""

    file: str
    direction: Direction
    started_s: float
    ended_s: float
    speed_mps: float
    logged: Passage | None


@dataclass(frozen=True)
class Room:
    legs: list[Leg]
    n_counted: dict[str, int]
    table: str


@pytest.fixture(scope="module")
def room(recordings: Path, tmp_path_factory: pytest.TempPathFactory) -> Room:
    return read_room(recordings, tmp_path_factory.mktemp("room"))


def read_room(recordings: Path, stores: Path) -> Room:
    """All four recordings, each leg with what was logged for most of its time."""
    folder = recordings / "walkers-24ghz"
    labels = read_labels(folder / "labels.csv")
    legs: list[Leg] = []
    n_counted: dict[str, int] = {}
    for path in sorted(folder.glob("*.wav")):
        logged = replayed(path, SENSOR, stores)
        n_counted[path.name] = sum(passage.story is Story.PASSAGE for passage in logged)
        for label in (row for row in labels if row["file"] == path.name):
            started_s, ended_s = float(label["leg_from_s"]), float(label["leg_to_s"])
            best = max(logged, key=lambda passage: _overlap_s(passage, started_s, ended_s), default=None)
            if best is not None and _overlap_s(best, started_s, ended_s) <= 0:
                best = None
            direction = Direction.APPROACHING if label["direction"] == "toward" else Direction.RECEDING
            speed_mps = float(label["speed_ms_at_24.125GHz"])
            legs.append(Leg(path.name, direction, started_s, ended_s, speed_mps, best))
    return Room(legs, n_counted, _table(legs, n_counted))


def _overlap_s(passage: Passage, started_s: float, ended_s: float) -> float:
    """Seconds of a leg in which something was heard, less what was heard outside the leg."""
    first_s, last_s = since_start_s(passage.started_us), since_start_s(passage.ended_us)
    shared_s = min(ended_s, last_s) - max(started_s, first_s)
    return shared_s - 0.5 * ((last_s - first_s) - max(shared_s, 0.0))


def _table(legs: list[Leg], n_counted: dict[str, int]) -> str:
    lines = ["\nfile | leg s | label | logged | label m/s | logged m/s | error %"]
    for leg in legs:
        if leg.logged is None or leg.logged.speed_mps is None:
            lines.append(f"{leg.file} | {leg.started_s}-{leg.ended_s} | {leg.direction} | not logged")
            continue
        lines.append(
            f"{leg.file} | {leg.started_s}-{leg.ended_s} | {leg.direction} | {leg.logged.direction}"
            f" | {leg.speed_mps} | {leg.logged.speed_mps:.2f}"
            f" | {100 * (leg.logged.speed_mps / leg.speed_mps - 1):+.1f}"
        )
    lines.append(f"counted as passages: {n_counted}")
    return "\n".join(lines)


def test_the_direction_of_nearly_every_leg_is_right_from_one_channel(
    room: Room, record_property: Callable[[str, object], None]
) -> None:
    record_property("table", room.table)
    right = [leg for leg in room.legs if leg.logged is not None and leg.logged.direction is leg.direction]
    assert len(room.legs) == 14
    assert len(right) >= LEAST_RIGHT


def test_the_torso_speed_of_nearly_every_leg_is_right(room: Room) -> None:
    right = [
        leg
        for leg in room.legs
        if leg.logged is not None
        and leg.logged.speed_mps is not None
        and abs(leg.logged.speed_mps / leg.speed_mps - 1) <= WITHIN_SPEED
    ]
    assert len(right) >= LEAST_RIGHT


def test_turning_back_and_forth_is_no_stream_of_passages(room: Room) -> None:
    # At most every other leg may count: someone who came in at the far end and left beside the
    # sensor did pass, and a recording's edge hides the other half of a turn.
    n_legs = {name: sum(leg.file == name for leg in room.legs) for name in room.n_counted}
    assert all(n_counted <= n_legs[name] / 2 for name, n_counted in room.n_counted.items())
    assert sum(room.n_counted.values()) <= len(room.legs) / 3
