"""Passwords and tokens: made, hashed and checked."""

from __future__ import annotations

import functools
import hashlib
import secrets
import threading

from argon2 import PasswordHasher
from argon2.exceptions import InvalidHashError, VerificationError

SHORTEST = 10
_MARK = "ginnel_"  # so that a token that strayed somewhere is recognised

_hasher = PasswordHasher()  # the library's defaults: Argon2id, 64 MiB, RFC 9106's second choice
_one_at_a_time = threading.Lock()  # each hash takes 64 MiB, and a small board has 512


def hash_password(password: str) -> str:
    """Hash a password, with its own salt and parameters inside."""
    with _one_at_a_time:
        return _hasher.hash(password)


def is_password(password_hash: str | None, password: str) -> bool:
    """Whether a password is the right one; takes as long for a user who is not there (None)."""
    with _one_at_a_time:
        try:
            return _hasher.verify(password_hash or _nobodys(), password) and password_hash is not None
        except (VerificationError, InvalidHashError):
            return False


def new_token() -> str:
    """Make a token, with 256 bits of chance in it."""
    return _MARK + secrets.token_urlsafe(32)


def digest(token: str) -> str:
    """What the store keeps of a token. So much chance needs no salt and no slow hash."""
    return hashlib.sha256(token.encode()).hexdigest()


def stamp(password_hash: str) -> str:
    """What a session holds of the password's hash: with a new password, old sessions end."""
    return hashlib.sha256(password_hash.encode()).hexdigest()[:20]


@functools.cache
def _nobodys() -> str:
    return _hasher.hash(secrets.token_urlsafe(16))
