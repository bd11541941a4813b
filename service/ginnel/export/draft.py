"""Files that appear whole or not at all."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from ginnel.errors import ExportError


@contextmanager
def whole(path: Path) -> Iterator[Path]:
    """Give a draft to write, which takes the file's name once it is on the disk, or goes.

    A file of that name is replaced. A draft that an export which was killed has left behind goes too.

    Raises
    ------
    ExportError
        The file cannot be written.
    """
    _sweep(path)
    draft = path.with_name(f".{path.name}.{os.getpid()}.draft")
    try:
        draft.touch()
        yield draft
        with draft.open("rb+") as stream:
            os.fsync(stream.fileno())
        draft.replace(path)
    except OSError as error:
        raise _cannot(path, error) from error
    finally:
        draft.unlink(missing_ok=True)


@contextmanager
def whole_folder(path: Path) -> Iterator[Path]:
    """Give a draft folder to fill, which takes the folder's name when it is complete, or goes.

    Raises
    ------
    ExportError
        There is something at that name already, or the folder cannot be written.
    """
    if path.exists() and not (path.is_dir() and not any(path.iterdir())):
        raise ExportError(f"{path} is there already: give the name of a new folder")
    _sweep(path)
    draft = path.with_name(f".{path.name}.{os.getpid()}.draft")
    try:
        draft.mkdir()
        yield draft
        draft.replace(path)
    except OSError as error:
        raise _cannot(path, error) from error
    finally:
        shutil.rmtree(draft, ignore_errors=True)


def check_place(path: Path) -> Path:
    """Full path of a file to be written.

    Raises
    ------
    ExportError
        It is no file, or its folder is not there.
    """
    if path.exists() and not path.is_file():
        raise ExportError(f"{path} is not a file: give a file name, or none for standard output")
    if not path.absolute().parent.is_dir():
        raise ExportError(f"{path} cannot be written: there is no folder {path.parent}: make it first")
    return path.resolve()


def _cannot(path: Path, error: OSError) -> ExportError:
    return ExportError(f"{path} cannot be written: {error.strerror or error}")


def _sweep(path: Path) -> None:
    """Remove drafts of processes that are no more."""
    for left in path.parent.iterdir():
        name, _, owner = left.name.removesuffix(".draft").rpartition(".")
        if name != f".{path.name}" or not owner.isdecimal() or _runs(int(owner)):
            continue
        if left.is_dir():
            shutil.rmtree(left, ignore_errors=True)
        else:
            with suppress(OSError):
                left.unlink()


def _runs(process: int) -> bool:
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except OSError:
        return True
    return True
