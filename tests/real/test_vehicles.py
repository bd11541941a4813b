"""Fifteen labelled vehicles, recorded at 24 GHz beside a road, through the whole chain into a store.

Labels: times of passing were read by eye from spectrograms (to about 0.3 s), plateau speeds were
measured well away from the sensor. The mounting was not recorded: a lane's width aside is assumed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from tests.real.conftest import read_labels, replayed, since_start_s

from ginnel.words import Aspect, Direction, Mounting, Passage, Sensor, Story

SENSOR = Sensor(
    name="roadside",
    carrier_hz=24.125e9,
    min_speed_mps=2.0,
    max_speed_mps=25.0,
    mounting=Mounting(aspect=Aspect.OBLIQUE, height_m=1.0, offset_m=4.5, beam_angle_deg=10.0),
)
WITHIN_S = 0.7
WITHIN_SPEED = 0.06
MOST_OTHERS = 2

pytestmark = pytest.mark.recordings


@dataclass(frozen=True)
class Vehicle:
    """One label and the passage that was found for it."""

    file: str
    target: str
    direction: Direction
    crossed_s: float
    speed_mps: float
    passage: Passage | None


@dataclass(frozen=True)
class Roadside:
    vehicles: list[Vehicle]
    others: list[tuple[str, Passage]]
    table: str


@pytest.fixture(scope="module")
def roadside(recordings: Path, tmp_path_factory: pytest.TempPathFactory) -> Roadside:
    return read_roadside(recordings, tmp_path_factory.mktemp("roadside"))


def read_roadside(recordings: Path, stores: Path) -> Roadside:
    """All eight recordings, each label matched to the nearest passage of its direction."""
    folder = recordings / "vehicles-24ghz"
    labels = read_labels(folder / "labels.csv")
    vehicles: list[Vehicle] = []
    others: list[tuple[str, Passage]] = []
    for path in sorted(folder.glob("*.wav")):
        found = replayed(path, SENSOR, stores)
        left = [passage for passage in found if passage.story is Story.PASSAGE]
        for label in (row for row in labels if row["file"] == path.name):
            direction = Direction.APPROACHING if label["direction"] == "toward" else Direction.RECEDING
            crossed_s = float(label["t_closest_s"])
            fits = [
                passage
                for passage in left
                if passage.direction is direction
                and abs(since_start_s(passage.crossed_us) - crossed_s) <= WITHIN_S
            ]
            best = min(
                fits, key=lambda passage: abs(since_start_s(passage.crossed_us) - crossed_s), default=None
            )
            if best is not None:
                left.remove(best)
            speed_mps = float(label["speed_ms_at_24.125GHz"])
            vehicles.append(Vehicle(path.name, label["target"], direction, crossed_s, speed_mps, best))
        others += [(path.name, passage) for passage in left]
    return Roadside(vehicles, others, _table(vehicles, others))


def _table(vehicles: list[Vehicle], others: list[tuple[str, Passage]]) -> str:
    lines = ["\nfile | vehicle | direction | label s | found s | label m/s | found m/s | error %"]
    for one in vehicles:
        if one.passage is None or one.passage.speed_mps is None:
            lines.append(f"{one.file} | {one.target} | {one.direction} | {one.crossed_s} | not found")
            continue
        lines.append(
            f"{one.file} | {one.target} | {one.direction} | {one.crossed_s}"
            f" | {since_start_s(one.passage.crossed_us):.2f} | {one.speed_mps} | {one.passage.speed_mps:.2f}"
            f" | {100 * (one.passage.speed_mps / one.speed_mps - 1):+.1f}"
        )
    lines.append(f"other passages: {[(name, since_start_s(p.crossed_us)) for name, p in others]}")
    return "\n".join(lines)


def test_each_labelled_vehicle_is_one_passage_the_right_way_at_the_right_time(
    roadside: Roadside, record_property: Callable[[str, object], None]
) -> None:
    record_property("table", roadside.table)
    assert len(roadside.vehicles) == 15
    assert [one.target for one in roadside.vehicles if one.passage is None] == []


def test_each_vehicles_speed_is_its_plateau_speed(roadside: Roadside) -> None:
    errors = {
        f"{one.file}: {one.target}": one.passage.speed_mps / one.speed_mps - 1
        for one in roadside.vehicles
        if one.passage is not None and one.passage.speed_mps is not None
    }
    assert {name: error for name, error in errors.items() if abs(error) > WITHIN_SPEED} == {}


def test_hardly_anything_else_is_counted(roadside: Roadside) -> None:
    assert len(roadside.others) <= MOST_OTHERS
