"""The answer as plain text for the bench: the ranking, the best candidate in full, how sure it is."""

from __future__ import annotations

from collections.abc import Sequence

from partpick.quantities import format_percent, format_quantity
from partpick.report.bands_table import bands_in_full, share_of_strays, swept_range, with_labels, worst_q
from partpick.report.ladder_table import ladder_lines
from partpick.report.oscillator import common_terminal
from partpick.report.spread_table import built_units
from partpick.report.stress_table import stress_lines
from partpick.report.switch_text import switch_lines
from partpick.report.text import (
    clean,
    columns,
    figure,
    length,
    plural,
    quantity,
    signed_percent,
    signed_shift,
    slope,
    wrapped,
)
from partpick.report.tracking import tracking_lines, worst_tracking
from partpick.request import Request
from partpick.result import Candidate, CoilFigures, Front, PartLine, Proof, Result

MOST_WARNINGS = 10
_ORDERS = {"build": "easiest to build first", "error": "least error first", "price": "cheapest first"}


def result_table(result: Result) -> str:
    """Return the whole answer in lines of at most 80 columns, with a final newline."""
    blocks = [_heading(result)]
    if result.candidates:
        first = result.candidates[0]
        blocks += [_ranking(result), _in_full(f"Rank {_rank(first)} in full", first)]
        blocks += [tracking_lines(first)]
        blocks += [built_units(result.request, first), stress_lines(first), _front(result.front)]
        blocks += [_further_front(front) for front in result.fronts]
    else:
        blocks += [_nothing(result)]
        if result.nearest_miss is not None:
            blocks += [_in_full("The nearest miss, outside the limits", result.nearest_miss)]
            blocks += [stress_lines(result.nearest_miss)]
    blocks += [_proof(result), _warnings(result)]
    return "\n\n".join("\n".join(block) for block in blocks if block) + "\n"


# ---------------------------------------------------------------- heading and ranking


def _heading(result: Result) -> list[str]:
    request = result.request
    found = len(result.candidates)
    name = clean(request.title) or _job(request)
    if not found:
        return wrapped(name)
    lines = wrapped(f"{name}: {plural(found, 'candidate')}, {_ORDERS.get(request.by, request.by)}", 0, 2)
    if request.units > 1:
        lines += wrapped(f"All figures and quantities are for one of {request.units} units.")
    return lines


def _job(request: Request) -> str:
    if len(request.bands) != 1:
        return f"Tanks for {len(request.bands)} bands"
    band = request.bands[0]
    if band.swept:
        return f"Tank for {swept_range(band.low, band.high)}"
    return f"Tank for {format_quantity(band.highest, 'Hz', 6)}"


def _ranking(result: Result) -> list[str]:
    one_band = len(result.request.bands) == 1
    head, rows = _rank_rows_one(result.candidates) if one_band else _rank_rows_many(result.candidates)
    head, rows = _without_empty_columns(head, rows)
    figures = columns([head, *rows])
    lines = [figures[0]]
    for candidate, line in zip(result.candidates, figures[1:], strict=True):
        lines.append(line)
        lines += wrapped(_what(candidate, one_band), 5, 2)
    return lines + _legend(result.candidates, set(head))


def _legend(candidates: Sequence[Candidate], heads: set[str]) -> list[str]:
    """Return what the signs and short headings in use mean."""
    connections = "".join(band.connection for candidate in candidates for band in candidate.bands)
    meanings = {
        "|": "|: in parallel" if "|" in connections else "",
        "+": "+: in series" if "+" in connections else "",
        "\u03a9": "\u03a9: reactance of the coil",
        "per pF": "per pF: shift of the frequency",
        "strays": "strays: wiring and self-capacitance as a share of all",
        "others": "others: further choices on the same former",
    }
    used = [text for sign, text in meanings.items() if text and (sign in heads or sign in "|+")]
    return wrapped(f"({'; '.join(used)})", 0, 1) if used else []


def _rank_rows_one(candidates: Sequence[Candidate]) -> tuple[list[str], list[list[str]]]:
    head = ["rank", "error", "off by", "excess", "Q", "\u03a9", "per pF", "strays", "price", "others"]
    rows = []
    for candidate in candidates:
        band = candidate.bands[0]
        off = None if band.error is None or band.target is None else band.error * band.target
        share = share_of_strays(band)
        rows.append([
            _rank(candidate),
            "" if band.error is None else signed_percent(band.error),
            signed_shift(off),
            "" if candidate.worst_excess is None else format_percent(candidate.worst_excess),
            figure(band.q),
            figure(band.reactance),
            "" if band.hertz_per_farad is None else slope(band.hertz_per_farad),
            "" if share is None else format_percent(share, 2),
            "" if candidate.price is None else f"{candidate.price:.2f}",
            "" if candidate.alternatives is None else str(candidate.alternatives),
        ])  # fmt: skip
    return head, rows


