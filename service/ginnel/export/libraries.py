"""Libraries that only some kinds of files need: the extras of the package."""

from __future__ import annotations

import importlib
from typing import Any

from ginnel.errors import ExportError


def optional(library: str, package: str, purpose: str) -> Any:
    """Import a library of an extra; ``package`` is what it is called on the index.

    Raises
    ------
    ExportError
        It is not installed; the message says how to get it.
    """
    try:
        return importlib.import_module(library)
    except ModuleNotFoundError as error:
        raise ExportError(f"{purpose} needs {library}: pip install {package}") from error
