"""The service's files: systemd's own tools judge the units, and the install script is run into a folder."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
UNITS = ("ginnel-listen.service", "ginnel-serve.service")
#: The least that a network service can be exposed, by systemd's own count, is near 1; 2.0 is our limit.
MOST_EXPOSED = 2.0

# Stands for the program: says what it was asked, and does what the script relies on.
PROGRAM = """#!/bin/sh
echo "$(basename "$(dirname "$(dirname "$(dirname "$0")")")"): $*" >>"$TOLD"
case "$1 $2" in
  init*) echo "# mine" >ginnel.toml; echo "store" >ginnel.db ;;
esac
"""
ENVIRONMENT = """make_environment() {
  mkdir -p .venv/bin
  cp "$PROGRAM" .venv/bin/ginnel
  echo "environment: $*" >>"$TOLD"
}
"""


def analyse(*arguments: str) -> subprocess.CompletedProcess[str]:
    if shutil.which("systemd-analyze") is None:
        if os.environ.get("CI"):
            pytest.fail("there is no systemd-analyze: apt install systemd")
        pytest.skip("there is no systemd-analyze: apt install systemd")
    return subprocess.run(
        ["systemd-analyze", "--no-pager", *arguments], capture_output=True, text=True, timeout=60, check=False
    )


@pytest.mark.parametrize("unit", UNITS)
def test_units_are_sound_and_hardened(tmp_path: Path, unit: str) -> None:
    # the program is not installed where tests run: another one that is there stands for it
    text = (ROOT / "deploy/systemd" / unit).read_text("utf-8")
    (tmp_path / unit).write_text(text.replace("/opt/ginnel/current/.venv/bin/ginnel", "/bin/true"), "utf-8")
    verified = analyse("verify", "--man=no", str(tmp_path / unit))
    assert (verified.returncode, verified.stderr) == (0, "")
    judged = analyse("security", "--offline=true", str(tmp_path / unit))
    exposed = re.search(r"Overall exposure level for \S+: ([0-9.]+)", judged.stdout)
    assert exposed is not None, judged.stderr
    assert float(exposed[1]) <= MOST_EXPOSED


def test_listening_may_ask_whether_the_clock_is_set() -> None:
    """ProtectClock= would forbid adjtimex(2), and every span would be untrusted for ever."""
    text = (ROOT / "deploy/systemd/ginnel-listen.service").read_text("utf-8")
    assert "\nProtectClock=no\n" in text
    assert "\nSystemCallFilter=adjtimex\n" in text


class Machine:
    """A folder that stands for a machine, and a checkout to install from."""

    def __init__(self, folder: Path) -> None:
        self.root, self.checkout, self.told = folder / "root", folder / "checkout", folder / "told"
        self.root.mkdir()
        shutil.copytree(ROOT / "deploy", self.checkout / "deploy")
        (self.checkout / "deploy/environment.sh").write_text(ENVIRONMENT, "utf-8")
        (folder / "program").write_text(PROGRAM, "utf-8")
        (folder / "program").chmod(0o755)
        self.environment = {
            "PATH": os.environ["PATH"],
            "HOME": str(folder),
            "GINNEL_ROOT": str(self.root),
            "TOLD": str(self.told),
            "PROGRAM": str(folder / "program"),
        }
        self.git("init", "--quiet")
        self.commit("first")

    def git(self, *arguments: str) -> None:
        names = ["-c", "user.name=A", "-c", "user.email=a@example.org"]
        subprocess.run(["git", *names, *arguments], cwd=self.checkout, env=self.environment, check=True)

    def commit(self, text: str) -> None:
        (self.checkout / "release").write_text(text, "utf-8")
        self.git("add", "--all")
        self.git("commit", "--quiet", "-m", text)

    def install(self, *arguments: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            ["bash", "deploy/install", *arguments],
            cwd=self.checkout,
            env=self.environment,
            capture_output=True,
            text=True,
            timeout=60,
            check=False,
        )

    def asked(self) -> list[str]:
        """What the program was asked since the last time."""
        lines = self.told.read_text("utf-8").splitlines() if self.told.exists() else []
        self.told.unlink(missing_ok=True)
        return [re.sub(r"^([0-9a-f]{12}(-\w+)?|current): ", "", line) for line in lines]

    def files(self) -> dict[str, bytes]:
        return {str(p.relative_to(self.root)): p.read_bytes() for p in self.root.rglob("*") if p.is_file()}


def test_install_again_upgrade_and_remove(tmp_path: Path) -> None:
    machine = Machine(tmp_path)
    done = machine.install("--with", "serial,postgresql")
    assert done.returncode == 0, done.stderr
    assert machine.asked() == [
        "environment: --no-default-groups --extra serial --extra postgresql",
        "init --quiet .",
    ]
    assert "Say there what the sensor is" in done.stdout
    first = machine.files()
    assert {f"etc/systemd/system/{unit}" for unit in UNITS} <= set(first)
    assert (machine.root / "opt/ginnel/current/release").read_text("utf-8") == "first"

    # again: nothing is made anew, nothing changes
    assert machine.install("--with", "serial,postgresql").returncode == 0
    assert machine.asked() == []
    assert machine.files() == first

    # an upgrade: the old program backs up, the new one migrates; settings, store and rules stay
    home = machine.root / "var/lib/ginnel"
    (home / "ginnel.toml").write_text("# changed by hand", "utf-8")
    (machine.root / "etc/udev/rules.d/70-ginnel.rules").write_text("# filled in", "utf-8")
    machine.commit("second")
    assert machine.install().returncode == 0
    assert machine.asked() == [
        "environment: --no-default-groups",
        "listen --help",
        "store backup --quiet --config ginnel.toml",
        "store upgrade --config ginnel.toml",
    ]
    assert (machine.root / "opt/ginnel/current/release").read_text("utf-8") == "second"
    assert (home / "ginnel.toml").read_text("utf-8") == "# changed by hand"
    assert (machine.root / "etc/udev/rules.d/70-ginnel.rules").read_text("utf-8") == "# filled in"

    # the one before stays, older ones go
    machine.commit("third")
    assert machine.install().returncode == 0
    releases = {path / "release" for path in (machine.root / "opt/ginnel/releases").iterdir()}
    assert {path.read_text("utf-8") for path in releases} == {"second", "third"}

    # removed: the program is gone, what it knows is not
    done = machine.install("--remove")
    assert done.returncode == 0
    left = set(machine.files())
    assert left == {
        "var/lib/ginnel/ginnel.toml",
        "var/lib/ginnel/ginnel.db",
        "etc/udev/rules.d/70-ginnel.rules",
    }
    assert str(home) in done.stdout


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--with", "carrier-pigeon"], "there is sound, serial and postgresql"),
        (["--with"], "--with needs a list"),
        (["--bogus"], "see the first lines of deploy/install"),
    ],
)
def test_wrong_usage_is_one_line_and_changes_nothing(tmp_path: Path, arguments: list[str], said: str) -> None:
    machine = Machine(tmp_path)
    done = machine.install(*arguments)
    assert done.returncode == 1
    (line,) = done.stderr.splitlines()
    assert said in line
    assert machine.files() == {}


def test_where_there_is_no_systemd_the_script_says_so(tmp_path: Path) -> None:
    machine = Machine(tmp_path)
    machine.environment.pop("GINNEL_ROOT")
    tools = tmp_path / "tools"
    tools.mkdir()
    for tool in ("bash", "dirname", "id"):
        (tools / tool).symlink_to(str(shutil.which(tool)))
    machine.environment["PATH"] = str(tools)
    done = subprocess.run(
        [str(tools / "bash"), "deploy/install"],
        cwd=machine.checkout,
        env=machine.environment,
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )
    assert done.returncode == 1
    assert "there is no systemd here" in done.stderr or "needs root" in done.stderr
