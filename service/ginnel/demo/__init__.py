"""The demo: an invented place with a day of captures, and eight weeks before it that were only drawn.

The captures go through the real chain. The weeks are there so that every page has something to show; the
log marks them as drawn, by the version of the chain that they claim to come from.
"""

from ginnel.demo.captured import Tally, run, work_s
from ginnel.demo.drawn import draw_weeks
from ginnel.demo.place import prepare

__all__ = ["Tally", "draw_weeks", "prepare", "run", "work_s"]