def _rank_rows_many(candidates: Sequence[Candidate]) -> tuple[list[str], list[list[str]]]:
    head = ["rank", "pieces", "values", "worst error", "tracking", "excess", "least Q", "most strays", "price"]
    head.append("others")
    rows = []
    for candidate in candidates:
        shares = [share for band in candidate.bands if (share := share_of_strays(band)) is not None]
        rows.append([
            _rank(candidate),
            str(candidate.piece_count),
            str(candidate.value_count),
            "" if candidate.worst_error is None else _size(candidate.worst_error),
            worst_tracking(candidate),
            "" if candidate.worst_excess is None else format_percent(candidate.worst_excess),
            figure(worst_q(candidate)),
            format_percent(max(shares), 2) if shares else "",
            "" if candidate.price is None else f"{candidate.price:.2f}",
            "" if candidate.alternatives is None else str(candidate.alternatives),
        ])  # fmt: skip
    return head, rows


def _without_empty_columns(head: list[str], rows: list[list[str]]) -> tuple[list[str], list[list[str]]]:
    kept = [place for place in range(len(head)) if any(row[place] for row in rows)]
    return [head[place] for place in kept], [[row[place] for place in kept] for row in rows]


def _what(candidate: Candidate, one_band: bool) -> str:
    """Return coil and capacitors of a candidate in one sentence without figures."""
    if not one_band:
        return "; ".join(f"{coil.reference} {coil.label}" for coil in candidate.coils)
    band = candidate.bands[0]
    labels = with_labels(band.connection, candidate.parts)
    coil = "; ".join(coil.label for coil in candidate.coils)
    tap = f", tap at turn {band.tap_turns}" if band.tap_turns is not None else ""
    return f"{labels or 'no capacitor'} with {coil}{tap}{common_terminal(band)}"


def _rank(candidate: Candidate) -> str:
    return "-" if candidate.rank is None else str(candidate.rank)


def _size(fraction: float) -> str:
    return signed_percent(abs(fraction)).lstrip("+")


# ---------------------------------------------------------------- one candidate in full


def _in_full(heading: str, candidate: Candidate) -> list[str]:
    lines = [heading]
    for coil in candidate.coils:
        lines += wrapped(f"{coil.reference}  {coil_in_words(coil)}{_for_bands(coil, candidate)}", 2, 4)
    lines += _parts(candidate.parts)
    lines += ladder_lines(candidate) or bands_in_full(candidate)
    return lines + switch_lines(candidate)


def coil_in_words(coil: CoilFigures) -> str:
    """Return a coil as it is wound or bought, with the figures that it should measure."""
    told = [coil.label]
    if coil.winding_length is not None:
        told.append(f"winding {length(coil.winding_length)} long")
    if coil.wire_length is not None:
        told.append(f"{length(coil.wire_length)} of wire")
    told.append(quantity(coil.inductance, "H", 4) + _either_way(coil.extra.get("inductance_spread")))
    if isinstance(adjust := coil.extra.get("adjust"), float) and adjust > 0:
        told.append(f"adjustable{_either_way(adjust)}")
    if coil.self_capacitance is not None:
        told.append(f"self-capacitance {quantity(coil.self_capacitance, 'F', 2)}")
    return ", ".join(told)


def _either_way(spread: object) -> str:
    """Return a spread such as " ±2.1 %", "" where it is unknown."""
    return f" \u00b1{format_percent(spread, 2)}" if isinstance(spread, float) else ""


def _for_bands(coil: CoilFigures, candidate: Candidate) -> str:
    if len(candidate.coils) < 2:
        return ""
    return "; for " + ", ".join(band.name for band in candidate.bands if band.coil == coil.reference)


def _parts(parts: Sequence[PartLine]) -> list[str]:
    """Return the parts other than coils, equal ones in one line."""
    alike: dict[str, list[PartLine]] = {}
    for part in parts:
        if part.kind != "coil":
            tolerance = "" if part.tolerance is None else f", {format_percent(part.tolerance)}"
            alike.setdefault(part.description + tolerance, []).append(part)
    lines = []
    for description, pieces in alike.items():
        count = f"{len(pieces)} of " if len(pieces) > 1 else ""
        lines += wrapped(f"{' '.join(piece.reference for piece in pieces)}  {count}{description}", 2, 4)
    return lines


