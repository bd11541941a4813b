"""The dashboard's server: waitress, on the loopback address unless somebody has a password."""

from __future__ import annotations

import errno
import importlib
import ipaddress
import logging
import socket
import threading
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self
from urllib.parse import urlsplit

from ginnel.errors import ConfigError, GinnelError

if TYPE_CHECKING:
    from ginnel.config import Settings, WebSettings

LARGEST_HEADER = 16 * 1024
PATIENCE_S = 30
MOST_CONNECTIONS = 200


class Server:
    """A server whose port is taken already, so that its address is known before it runs."""

    def __init__(self, server: Any, host: str) -> None:
        self._server = server
        self._host = f"[{host}]" if ":" in host else host

    @property
    def address(self) -> str:
        """What to type into a browser."""
        return f"http://{self._host}:{self._server.effective_port}/"

    def run(self) -> None:
        """Answer until interrupted."""
        # the chart library takes a second to load, or three on a small board: not at somebody's first visit
        threading.Thread(
            target=importlib.import_module, args=("ginnel.web.drawing.busy",), daemon=True
        ).start()
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


def bind(settings: Settings, port: int | None = None) -> Server:
    """Take the port, that of the settings unless another is given, ready to run; port 0 takes a free one.

    Raises
    ------
    ConfigError
        Others could reach the dashboard, and nobody has a password.
    GinnelError
        The port is in use or not allowed.
    """
    from waitress.server import create_server

    from ginnel.web.app import create_app

    check_reach(settings)
    app = create_app(settings)
    # a request that waits for a thread a moment is no news to whoever started the dashboard
    logging.getLogger("waitress.queue").setLevel(logging.ERROR)
    address = ipaddress.ip_address(settings.web.address)
    # a socket of our own: waitress leaves its open when the port is taken
    taken = socket.socket(socket.AF_INET6 if address.version == 6 else socket.AF_INET, socket.SOCK_STREAM)
    try:
        taken.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        taken.bind((str(address), settings.web.port if port is None else port))
        return Server(create_server(app, sockets=[taken], **_limits(settings.web)), str(address))
    except OSError as exc:
        taken.close()
        why = "in use already" if exc.errno == errno.EADDRINUSE else str(exc.strerror)
        where = f"{address} port {settings.web.port if port is None else port}"
        raise GinnelError(f"{where} is {why}: choose another with --port") from exc


def check_reach(settings: Settings) -> None:
    """Refuse to show the log to others as long as nobody has a password."""
    from ginnel.store import open_store
    from ginnel.store.users import has_users

    web = settings.web
    if ipaddress.ip_address(web.address).is_loopback and web.public_url is None:
        return
    with open_store(settings.store.url, read_only=True) as store:
        if not has_users(store):
            reached = web.public_url or web.address
            raise ConfigError(
                f"the dashboard at {reached} could be seen by others, and nobody has a password: "
                "run `ginnel users add NAME` first"
            )


def _limits(web: WebSettings) -> dict[str, Any]:
    """Settings of waitress: what a client may send and how long it may take; who is a proxy."""
    limits: dict[str, Any] = {
        "threads": 4,
        "ident": None,
        "max_request_header_size": LARGEST_HEADER,
        "max_request_body_size": 64 * 1024,
        "channel_timeout": PATIENCE_S,
        "connection_limit": MOST_CONNECTIONS,
        "clear_untrusted_proxy_headers": True,
    }
    if web.public_url is None:
        return limits
    return limits | {
        "trusted_proxy": "127.0.0.1",
        "trusted_proxy_count": 1,
        "trusted_proxy_headers": {"x-forwarded-for", "x-forwarded-proto", "x-forwarded-host"},
        "url_prefix": urlsplit(web.public_url).path.rstrip("/"),
    }
