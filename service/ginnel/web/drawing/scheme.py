"""Colours and dress of all charts; the colours match the style sheet's."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from bokeh.models import BasicTicker, BoxZoomTool, FixedTicker, HoverTool, ResetTool
from bokeh.models.annotations import BoxAnnotation, Legend
from bokeh.models.ranges import Range1d
from bokeh.plotting import figure

from ginnel.words import Direction

FONT = "system-ui, sans-serif"


@dataclass(frozen=True, slots=True, kw_only=True)
class Scheme:
    """Colours for light or dark surroundings."""

    ink: str
    quiet: str
    faint: str
    approaching: str
    receding: str
    unknown: str
    mark: str
    paper: str
    ramp: tuple[str, ...]  # from few to many

    def of(self, direction: Direction | None) -> str:
        """Colour of a direction."""
        colours = {
            Direction.APPROACHING: self.approaching,
            Direction.RECEDING: self.receding,
            Direction.UNKNOWN: self.unknown,
            None: self.ink,
        }
        return colours[direction]


def _ramp(first: tuple[int, int, int], last: tuple[int, int, int], steps: int = 9) -> tuple[str, ...]:
    """Colours in even steps of one hue: lightness alone tells the order."""
    mixed = [
        [round(a + (b - a) * step / (steps - 1)) for a, b in zip(first, last, strict=True)]
        for step in range(steps)
    ]
    return tuple("#" + "".join(f"{part:02x}" for part in one) for one in mixed)


SCHEMES = {
    "light": Scheme(
        ink="#222c33",
        quiet="#5b656d",
        faint="#c9c4b8",
        approaching="#1f6f6b",
        receding="#c07a2a",
        unknown="#8b9196",
        mark="#8a2f4a",
        paper="#faf8f3",
        ramp=_ramp((0xEC, 0xEF, 0xEA), (0x0E, 0x4A, 0x50)),
    ),
    "dark": Scheme(
        ink="#e2e6e3",
        quiet="#a3adaf",
        faint="#46525a",
        approaching="#5fbcb1",
        receding="#e0a860",
        unknown="#8d9598",
        mark="#ee9ab2",
        paper="#12181b",
        ramp=_ramp((0x1F, 0x29, 0x2C), (0x9D, 0xE0, 0xD6)),
    ),
}
#: Patterns beside the colours, for eyes and printers that do not tell these apart.
PATTERNS = {Direction.APPROACHING: None, Direction.RECEDING: "right_diagonal_line", Direction.UNKNOWN: "dot"}


def bare(x_range: tuple[float, float], y_range: tuple[float, float] | None, height: int) -> figure:
    """Make an empty plot that fills the width, with a box to zoom into and a way back."""
    plot = figure(
        height=height,
        x_range=Range1d(start=x_range[0], end=x_range[1]),
        sizing_mode="stretch_width",
        toolbar_location="above",
        tools=[BoxZoomTool(dimensions="width"), ResetTool()],
        active_drag=None,  # a finger that moves over the chart scrolls the page
    )
    if y_range is not None:
        plot.y_range = Range1d(start=y_range[0], end=y_range[1])
    plot.toolbar.autohide = True
    plot.toolbar.logo = None
    return plot


def dressed(plot: figure, scheme: Scheme) -> figure:
    """Give a plot the colours and the type of the page."""
    plot.background_fill_color = plot.border_fill_color = None
    plot.outline_line_color = None
    plot.min_border_left, plot.min_border_right = 48, 14
    plot.grid.grid_line_color = None
    plot.ygrid.grid_line_color = scheme.faint
    plot.ygrid.grid_line_alpha = 0.6
    plot.axis.axis_line_color = None
    plot.axis.minor_tick_line_color = None
    plot.axis.major_tick_line_color = scheme.faint
    plot.axis.major_label_text_color = plot.axis.axis_label_text_color = scheme.quiet
    plot.axis.major_label_text_font = plot.axis.axis_label_text_font = FONT
    plot.axis.major_label_text_font_size = plot.axis.axis_label_text_font_size = "12px"
    plot.axis.axis_label_text_font_style = "normal"
    if not plot.legend:
        return plot
    plot.legend.click_policy = "hide"
    plot.legend.ncols = 2  # side by side they would stick out of a phone
    plot.legend.background_fill_color = plot.legend.border_line_color = None
    plot.legend.label_text_color = scheme.ink
    plot.legend.label_text_font = FONT
    plot.legend.label_text_font_size = "12px"
    for legend in [one for one in plot.center if isinstance(one, Legend)]:
        legend.padding, legend.margin = 0, 4  # type: ignore[assignment]
        plot.center.remove(legend)
        plot.add_layout(legend, "above")
    return plot


def fill_of(direction: Direction, scheme: Scheme) -> dict[str, Any]:
    """Colour and pattern of a direction's bars."""
    return {
        "fill_color": scheme.of(direction),
        "line_color": None,
        "hatch_pattern": PATTERNS[direction],
        "hatch_color": scheme.paper,
        "hatch_alpha": 0.55,
        "hatch_scale": 6,
        "hatch_weight": 1.2,
    }


def hatch(plot: figure, left: float, right: float, scheme: Scheme) -> None:
    """Mark a stretch that was not listened to."""
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


def hover(tips: list[tuple[str, str]], renderers: list[Any]) -> HoverTool:
    """Show values where the pointer is; no button for it."""
    return HoverTool(renderers=renderers, tooltips=tips, visible=False)


def ticks(plot: figure, low: float, high: float, text: Any) -> None:
    """Label the upright axis with round whole numbers in the site's way of writing."""
    step = step_to(max(abs(low), abs(high)))
    first, last = int(low // step), int(high // step)
    marks = [step * i for i in range(first, last + 1) if low <= step * i <= high]
    plot.yaxis.ticker = FixedTicker(ticks=marks)
    plot.yaxis.major_label_overrides = {mark: text(abs(mark)) for mark in marks}


def share_ticks(plot: figure, top: float, text: Callable[[float, int], str]) -> None:
    """Label the upright axis with round shares from nothing to the top."""
    thousandth = step_to(max(1000 * top, 1.0)) / 1000
    marks = [thousandth * i for i in range(int(top / thousandth) + 1)]
    plot.yaxis.ticker = FixedTicker(ticks=marks)
    plot.yaxis.major_label_overrides = {mark: text(mark, 0 if thousandth >= 0.01 else 1) for mark in marks}


def step_to(top: float) -> int:
    """Choose a round distance between ticks that gives three to seven of them up to the top."""
    step, factors = 1, (2, 2.5, 2)
    for turn in range(30):
        if top / step <= 5:
            break
        step = int(step * factors[turn % 3])
    return step


def plain_ticks(plot: figure, wanted: int = 6) -> None:
    """Few ticks along the lower axis."""
    plot.xaxis.ticker = BasicTicker(desired_num_ticks=wanted)
