"""Charts of the page How busy."""

from __future__ import annotations

import math

import numpy as np
from bokeh.models import ColumnDataSource, FixedTicker, LinearColorMapper
from bokeh.models.annotations import ColorBar, Span
from bokeh.plotting import figure

from ginnel.reports.flow import TypicalWeek
from ginnel.web.answers.busy import Busy
from ginnel.web.drawing.along import hours_in, plot_along
from ginnel.web.drawing.scheme import Scheme, bare, dressed, fill_of, hatch, hover, ticks
from ginnel.web.wording import Wording, interval_name, name_of
from ginnel.words import Direction

_ARROWS = {Direction.APPROACHING: " ↑", Direction.RECEDING: " ↓"}


def draw(busy: Busy, wording: Wording, scheme: Scheme) -> dict[str, figure]:
    """Draw all charts of the page, by the id of their place."""
    charts = {"flow": flow(busy, wording, scheme)}
    if busy.week is not None and np.isfinite(busy.week.rate).any():
        charts["week"] = heat(busy.week, wording, scheme)
    return charts


def flow(busy: Busy, wording: Wording, scheme: Scheme) -> figure:
    """Draw counts: approaching upwards, receding downwards from one line; the usual total as a step line."""
    low, high = _reach(busy)
    plot = plot_along(busy.view, wording, 320, (low, high))
    for gap in busy.gaps:
        hatch(plot, hours_in(busy.view, gap.started_us), hours_in(busy.view, gap.ended_us), scheme)
    above: dict[int, int] = {}
    for direction in busy.directions:
        sign = -1 if direction is Direction.RECEDING else 1
        shown = [(one, one.counts[direction] or 0) for one in busy.intervals if one.both is not None]
        base = [above.get(one.start_us, 0) if sign > 0 else 0 for one, _ in shown]
        tops = [start + sign * count for start, (_, count) in zip(base, shown, strict=True)]
        if sign > 0:
            above |= {one.start_us: top for top, (one, _) in zip(tops, shown, strict=True)}
        gap_h = 0.08 * min(
            (hours_in(busy.view, one.end_us) - hours_in(busy.view, one.start_us) for one, _ in shown),
            default=1.0,
        )
        source = ColumnDataSource(
            {
                "left": [hours_in(busy.view, one.start_us) + gap_h for one, _ in shown],
                "right": [hours_in(busy.view, one.end_us) - gap_h for one, _ in shown],
                "bottom": base,
                "top": tops,
                "when": [interval_name(busy.view, busy.every, one.start_us, wording) for one, _ in shown],
                "count": [wording.number(count) for _, count in shown],
                "usual": [wording.number(one.usual.get(direction)) for one, _ in shown],
                "listened": [wording.share(one.coverage) for one, _ in shown],
                "way": [name_of(direction, busy.view.sensor)] * len(shown),
            }
        )
        bars = plot.quad(
            left="left",
            right="right",
            top="top",
            bottom="bottom",
            source=source,
            legend_label=name_of(direction, busy.view.sensor) + _ARROWS.get(direction, ""),
            **fill_of(direction, scheme),
        )
        tips = [("", "@when"), ("", "@count @way"), ("usual", "@usual"), ("listened", "@listened")]
        plot.add_tools(hover(tips, [bars]))
    _usual(plot, busy, scheme)
    plot.add_layout(Span(location=0, dimension="width", line_color=scheme.ink, line_width=1))
    ticks(plot, low, high, wording.number)
    return dressed(plot, scheme)


def heat(week: TypicalWeek, wording: Wording, scheme: Scheme) -> figure:
    """Draw the week: weekdays from top to bottom, hours from left to right, darker with more passages."""
    days, hours = np.mgrid[0:7, 0:24]
    rate = week.rate
    top = float(np.nanmax(rate)) or 1.0
    known = np.isfinite(rate).ravel()
    source = ColumnDataSource(
        {
            "hour": (hours.ravel() + 0.5)[known],
            "day": (6.5 - days.ravel())[known],
            "rate": rate.ravel()[known],
            "text": [wording.number(value, 1) for value in rate.ravel()[known]],
            "when": [
                f"{wording.weekday(int(day))} {hour:02}:00"
                for day, hour in zip(days.ravel()[known], hours.ravel()[known], strict=True)
            ],
            "heard": [wording.number(value) for value in week.listened_h.ravel()[known]],
        }
    )
    plot = bare((0, 24), (0, 7), 280)
    colours = LinearColorMapper(palette=list(scheme.ramp), low=0, high=top)
    cells = plot.rect(
        x="hour",
        y="day",
        width=0.94,
        height=0.9,
        source=source,
        line_color=None,
        fill_color={"field": "rate", "transform": colours},
    )
    plot.rect(
        x="hour",
        y="day",
        width=0.94,
        height=0.9,
        source=ColumnDataSource({"hour": (hours.ravel() + 0.5)[~known], "day": (6.5 - days.ravel())[~known]}),
        line_color=None,
        fill_color=None,
        hatch_pattern="right_diagonal_line",
        hatch_color=scheme.faint,
        hatch_scale=9,
        hatch_weight=1,
    )
    plot.add_tools(
        hover([("", "@when"), ("passages an hour", "@text"), ("hours listened", "@heard")], [cells])
    )
    bar = ColorBar(
        color_mapper=colours,
        width=10,
        padding=4,
        title=None,
        background_fill_color=None,
        major_label_text_color=scheme.quiet,
        major_label_text_font_size="12px",
        bar_line_color=None,
        major_tick_line_color=None,
    )
    plot.add_layout(bar, "right")
    plot.xaxis.ticker = FixedTicker(ticks=list(range(0, 25, 3)))
    plot.xaxis.major_label_overrides = {at: f"{at:02}" for at in range(0, 25, 3)}
    plot.yaxis.ticker = FixedTicker(ticks=[day + 0.5 for day in range(7)])
    plot.yaxis.major_label_overrides = {6.5 - day: wording.weekday(day, short=True) for day in range(7)}
    dressed(plot, scheme)
    plot.ygrid.grid_line_color = None
    return plot


def _reach(busy: Busy) -> tuple[float, float]:
    """How far the upright axis goes to both sides."""
    up = max(
        (
            sum(n or 0 for way, n in one.counts.items() if way is not Direction.RECEDING)
            for one in busy.intervals
        ),
        default=0,
    )
    down = max((one.counts.get(Direction.RECEDING) or 0 for one in busy.intervals), default=0)
    return -max(down * 1.1, 2.0), max(up * 1.1, 2.0)


def _usual(plot: figure, busy: Busy, scheme: Scheme) -> None:
    """Draw what is usual for each way as a step line, where it is known."""
    for direction, sign in ((Direction.APPROACHING, 1), (Direction.RECEDING, -1)):
        x: list[float] = []
        y: list[float] = []
        for one in busy.intervals:
            level = one.usual[direction]
            x += [hours_in(busy.view, one.start_us), hours_in(busy.view, one.end_us)]
            y += [math.nan if level is None else sign * level] * 2
        if any(math.isfinite(level) for level in y):
            plot.line(x, y, line_color=scheme.ink, line_width=1.5, legend_label="usual")
