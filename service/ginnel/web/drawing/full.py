"""Charts of the page How full."""

from __future__ import annotations

import math

from bokeh.models import ColumnDataSource
from bokeh.plotting import figure

from ginnel.reports import InsideRow
from ginnel.web.answers.full import Full
from ginnel.web.drawing.along import hours_in, plot_along
from ginnel.web.drawing.scheme import Scheme, dressed, hatch, hover, share_ticks, ticks
from ginnel.web.wording import Wording, interval_name


def draw(full: Full, wording: Wording, scheme: Scheme) -> dict[str, figure]:
    """Draw all charts of the page, by the id of their place."""
    charts = {"occupied": occupied(full, wording, scheme)} if full.rows else {}
    for number, inside in enumerate(full.spaces):
        if any(row.inside is not None for row in inside.rows):
            charts[f"inside-{number}"] = number_inside(full, inside.rows, wording, scheme)
    return charts


def occupied(full: Full, wording: Wording, scheme: Scheme) -> figure:
    """Draw the share of time in which somebody was in the beam."""
    view = full.view
    known = [row for row in full.rows if row.occupancy is not None]
    top = max((row.occupancy or 0.0 for row in known), default=0.0)
    plot = plot_along(view, wording, 260, (0, max(min(top * 1.15, 1.0), 0.01)))
    for row in full.rows:
        if row.occupancy is None:
            hatch(plot, hours_in(view, row.interval_start_us), hours_in(view, row.interval_end_us), scheme)
    source = ColumnDataSource(
        {
            "left": [hours_in(view, row.interval_start_us) for row in known],
            "right": [hours_in(view, row.interval_end_us) for row in known],
            "top": [row.occupancy for row in known],
            "text": [wording.share(row.occupancy, 1) for row in known],
            "when": [interval_name(view, full.every, row.interval_start_us, wording) for row in known],
            "listened": [wording.share(row.coverage) for row in known],
        }
    )
    bars = plot.quad(
        left="left",
        right="right",
        bottom=0,
        top="top",
        source=source,
        fill_color=scheme.approaching,
        line_color=scheme.paper,
    )
    plot.add_tools(hover([("", "@when"), ("somebody there", "@text"), ("listened", "@listened")], [bars]))
    share_ticks(plot, max(min(top * 1.15, 1.0), 0.01), wording.share)
    return dressed(plot, scheme)


def number_inside(full: Full, rows: tuple[InsideRow, ...], wording: Wording, scheme: Scheme) -> figure:
    """Draw the number inside with its band of uncertainty."""
    view = full.view
    top = max((row.high or 0.0 for row in rows), default=1.0)
    plot = plot_along(view, wording, 260, (0, max(top * 1.1, 2.0)))
    source = ColumnDataSource(
        {
            "x": [hours_in(view, row.interval_end_us) for row in rows],
            "inside": [_or_nan(row.inside) for row in rows],
            "low": [_or_nan(row.low) for row in rows],
            "high": [_or_nan(row.high) for row in rows],
            "text": [wording.number(row.inside) for row in rows],
            "band": [f"{wording.number(row.low)} to {wording.number(row.high)}" for row in rows],
            "when": [wording.moment(row.interval_end_us) for row in rows],
        }
    )
    plot.varea(
        x="x",
        y1="low",
        y2="high",
        source=source,
        fill_color=scheme.approaching,
        fill_alpha=0.22,
        legend_label="95 % of the doubt",
    )
    line = plot.line(
        x="x", y="inside", source=source, line_color=scheme.approaching, line_width=2, legend_label="inside"
    )
    plot.add_tools(hover([("", "@when"), ("inside", "@text"), ("95 %", "@band")], [line]))
    ticks(plot, 0, top * 1.1, wording.number)
    return dressed(plot, scheme)


def _or_nan(value: float | None) -> float:
    return math.nan if value is None else value
