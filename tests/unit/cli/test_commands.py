"""The commands as a person meets them: help, exit codes, and one clear line for what is wrong."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.testing import CliRunner, Result

from ginnel.cli import main
from ginnel.cli.group import COMMANDS
from ginnel.cli.options import Rate, moment_us


@pytest.fixture(autouse=True)
def _in_an_empty_folder(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("GINNEL_CONFIG", raising=False)


def ginnel(*arguments: str) -> Result:
    return CliRunner().invoke(main, arguments)


def test_help_lists_every_command_and_imports_none_of_them() -> None:
    # in a process of its own, since others have imported everything here
    script = (
        "import sys; from click.testing import CliRunner; from ginnel.cli import main;"
        "print(CliRunner().invoke(main, ['--help']).output);"
        "heavy = {'numpy', 'sqlalchemy', 'flask', 'bokeh', 'soundfile', 'pydantic'} & set(sys.modules);"
        "sys.exit(f'imported {heavy}' if heavy else 0)"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
    for command in COMMANDS:
        assert re.search(rf"^  {command} ", done.stdout, re.MULTILINE)


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_every_command_has_help_and_its_line_in_the_list_is_not_stale(command: str) -> None:
    done = ginnel(command, "--help")
    assert done.exit_code == 0
    assert done.output.startswith(f"Usage: main {command}")


@pytest.mark.parametrize(
    "arguments",
    [
        ("listen-in",),
        ("replay",),
        ("replay", "--rate", "fast", "x.raw"),
        ("replay", "--rate", "8000", "x.raw"),
        ("replay", "--started-at", "noon", "x.wav"),
        ("export", "people"),
        ("export", "counts", "--every", "fortnight"),
        ("export", "counts", "--uncounted"),
        ("serve", "--port", "70000"),
        ("simulate", "--rate", "900"),
        ("simulate", "--rate", "8000.5"),
        ("simulate", "--started-at", "2026-03-02T08:00:00.5"),
    ],
)
def test_wrong_usage_is_exit_code_2(arguments: tuple[str, ...]) -> None:
    done = ginnel(*arguments)
    assert done.exit_code == 2, done.output
    assert "Usage: " in done.stderr


@pytest.mark.parametrize(
    "command", [("store", "check"), ("export", "counts"), ("serve",), ("replay", "x.wav")]
)
def test_without_settings_every_command_says_how_to_get_them(command: tuple[str, ...]) -> None:
    done = ginnel(*command)
    assert done.exit_code == 1
    assert done.stdout == ""
    assert done.stderr == (
        "ginnel: no ginnel.toml here: run `ginnel init`, or say where it is with --config FILE\n"
    )


def test_each_bad_setting_is_a_line_on_stderr(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text('[site]\nnme = "x"\n[stor]\n', "utf-8")
    done = ginnel("store", "check")
    assert done.exit_code == 1
    assert [line.split(": ", 2)[2] for line in done.stderr.splitlines()] == [
        "site.nme: unknown key; did you mean name?",
        "stor: unknown key; did you mean store?",
    ]


def test_init_writes_settings_and_an_empty_store_that_is_in_order(tmp_path: Path) -> None:
    done = ginnel("init", "mill", "--site", "Mill", "--timezone", "Europe/Dublin")
    assert done.exit_code == 0, done.output
    assert 'name = "Mill"' in (tmp_path / "mill/ginnel.toml").read_text("utf-8")
    checked = ginnel("store", "check", "--config", "mill/ginnel.toml")
    assert checked.exit_code == 0
    assert "revision" in checked.stdout
    assert "up to date" in ginnel("store", "upgrade", "--config", "mill/ginnel.toml").stdout


def test_init_leaves_settings_alone_that_are_there(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text("# mine\n", "utf-8")
    done = ginnel("init")
    assert done.exit_code == 1
    assert done.stderr == "ginnel: ginnel.toml is there already; it was left as it is\n"
    assert (tmp_path / "ginnel.toml").read_text("utf-8") == "# mine\n"


def test_init_with_a_wrong_zone_leaves_nothing_behind(tmp_path: Path) -> None:
    assert ginnel("init", "--timezone", "Mars/Olympus").exit_code == 1
    assert not (tmp_path / "ginnel.toml").exists()


def test_upgrade_makes_a_store_that_is_not_there(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text("", "utf-8")
    assert ginnel("store", "check").exit_code == 1
    assert ginnel("store", "upgrade", "--quiet").output == ""
    assert ginnel("store", "check").exit_code == 0


def test_an_exported_empty_log_is_its_header_alone() -> None:
    ginnel("init")
    done = ginnel("export", "passages")
    assert done.exit_code == 0, done.output
    assert done.stdout.splitlines() == [
        "passage_id,sensor,started_at,crossed_at,ended_at,direction,direction_confidence,speed_mps,"
        "speed_se_mps,speed_band,snr_db,mover,flags"
    ]


def test_export_refuses_an_end_before_its_start() -> None:
    ginnel("init")
    done = ginnel("export", "counts", "--from", "2026-03-02", "--to", "2026-03-02")
    assert done.exit_code == 2


def test_a_port_in_use_is_one_clear_line() -> None:
    import socket

    ginnel("init")
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        done = ginnel("serve", "--port", str(port))
    assert done.exit_code == 1
    assert done.stderr == f"ginnel: 127.0.0.1 port {port} is in use already: choose another with --port\n"


@pytest.mark.parametrize("arguments", [("--help",), ("export", "passages")])
def test_an_output_that_takes_no_more_is_one_clear_line(arguments: tuple[str, ...]) -> None:
    ginnel("init")
    script = "from ginnel.cli import main; main(prog_name='ginnel')"
    with Path("/dev/full").open("wb") as full:  # the kernel's own full disk
        done = subprocess.run(
            [sys.executable, "-c", script, *arguments],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            timeout=60,
        )
    assert done.returncode == 1
    assert done.stderr == "ginnel: the output: No space left on device\n"


def test_simulate_on_a_full_disk_is_one_clear_line_and_leaves_no_half_capture(tmp_path: Path) -> None:
    capture = tmp_path / "captures/simulated-20260302T080000Z.wav"
    capture.parent.mkdir()
    capture.symlink_to("/dev/full")
    done = ginnel("simulate", "--minutes", "0.5", "--rate", "2k")
    assert done.exit_code == 1
    assert re.fullmatch(r"ginnel: captures cannot be written: .*is the disk full\?\n", done.stderr)
    assert not capture.is_symlink()


def test_simulate_gives_the_same_files_for_the_same_seed(tmp_path: Path) -> None:
    for folder in ("a", "b"):
        done = ginnel("simulate", folder, "--minutes", "0.5", "--rate", "2k", "--per-hour", "600")
        assert done.exit_code == 0, done.output
    other = ginnel("simulate", "c", "--minutes", "0.5", "--rate", "2k", "--per-hour", "600", "--seed", "1")
    assert other.exit_code == 0
    names = ["simulated-20260302T080000Z-truth.csv", "simulated-20260302T080000Z.wav"]
    assert sorted(file.name for file in (tmp_path / "a").iterdir()) == names
    for name in names:
        same, again, different = ((tmp_path / folder / name).read_bytes() for folder in "abc")
        assert same == again
        assert same != different


def test_simulate_takes_the_sensor_and_the_zone_of_the_settings(tmp_path: Path) -> None:
    ginnel("init", "--timezone", "Australia/Adelaide")  # ten and a half hours ahead in March
    done = ginnel("simulate", "--minutes", "0.5", "--rate", "2k", "--format", "sigmf", "--channels", "iq")
    assert done.exit_code == 0, done.output
    assert (tmp_path / "captures/sensor-1-20260301T213000Z.sigmf-meta").is_file()


def test_a_rate_is_read_with_and_without_its_unit() -> None:
    texts = ("8000", "44.1k", "48kHz", "22050 Hz")
    assert [Rate().convert(text, None, None) for text in texts] == [8000.0, 44100.0, 48000.0, 22050.0]
    for wrong in ("0", "-8000", "8 MHz", "k"):
        with pytest.raises(click.BadParameter):
            Rate().convert(wrong, None, None)


def test_a_moment_without_offset_is_the_sites_own() -> None:
    from datetime import datetime

    summer = datetime.fromisoformat("2026-07-01T12:00:00")
    # `date -u -d 2026-07-01T11:00:00Z +%s` of GNU coreutils says 1782903600
    assert moment_us(summer, "Europe/Dublin") == 1_782_903_600_000_000
    assert moment_us(datetime.fromisoformat("2026-07-01T11:00:00Z"), "Asia/Tokyo") == 1_782_903_600_000_000
