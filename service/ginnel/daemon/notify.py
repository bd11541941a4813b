"""Word to systemd, by the protocol of sd_notify(3): a datagram to the socket that it names."""

from __future__ import annotations

import os
import socket


def notify(*lines: str) -> None:
    """Send lines such as ``READY=1``; without systemd nothing happens."""
    address = os.environ.get("NOTIFY_SOCKET")
    if not address:
        return
    if address.startswith("@"):  # an abstract socket
        address = "\0" + address[1:]
    with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM | socket.SOCK_CLOEXEC) as sender:
        try:
            sender.sendto("\n".join(lines).encode(), address)
        except OSError:
            return  # systemd is restarting; it will hear the next one


def watchdog_s() -> float | None:
    """How often systemd wants to hear ``WATCHDOG=1``, at least; None where it does not wait for it."""
    wanted_of = os.environ.get("WATCHDOG_PID")
    if wanted_of not in (None, str(os.getpid())):
        return None
    microseconds = os.environ.get("WATCHDOG_USEC", "")
    return int(microseconds) / 1e6 if microseconds.isdigit() else None
