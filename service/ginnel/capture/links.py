"""Byte links that raw samples come over: a pipe, a TCP connection, a serial line."""

from __future__ import annotations

import contextlib
import os
import select
import socket
import stat
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Protocol

from ginnel.errors import CaptureError, SourceLostError

_READ_BYTES = 1 << 16
_CONNECT_S = 5.0


@dataclass(frozen=True, slots=True)
class Chunk:
    """Bytes that came, perhaps none."""

    data: bytes = b""
    is_overrun: bool = False  # samples were lost just before these
    is_end: bool = False  # nothing will ever follow


class Link(Protocol):
    """Something that bytes come out of, which may go away and come back."""

    def open(self) -> None:
        """Connect; `SourceLostError` where it is not there (now)."""

    def read(self, timeout_s: float) -> Chunk:
        """Wait for bytes, so long at most; `SourceLostError` where it has gone."""

    def close(self) -> None:
        """Disconnect; harmless when repeated."""


class PipeLink:
    """A FIFO, or standard input."""

    def __init__(self, path: str, stdin_fd: int = 0) -> None:
        self._path, self._stdin_fd = path, stdin_fd
        self._fd: int | None = None

    def open(self) -> None:
        """Open the FIFO for both ways, so that a writer may come and go."""
        if self._path == "-":
            self._fd = self._stdin_fd
            return
        try:
            if not _is_pipe(Path(self._path)):
                raise CaptureError(f"{self._path}: is no FIFO: make one with mkfifo, or use a folder source")
            self._fd = os.open(self._path, os.O_RDWR | os.O_NONBLOCK | os.O_CLOEXEC)
        except OSError as exc:
            raise SourceLostError(f"{self._path}: {exc.strerror}") from exc

    def read(self, timeout_s: float) -> Chunk:
        """Wait for bytes."""
        assert self._fd is not None  # noqa: S101 (opened before)
        if not select.select([self._fd], [], [], timeout_s)[0]:
            return Chunk()
        try:
            data = os.read(self._fd, _READ_BYTES)
        except BlockingIOError:
            return Chunk()
        except OSError as exc:
            raise SourceLostError(f"{self._path}: {exc.strerror}") from exc
        return Chunk(data, is_end=not data)

    def close(self) -> None:
        """Close the FIFO; standard input is not ours to close."""
        if self._fd is not None and self._path != "-":
            os.close(self._fd)
        self._fd = None


def _is_pipe(path: Path) -> bool:
    mode = path.stat().st_mode
    return stat.S_ISFIFO(mode) or stat.S_ISCHR(mode)


class TcpLink:
    """A connection to something that sends samples as soon as somebody connects."""

    def __init__(self, host: str, port: int) -> None:
        self._address = (host, port)
        self._socket: socket.socket | None = None

    def open(self) -> None:
        """Connect."""
        try:
            self._socket = socket.create_connection(self._address, _CONNECT_S)
        except OSError as exc:
            raise self._lost(exc.strerror or str(exc)) from exc
        # a peer that lost its power never says goodbye
        self._socket.setsockopt(socket.SOL_SOCKET, socket.SO_KEEPALIVE, 1)

    def read(self, timeout_s: float) -> Chunk:
        """Wait for bytes."""
        assert self._socket is not None  # noqa: S101 (opened before)
        self._socket.settimeout(timeout_s)
        try:
            data = self._socket.recv(_READ_BYTES)
        except TimeoutError:
            return Chunk()
        except OSError as exc:
            raise self._lost(exc.strerror or str(exc)) from exc
        if not data:
            raise self._lost("the other side hung up")
        return Chunk(data)

    def close(self) -> None:
        """Hang up."""
        if self._socket is not None:
            self._socket.close()
        self._socket = None

    def _lost(self, why: str) -> SourceLostError:
        host, port = self._address
        return SourceLostError(f"{host} port {port}: {why}")


class SerialLink:
    """A serial line, or a microcontroller's USB port that looks like one."""

    def __init__(self, path: str, baud: int) -> None:
        try:
            import serial
        except ModuleNotFoundError as exc:
            raise CaptureError('kind = "serial" needs pyserial: pip install pyserial') from exc
        self._path, self._baud = path, baud
        self._errors: tuple[type[Exception], ...] = (serial.SerialException, OSError)
        self._port: Any = None

    def open(self) -> None:
        """Open the device for ourselves alone, and forget what it had in store."""
        import serial

        try:
            self._port = serial.Serial(self._path, self._baud, timeout=0, exclusive=True)
            self._port.reset_input_buffer()
        except self._errors as exc:
            self.close()
            raise SourceLostError(f"{self._path}: {_short(exc)}") from exc

    def read(self, timeout_s: float) -> Chunk:
        """Wait for bytes."""
        try:
            self._port.timeout = timeout_s
            first = self._port.read(1)
            return Chunk(first + self._port.read(min(self._port.in_waiting, _READ_BYTES)) if first else b"")
        except self._errors as exc:
            raise SourceLostError(f"{self._path}: {_short(exc)}") from exc

    def close(self) -> None:
        """Close the device, which may have gone already."""
        if self._port is not None:
            with contextlib.suppress(*self._errors):
                self._port.close()
        self._port = None


def _short(exc: Exception) -> str:
    """Say what the system says, without what the library wraps round it."""
    return str(getattr(exc, "strerror", None) or exc).split(":")[0].strip() or type(exc).__name__
