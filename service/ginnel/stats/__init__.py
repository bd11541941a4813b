"""Statistics of counts and speeds: arrays in, numbers out.

Pure functions that know no store, no clock and no time zone, so that each can be checked against a
published number. The source of each formula stands beside it.
"""

from ginnel.stats.counts import counts_in, union_us_in
from ginnel.stats.pace import Pace, pace, share_over
from ginnel.stats.speeds import SpeedSummary, band_counts, quantiles, space_mean, summarise_speeds
from ginnel.stats.uncertainty import (
    Dispersion,
    Mean,
    dispersion,
    expand,
    mean_with_limits,
    poisson_limits,
    wilson_limits,
)

__all__ = [
    "Dispersion",
    "Mean",
    "Pace",
    "SpeedSummary",
    "band_counts",
    "counts_in",
    "dispersion",
    "expand",
    "mean_with_limits",
    "pace",
    "poisson_limits",
    "quantiles",
    "share_over",
    "space_mean",
    "summarise_speeds",
    "union_us_in",
    "wilson_limits",
]
