"""What a listener must not forget when it is killed: the open span, and deliveries under way.

A checkpoint is written before its deliveries leave the listener, so the chain in it has given out all
that was ever stored, and nothing is found twice. It lies in the listener's own folder, closed to others,
and is not read unless this user wrote it: it holds the chain as a pickle.
"""

from __future__ import annotations

import logging
import os
import pickle
import platform
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from ginnel import __version__
from ginnel.capture import FolderPlace
from ginnel.chain import CHAIN_VERSION
from ginnel.daemon.deliveries import Delivery, from_json, to_json
from ginnel.daemon.open_span import OpenSpan

log = logging.getLogger(__name__)

#: A pickled chain is understood by the very versions that wrote it.
_VERSIONS = " ".join((__version__, CHAIN_VERSION, platform.python_version(), np.__version__)).encode()
_MARK = b"\n--ginnel--\n"


@dataclass(frozen=True, slots=True, kw_only=True)
class Checkpoint:
    """A listener's state at one moment."""

    deliveries: Sequence[Delivery] = ()
    span: OpenSpan | None = None
    place: FolderPlace | None = None


def save(path: Path, checkpoint: Checkpoint, *, is_lasting: bool) -> None:
    """Write a checkpoint in place of the one before; lasting ones survive a power cut."""
    state = pickle.dumps((checkpoint.span, checkpoint.place), pickle.HIGHEST_PROTOCOL)
    text = _MARK.join((_VERSIONS, to_json(checkpoint.deliveries), state))
    beside = path.with_suffix(".new")
    handle = os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_TRUNC | os.O_CLOEXEC, 0o600)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(text)
            if is_lasting:
                file.flush()
                os.fsync(file.fileno())
        beside.replace(path)
    except BaseException:
        beside.unlink(missing_ok=True)
        raise


def load(path: Path) -> Checkpoint | None:
    """Read the last checkpoint; None where there is none that can be trusted.

    Deliveries are understood by every version, the open span only by the one that wrote it.
    """
    try:
        if path.stat().st_uid != os.geteuid() or path.parent.stat().st_uid != os.geteuid():
            log.error("%s belongs to somebody else: it is not read", path)
            return None
        versions, deliveries, state = path.read_bytes().split(_MARK, 2)
        found = Checkpoint(deliveries=from_json(deliveries))
    except FileNotFoundError:
        return None
    except (OSError, ValueError) as exc:
        log.error("%s cannot be read (%s): listening begins anew", path, exc)
        return None
    if versions != _VERSIONS:
        log.warning("%s was written by another version: listening begins anew", path)
        return found
    span, place = pickle.loads(state)  # noqa: S301 (written by this user, looked at above)
    return Checkpoint(deliveries=found.deliveries, span=span, place=place)
