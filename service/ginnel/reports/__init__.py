"""Questions to the log, answered as small tables.

Only this folder asks the store and does sums; pages and files show what it answers. Hours, days and
weeks are cut in the site's time zone. An interval never listened to has no count: None, not 0.
"""

from ginnel.reports.columns import BandedPassages, iter_columns
from ginnel.reports.counts import CountRow, CoverageRow, counts, coverage, iter_counts
from ginnel.reports.facts import SensorFacts, sensor_facts, site
from ginnel.reports.intervals import Every, Period, cut, period, zone
from ginnel.reports.passages import PassageEntry, iter_entries, latest_passages
from ginnel.reports.speeds import SpeedRow, iter_speeds, speed_histogram, speeds

__all__ = [
    "BandedPassages",
    "CountRow",
    "CoverageRow",
    "Every",
    "PassageEntry",
    "Period",
    "SensorFacts",
    "SpeedRow",
    "counts",
    "coverage",
    "cut",
    "iter_columns",
    "iter_counts",
    "iter_entries",
    "iter_speeds",
    "latest_passages",
    "period",
    "sensor_facts",
    "site",
    "speed_histogram",
    "speeds",
    "zone",
]
