"""Real recordings and real walks: where they are, and the way of one recording into a store."""

from __future__ import annotations

import csv
import os
from pathlib import Path

import pytest

from ginnel.capture import arrange, open_recording
from ginnel.replay import replay_span
from ginnel.store import iter_passages, open_store, upgrade
from ginnel.words import US_PER_S, Passage, Sensor

REPOSITORY = Path(__file__).parents[2]
STARTED_US = 1_772_438_400 * US_PER_S  # the recordings do not say when: any moment will do


def outside_data(name: str, variable: str) -> Path:
    """Folder of data that is kept outside the project; its tests must run in CI."""
    given = os.environ.get(variable)
    folder = Path(given) if given else REPOSITORY.parent / "shared" / name
    if not folder.is_dir():
        reason = f"{folder} is not there; set {variable} to the folder of {name}"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    return folder


@pytest.fixture(scope="session")
def recordings() -> Path:
    return outside_data("recordings", "GINNEL_RECORDINGS")


@pytest.fixture(scope="session")
def trajectories() -> Path:
    return outside_data("trajectories", "GINNEL_TRAJECTORIES")


def replayed(path: Path, sensor: Sensor, folder: Path) -> list[Passage]:
    """Everything that the store holds after a recording was replayed into it, uncounted ones too."""
    url = f"sqlite:///{folder / path.stem}.db"
    upgrade(url)
    recording = open_recording(path, sensor, started_us=STARTED_US)
    store = open_store(url)
    try:
        for span in arrange([recording]).spans:
            replay_span(store, sensor, span)
        return [row.passage for row in iter_passages(store, sensor.name, None, None, with_uncounted=True)]
    finally:
        store.close()


def since_start_s(time_us: int) -> float:
    return (time_us - STARTED_US) / US_PER_S


def read_labels(path: Path) -> list[dict[str, str]]:
    with path.open(newline="") as lines:
        return list(csv.DictReader(lines))
