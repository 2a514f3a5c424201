"""What built units of the first candidate will do, as lines of text: spread, alignment, drift, what to buy."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from partpick.quantities import format_percent, format_quantity
from partpick.report.bands_table import LONGEST_NAME
from partpick.report.text import clean, columns, cut, figure, plural, signed_shift, slope, wrapped
from partpick.request import Request
from partpick.result import BandFigures, Candidate

_MOST_SWAPS = 6
_WHY = {
    "coil first": "its trimmer in the middle",
    "low end by the coil": "the tuning element closed, its trimmer in the middle",
    "spread evenly": "so that the errors of its bands without trimmer are alike",
}


def built_units(request: Request, candidate: Candidate) -> list[str]:
    """Return what built units do; nothing where the candidate holds no figures about them."""
    if "spread" not in candidate.extra:
        return []
    lines = _bands(request, candidate)
    lines += _whole_unit(request, candidate)
    lines += _alignment(candidate)
    lines += _temperature(candidate)
    lines += _closer(candidate)
    lines += _refit(candidate)
    return lines + _series(candidate)


def _table(value: object) -> Mapping[str, Any]:
    return value if isinstance(value, Mapping) else {}


# ---------------------------------------------------------------- bands


def _bands(request: Request, candidate: Candidate) -> list[str]:
    shown = [band for band in candidate.bands if "spread" in band.extra]
    if not shown:
        return []
    head, rows = ["band", "9 of 10 units", "every unit"], [_range_cells(band) for band in shown]
    if request.limits.error is not None:
        head.append(f"within {format_percent(request.limits.error)}")
        rows = [
            [*row, _share(_inside(band))]
            for row, band in zip(rows, shown, strict=True)
        ]
    if any("alignment" in band.extra for band in shown):
        head.append("aligned")
        rows = [
            [*row, _share(_table(band.extra.get("alignment")).get("share_aligned"))]
            for row, band in zip(rows, shown, strict=True)
        ]
    first = "As built, parts anywhere within tolerance, nothing adjusted:"
    return [*wrapped(first), *(f"  {line}" for line in columns([head, *rows], left=(0,)))]


def _inside(band: BandFigures) -> float | None:
    """Return the share of units inside the limit, of a swept band that of those which cover it."""
    spread = _table(band.extra["spread"])
    share: float | None = spread["share_inside"] if "share_inside" in spread else spread["share_covering"]
    return share


def _range_cells(band: BandFigures) -> list[str]:
    spread = _table(band.extra["spread"])
    if "share_covering" in spread:
        return [
            cut(clean(band.name), LONGEST_NAME),
            f"{_megahertz(spread['tuned_low_95_percent_hz'])}..{_megahertz(spread['tuned_high_5_percent_hz'])}",
            f"{_megahertz(spread['tuned_low_most_hz'])}..{_megahertz(spread['tuned_high_least_hz'])}",
        ]
    return [
        cut(clean(band.name), LONGEST_NAME),
        _percent_range(spread["error_5_percent"], spread["error_95_percent"]),
        _percent_range(spread["error_least"], spread["error_most"]),
    ]


def _megahertz(hertz: float) -> str:
    return format_quantity(hertz, "Hz", 4).replace(" ", "").removesuffix("Hz")


def _percent_range(low: float, high: float) -> str:
    return f"{figure(low * 100, 2, '+')}..{figure(high * 100, 2, '+')} %"


def _share(share: float | None) -> str:
    """Return a share of units; counted in builds, it is never told as all or none."""
    if share is None:
        return "?"
    if share < 0.001:
        return "< 0.1 %"
    return "> 99.9 %" if share > 0.999 else f"{figure(share * 100, 3)} %"


def _whole_unit(request: Request, candidate: Candidate) -> list[str]:
    spread = _table(candidate.extra["spread"])
    if spread["share_inside"] is None or request.limits.error is None or len(candidate.bands) < 2:
        return []
    swept = ", every range covered," if any(band.target is None for band in candidate.bands) else ""
    right = f"Every band within {format_percent(request.limits.error)}{swept} as built"
    return wrapped(f"{right}: {_share(spread['share_inside'])} of {spread['builds']} units drawn at random.", 0, 2)


# ---------------------------------------------------------------- alignment


def _alignment(candidate: Candidate) -> list[str]:
    own = _table(candidate.extra.get("alignment"))
    if not own:
        return []
    worst = "every unit within tolerance can be aligned over the full travel"
    if not own["worst_case_aligned"]:
        worst = "not every unit within tolerance can be aligned, even over the full travel"
    text = f"Adjusted, settings inside 20 to 80 % of travel: {_share(own['share_aligned'])} of units; {worst}."
    lines = wrapped(text, 0, 2)
    for number, step in enumerate(alignment_steps(candidate), 1):
        lines += wrapped(f"{number}. {step}", 2, 3)
    return lines


def alignment_steps(candidate: Candidate) -> list[str]:
    """Return in words what to set on the bench, in the order in which it is; nothing where that is not known."""
    return [_step(step, candidate) for step in _table(candidate.extra.get("alignment")).get("steps", ())]


def _step(step: Mapping[str, Any], candidate: Candidate) -> str:
    band = next(each for each in candidate.bands if each.name == step["band"])
    at = f"{band.name} ({format_quantity(step['to_hz'], 'Hz', 6)})"
    if step["adjust"] is None:
        return f"{at}: nothing to adjust, measure it"
    figures = _table(band.extra.get("alignment"))
    if step["why"] in ("own trimmer", "high end by the trimmer"):
        at += ", the tuning element open" if band.target is None else ""
        trimmer = _table(figures["trimmer"])
        if not 0.0 <= trimmer["travel"] <= 1.0:
            return f"{step['adjust']} for {at}: out of its reach with nominal parts"
        set_to = format_quantity(trimmer["set_to_f"], "F")
        per_pf = slope(figures["hertz_per_farad"])
        again = "; then the low end again, in turn until both stay" if _moves_low_end(step, candidate) else ""
        return f"{step['adjust']} for {at}: about {set_to}, {_travel(trimmer)}, {per_pf} per pF{again}"
    coils: Sequence[Mapping[str, Any]] = _table(candidate.extra["alignment"])["coils"]
    coil = next(each for each in coils if each["reference"] == step["adjust"])
    per_cent = signed_shift(figures["hertz_per_percent_inductance"])
    why = _WHY[step["why"]] if step["why"] != "coil first" or figures["trimmer"] else ""
    on = f"{step['adjust']} for {at}" + (f", {why}" if why else "")
    return f"{on}: {_travel(coil)}, {per_cent} for 1 % more inductance"


def _moves_low_end(step: Mapping[str, Any], candidate: Candidate) -> bool:
    """Whether a trimmer at the high end undoes what a coil was set to at the low end of the same band."""
    steps = _table(candidate.extra["alignment"])["steps"]
    lows = {each["band"] for each in steps if each["why"] == "low end by the coil"}
    return step["why"] == "high end by the trimmer" and step["band"] in lows


def _travel(setting: Mapping[str, Any]) -> str:
    low, high = (figure(setting[key] * 100, 2) for key in ("travel_5_percent", "travel_95_percent"))
    if low == high:
        return f"mostly near {low} % of travel"
    return f"mostly at {low} to {high} % of travel"


# ---------------------------------------------------------------- temperature


def _temperature(candidate: Candidate) -> list[str]:
    limits = _table(candidate.extra.get("temperature"))
    if not limits:
        return []
    rows = [["band", "as stated", "9 of 10 units", "every unit"]]
    for band in candidate.bands:
        own = _table(band.extra.get("temperature"))
        name = cut(clean(band.name), LONGEST_NAME)
        rows.append([name, *(_shifts(own) if own else ("?", "?", "?"))])
    span = f"{figure(limits['from_c'])} to {figure(limits['to_c'])} \u00b0C"
    return [f"Drift from {span}, in kHz:", *(f"  {line}" for line in columns(rows, left=(0,)))]


def _shifts(own: Mapping[str, Any]) -> tuple[str, str, str]:
    nominal, size = own["shift_hz"], own["shift_spread_hz"]
    return (
        _kilohertz(nominal),
        f"{_kilohertz(own['shift_5_percent_hz'])}..{_kilohertz(own['shift_95_percent_hz'])}",
        f"{_kilohertz(nominal - size)}..{_kilohertz(nominal + size)}",
    )


def _kilohertz(hertz: float) -> str:
    return figure(hertz / 1000, 3, "+")


# ---------------------------------------------------------------- parts


def _closer(candidate: Candidate) -> list[str]:
    own = _table(candidate.extra.get("worth_improving"))
    if not own:
        return []
    part = next(part for part in candidate.parts if part.reference == own["reference"])
    how = "wound, measured and told to the plan" if own["kind"] == "coil" else "bought closer or picked by measuring"
    now, then = (format_percent(own[key], 2) for key in ("standard_deviation", "standard_deviation_then"))
    tolerances = f"{format_percent(own['better_tolerance'])} instead of {format_percent(own['tolerance'], 2)}"
    return wrapped(
        f"Worth having closer: {own['reference']}, {part.label}, {how}: at {tolerances} the standard deviation "
        f"of {own['band']} falls from {now} to {then}.",
        0,
        2,
    )


def _refit(candidate: Candidate) -> list[str]:
    lines: list[str] = []
    swaps: Any = candidate.extra.get("refit", ())
    for swap in swaps[:_MOST_SWAPS]:
        band = next(each for each in candidate.bands if each.name == swap["band"])
        left = f"{figure(swap['drift_per_k'] * 1e6, 2, '+')} \u00b1{figure(swap['drift_spread_per_k'] * 1e6, 2)} ppm/K"
        moved = (band.hertz_per_farad or 0.0) * swap["capacitance_change_f"]
        by = " and ".join(swap["by"])
        shifted = f", the band moves by {signed_shift(moved)}" if abs(moved) >= 0.5 else ""
        lines += wrapped(f"{band.name}: {swap['replaces']} {swap['label']} by {by}: {left} left{shifted}", 2, 2)
    return ["To take out the measured drift, swap one of:", *lines] if lines else []


def _series(candidate: Candidate) -> list[str]:
    own = _table(candidate.extra.get("series"))
    if not own:
        return []
    units, right = plural(own["units"], "unit"), own["yield"]
    if right is None:
        first = f"For {units}; nobody can say how many come right."
    elif own["sets"] is None:
        first = f"For {units}: only {_share(right)} come right; closer parts or a wider adjustment, not spares."
    else:
        spare = own["sets"] - own["units"]
        first = f"For {units}: {_share(right)} come right, so {plural(spare, 'further set')} as spares."
    lines = wrapped(first, 0, 2)
    for piece in own["pieces"]:
        spares = f" and {piece['spares']} spare" if piece["spares"] else ""
        short = ""
        if piece["stock"] is not None and piece["stock"] < piece["needed"] + (piece["spares"] or 0):
            short = f"; {piece['stock']} in stock"
        count = f"{piece['needed']}{spares} of {piece['description']}{short}"
        lines += wrapped(f"{' '.join(piece['references'])}  {count}", 2, 4)
    if own["price"] is not None:
        lines += wrapped(f"Price in all: {own['price']:.2f}")
    return lines
