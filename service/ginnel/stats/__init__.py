"""Statistics of counts and speeds: arrays in, numbers out.

Pure functions that know no store, no clock and no time zone, so that each can be checked against a
published number. The source of each formula stands beside it.
"""

from ginnel.stats.counts import counts_in, listened_us_in
from ginnel.stats.speeds import SpeedSummary, band_counts, quantiles, space_mean, summarise_speeds
from ginnel.stats.uncertainty import poisson_limits

__all__ = [
    "SpeedSummary",
    "band_counts",
    "counts_in",
    "listened_us_in",
    "poisson_limits",
    "quantiles",
    "space_mean",
    "summarise_speeds",
]
