"""Bar charts as small SVG drawings, for print: no script, no colour that grey paper would lose.

Drawn here since the charts of pages need a script, and drawing libraries that do not are large; fpdf2 takes
the same drawing into a PDF.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape

_WIDTH, _HEIGHT = 640, 170
_LEFT, _RIGHT, _TOP, _BOTTOM = 46, 6, 8, 22
_DARK, _LIGHT, _PALE = "#1f4e5f", "#8db3bf", "#e6e6e6"


@dataclass(frozen=True, slots=True, kw_only=True)
class Bar:
    """One bar; None is drawn as a pale band as high as the chart, which is not a zero."""

    label: str  # empty: none below this bar
    value: float | None
    is_partial: bool = False  # drawn lighter


def bar_chart(bars: Sequence[Bar]) -> str:
    """Draw bars from zero, with a scale on the left."""
    highest = max((bar.value for bar in bars if bar.value is not None), default=0.0)
    step = _step(highest)
    top = step * max(math.ceil(highest / step), 1)
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDTH} {_HEIGHT}" width="{_WIDTH}" '
        f'height="{_HEIGHT}" role="img" font-family="helvetica" font-size="10">'
    ]
    parts += _scale(step, top)
    width = (_WIDTH - _LEFT - _RIGHT) / max(len(bars), 1)
    for place, bar in enumerate(bars):
        parts += _bar(bar, _LEFT + place * width, width, top)
    parts.append("</svg>")
    return "".join(parts)


def _bar(bar: Bar, x: float, width: float, top: float) -> list[str]:
    value, fill = (top, _PALE) if bar.value is None else (bar.value, _LIGHT if bar.is_partial else _DARK)
    y = _y(value, top)
    parts = [
        f'<rect x="{x + 0.1 * width:.2f}" y="{y:.2f}" width="{0.8 * width:.2f}" '
        f'height="{_y(0, top) - y:.2f}" fill="{fill}"/>'
    ]
    if bar.label:
        parts.append(
            f'<text x="{x + width / 2:.2f}" y="{_HEIGHT - 8}" text-anchor="middle">{escape(bar.label)}</text>'
        )
    return parts


def _scale(step: float, top: float) -> list[str]:
    parts = []
    for tick in range(round(top / step) + 1):
        y = _y(tick * step, top)
        parts.append(
            f'<line x1="{_LEFT - 3}" x2="{_WIDTH - _RIGHT}" y1="{y:.2f}" y2="{y:.2f}" stroke="#999999" '
            'stroke-width="0.4"/>'
            f'<text x="{_LEFT - 6}" y="{y + 3:.2f}" text-anchor="end">{tick * step:g}</text>'
        )
    return parts


def _y(value: float, top: float) -> float:
    return _TOP + (_HEIGHT - _TOP - _BOTTOM) * (1 - value / top)


def _step(highest: float) -> float:
    """Round step of 1, 2 or 5 that makes three to six ticks."""
    if highest <= 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(highest / 3))
    return next(power * digit for digit in (1, 2, 5, 10) if highest / (power * digit) <= 5)
