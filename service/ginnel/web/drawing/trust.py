"""Charts of the page How sure."""

from __future__ import annotations

import math
from typing import Literal

from bokeh.models import ColumnDataSource, FixedTicker
from bokeh.plotting import figure

from ginnel.web.answers.trust import Trust
from ginnel.web.drawing.along import hours_in, plot_along
from ginnel.web.drawing.scheme import Scheme, dressed, hatch, hover
from ginnel.web.wording import Wording


def draw(trust: Trust, wording: Wording, scheme: Scheme) -> dict[str, figure]:
    """Draw all charts of the page, by the id of their place."""
    charts = {"coverage": coverage(trust, wording, scheme)}
    if trust.course:
        charts["level"] = level(trust, wording, scheme)
        charts["lines"] = lines(trust, wording, scheme)
    return charts


def level(trust: Trust, wording: Wording, scheme: Scheme) -> figure:
    """Draw level and noise floor along the view."""
    return _courses(
        trust,
        wording,
        scheme,
        (("level", "level_dbfs", "circle"), ("noise", "noise_dbfs_hz", "square")),
        "dB",
    )


def lines(trust: Trust, wording: Wording, scheme: Scheme) -> figure:
    """Draw how far hum and lamp lines stand above the noise."""
    return _courses(
        trust,
        wording,
        scheme,
        (("hum", "hum_db", "circle"), ("lamps", "lamp_db", "square")),
        "dB over noise",
    )


def _courses(
    trust: Trust,
    wording: Wording,
    scheme: Scheme,
    courses: tuple[tuple[str, str, Literal["circle", "square"]], ...],
    unit: str,
) -> figure:
    plot = plot_along(trust.view, wording, 200)
    at = [hours_in(trust.view, one.at_us) for one in trust.course]
    when = [wording.moment(one.at_us) for one in trust.course]
    for name, field, marker in courses:
        values = [math.nan if getattr(one, field) is None else getattr(one, field) for one in trust.course]
        source = ColumnDataSource(
            {
                "x": at,
                "y": values,
                "when": when,
                "text": [wording.number(v, 1) if v == v else "" for v in values],
            }
        )
        colour = scheme.approaching if marker == "circle" else scheme.receding
        points = plot.scatter(
            x="x", y="y", source=source, marker=marker, size=4, color=colour, legend_label=name
        )
        plot.add_tools(hover([("", "@when"), (name, f"@text {unit}")], [points]))
    plot.yaxis.axis_label = unit
    return dressed(plot, scheme)


def coverage(trust: Trust, wording: Wording, scheme: Scheme) -> figure:
    """Draw the share of each interval that was listened to, with the gaps hatched."""
    view = trust.view
    plot = plot_along(view, wording, 180, (0, 1))
    for gap in trust.gaps:
        hatch(plot, hours_in(view, gap.started_us), hours_in(view, gap.ended_us), scheme)
    source = ColumnDataSource(
        {
            "left": [hours_in(view, start_us) for start_us, _, _ in trust.coverage],
            "right": [hours_in(view, end_us) for _, end_us, _ in trust.coverage],
            "top": [share for _, _, share in trust.coverage],
            "text": [wording.share(share, 1) for _, _, share in trust.coverage],
            "when": [wording.moment(start_us) for start_us, _, _ in trust.coverage],
        }
    )
    bars = plot.quad(
        left="left",
        right="right",
        bottom=0,
        top="top",
        source=source,
        fill_color=scheme.quiet,
        fill_alpha=0.75,
        line_color=None,
    )
    plot.add_tools(hover([("", "@when"), ("listened", "@text")], [bars]))
    plot.yaxis.ticker = FixedTicker(ticks=[0, 0.5, 1])
    plot.yaxis.major_label_overrides = {at: wording.share(at) for at in (0, 0.5, 1)}
    return dressed(plot, scheme)
