"""The build sheet: one page of HTML for whoever winds and solders, complete in itself.

No script, nothing fetched, and the same result gives the same bytes. Pictures that need matplotlib are
replaced by a line that says how to get them where it is not installed.
"""

from __future__ import annotations

import partpick
from partpick.quantities import format_percent
from partpick.report import charts, html, sheet_parts
from partpick.report.cautions import ALWAYS
from partpick.report.circuit_rows import shares_capacitors
from partpick.report.drawing import circuit
from partpick.report.ladder_table import ladder_section
from partpick.report.load_table import load_table
from partpick.report.oscillator import start_table
from partpick.report.pictures import HOW_TO_GET, Picture, pictures
from partpick.report.sensitivity_table import HEAD as SENSITIVITY_HEAD
from partpick.report.sensitivity_table import sensitivity_rows
from partpick.report.sheet_style import STYLE
from partpick.report.spread_table import alignment_steps
from partpick.report.stress_table import FIGURES, GUESS, HEAD, cautions, stress_rows
from partpick.report.switch_text import switch_in_words
from partpick.report.table import how_sure
from partpick.report.text import plural
from partpick.report.tracking import tracking_table
from partpick.result import Candidate, Result


def sheet(result: Result) -> str:
    """Return the build sheet of the first candidate; where nothing fits, a page that says why."""
    title = result.request.title or "Tuned circuit"
    body = [_head(title, result)]
    if result.candidates:
        body += _candidate(result, result.candidates[0])
    else:
        body.append(_nothing(result))
    body += [_cautions(result.candidates[0] if result.candidates else None), _proof(result)]
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{html.text(title)}</title>\n<style>{STYLE}</style>\n</head>\n<body>\n"
        + "\n".join(part for part in body if part)
        + "\n</body>\n</html>\n"
    )


def _head(title: str, result: Result) -> str:
    told = [f"Build sheet, partpick {partpick.__version__}", plural(len(result.request.bands), "band")]
    if result.candidates:
        first = result.candidates[0]
        told.append(f"{plural(first.part_count, 'capacitor')}, {plural(first.inductor_count, 'coil')}")
    return html.element(
        "header", html.element("h1", html.text(title)) + html.paragraph(" \u00b7 ".join(told), class_="soft")
    )


def _candidate(result: Result, candidate: Candidate) -> list[str]:
    return [
        html.section("Bands at a glance", sheet_parts.at_a_glance(candidate)),
        html.section("What to buy or pull", sheet_parts.shopping(candidate, result.request.units)),
        html.section("What to wind", sheet_parts.windings(candidate)),
        html.section("Load", load_table(result.request, candidate)),
        html.section("Circuit", _circuits(candidate)),
        html.section("Switch", _switch(candidate)),
        html.section("Relay positions", ladder_section(candidate)),
        html.section("Start of the oscillator", start_table(candidate)),
        html.section("Readings to expect", *_readings(candidate)),
        html.section("Tracking", tracking_table(candidate)),
        html.section("Errors and tolerance", _errors(result, candidate)),
        html.section("At the stated drive", _stress(candidate)),
        html.section("Response and tuning", _pictures(pictures(result, candidate))),
    ]


def _circuits(candidate: Candidate) -> str:
    drawings = [html.element("figure", circuit(candidate, coil.reference)) for coil in candidate.coils]
    note = "Each row shows what one position puts across the coil."
    if shares_capacitors(candidate):
        note = "Wire each row once. Its contact is closed at the bands named over it."
    cards = html.element("div", "\n".join(drawings), class_="cards")
    return cards + (html.paragraph(note, class_="soft") if len(candidate.bands) > 1 else "")


def _switch(candidate: Candidate) -> str:
    if not any(band.contacts for band in candidate.bands):
        return ""
    said = "".join(html.paragraph(f"{text[0].upper()}{text[1:]}.") for text in switch_in_words(candidate))
    return said + sheet_parts.switch_table(candidate)


