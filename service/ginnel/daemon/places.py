"""Where the daemon keeps what it must not forget, and the lock that keeps a second one out."""

from __future__ import annotations

import fcntl
import hashlib
import os
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Self

from ginnel.errors import ConfigError, GinnelError

_SHARED_MEMORY = Path("/dev/shm")  # noqa: S108 (a folder of our own in it, closed to others)


@dataclass(frozen=True, slots=True, kw_only=True)
class Places:
    """Two folders: one that lasts, and one in memory that lasts until the next boot.

    What changes every few seconds goes into memory, since it would wear out a flash card.
    """

    lasting: Path
    fleeting: Path

    @property
    def spool(self) -> Path:
        """The queue of what the store does not take now."""
        return self.lasting / "undelivered.db"

    def checkpoint(self, sensor_name: str, *, is_lasting: bool) -> Path:
        """A sensor's checkpoint."""
        return (self.lasting if is_lasting else self.fleeting) / f"{sensor_name}.checkpoint"


def make_places(state: Path) -> Places:
    """Make the folders.

    Raises
    ------
    ConfigError
        One cannot be made or written, or is not ours.
    """
    lasting = _own_folder(state, "[listen] state")
    if given := os.environ.get("RUNTIME_DIRECTORY"):  # systemd's RuntimeDirectory=
        return Places(lasting=lasting, fleeting=_own_folder(Path(given.split(":")[0]), "RUNTIME_DIRECTORY"))
    if not os.access(_SHARED_MEMORY, os.W_OK):
        return Places(lasting=lasting, fleeting=lasting)
    mark = hashlib.sha256(os.fsencode(state.resolve())).hexdigest()[:12]
    fleeting = _own_folder(_SHARED_MEMORY / f"ginnel-{os.geteuid()}-{mark}", "the folder in memory")
    return Places(lasting=lasting, fleeting=fleeting)


def _own_folder(folder: Path, what: str) -> Path:
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        status = folder.lstat()
        is_writable = os.access(folder, os.W_OK | os.X_OK)
    except OSError as exc:
        raise ConfigError(f"{folder} ({what}) cannot be made: {exc.strerror}") from exc
    if not folder.is_dir() or folder.is_symlink():
        raise ConfigError(f"{folder} ({what}) is no folder: name another")
    if status.st_uid != os.geteuid() or status.st_mode & 0o022:
        raise ConfigError(f"{folder} ({what}) must belong to this user and be closed to others' writing")
    if not is_writable:
        raise ConfigError(f"{folder} ({what}) cannot be written by this user: change its owner or its mode")
    return folder


class Lock:
    """Held by the one daemon that works with a folder; the system lets go of it when the process ends."""

    def __init__(self, places: Places) -> None:
        self._path = places.lasting / "lock"

    def __enter__(self) -> Self:
        self._fd = os.open(self._path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC, 0o600)
        try:
            fcntl.flock(self._fd, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            holder = os.read(self._fd, 20).decode(errors="replace").strip() or "unknown"
            os.close(self._fd)
            raise GinnelError(
                f"ginnel listen is running already with {self._path.parent} (process {holder}): end it first"
            ) from None
        os.ftruncate(self._fd, 0)
        os.pwrite(self._fd, str(os.getpid()).encode(), 0)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        os.close(self._fd)
