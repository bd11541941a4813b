"""Rows as lines of text: CSV by RFC 4180 and JSON lines, hundreds of thousands a second.

A batch of rows is laid out as a matrix of bytes, one row a line, in which 0 stands for no
character; leaving the zeros out gives the lines. So each column costs a few array operations, and
nothing is done row by row.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import UTC, tzinfo
from functools import cache

import numpy as np
from numpy.typing import NDArray

from ginnel.export.cells import Batch, Cells, Moments, Numbered, in_last_places, is_moments, n_rows
from ginnel.export.columns import Column
from ginnel.store import Coded
from ginnel.times import from_us
from ginnel.words import US_PER_S, FloatArray

Characters = NDArray[np.uint8]  # shape (n, width)
IntArray = NDArray[np.int64]

_DAY_S = 86_400


@dataclass(frozen=True, slots=True, kw_only=True)
class Style:
    """How a line is written."""

    before: Callable[[int, str], str]  # what stands before a cell, by the number and name of its column
    after: str  # what ends the line
    blank: str
    quoted: Callable[[str], str]
    moment_quote: str


def csv_header(columns: Sequence[Column]) -> bytes:
    """First line of a CSV file."""
    return (",".join(_csv_text(column.name) for column in columns) + "\r\n").encode()


def csv_lines(columns: Sequence[Column], batch: Batch, zone: tzinfo) -> bytes:
    """Lines of CSV; text that a spreadsheet would take for a formula is made harmless."""
    return _lines(columns, batch, zone, _CSV)


def json_lines(columns: Sequence[Column], batch: Batch, zone: tzinfo) -> bytes:
    """Lines of JSON, each an object with every column; null where blank."""
    return _lines(columns, batch, zone, _JSON)


def safe_text(text: str) -> str:
    """Text that no spreadsheet takes for a formula; an apostrophe goes before what looks like one."""
    return f"'{text}" if text.startswith(("=", "+", "-", "@", "\t", "\r", "\n")) else text


def _csv_text(text: str) -> str:
    """Quoted by RFC 4180 where it must be."""
    safe = safe_text(text)
    if any(character in safe for character in ',"\r\n'):
        return '"' + safe.replace('"', '""') + '"'
    return safe


def _json_text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)


_CSV = Style(
    before=lambda number, _: "," if number else "",
    after="\r\n",
    blank="",
    quoted=_csv_text,
    moment_quote="",
)
_JSON = Style(
    before=lambda number, name: f"{',' if number else '{'}{_json_text(name)}:",
    after="}\n",
    blank="null",
    quoted=_json_text,
    moment_quote='"',
)


def _lines(columns: Sequence[Column], batch: Batch, zone: tzinfo, style: Style) -> bytes:
    pieces: list[Characters | bytes] = []
    for number, (column, cells) in enumerate(zip(columns, batch, strict=True)):
        pieces.append(style.before(number, column.name).encode())
        pieces += _cell_pieces(column, cells, zone, style)
    pieces.append(style.after.encode())
    widths = [len(piece) if isinstance(piece, bytes) else piece.shape[1] for piece in pieces]
    page = np.empty((n_rows(batch), sum(widths)), np.uint8)
    at = 0
    for piece, width in zip(pieces, widths, strict=True):
        page[:, at : at + width] = np.frombuffer(piece, np.uint8) if isinstance(piece, bytes) else piece
        at += width
    characters = page.ravel()
    return np.compress(characters != 0, characters).tobytes()  # twice as quick as a mask as index


def _cell_pieces(column: Column, cells: Cells, zone: tzinfo, style: Style) -> list[Characters | bytes]:
    if isinstance(cells, Coded):
        table = _table([style.quoted(word) if word else style.blank for word in cells.words])
        return [table[cells.codes]]
    if isinstance(cells, Numbered):
        # the number goes inside the quotes, if there are any
        split = [style.quoted(f"{word}-0").rpartition("0") for word in cells.word.words]
        opening, closing = _table([before for before, _, _ in split]), _table([after for *_, after in split])
        return [opening[cells.word.codes], _digits(cells.number), closing[cells.word.codes]]
    if is_moments(cells):
        blank = np.isnat(cells)
        known = np.where(blank, np.datetime64(0, "us"), cells)
        text = _moment_text(known, zone if column.local else UTC)
        quote = np.full((len(cells), len(style.moment_quote)), ord(style.moment_quote or "0"), np.uint8)
        text = np.hstack([quote, text, quote]) if style.moment_quote else text
    else:
        blank = ~np.isfinite(cells)
        text = _number_text(np.where(blank, 0.0, cells), column.decimals)
    return [_blanked(text, blank, style.blank)]


def _blanked(text: Characters, blank: NDArray[np.bool], word: str) -> Characters:
    if not blank.any():
        return text
    wide = np.zeros((len(text), max(text.shape[1], len(word))), np.uint8)
    wide[:, : text.shape[1]] = text
    wide[blank] = 0
    wide[blank, : len(word)] = np.frombuffer(word.encode(), np.uint8)
    return wide


def _table(words: Sequence[str]) -> Characters:
    """Words as rows of characters, shape (number of words, longest of them)."""
    encoded = np.array([word.encode() for word in words] or [b""])
    return encoded.view(np.uint8).reshape(len(encoded), -1)


def _digits(values: IntArray, least: int = 1) -> Characters:
    """Whole numbers, none of them negative, with at least so many digits."""
    width = max(len(str(int(values.max(initial=0)))), least)
    triples = _triples()
    n_triples = -(-width // 3)
    text = np.empty((len(values), 3 * n_triples), np.uint8)
    rest = values
    for place in reversed(range(n_triples)):
        rest, triple = np.divmod(rest, 1000)
        text[:, 3 * place : 3 * place + 3] = triples[triple]
    text = text[:, 3 * n_triples - width :]
    always = max(len(str(int(values.min(initial=0)))) if len(values) else 1, least)
    for place in range(width - always):
        # leading zeros: everything above the number's own size
        text[values < 10 ** (width - 1 - place), place] = 0
    return text


def _number_text(values: FloatArray, decimals: int) -> Characters:
    """Plain decimal numbers, never ``-0``; values to 2**53 in the last place."""
    scaled = in_last_places(values, decimals).astype(np.int64)
    sign = np.where(scaled < 0, ord("-"), 0).astype(np.uint8)[:, None]
    whole, part = np.divmod(np.abs(scaled), 10**decimals)
    if not decimals:
        return np.hstack([sign, _digits(whole)])
    point = np.full((len(values), 1), ord("."), np.uint8)
    return np.hstack([sign, _digits(whole), point, _digits(part, decimals)])


def _moment_text(moments: Moments, zone: tzinfo) -> Characters:
    """RFC 3339: in UTC with six digits and Z, elsewhere with the offset of the moment."""
    us = moments.view(np.int64)
    if zone is not UTC:
        texts = {one: from_us(one, zone).isoformat() for one in np.unique(us).tolist()}
        return _table([texts[one] for one in us.tolist()])
    second, part = np.divmod(us, US_PER_S)
    day, clock = np.divmod(second, _DAY_S)
    first, last = int(day.min(initial=0)), int(day.max(initial=0))
    if last - first <= len(day):
        days, day_idx = np.arange(first, last + 1), day - first
    else:
        days, day_idx = np.unique(day, return_inverse=True)
    text = np.empty((len(us), 27), np.uint8)
    text[:, :10] = _table(np.datetime_as_string(days.astype("datetime64[D]")).tolist())[day_idx]
    text[:, 10:19] = _clock_texts()[clock]
    text[:, 19] = ord(".")
    text[:, 20:23] = _triples()[part // 1000]
    text[:, 23:26] = _triples()[part % 1000]
    text[:, 26] = ord("Z")
    return text


@cache
def _triples() -> Characters:
    """000 to 999."""
    return _table([f"{value:03d}" for value in range(1000)])


@cache
def _clock_texts() -> Characters:
    """T00:00:00 to T23:59:59."""
    second = np.arange(_DAY_S)
    text = np.full((_DAY_S, 9), ord(":"), np.uint8)
    text[:, 0] = ord("T")
    for place, value in ((1, second // 3600), (4, second // 60 % 60), (7, second % 60)):
        text[:, place : place + 2] = _triples()[value, 1:]
    return text
