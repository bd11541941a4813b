"""How full: the share of time a beam is occupied, and the number of people behind some doors."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class DoorError:
    """How well a sensor at a door counts."""

    recall_entering: float = 1.0  # share of those who enter that is counted, 0 to 1
    recall_leaving: float = 1.0
    recall_se: float = 0.0  # standard error of either recall
    direction_error: float = 0.0  # share counted with the wrong direction, below 0.5

    def __post_init__(self) -> None:
        """Refuse what cannot be reckoned with."""
        if not (0 < self.recall_entering <= 1 and 0 < self.recall_leaving <= 1):
            raise ValueError("a recall must be above 0 and at most 1")
        if not (0 <= self.direction_error < 0.5 and self.recall_se >= 0):
            raise ValueError("direction_error must be 0 to below 0.5, recall_se not negative")


def share_occupied(occupied_us: FloatArray, listened_us: FloatArray) -> FloatArray:
    """Share of the time listened in which somebody was in the beam; NaN where nobody listened.

    Notes
    -----
    ``occupied_us`` is the union of all presences, so the share never exceeds 1; their sum over time
    would. People at random at rate q, each there for D, occupy a share of 1 - exp(-q D).
    """
    listened = np.asarray(listened_us, float)
    share: FloatArray = np.full(listened.shape, np.nan)
    np.divide(occupied_us, listened, out=share, where=listened > 0)
    return np.minimum(share, 1.0, out=share)


def number_inside(entered: FloatArray, left: FloatArray, error: DoorError) -> tuple[FloatArray, FloatArray]:
    """Change of the number inside by those counted at a door, with its variance.

    Parameters
    ----------
    entered, left : arrays of one shape, counted since some moment

    Returns
    -------
    net, variance : arrays of that shape; net is true entries less true exits

    Notes
    -----
    Of true entries a share r_in (1 - p) is counted as such and r_in p as exits, with recall r and
    direction error p; of exits likewise. Solved for the true numbers, of those seen
    ((1 - p) entered - p left) / (1 - 2 p) went in (not less than none, not more than all) and the others
    out; over r_in and r_out. So net = a entered - b left with a = ((1 - p) / r_in + p / r_out) / (1 - 2 p)
    and b the same with in and out swapped. One true entry adds r_in ((1 - p) a^2 + p b^2) - 1 to the
    variance, one true exit r_out ((1 - p) b^2 + p a^2) - 1.
    Recalls that are themselves off by a standard error s add (s E / r_in)^2 + (s X / r_out)^2, which
    grows with the square of the flow. Derived here; checked by simulation.

    1,000 each way at recall 0.95 give a standard deviation of 9.75 counted, at direction error 0.02
    (recall 1) 12.5 counted; the variance here is that of the corrected net.
    """
    r_in, r_out, p = error.recall_entering, error.recall_leaving, error.direction_error
    entered, left = np.asarray(entered, float), np.asarray(left, float)
    a = ((1 - p) / r_in + p / r_out) / (1 - 2 * p)
    b = (p / r_in + (1 - p) / r_out) / (1 - 2 * p)
    seen = entered + left
    seen_in = np.clip(((1 - p) * entered - p * left) / (1 - 2 * p), 0, seen)
    true_in, true_out = seen_in / r_in, (seen - seen_in) / r_out
    variance = true_in * (r_in * ((1 - p) * a**2 + p * b**2) - 1)
    variance += true_out * (r_out * ((1 - p) * b**2 + p * a**2) - 1)
    variance += (error.recall_se * true_in / r_in) ** 2 + (error.recall_se * true_out / r_out) ** 2
    return true_in - true_out, variance
