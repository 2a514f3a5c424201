"""What a build sheet says in tables: parts to buy, coils to wind, the switch, and what should be read."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from partpick.forms.block import TAIL
from partpick.quantities import format_percent, format_quantity
from partpick.report import html
from partpick.report.bands_table import with_labels
from partpick.report.bom import price_without_wire
from partpick.report.oscillator import common_terminal
from partpick.report.switch_text import switch_to_buy
from partpick.report.text import figure, length, quantity, signed_percent, signed_shift, slope
from partpick.result import BandFigures, Candidate, CoilFigures, PartLine

TEST_CAPACITORS = tuple(first * 10.0**power for power in (-11, -10, -9) for first in (1.0, 2.2, 4.7))  # F, E3
TEST_TOLERANCE = 0.01  # of a capacitor kept for measuring


# ---------------------------------------------------------------- to buy


def shopping(candidate: Candidate, units: int) -> str:
    """Return what to buy or pull for one unit, equal pieces in one row, wire as a row of its own."""
    head = ("Part", "Quantity", "For", "Tolerance", "Price each")
    alike: dict[tuple[str, str, float | None], list[PartLine]] = {}
    for part in candidate.parts:
        name = part.description
        if part.kind == "coil":
            coil = next((c for c in candidate.coils if c.reference == part.reference), None)
            name = coil.former if coil and coil.former else part.description
        alike.setdefault((name, _tolerance(part), part.unit_price), []).append(part)
    rows = []
    for (name, tolerance, _), pieces in alike.items():
        references = " ".join(piece.reference for piece in pieces)
        own = price_without_wire(pieces[0])
        each = "" if not own else f"{own:.2f}"
        rows.append([name, str(len(pieces)), references, tolerance, each])
    for part in candidate.parts:
        if part.wire is not None and part.wire_length is not None:
            rows.append([f"wire {part.wire}", length(part.wire_length), part.reference, "", _wire_price(part)])
    rows += [[words, "1", "", "", ""] for words in switch_to_buy(candidate)]
    told = [html.table(head, rows, figures=(1, 3, 4))]
    if units > 1:
        told.append(html.paragraph(f"Quantities are for one of {units} units.", class_="soft"))
    if candidate.price is not None:
        told.append(html.paragraph(f"Together {candidate.price:.2f}, wire included."))
    else:
        told.append(html.paragraph("No sum: not every part has a price in the lists.", class_="soft"))
    return "\n".join(told)


def _tolerance(part: PartLine) -> str:
    return "" if part.tolerance is None or part.kind == "coil" else f"\u00b1{format_percent(part.tolerance, 2)}"


def _wire_price(part: PartLine) -> str:
    return "" if part.wire_price_per_m is None else f"{part.wire_price_per_m:.2f} a metre"


# ---------------------------------------------------------------- to wind


def windings(candidate: Candidate) -> str:
    """Return one card a coil: everything that is needed to wind it, in the order in which it is."""
    return html.element("div", "\n".join(_coil(coil, candidate) for coil in candidate.coils), class_="cards")


def _coil(coil: CoilFigures, candidate: Candidate) -> str:
    bands = [band.name for band in candidate.bands if band.coil == coil.reference]
    taps = sorted({b.tap_turns for b in candidate.bands if b.coil == coil.reference and b.tap_turns is not None})
    part = next((part for part in candidate.parts if part.reference == coil.reference), None)
    spread = "" if part is None or part.tolerance is None else f" \u00b1{format_percent(part.tolerance, 2)}"
    rows = [
        ("Former", coil.former),
        ("Wire", coil.wire),
        ("Cut", None if coil.wire_length is None else f"{length(coil.wire_length)}, both ends included"),
        ("Turns", None if coil.turns is None else str(coil.turns)),
        ("Pitch", None if coil.pitch is None else f"{length(coil.pitch)} from turn to turn"),
        ("Winding", None if coil.winding_length is None else f"{length(coil.winding_length)} long"),
        ("Diameter", None if coil.mean_diameter is None else f"{length(coil.mean_diameter)}, middle of the wire"),
        ("Taps", ", ".join(f"turn {turn}" for turn in taps) + " from the earthed end" if taps else None),
        ("Inductance", quantity(coil.inductance, "H", 4) + spread),
        ("Own capacitance", None if not coil.self_capacitance else quantity(coil.self_capacitance, "F", 2)),
        ("For", ", ".join(bands) if len(candidate.bands) > 1 else None),
    ]
    title = html.element("h3", html.text(f"{coil.reference}: {coil.label}"))
    return html.element("div", title + html.pairs(rows) + html.bullets(_how(coil)), class_="card")


def _how(coil: CoilFigures) -> list[str]:
    """Return how such a coil is wound; common practice."""
    if not coil.turns:
        return ["Nothing to wind." if coil.form != "measured" else "The coil that you have measured."]
    ends = f"Leave {length(TAIL)} of wire free at each end."
    if coil.form == "ring core":
        return [
            "Each pass of the wire through the hole is one turn, all in one direction.",
            "One layer, spread evenly round the ring; keep some 30\u00b0 free between the ends.",
            ends,
        ]
    one_way = "Wind all turns in one direction."
    if coil.pitch is None:
        return [one_way, ends]
    close = "close wound" in coil.label
    lay = "Turns touch each other." if close else "Keep the pitch; a groove or a second wire helps."
    return [one_way, lay, ends, "Spread turns to raise the frequency, press them together to lower it."]


# ---------------------------------------------------------------- the bands and the switch


def at_a_glance(candidate: Candidate) -> str:
    """Return one row a band: what is asked for, what comes out, with which parts."""
    head = ("Band", "Wanted", "Computed", "Off", "Q", "Loaded Q", "Damping", "Bandwidth", "Drift")
    return html.table(head, [_band(band) for band in candidate.bands], figures=range(1, len(head)))


def _band(band: BandFigures) -> list[str]:
    if band.target is None or band.resonance is None:
        wanted, tuned = _range(band, "low_hz", "high_hz"), _range(band, "tuned_low_hz", "tuned_high_hz")
        off = ""
    else:
        wanted, tuned = quantity(band.target, "Hz", 6), quantity(band.resonance, "Hz", 6)
        off = f"{signed_percent(band.error)} ({signed_shift((band.error or 0.0) * band.target)})"
    width = "" if band.bandwidth is None else format_quantity(band.bandwidth, "Hz")
    drift = "" if band.drift is None else f"{figure(band.drift * 1e6, 2, '+')} ppm/K"
    load = band.extra.get("load")
    stated = load if isinstance(load, Mapping) else {}
    loaded, damping = stated.get("loaded_q"), stated.get("damping_resistor_ohm")
    return [
        band.name,
        wanted,
        tuned,
        off,
        figure(band.q),
        "" if loaded is None else figure(loaded),
        "" if damping is None else quantity(damping, "\u03a9") + " across",
        width,
        drift,
    ]


def _range(band: BandFigures, low: str, high: str) -> str:
    ends = [band.extra.get(key) for key in (low, high)]
    return " to ".join(quantity(float(end) if isinstance(end, (int, float)) else None, "Hz", 5) for end in ends)


def switch_table(candidate: Candidate) -> str:
    """Return which contacts are closed at each band and what is then in circuit."""
    head = ("Band", "Contacts", "Coil", "Across the coil")
    rows = []
    for band in candidate.bands:
        tap = "" if band.tap_turns is None else f", tap at turn {band.tap_turns}"
        network = with_labels(band.connection, candidate.parts, keep=True) or "no capacitor"
        trimmers = [p.reference for p in candidate.parts if p.kind == "trimmer" and band.name in p.bands]
        across = " | ".join([network, *trimmers])
        tap += common_terminal(band)
        rows.append([band.name, " ".join(band.contacts) or "none", f"{band.coil}{tap}", across])
    return html.table(head, rows) + html.paragraph("| in parallel, + in series.", class_="soft")


# ---------------------------------------------------------------- what should be read


def dips(candidate: Candidate) -> str:
    """Return where each coil, alone on the bench with a known capacitor across it, should dip."""
    head = ("Coil", "Across it", "Dips at", "Within")
    rows = []
    for coil in candidate.coils:
        part = next((part for part in candidate.parts if part.reference == coil.reference), None)
        spread = (part.tolerance or 0.0) if part else 0.0
        for capacitance, inductance in _test_points(coil, candidate.bands):
            frequency = _dip(inductance, capacitance + (coil.self_capacitance or 0.0))
            low = _dip(inductance * (1 + spread), capacitance * (1 + TEST_TOLERANCE) + (coil.self_capacitance or 0.0))
            high = _dip(inductance * (1 - spread), capacitance * (1 - TEST_TOLERANCE) + (coil.self_capacitance or 0.0))
            within = f"{quantity(low, 'Hz', 4)} to {quantity(high, 'Hz', 4)}"
            rows.append([coil.reference, quantity(capacitance, "F"), quantity(frequency, "Hz", 4), within])
    return html.table(head, rows, figures=(1, 2))


def _dip(inductance: float, capacitance: float) -> float:
    return 1 / (2 * math.pi * math.sqrt(inductance * capacitance))


def _test_points(coil: CoilFigures, bands: Sequence[BandFigures]) -> list[tuple[float, float]]:
    """Return test capacitor and inductance near the coil's lowest and its highest band."""
    own = [band for band in bands if band.coil == coil.reference]
    points: dict[float, float] = {}
    for band in (min(own, key=_frequency), max(own, key=_frequency)):
        # a coil that is tuned is looked at by itself
        inductance = coil.inductance if "setting_unit" in band.extra else band.inductance
        wanted = 1 / ((2 * math.pi * _frequency(band)) ** 2 * inductance)
        nearest = min(TEST_CAPACITORS, key=lambda value: abs(math.log(value / wanted)))
        points.setdefault(nearest, inductance)
    return list(points.items())


def _frequency(band: BandFigures) -> float:
    """Return where figures of a band were taken: its target, or the high end of its range."""
    return band.reactance / (2 * math.pi * band.inductance)


def readings(candidate: Candidate) -> str:
    """Return how each band answers in circuit: its resonance, and how far one picofarad moves it."""
    head = ("Band", "Dips at", "Per pF more", "Capacitance", "of which strays")
    rows = []
    for band in candidate.bands:
        strays = quantity(band.stray + band.self_capacitance, "F", 2)
        tuned = _range(band, "tuned_low_hz", "tuned_high_hz") if band.resonance is None else None
        rows.append([
            band.name,
            tuned or quantity(band.resonance, "Hz", 6),
            "" if band.hertz_per_farad is None else slope(band.hertz_per_farad),
            "" if band.capacitance is None else quantity(band.capacitance, "F", 4),
            strays,
        ])  # fmt: skip
    return html.table(head, rows, figures=(1, 2, 3, 4))