def _front(front: Sequence[Candidate]) -> list[str]:
    """Return what more or fewer pieces would give, where there is a choice."""
    if len(front) < 2:
        return []
    steps = []
    for candidate in front:
        figures = []
        if candidate.worst_error is not None:
            figures.append(_size(candidate.worst_error))
        if tracking := worst_tracking(candidate):
            figures.append(tracking)
        elif candidate.worst_excess is not None:
            figures.append(f"excess {format_percent(candidate.worst_excess)}")
        steps.append(f"{plural(candidate.piece_count, 'piece')} {' and '.join(figures)}")
    what = "excess" if front[0].worst_error is None else "error"
    what = "tracking error" if worst_tracking(front[0]) else what
    return wrapped(f"Least {what} for the number of pieces: {'; '.join(steps)}.", 0, 2)


def _further_front(front: Front) -> list[str]:
    """Return what one criterion costs in another."""
    limited, least = front.criteria
    steps = [f"{_criterion(candidate, limited)} {_criterion(candidate, least)}" for candidate in front.candidates]
    told = f"Least {least} for the number of {limited}: {'; '.join(steps) or 'none has one'}."
    end = "" if front.complete else " The search was stopped: fewer may do."
    return wrapped(told + end, 0, 2)


def _criterion(candidate: Candidate, name: str) -> str:
    if name == "price":
        return "?" if candidate.price is None else f"{candidate.price:.2f}"
    if name == "error":
        error = candidate.worst_error if candidate.worst_error is not None else candidate.worst_excess
        return "?" if error is None else _size(error)
    return plural(candidate.value_count, "value") if name == "values" else plural(candidate.piece_count, "piece")


# ---------------------------------------------------------------- what it is worth


def _nothing(result: Result) -> list[str]:
    if result.proof.status != "infeasible":
        return wrapped(
            "Nothing was found before the search stopped; that does not say that nothing fits.", 0, 2
        )
    reason = "" if result.ruled_out_by is None else f": {result.ruled_out_by.text.rstrip('.')}"
    lines = wrapped(f"Nothing fits{reason}.", 0, 2)
    for other in result.ruled_out_by.others if result.ruled_out_by else ():
        lines += wrapped(f"Or: {other.text.rstrip('.')}.", 0, 2)
    if result.ruled_out_by is not None and result.ruled_out_by.others and result.ruled_out_by.unsettled:
        lines += wrapped(f"Not known, the search was stopped before: {', '.join(result.ruled_out_by.unsettled)}.", 0, 2)
    return lines


def _proof(result: Result) -> list[str]:
    lines = wrapped(how_sure(result.proof, bool(result.candidates)), 0, 2)
    lines += wrapped(f"Searched: {result.proof.searched}", 0, 2) if result.proof.searched else []
    if result.candidates:
        lines += wrapped(f"Errors below {format_percent(result.floor, 2)} are noise: parts vary more.")
    return lines


def how_sure(proof: Proof, found: bool) -> str:
    """Return in words how far the answer is proven."""
    stopped = f"the search was stopped ({proof.stopped_by})" if proof.stopped_by else "the search has ended"
    if proof.status == "optimal":
        return "Proven: nothing that was left out would rank before what is shown."
    if proof.status == "infeasible":
        return "Proven: no choice of these parts is inside every limit."
    if not found:
        return f"Not proven: {stopped}."
    return f"Not proven: {stopped}; there may be better ones.{_bounds(proof)}"


def _bounds(proof: Proof) -> str:
    """Return how far each objective that is still open could fall."""
    told = []
    for stage in proof.stages:
        if stage.value is None or stage.bound is None or stage.value == stage.bound:
            continue
        name = stage.objective.replace("_", " ")
        show = format_percent if "error" in name or "excess" in name else figure
        told.append(f"{name} {show(stage.value)}, perhaps down to {show(stage.bound)}")
    return f" Reached: {'; '.join(told)}." if told else ""


def _warnings(result: Result) -> list[str]:
    """Return each warning once, with the ranks that it is about."""
    about: dict[str, list[str]] = {text: [] for text in result.warnings}
    shown = result.candidates or ((result.nearest_miss,) if result.nearest_miss else ())
    for candidate in shown:
        for text in candidate.warnings:
            about.setdefault(text, []).append(_rank(candidate))
    lines = []
    for text, ranks in list(about.items())[:MOST_WARNINGS]:
        everywhere = not ranks or len(ranks) == len(shown)
        ranked = "" if everywhere else f"rank {', '.join(ranks)}: "
        lines += wrapped(f"Note: {ranked}{text}", 0, 2)
    if len(about) > MOST_WARNINGS:
        lines += wrapped(f"{plural(len(about) - MOST_WARNINGS, 'further note')} in the JSON file.")
    return lines
