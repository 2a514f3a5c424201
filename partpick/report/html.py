"""Small pieces of HTML, every text escaped on its way in."""

from __future__ import annotations

import re
from collections.abc import Sequence
from html import escape

from partpick.report.text import clean

UNIT = re.compile(r"(?<=\d) (?=[^\s\d]*(?:Hz|F|H|\u03a9|%|V|A|W|S|ppm)\b|%)")  # a figure stays with its unit


def text(words: str) -> str:
    """Return a text from a plan, a drawer or the program as it may stand in HTML and in an attribute."""
    return escape(clean(words), quote=True)


def element(name: str, inner: str, **attributes: str) -> str:
    """Return an element around ready HTML; `class_` stands for class, `_` in a name for `-`."""
    return f"<{name}{_attributes(attributes)}>{inner}</{name}>"


def paragraph(words: str, **attributes: str) -> str:
    """Return a paragraph of text."""
    return element("p", text(words), **attributes)


def section(heading: str, *inner: str, **attributes: str) -> str:
    """Return a section with its heading; nothing where it would be empty."""
    body = "\n".join(part for part in inner if part)
    return f"<section{_attributes(attributes)}>\n<h2>{text(heading)}</h2>\n{body}\n</section>" if body else ""


def bullets(lines: Sequence[str]) -> str:
    """Return a list of texts."""
    return element("ul", "".join(element("li", text(line)) for line in lines)) if lines else ""


def steps(lines: Sequence[str]) -> str:
    """Return a numbered list of texts."""
    return element("ol", "".join(element("li", text(line)) for line in lines)) if lines else ""


def pairs(rows: Sequence[tuple[str, str | None]]) -> str:
    """Return terms with their values, those without a value left out."""
    told = [f"<dt>{text(term)}</dt><dd>{text(value)}</dd>" for term, value in rows if value is not None]
    return element("dl", "".join(told)) if told else ""


def table(head: Sequence[str], rows: Sequence[Sequence[str]], figures: Sequence[int] = ()) -> str:
    """Return a table without its empty columns; those in `figures` stand to the right.

    Each cell knows its heading, so that a narrow screen can show a row as a list.
    """
    kept = [place for place in range(len(head)) if any(row[place] for row in rows)]
    if not kept:
        return ""

    def cell(name: str, place: int, words: str, **attributes: str) -> str:
        if place in figures:
            attributes["class_"] = "figure"
            return element(name, UNIT.sub("\u00a0", text(words)), **attributes)
        return element(name, text(words), **attributes)

    top = "".join(cell("th", place, head[place], scope="col") for place in kept)
    body = "\n".join(
        element("tr", "".join(cell("td", place, row[place], data_label=head[place]) for place in kept)) for row in rows
    )
    return f"<table>\n<thead><tr>{top}</tr></thead>\n<tbody>\n{body}\n</tbody>\n</table>"


def _attributes(attributes: dict[str, str]) -> str:
    return "".join(
        f' {name.rstrip("_").replace("_", "-")}="{text(value)}"' for name, value in sorted(attributes.items())
    )
