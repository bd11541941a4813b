"""The dashboard's server: waitress, on the loopback address."""

from __future__ import annotations

import errno
import logging
import socket
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self

from ginnel.errors import GinnelError

if TYPE_CHECKING:
    from ginnel.config import Settings

LOOPBACK = "127.0.0.1"


class Server:
    """A server whose port is taken already, so that its address is known before it runs."""

    def __init__(self, server: Any) -> None:
        self._server = server

    @property
    def address(self) -> str:
        """What to type into a browser."""
        return f"http://{LOOPBACK}:{self._server.effective_port}/"

    def run(self) -> None:
        """Answer until interrupted."""
        self._server.run()

    def close(self) -> None:
        """Give the port back; harmless when repeated."""
        self._server.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()


def bind(settings: Settings, port: int) -> Server:
    """Take the port, ready to run; port 0 takes a free one.

    Raises
    ------
    GinnelError
        The port is in use or not allowed.
    """
    from waitress.server import create_server

    from ginnel.web.app import create_app

    app = create_app(settings)
    # a request that waits for a thread a moment is no news to whoever started the dashboard
    logging.getLogger("waitress.queue").setLevel(logging.ERROR)
    # a socket of our own: waitress leaves its open when the port is taken
    taken = socket.socket(socket.AF_INET, socket.SOCK_STREAM)
    try:
        taken.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        taken.bind((LOOPBACK, port))
        return Server(create_server(app, sockets=[taken], threads=4, ident="ginnel"))
    except OSError as exc:
        taken.close()
        why = "in use already" if exc.errno == errno.EADDRINUSE else str(exc.strerror)
        raise GinnelError(f"port {port} is {why}: choose another with --port") from exc
