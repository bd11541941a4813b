"""Real people's motion and real recordings on the scoreboard, by the functions that `tests/real` has."""

from __future__ import annotations

import os
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
from tests.real.conftest import REPOSITORY
from tests.real.test_corridor import read_people, watch
from tests.real.test_vehicles import read_roadside
from tests.real.test_walkers import read_room

from ginnel.words import Channels

_HEAD = "| data | to be found | found | others counted | direction right | speed bias % | speed MAE % |"
_RULE = "| --- | --- | --- | --- | --- | --- | --- |"


def table(lines: list[str]) -> str:
    """The lines below under their heads."""
    return "\n".join([_HEAD, _RULE, *lines])


def corridor(channels: Channels) -> str:
    """Fifty people of the HERMES corridor experiment."""
    folder = _folder("trajectories", "GINNEL_TRAJECTORIES")
    if folder is None:
        return _absent("fifty people in a corridor")
    people = read_people(folder)
    watched = watch(people, channels)
    right = sum(person.direction is passage.direction for person, passage in watched.pairs)
    errors = [100.0 * float(error) for error in watched.speed_errors]
    n_found, n_others = len(watched.pairs), len(watched.passages) - len(watched.pairs)
    return _line(
        f"fifty people in a corridor, {_written(channels)}", len(people), n_found, n_others, right, errors
    )


def roadside() -> str:
    """Fifteen vehicles recorded at 24 GHz."""
    folder = _folder("recordings", "GINNEL_RECORDINGS")
    if folder is None:
        return _absent("recorded vehicles, 24 GHz")
    with TemporaryDirectory() as stores:
        read = read_roadside(folder, Path(stores))
    found = [(one, one.passage) for one in read.vehicles if one.passage is not None]
    errors = [
        100.0 * (passage.speed_mps / one.speed_mps - 1.0)
        for one, passage in found
        if passage.speed_mps is not None
    ]
    # Labels are matched within one direction: what is found has the right one.
    return _line(
        "recorded vehicles, 24 GHz", len(read.vehicles), len(found), len(read.others), len(found), errors
    )


def room() -> str:
    """Legs of one person to and fro in a room, recorded at 24 GHz; nobody passes there."""
    folder = _folder("recordings", "GINNEL_RECORDINGS")
    if folder is None:
        return _absent("recorded legs to and fro, 24 GHz")
    with TemporaryDirectory() as stores:
        read = read_room(folder, Path(stores))
    logged = [(leg, leg.logged) for leg in read.legs if leg.logged is not None]
    errors = [
        100.0 * (passage.speed_mps / leg.speed_mps - 1.0)
        for leg, passage in logged
        if passage.speed_mps is not None
    ]
    right = sum(passage.direction is leg.direction for leg, passage in logged)
    n_counted = sum(read.n_counted.values())
    return _line("recorded legs to and fro, 24 GHz", len(read.legs), len(logged), n_counted, right, errors)


def _folder(name: str, variable: str) -> Path | None:
    folder = Path(os.environ.get(variable) or REPOSITORY.parent / "shared" / name)
    return folder if folder.is_dir() else None


def _written(channels: Channels) -> str:
    return "I/Q" if channels is Channels.IQ else "mono"


def _absent(name: str) -> str:
    return f"| {name} | not at hand: see DEVELOPERS.md | | | | | |"


def _line(name: str, n: int, n_found: int, n_others: int, right: int, errors: list[float]) -> str:
    bias, mae = np.mean(errors), np.mean(np.abs(errors))
    return f"| {name} | {n} | {n_found} | {n_others} | {right} of {n_found} | {bias:+.1f} | {mae:.1f} |"
