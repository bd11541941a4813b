"""The commands, one file each.

In come words typed by a person, out go lines on a terminal and an exit code: 0 done, 1 failed, 2 wrong
usage. A command reads its options, calls the rooms that do the work, and reports; it does no work itself.
Each file is imported only when its command is asked for, so that `ginnel --help` is quick on a small board.
"""

from ginnel.cli.group import main

__all__ = ["main"]
