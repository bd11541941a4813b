"""Summaries as pages to print: HTML, or PDF by fpdf2, a page a sensor."""

from __future__ import annotations

import io
from collections.abc import Sequence
from importlib import resources
from pathlib import Path
from typing import Any, BinaryIO

from ginnel.export.draft import check_place, whole
from ginnel.export.libraries import optional
from ginnel.export.summary import Summary

#: With these a PDF shows any European script; without them, what is not in Latin-1 becomes a question mark.
_FONTS = Path("/usr/share/fonts/truetype/dejavu")


def write_summary(pages: Sequence[Summary], output: Path | BinaryIO, kind: str) -> None:
    """Write pages as ``html`` or ``pdf``, to a stream or to a file, which appears whole or not at all.

    Raises
    ------
    ExportError
        The file cannot be written, or fpdf2 is not installed.
    """
    data = summary_html(pages).encode() if kind == "html" else summary_pdf(pages)
    if not isinstance(output, Path):
        output.write(data)
        return
    with whole(check_place(output)) as draft:
        draft.write_bytes(data)


def summary_html(pages: Sequence[Summary]) -> str:
    """Lay pages out as one HTML document that needs nothing else."""
    from jinja2 import Environment

    template = resources.files("ginnel.export").joinpath("summary.html").read_text("utf-8")
    environment = Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True)
    return environment.from_string(template).render(pages=pages)


def summary_pdf(pages: Sequence[Summary]) -> bytes:
    """Lay pages out as a PDF of A4 pages."""
    fpdf = optional("fpdf", "fpdf2", "a PDF")
    pdf = fpdf.FPDF(format="A4")
    pdf.set_margin(14)
    pdf.set_auto_page_break(True, margin=12)
    family = _family(pdf)
    pdf.set_title(pages[0].title)
    pdf.set_creator("ginnel")
    for page in pages:
        _lay_out(pdf, family, page)
    return bytes(pdf.output())


def _lay_out(pdf: Any, family: str, page: Summary) -> None:
    def write(text: str, size: float, style: str = "", x: float | None = None) -> None:
        pdf.set_font(family, style, size)
        pdf.set_x(pdf.l_margin if x is None else x)
        pdf.multi_cell(0, size * 0.48, _printable(text, family), align="L", new_x="LMARGIN", new_y="NEXT")

    pdf.add_page()
    write(page.title, 16, "B")
    write(page.period, 9.5)
    pdf.ln(2)
    for what, value in page.facts:
        line = pdf.get_y()
        write(what, 9.5)
        pdf.set_y(line)
        write(value, 9.5, x=pdf.l_margin + 52)
    for chart in page.charts:
        pdf.ln(2)
        write(chart.title, 10.5, "B")
        pdf.set_font(family)
        pdf.image(io.BytesIO(chart.svg.encode()), w=pdf.epw)
        write(chart.caption, 8)
    for title, lines in (("Cautions", page.cautions), ("Method", page.method)):
        pdf.ln(2)
        write(title, 10.5, "B")
        for line in lines:
            write(line, 8.5)


def _family(pdf: Any) -> str:
    faces = {"": _FONTS / "DejaVuSans.ttf", "B": _FONTS / "DejaVuSans-Bold.ttf"}
    if not all(face.is_file() for face in faces.values()):
        return "helvetica"
    for style, face in faces.items():
        pdf.add_font("ginnel", style, face)
    return "ginnel"


def _printable(text: str, family: str) -> str:
    return text.encode("latin-1", "replace").decode("latin-1") if family == "helvetica" else text