def _readings(candidate: Candidate) -> tuple[str, ...]:
    coil = (
        "First the coil alone, with short leads and the capacitor below across it. It dips too low: fewer turns, or "
        "turns spread; too high: turns pressed together, or one more."
    )
    steps = alignment_steps(candidate)
    middle = ", trimmers in the middle of their range" if _trimmed(candidate) else ""
    return (
        html.paragraph(coil),
        sheet_parts.dips(candidate),
        html.paragraph(f"Then in circuit, band by band, the strays of the wiring included{middle}."),
        sheet_parts.readings(candidate),
        html.element("h3", "Setting") + html.steps(steps) if steps else "",
    )


def _errors(result: Result, candidate: Candidate) -> str:
    figures = []
    bars = charts.error_bars(result, candidate)
    if bars:
        limit = result.request.limits.error
        what = "the limit of" if result.request.limits.error_stated or not _trimmed(candidate) else "within"
        inside = f" Shaded: {what} {format_percent(limit, 2)} for nominal values." if limit is not None else ""
        told = "Dot: nominal parts."
        if any(charts.spread_of(band) for band in candidate.bands):
            told += " Thick: where 9 of 10 units fall. Thin: every unit within tolerance. Nothing is adjusted yet."
        told += inside
        figures.append(_figure(bars, told))
    steps = charts.front(result.front)
    if steps:
        what = charts.least(result.front)
        floor = format_percent(result.floor, 2)
        noise = f" Errors below {floor} are noise: parts vary more." if what == "error" else ""
        figures.append(_figure(steps, f"What more pieces would buy, least {what} each.{noise}"))
    cards = html.element("div", "\n".join(figures), class_="cards") if figures else ""
    rows = sensitivity_rows(candidate)
    if not rows:
        return cards
    told = html.element("h3", "What each part contributes, nothing adjusted")
    head = ["Drift, ppm/K" if each == "ppm/K" else each.capitalize() for each in SENSITIVITY_HEAD]
    return cards + told + html.table(head, rows, figures=range(2, 7))


def _trimmed(candidate: Candidate) -> bool:
    return any(band.trimmer is not None for band in candidate.bands)


def _figure(drawing: str, told: str) -> str:
    return html.element("figure", drawing + html.element("figcaption", html.text(told)))


def _pictures(drawn: tuple[Picture, ...]) -> str:
    made = [_figure(picture.drawing, picture.title) for picture in drawn if picture.drawing is not None]
    missing = [picture.title.lower() for picture in drawn if picture.drawing is None]
    told = f"Missing: {' and '.join(missing)}. They need matplotlib: {HOW_TO_GET}, then write the sheet again."
    cards = html.element("div", "\n".join(made), class_="cards") if made else ""
    return cards + (html.paragraph(told, class_="soft") if missing else "")


def _nothing(result: Result) -> str:
    if result.proof.status != "infeasible":
        return html.section("Nothing to build", html.paragraph("The search was stopped before it found anything."))
    ruled_out = result.ruled_out_by
    reasons = [] if ruled_out is None else [ruled_out.text, *(other.text for other in ruled_out.others)]
    return html.section("Nothing fits", html.bullets(reasons) or html.paragraph("No choice is inside every limit."))


def _stress(candidate: Candidate) -> str:
    rows = stress_rows(candidate)
    if not rows:
        return ""
    return html.table([word.capitalize() for word in HEAD], rows, figures=FIGURES) + html.paragraph(GUESS)


def _cautions(candidate: Candidate | None) -> str:
    """Those that the drive has triggered, with their figure, and those that always stand."""
    triggered = cautions(candidate) if candidate is not None else []
    return html.section("Cautions", html.bullets(list(dict.fromkeys([*triggered, *ALWAYS]))), class_="cautions")


def _proof(result: Result) -> str:
    found = bool(result.candidates)
    told = [how_sure(result.proof, found)]
    if result.proof.searched:
        told.append(f"Searched: {result.proof.searched}.")
    notes = [*result.warnings, *(result.candidates[0].warnings if found else ())]
    return html.section(
        "How sure this is", *(html.paragraph(line) for line in told), html.bullets(list(dict.fromkeys(notes)))
    )
