"""Charts of the page How fast."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
from bokeh.models import ColumnDataSource, FixedTicker
from bokeh.models.annotations import BoxAnnotation, Label, Span
from bokeh.plotting import figure

from ginnel.reports.speed_profile import SpeedProfile
from ginnel.stats import SpeedSummary
from ginnel.web.answers.fast import FEW, Fast
from ginnel.web.drawing.along import hours_in, plot_along
from ginnel.web.drawing.scheme import FONT, Scheme, bare, dressed, fill_of, hover, plain_ticks, ticks
from ginnel.web.wording import PER_MPS, Wording, name_of


def draw(fast: Fast, wording: Wording, scheme: Scheme) -> dict[str, figure]:
    """Draw all charts of the page, by the id of their place."""
    if not fast.all.summary.n:
        return {}
    charts = {"speeds": speeds(fast, wording, scheme)}
    if any(one.summary.n >= FEW for one in fast.along):
        charts["trend"] = trend(fast, wording, scheme)
    if any(one.n >= FEW for one in fast.by_hour):
        charts["clock"] = clock(fast, wording, scheme)
    return charts


def speeds(fast: Fast, wording: Wording, scheme: Scheme) -> figure:
    """Draw the histogram, directions stacked, with the pace behind it and the percentiles above."""
    scale = PER_MPS[wording.units]
    edges = fast.all.edges_mps * scale
    width = edges[1] - edges[0]
    highest = float(fast.all.counts.max()) * 1.3
    plot = bare((max(edges[0] - 3 * width, 0.0), edges[-1] + 3 * width), (0, highest), 300)
    if fast.all.pace is not None:
        plot.add_layout(
            BoxAnnotation(
                left=fast.all.pace.low_mps * scale,
                right=fast.all.pace.high_mps * scale,
                fill_color=scheme.faint,
                fill_alpha=0.35,
                line_color=None,
                level="underlay",
            )
        )
    base = np.zeros(len(edges) - 1)
    for profile in fast.profiles[:-1]:
        counts = _aligned(profile, fast)
        assert profile.direction is not None  # noqa: S101 (only the last one is of all)
        name = name_of(profile.direction, fast.view.sensor)
        source = ColumnDataSource(
            {
                "left": edges[:-1].tolist(),
                "right": edges[1:].tolist(),
                "bottom": base.tolist(),
                "top": (base + counts).tolist(),
                "count": [wording.number(int(n)) for n in counts],
                "band": [
                    f"{wording.number(a, 1)} to {wording.number(b, 1)} {wording.units}"
                    for a, b in pairwise(edges)
                ],
                "way": [name] * len(counts),
            }
        )
        bars = plot.quad(
            left="left",
            right="right",
            top="top",
            bottom="bottom",
            source=source,
            legend_label=name,
            **fill_of(profile.direction, scheme),
        )
        plot.add_tools(hover([("", "@band"), ("", "@count @way")], [bars]))
        base = base + counts
    for percent in (15, 50, 85, 95):
        _mark(plot, fast.all.summary, percent, scale, highest, scheme)
    if fast.limit_mps is not None:
        plot.add_layout(
            Span(location=fast.limit_mps * scale, dimension="height", line_color=scheme.mark, line_width=3)
        )
    plot.xaxis.axis_label = wording.units
    plain_ticks(plot)
    ticks(plot, 0, highest, wording.number)
    return dressed(plot, scheme)


def trend(fast: Fast, wording: Wording, scheme: Scheme) -> figure:
    """Draw median and 85th percentile along the view."""
    plot = plot_along(fast.view, wording, 240)
    middle = [(hours_in(fast.view, one.start_us) + hours_in(fast.view, one.end_us)) / 2 for one in fast.along]
    _percentile_lines(plot, middle, [one.summary for one in fast.along], wording, scheme)
    return dressed(plot, scheme)


def clock(fast: Fast, wording: Wording, scheme: Scheme) -> figure:
    """Draw median and 85th percentile by hour of the clock."""
    plot = bare((0, 24), None, 240)
    _percentile_lines(plot, [hour + 0.5 for hour in range(24)], fast.by_hour, wording, scheme)
    plot.xaxis.ticker = FixedTicker(ticks=list(range(0, 25, 3)))
    plot.xaxis.major_label_overrides = {at: f"{at:02}" for at in range(0, 25, 3)}
    return dressed(plot, scheme)


def _percentile_lines(
    plot: figure,
    x: list[float],
    summaries: tuple[SpeedSummary, ...] | list[SpeedSummary],
    wording: Wording,
    scheme: Scheme,
) -> None:
    scale = PER_MPS[wording.units]
    for name, field, marker, dash in (
        ("85 % were slower", "p85_mps", "circle", "solid"),
        ("half were slower", "p50_mps", "square", "dashed"),
    ):
        values = [
            getattr(one, field) * scale if one.n >= FEW and getattr(one, field) is not None else math.nan
            for one in summaries
        ]
        source = ColumnDataSource(
            {
                "x": x,
                "y": values,
                "text": [
                    wording.number(v, wording.speed_decimals) if math.isfinite(v) else "" for v in values
                ],
                "n": [wording.number(one.n) for one in summaries],
            }
        )
        colour = scheme.ink if field == "p85_mps" else scheme.quiet
        plot.line(
            x="x", y="y", source=source, line_color=colour, line_width=2, line_dash=dash, legend_label=name
        )
        points = plot.scatter(
            x="x", y="y", source=source, marker=marker, size=6, color=colour, legend_label=name
        )
        plot.add_tools(hover([(name, f"@text {wording.units}"), ("of passages", "@n")], [points]))
    plot.y_range.only_visible = True  # type: ignore[attr-defined]
    plot.yaxis.axis_label = wording.units


def _aligned(profile: SpeedProfile, fast: Fast) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Counts of a direction over the edges of all."""
    counts = np.zeros(len(fast.all.counts))
    if len(profile.counts):
        at = round((profile.edges_mps[0] - fast.all.edges_mps[0]) / fast.bin_mps)
        counts[at : at + len(profile.counts)] = profile.counts
    return counts


def _mark(
    plot: figure, summary: SpeedSummary, percent: int, scale: float, highest: float, scheme: Scheme
) -> None:
    value_mps: float | None = getattr(summary, f"p{percent}_mps")
    if value_mps is None:
        return
    strong = percent == 85
    plot.add_layout(
        Span(
            location=value_mps * scale,
            dimension="height",
            line_color=scheme.ink,
            line_width=2 if strong else 1,
            line_dash="solid" if strong else "dotted",
        )
    )
    plot.add_layout(
        Label(
            x=value_mps * scale,
            y=highest,
            x_offset=4,
            y_offset=-4 if percent in (15, 85) else -20,
            text=f"{percent} %",
            text_color=scheme.ink,
            text_baseline="top",
            text_font=FONT,
            text_font_size="12px",
        )
    )
