"""What only a person can mend is told in one line, before anything has begun."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest

from ginnel.config import load_settings
from ginnel.daemon.listen import Daemon
from ginnel.errors import ConfigError, GinnelError, StoreError

SENSOR = """
[[sensor]]
name = "lane"
[sensor.source]
kind = "pipe"
path = "samples"
rate_hz = 2000
"""


def refused(folder: Path, text: str, kind: type[GinnelError] = GinnelError) -> str:
    (folder / "ginnel.toml").write_text(text, "utf-8")
    with pytest.raises(kind) as told:
        Daemon(load_settings(folder / "ginnel.toml"), lambda: pytest.fail("not read again")).run()
    (line,) = str(told.value).splitlines()
    return line


@pytest.fixture(autouse=True)
def _without_settings_of_others(monkeypatch: pytest.MonkeyPatch) -> None:
    for name in [key for key in os.environ if key.startswith("GINNEL_") or key == "RUNTIME_DIRECTORY"]:
        monkeypatch.delenv(name)


def test_without_a_sensor_there_is_nothing_to_listen_to(tmp_path: Path) -> None:
    assert "no sensor is configured: add a [[sensor]]" in refused(tmp_path, '[site]\nname = "Weir lane"\n')


def test_a_mistake_in_the_settings_has_its_line(tmp_path: Path) -> None:
    line = refused(tmp_path, SENSOR.replace("rate_hz", "rate_khz"), ConfigError)
    assert "ginnel.toml, line 7: sensor[0].source.rate_khz: unknown key; did you mean rate_hz?" in line


def test_a_store_that_is_none_is_not_written_over(tmp_path: Path) -> None:
    (tmp_path / "ginnel.db").write_bytes(b"this is no database " * 1000)
    assert "is not a Ginnel store" in refused(tmp_path, SENSOR, StoreError)
    assert (tmp_path / "ginnel.db").read_bytes().startswith(b"this is no database")


def _file(state: Path) -> None:
    state.write_text("a file", "utf-8")


def _open_to_all(state: Path) -> None:
    state.mkdir()
    state.chmod(0o777)


def _link(state: Path) -> None:
    (state.parent / "elsewhere").mkdir(mode=0o700)
    state.symlink_to(state.parent / "elsewhere")


def _of_another(state: Path) -> None:
    if os.geteuid() != 0:
        pytest.skip("only root may become somebody else")
    state.mkdir(mode=0o700)
    os.chown(state, 65534, 65534)


@pytest.mark.parametrize(
    ("make", "told"),
    [
        (_file, "cannot be made: File exists"),
        (_open_to_all, "must belong to this user and be closed to others' writing"),
        (_of_another, "must belong to this user"),
        (_link, "is no folder"),
    ],
)
def test_a_state_folder_that_is_not_ours_alone_is_refused(
    tmp_path: Path, make: Callable[[Path], None], told: str
) -> None:
    # what lies in it is believed when listening goes on
    make(tmp_path / "listening")
    line = refused(tmp_path, SENSOR, ConfigError)
    assert line.startswith(f"{tmp_path / 'listening'} ([listen] state)")
    assert told in line
