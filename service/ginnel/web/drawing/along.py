"""Plots along time: in hours since the view began, so that a day is drawn as long as it was.

A day of 23 or 25 hours is; the marks below say what the local clock showed.
"""

from __future__ import annotations

from bokeh.models import FixedTicker
from bokeh.plotting import figure

from ginnel import reports
from ginnel.reports import Every
from ginnel.times import from_us
from ginnel.web.drawing.scheme import bare
from ginnel.web.view import View
from ginnel.web.wording import Wording
from ginnel.words import US_PER_S

US_PER_HOUR = 3600 * US_PER_S


def hours_in(view: View, moment_us: int) -> float:
    """Hours from the start of a view to a moment."""
    return (moment_us - view.start_us) / US_PER_HOUR


def plot_along(
    view: View, wording: Wording, height: int, y_range: tuple[float, float] | None = None
) -> figure:
    """Make a plot over a view, with its calendar beneath."""
    plot = bare((0.0, hours_in(view, view.end_us)), y_range, height)
    labels = _labels(view, wording)
    plot.xaxis.ticker = FixedTicker(ticks=list(labels))
    plot.xaxis.major_label_overrides = {at: text for at, text in labels.items()}
    return plot


def _labels(view: View, wording: Wording) -> dict[float, str]:
    """Calendar marks, at most about a dozen of them, by their place."""
    n = view.n_days
    every = Every.HOUR if n <= 2 else Every.DAY if n <= 45 else Every.MONTH
    edges = reports.cut(view.start_us, view.end_us, every, view.zone)[:-1]
    labels: dict[float, str] = {}
    for moment_us in edges.tolist():
        if moment_us < view.start_us:
            continue
        local = from_us(moment_us, view.zone)
        match every:
            case Every.HOUR:
                wanted, text = local.hour % (3 if n == 1 else 6) == 0, f"{local:%H}"
            case Every.DAY:
                wanted = n <= 8 or (local.day % 5 == 1 and local.day < 31)
                text = (
                    f"{wording.weekday(local.weekday(), short=True)} {local.day}"
                    if n <= 8
                    else f"{local.day}"
                )
            case _:
                wanted = n <= 800 or local.month == 1
                text = wording.month(local.month) if local.month > 1 else f"{local.year}"
        if wanted:
            labels[hours_in(view, moment_us)] = text
    return labels
