"""The charts of a day, as documents that the chart library's script draws.

Time runs in hours since the day began, so that a day of 23 or 25 hours is drawn as long as it was;
the ticks say what the local clock showed. What was not listened to is hatched, never drawn as zero.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from bokeh.core.types import ID
from bokeh.embed import json_item
from bokeh.models import ColumnDataSource, FixedTicker, HoverTool
from bokeh.models.annotations import BoxAnnotation, Label, Span
from bokeh.models.ranges import Range1d
from bokeh.plotting import figure

from ginnel.times import from_us
from ginnel.web.day import US_PER_HOUR, Day, name_of
from ginnel.words import Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class Scheme:
    """Colours of the charts; they match the style sheet's."""

    ink: str
    faint: str
    approaching: str
    receding: str
    unknown: str
    mark: str

    def of(self, direction: Direction) -> str:
        """Colour of a direction."""
        return {
            Direction.APPROACHING: self.approaching,
            Direction.RECEDING: self.receding,
            Direction.UNKNOWN: self.unknown,
        }[direction]


SCHEMES = {
    "light": Scheme(
        ink="#35404a",
        faint="#c9c4b8",
        approaching="#2d7d78",
        receding="#c7822f",
        unknown="#8b8f94",
        mark="#8a2f4a",
    ),
    "dark": Scheme(
        ink="#c6ccc9",
        faint="#434d50",
        approaching="#58b3a8",
        receding="#dfa558",
        unknown="#868e90",
        mark="#e58aa5",
    ),
}
FONT = "system-ui, sans-serif"
_EVERY_THIRD = frozenset(f"{hour:02}:00" for hour in range(0, 24, 3))


def day_charts(day: Day, scheme: Scheme) -> dict[str, Any]:
    """Give every chart of a day, by the id of the place it goes to."""
    plots = {"flow": flow(day, scheme), "speed": speed(day, scheme), "coverage": coverage(day, scheme)}
    return {name: json_item(plot, ID(name)) for name, plot in plots.items() if plot is not None}


