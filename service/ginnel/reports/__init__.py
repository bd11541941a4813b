"""Questions to the log, answered as small tables.

Only this folder asks the store and does sums; pages and files show what it answers. Hours, days and
weeks are cut in the site's time zone. An interval never listened to has no count: None, not 0.
"""

from ginnel.reports.average_day import AverageHour, average_day, average_day_of
from ginnel.reports.columns import BandedPassages, iter_columns
from ginnel.reports.comparison import Comparison, compare, compare_of
from ginnel.reports.counts import CountRow, CoverageRow, counts, coverage, iter_counts
from ginnel.reports.facts import SensorFacts, sensor_facts, site
from ginnel.reports.flow import Flow, flow
from ginnel.reports.headways import Headways, headways
from ginnel.reports.inside import InsideRow, inside
from ginnel.reports.intervals import Every, Period, cut, period, zone
from ginnel.reports.occupancy import OccupancyRow, iter_occupancy, occupancy
from ginnel.reports.passages import PassageEntry, iter_entries, latest_passages
from ginnel.reports.peaks import PeakHour, busiest, daily_peaks, daily_peaks_of
from ginnel.reports.series import series_flow
from ginnel.reports.speeds import SpeedRow, iter_speeds, speeds
from ginnel.reports.unusual import Finding, Oddity, unusual, unusual_of
from ginnel.reports.volumes import Volumes, volumes, volumes_of
from ginnel.reports.walkway import WalkwayRow, walkway

__all__ = [
    "AverageHour",
    "BandedPassages",
    "Comparison",
    "CountRow",
    "CoverageRow",
    "Every",
    "Finding",
    "Flow",
    "Headways",
    "InsideRow",
    "OccupancyRow",
    "Oddity",
    "PassageEntry",
    "PeakHour",
    "Period",
    "SensorFacts",
    "SpeedRow",
    "Volumes",
    "WalkwayRow",
    "average_day",
    "average_day_of",
    "busiest",
    "compare",
    "compare_of",
    "counts",
    "coverage",
    "cut",
    "daily_peaks",
    "daily_peaks_of",
    "flow",
    "headways",
    "inside",
    "iter_columns",
    "iter_counts",
    "iter_entries",
    "iter_occupancy",
    "iter_speeds",
    "latest_passages",
    "occupancy",
    "period",
    "sensor_facts",
    "series_flow",
    "site",
    "speeds",
    "unusual",
    "unusual_of",
    "volumes",
    "volumes_of",
    "walkway",
    "zone",
]
