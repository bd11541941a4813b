"""What a bare machine lacks is said in one line with the mend, before anything is made."""

from __future__ import annotations

import subprocess
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]

# stand-ins for an interpreter: each answers only what deploy/environment.sh asks before it makes anything
TOO_OLD = """#!/bin/sh
case "$*" in
  --version) echo "Python 3.9.2" ;;
  *version_info*) exit 1 ;;
esac
"""
WITHOUT_VENV = """#!/bin/sh
case "$*" in
  *ensurepip*) exit 1 ;;
esac
"""


@pytest.mark.parametrize(
    ("interpreter", "said"),
    [
        (
            None,
            "there is no python3-missing here. On Debian or Ubuntu: sudo apt install python3 python3-venv",
        ),
        (TOO_OLD, "Python 3.9.2 is too old, 3.11 or later is needed"),
        (WITHOUT_VENV, "has no venv module. On Debian or Ubuntu: sudo apt install python3-venv"),
    ],
    ids=["no python", "old python", "no venv"],
)
@pytest.mark.parametrize("script", ["try", "test"])
def test_a_bare_machine_gets_one_clear_line(
    tmp_path: Path, script: str, interpreter: str | None, said: str
) -> None:
    (tmp_path / "deploy").mkdir()
    for name in (script, "environment.sh"):
        (tmp_path / "deploy" / name).write_bytes((ROOT / "deploy" / name).read_bytes())
    python = "python3-missing"
    if interpreter is not None:
        file = tmp_path / "python3"
        file.write_text(interpreter, "utf-8")
        file.chmod(0o755)
        python = str(file)
    done = subprocess.run(
        ["bash", f"deploy/{script}"],
        cwd=tmp_path,
        env={"PATH": "/usr/bin:/bin", "PYTHON": python},
        capture_output=True,
        text=True,
        timeout=30,
    )
    assert done.returncode != 0
    assert done.stdout == ""
    (line,) = done.stderr.splitlines()
    assert line.startswith("ginnel: ")
    assert said in line
    assert not (tmp_path / ".venv").exists()
