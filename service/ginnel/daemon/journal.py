"""Lines for the journal: with systemd's priority where it listens, with the time where it does not."""

from __future__ import annotations

import logging
import os
import sys
import time

#: What sd-daemon(3) calls SD_ERR and so on.
_PRIORITIES = {logging.CRITICAL: 2, logging.ERROR: 3, logging.WARNING: 4, logging.INFO: 6, logging.DEBUG: 7}


class _JournalFormatter(logging.Formatter):
    def format(self, record: logging.LogRecord) -> str:
        mark = f"<{_PRIORITIES.get(record.levelno, 6)}>"
        return "\n".join(mark + line for line in super().format(record).splitlines())


def log_to_stderr(*, is_quiet: bool) -> None:
    """Set logging up, once, for this process."""
    handler = logging.StreamHandler(sys.stderr)
    if "JOURNAL_STREAM" in os.environ:
        handler.setFormatter(_JournalFormatter("%(message)s"))
    else:
        plain = logging.Formatter("%(asctime)sZ %(levelname)s %(message)s", "%Y-%m-%dT%H:%M:%S")
        plain.converter = time.gmtime
        handler.setFormatter(plain)
    root = logging.getLogger("ginnel")
    root.handlers[:] = [handler]
    root.setLevel(logging.WARNING if is_quiet else logging.INFO)
    root.propagate = False