def flow(day: Day, scheme: Scheme) -> figure:
    """Draw counts by hour: approaching upwards, receding downwards from one line."""
    highest = max((row.count or 0 for hour in day.hours for row in hour.counts.values()), default=0)
    unknown = Direction.UNKNOWN in day.directions
    top = max(highest * (1.35 if unknown else 1.15), 4)
    plot = _bare(day, height=300, y_range=(-top, top))
    for start_us, end_us in day.gaps_us():
        _hatch(plot, _hours_in(day, start_us), _hours_in(day, end_us), scheme)
    above: dict[int, int] = {}
    for direction in day.directions:
        sign = -1 if direction is Direction.RECEDING else 1
        shown = [(hour, hour.counts[direction]) for hour in day.hours if direction in hour.counts]
        base = [above.get(hour.start_us, 0) if sign > 0 else 0 for hour, _ in shown]
        tops = [low + sign * (row.count or 0) for low, (_, row) in zip(base, shown, strict=True)]
        if sign > 0:
            above |= {hour.start_us: high for high, (hour, _) in zip(tops, shown, strict=True)}
        source = ColumnDataSource(
            {
                "left": [_hours_in(day, hour.start_us) + 0.1 for hour, _ in shown],
                "right": [_hours_in(day, hour.end_us) - 0.1 for hour, _ in shown],
                "bottom": base,
                "top": tops,
                "hour": [hour.label for hour, _ in shown],
                "count": [str(row.count) for _, row in shown],
                "listened": [f"{hour.coverage:.0%}" for hour, _ in shown],
                "way": [name_of(direction, day.sensor)] * len(shown),
            }
        )
        bars = plot.quad(
            left="left",
            right="right",
            top="top",
            bottom="bottom",
            source=source,
            fill_color=scheme.of(direction),
            line_color=None,
        )
        tips = [("from", "@hour"), ("", "@count @way"), ("listened", "@listened")]
        plot.add_tools(HoverTool(renderers=[bars], tooltips=tips))
    plot.add_layout(Span(location=0, dimension="width", line_color=scheme.ink, line_width=1))
    step = _step(top)
    ticks = [step * i for i in range(-int(top // step), int(top // step) + 1)]
    plot.yaxis.ticker = FixedTicker(ticks=ticks)
    plot.yaxis.major_label_overrides = {tick: f"{abs(tick)}" for tick in ticks}
    return _dressed(plot, scheme)


def speed(day: Day, scheme: Scheme) -> figure | None:
    """Draw the speeds as a histogram, the directions stacked, with the 85th percentile; None without any."""
    edges = day.speeds.edges_mps
    if len(edges) < 2:
        return None
    highest = float(np.sum(list(day.speeds.counts.values()), axis=0).max()) * 1.2
    width = edges[1] - edges[0]
    plot = figure(
        height=260,
        x_range=Range1d(start=max(edges[0] - 5 * width, 0.0), end=edges[-1] + 5 * width),
        y_range=Range1d(start=0, end=highest),
        sizing_mode="stretch_width",
        toolbar_location=None,
        tools="",
    )
    base = [0.0] * (len(edges) - 1)
    for direction in day.directions:
        tops = [low + n for low, n in zip(base, day.speeds.counts[direction].tolist(), strict=True)]
        source = ColumnDataSource(
            {
                "left": edges[:-1],
                "right": edges[1:],
                "bottom": base,
                "top": tops,
                "count": [f"{n:.0f}" for n in day.speeds.counts[direction]],
                "band": [f"{a:.1f} to {b:.1f} m/s" for a, b in pairwise(edges)],
                "way": [name_of(direction, day.sensor)] * len(tops),
            }
        )
        bars = plot.quad(
            left="left",
            right="right",
            top="top",
            bottom="bottom",
            source=source,
            fill_color=scheme.of(direction),
            line_color=None,
        )
        plot.add_tools(HoverTool(renderers=[bars], tooltips=[("", "@band"), ("", "@count @way")]))
        base = tops
    p85 = day.speeds.summaries[None].p85_mps
    if p85 is not None:
        is_right = p85 > (edges[0] + edges[-1]) / 2
        plot.add_layout(Span(location=p85, dimension="height", line_color=scheme.mark, line_width=2))
        plot.add_layout(
            Label(
                x=p85,
                y=highest,
                x_offset=-6 if is_right else 6,
                text_align="right" if is_right else "left",
                y_offset=-4,
                text=f"85 % below {p85:.2f} m/s",
                text_color=scheme.mark,
                text_baseline="top",
                text_font=FONT,
                text_font_size="13px",
            )
        )
    plot.xaxis.axis_label = "m/s"
    plot.yaxis.ticker = FixedTicker(ticks=list(range(0, int(highest) + 1, _step(highest))))
    return _dressed(plot, scheme)


def coverage(day: Day, scheme: Scheme) -> figure:
    """Draw when the sensor was listening, as a strip."""
    plot = _bare(day, height=74, y_range=(0, 1))
    plot.yaxis.visible = plot.ygrid.visible = False
    for start_us, end_us in day.gaps_us():
        _hatch(plot, _hours_in(day, start_us), _hours_in(day, end_us), scheme)
    source = ColumnDataSource(
        {
            "left": [_hours_in(day, stretch.started_us) for stretch in day.heard],
            "right": [_hours_in(day, stretch.ended_us) for stretch in day.heard],
            "from": [f"{from_us(stretch.started_us, day.zone):%H:%M:%S}" for stretch in day.heard],
            "to": [f"{from_us(stretch.ended_us, day.zone):%H:%M:%S}" for stretch in day.heard],
        }
    )
    heard = plot.quad(
        left="left",
        right="right",
        bottom=0,
        top=1,
        source=source,
        fill_color=scheme.ink,
        fill_alpha=0.7,
        line_color=None,
    )
    plot.add_tools(HoverTool(renderers=[heard], tooltips=[("listened from", "@from"), ("to", "@to")]))
    return _dressed(plot, scheme)


def _hours_in(day: Day, moment_us: int) -> float:
    return (moment_us - day.start_us) / US_PER_HOUR


def _bare(day: Day, height: int, y_range: tuple[float, float]) -> figure:
    """Make a plot over the hours of a day; every third hour has its clock time beneath it."""
    plot = figure(
        height=height,
        x_range=Range1d(start=0, end=_hours_in(day, day.end_us)),
        y_range=Range1d(start=y_range[0], end=y_range[1]),
        sizing_mode="stretch_width",
        toolbar_location=None,
        tools="",
    )
    starts = [_hours_in(day, hour.start_us) for hour in day.hours]
    third = {
        at: hour.label[:2] for at, hour in zip(starts, day.hours, strict=True) if hour.label in _EVERY_THIRD
    }
    plot.xaxis.ticker = FixedTicker(ticks=list(third), minor_ticks=starts)
    plot.xaxis.major_label_overrides = {at: label for at, label in third.items()}
    return plot


def _hatch(plot: figure, left: float, right: float, scheme: Scheme) -> None:
    plot.add_layout(
        BoxAnnotation(
            left=left,
            right=right,
            fill_color=None,
            line_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=scheme.faint,
            hatch_scale=9,
            hatch_weight=1,
            level="underlay",
        )
    )


def _step(top: float) -> int:
    """Choose a round distance between ticks that gives three to seven of them up to the top."""
    step, factors = 1, (2, 2.5, 2)
    for turn in range(30):
        if top / step <= 5:
            break
        step = int(step * factors[turn % 3])
    return step


def _dressed(plot: figure, scheme: Scheme) -> figure:
    plot.background_fill_color = plot.border_fill_color = None
    plot.outline_line_color = None
    plot.min_border_left, plot.min_border_right = 44, 12
    plot.grid.grid_line_color = None
    plot.ygrid.grid_line_color = scheme.faint
    plot.ygrid.grid_line_alpha = 0.5
    plot.axis.axis_line_color = None
    plot.yaxis.minor_tick_line_color = None
    plot.axis.major_tick_line_color = plot.xaxis.minor_tick_line_color = scheme.faint
    plot.axis.major_label_text_color = plot.axis.axis_label_text_color = scheme.ink
    plot.axis.major_label_text_font = plot.axis.axis_label_text_font = FONT
    plot.axis.major_label_text_font_size = plot.axis.axis_label_text_font_size = "12px"
    plot.axis.axis_label_text_font_style = "normal"
    return plot
