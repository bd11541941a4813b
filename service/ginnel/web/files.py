"""Files to take away: what a page looks at, as `ginnel export` would write it."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from importlib.util import find_spec
from pathlib import Path

import flask
from flask import Blueprint, request
from werkzeug.utils import secure_filename

from ginnel.export import TABLES, Format, Question, Table, iter_lines, write
from ginnel.reports import Every
from ginnel.store import Store
from ginnel.web.asked import ask
from ginnel.web.view import View, ViewError

files = Blueprint("files", __name__, url_prefix="/files")

#: What each kind of table is about, in the order of the page.
TOLD = {
    "passages": "one row for each passage",
    "counts": "passages by interval and direction, with coverage",
    "speeds": "speeds by interval and direction",
    "occupancy": "how much of each interval somebody was in the beam",
    "health": "level, noise, hum and lamps, minute by minute",
}
_TYPES = {
    Format.CSV: "text/csv; charset=utf-8",
    Format.JSONL: "application/jsonl; charset=utf-8",
    Format.PARQUET: "application/vnd.apache.parquet",
    Format.XLSX: "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet",
}
_NEEDED = {Format.PARQUET: "pyarrow", Format.XLSX: "xlsxwriter"}


def formats() -> list[str]:
    """Kinds of files that can be made here."""
    return [one.value for one in Format if one not in _NEEDED or find_spec(_NEEDED[one])]


def kinds() -> list[tuple[str, str]]:
    """Kinds of tables, each with what it is about."""
    return [(kind, told) for kind, told in TOLD.items() if kind in TABLES]


@files.get("/<kind>.<form>")
def download(kind: str, form: str) -> flask.Response:
    """Give a table of one view as a file."""
    if kind not in TABLES or form not in formats():
        flask.abort(404)
    every = request.args.get("every", Every.HOUR.value)
    if every not in list(Every):
        raise ViewError(f"every={every} is not understood: it is one of {', '.join(Every)}")
    asked = ask()
    view = asked.view()
    table = TABLES[kind](
        asked.store,
        Question(
            sensors=(view.sensor.name,),
            start_us=view.start_us,
            end_us=view.end_us,
            every=Every(every),
            with_uncounted=request.args.get("with") == "uncounted",
        ),
    )
    name = _name(kind, form, view)
    if Format(form) in _NEEDED:
        return _whole(asked.store, table, Format(form), name)
    answer = flask.Response(_begun(iter_lines(table, Format(form))), content_type=_TYPES[Format(form)])
    answer.headers.set("Content-Disposition", "attachment", filename=name)
    return answer


@files.get("/summary.<form>")
def summary(form: str) -> flask.Response:
    """Give the page to print of one view."""
    from ginnel.export.summary import summaries
    from ginnel.export.summary_pages import summary_html, summary_pdf

    if form not in summary_forms():
        flask.abort(404)
    asked = ask()
    view = asked.view()
    names = (view.sensor.name,)
    pages = summaries(asked.store, Question(sensors=names, start_us=view.start_us, end_us=view.end_us))
    if not pages:
        flask.abort(404, "Nothing was logged in this time.")
    data = summary_pdf(pages) if form == "pdf" else summary_html(pages).encode()
    answer = flask.Response(data, mimetype="application/pdf" if form == "pdf" else "text/html")
    answer.headers.set("Content-Disposition", "attachment", filename=_name("summary", form, view))
    return answer


def summary_forms() -> list[str]:
    """Kinds of pages to print that can be made here."""
    return ["html", *(["pdf"] if find_spec("fpdf") else [])]


def _name(kind: str, form: str, view: View) -> str:
    days = view.first.isoformat() if view.n_days == 1 else f"{view.first}_{view.last}"
    return secure_filename(f"{view.sensor.name}-{kind}-{days}.{form}")


def _begun(lines: Iterator[bytes]) -> Iterator[bytes]:
    """Make the first piece now, while an error can still be answered; the others as they are wanted."""
    first = next(lines, b"")

    def rest() -> Iterator[bytes]:
        yield first
        yield from lines

    return rest()


def _whole(store: Store, table: Table, form: Format, name: str) -> flask.Response:
    with tempfile.TemporaryDirectory(prefix="ginnel-file-") as folder:
        path = Path(folder) / f"table.{form.value}"
        write(store, [table], path, form)
        opened = path.open("rb")  # outlives its name
    return flask.send_file(opened, mimetype=_TYPES[form], as_attachment=True, download_name=name)
