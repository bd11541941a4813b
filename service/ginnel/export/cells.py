"""The cells of a table, some thousands of rows at a time, a column each.

Four kinds of cells, all arrays of shape (n,) at heart: `Coded` texts, of which there are few
different ones; `Numbered` texts, which differ in every row; moments as ``datetime64[us]``, UTC; numbers,
whole or not, as floats. Blank are the empty text, NaT and NaN.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from ginnel.export.columns import Column, Kind
from ginnel.store import Coded
from ginnel.times import from_us
from ginnel.words import FloatArray

if TYPE_CHECKING:
    from typing_extensions import TypeIs


@dataclass(frozen=True, slots=True, kw_only=True)
class Numbered:
    """Texts made of a word, a dash and a whole number, as lasting names are."""

    word: Coded
    number: NDArray[np.int64]


Moments = NDArray[np.datetime64]
Cells = Coded | Numbered | Moments | FloatArray
Batch = tuple[Cells, ...]


def coded(texts: Sequence[str]) -> Coded:
    """Texts as cells."""
    words = {text: code for code, text in enumerate(dict.fromkeys(texts))}
    return Coded(codes=np.array([words[text] for text in texts], np.int64), words=tuple(words))


def moments(us: Sequence[int] | NDArray[np.int64]) -> Moments:
    """Microseconds since 1970 UTC as cells."""
    return np.asarray(us, np.int64).view("datetime64[us]")


def numbers(values: Sequence[float | None]) -> FloatArray:
    """Numbers as cells; None is blank."""
    return np.array(values, float)


def is_moments(cells: Moments | FloatArray) -> TypeIs[Moments]:
    """Tell moments from numbers."""
    return cells.dtype.kind == "M"


def n_rows(batch: Batch) -> int:
    """How many rows a batch has."""
    first = batch[0]
    return len(
        first.codes if isinstance(first, Coded) else first.number if isinstance(first, Numbered) else first
    )


def in_last_places(cells: FloatArray, decimals: int) -> FloatArray:
    """Numbers as whole multiples of their last decimal place, halves away from zero; NaN stays."""
    return np.copysign(np.floor(np.abs(cells) * 10.0**decimals + 0.5), cells)


def rounded(column: Column, cells: FloatArray) -> FloatArray:
    """Numbers with the decimals that the column promises, never -0."""
    return in_last_places(cells, column.decimals) / 10.0**column.decimals + 0.0


def values(column: Column, cells: Cells, zone: tzinfo) -> list[str | float | int | datetime | None]:
    """Cells as Python's own values; None where blank, moments in a zone."""
    if isinstance(cells, Coded):
        return [cells.words[code] or None for code in cells.codes.tolist()]
    if isinstance(cells, Numbered):
        return [
            f"{cells.word.words[code]}-{number}"
            for code, number in zip(cells.word.codes.tolist(), cells.number.tolist(), strict=True)
        ]
    if is_moments(cells):
        known = zip(cells.view(np.int64).tolist(), np.isnat(cells).tolist(), strict=True)
        return [None if blank else from_us(us, zone) for us, blank in known]
    listed = rounded(column, cells).tolist()
    if column.kind is Kind.WHOLE:
        return [None if one != one else int(one) for one in listed]
    return [None if one != one else one for one in listed]
