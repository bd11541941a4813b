"""How often somebody may try to log in."""

from __future__ import annotations

from limits import RateLimitItem, parse
from limits.storage import MemoryStorage
from limits.strategies import MovingWindowRateLimiter


class Throttle:
    """Counts failed tries by address, by name, and by both; what is full must wait.

    The narrowest limit catches somebody who guesses at one name; the others those who spread their
    guesses. Only failures count, so that nobody is kept out by logging in often.
    """

    def __init__(self) -> None:
        self._limiter = MovingWindowRateLimiter(MemoryStorage())
        self._of_both = parse("5 per 5 minutes")
        self._of_address = parse("20 per 5 minutes")
        self._of_name = parse("50 per hour")

    def is_open(self, address: str, name: str) -> bool:
        """Whether another try is allowed."""
        return all(self._limiter.test(limit, *key) for limit, key in self._keys(address, name))

    def failed(self, address: str, name: str) -> None:
        """Count a failed try."""
        for limit, key in self._keys(address, name):
            self._limiter.hit(limit, *key)

    def _keys(self, address: str, name: str) -> tuple[tuple[RateLimitItem, tuple[str, ...]], ...]:
        name = name[:80]
        return (
            (self._of_both, ("both", address, name)),
            (self._of_address, ("address", address)),
            (self._of_name, ("name", name)),
        )
