"""The bands of one candidate as lines of text: the figures, then the parts in circuit."""

from __future__ import annotations

import re
from collections.abc import Sequence

from partpick.quantities import format_percent, format_quantity
from partpick.report.oscillator import oscillator_in_words
from partpick.report.selectivity import selectivity_in_words
from partpick.report.text import (
    clean,
    columns,
    cut,
    figure,
    quantity,
    signed_percent,
    signed_shift,
    slope,
    wrapped,
)
from partpick.result import BandFigures, Candidate, PartLine

LONGEST_NAME = 14
MOST_COLUMNS = 80
OHM = "\u03a9"
LEAST_SHARE = 0.005  # of the loss, that is worth a word at the bench
CAUSES = ("skin", "proximity", "core", "former", "capacitors", "trimmer", "tuning")
PARTED = 0.001  # of the frequency: the least floor
_INDENT = 2
_FIXED_HEAD = ["band", "target", "error", "off by", "Q", "\u03a9", "per pF", "strays"]
_SWEPT_HEAD = ["band", "wanted", "tunes", "excess", "Q", "\u03a9"]


def bands_in_full(candidate: Candidate) -> list[str]:
    """Return the figures of every band in plan order, fixed bands before swept ones."""
    fixed = [band for band in candidate.bands if band.target is not None]
    swept = [band for band in candidate.bands if band.target is None]
    lines = _block(candidate, fixed, _FIXED_HEAD, [_fixed_row(band) for band in fixed], left=(0,))
    return lines + _block(candidate, swept, _SWEPT_HEAD, [_swept_row(band) for band in swept], left=(0, 1, 2))


def share_of_strays(band: BandFigures) -> float | None:
    """Return wiring and self-capacitance as a fraction of all capacitance in circuit."""
    if band.capacitance is None or band.capacitance <= 0:
        return None
    return (band.stray + band.self_capacitance) / band.capacitance


def worst_q(candidate: Candidate) -> float | None:
    """Return the least unloaded Q of all bands; None where one is unknown."""
    figures = [band.q for band in candidate.bands]
    known = [q for q in figures if q is not None]
    return min(known) if known and len(known) == len(figures) else None


def swept_range(low: float | None, high: float | None) -> str:
    """Return a range of frequency, such as "7 MHz..7.3 MHz"."""
    return f"{quantity(low, 'Hz', 4)}..{quantity(high, 'Hz', 4)}"


def with_labels(connection: str, parts: Sequence[PartLine], keep: bool = False) -> str:
    """Return a connection such as "C1 | (C2 + C3)" in values; `keep` leaves the references before them."""
    labels = {part.reference: f"{part.reference} {part.label}" if keep else part.label for part in parts}
    return re.sub(r"[A-Z]+[0-9]*", lambda found: labels.get(found[0], found[0]), connection)


def _block(
    candidate: Candidate,
    bands: list[BandFigures],
    head: list[str],
    rows: list[list[str]],
    left: tuple[int, ...],
) -> list[str]:
    if not bands:
        return []
    blank = " " * _INDENT
    figures = columns([head, *rows], left)
    over = _INDENT + max(map(len, figures)) - MOST_COLUMNS
    if over > 0:  # figures are not to be broken, a name may be
        shortest = max(LONGEST_NAME - over, 4)
        figures = columns([head, *([cut(row[0], shortest), *row[1:]] for row in rows)], left)
    lines = [blank + figures[0]]
    for band, line in zip(bands, figures[1:], strict=True):
        lines.append(blank + line)
        lines += wrapped(_in_circuit(band, candidate), 2 * _INDENT, _INDENT)
    return lines


def _fixed_row(band: BandFigures) -> list[str]:
    off = None if band.error is None or band.target is None else band.error * band.target
    share = share_of_strays(band)
    return [
        cut(clean(band.name), LONGEST_NAME),
        quantity(band.target, "Hz", 6),
        signed_percent(band.error),
        signed_shift(off),
        figure(band.q),
        figure(band.reactance),
        slope(band.hertz_per_farad),
        "?" if share is None else format_percent(share, 2),
    ]


def _swept_row(band: BandFigures) -> list[str]:
    excess = _number(band, "excess")
    return [
        cut(clean(band.name), LONGEST_NAME),
        swept_range(_number(band, "low_hz"), _number(band, "high_hz")),
        swept_range(_number(band, "tuned_low_hz"), _number(band, "tuned_high_hz")),
        "?" if excess is None else format_percent(excess),
        figure(band.q),
        figure(band.reactance),
    ]


def _number(band: BandFigures, key: str) -> float | None:
    value = band.extra.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _loaded_q(band: BandFigures) -> str:
    load = band.extra.get("load")
    return f"loaded Q {figure(load.get('loaded_q'))}, " if isinstance(load, dict) else ""


def _load_in_words(band: BandFigures) -> list[str]:
    """Return the damping resistor and how far a neighbour is kept out, where a load is stated."""
    load = band.extra.get("load")
    if not isinstance(load, dict):
        return []
    told = []
    if load.get("damping_resistor_ohm") is not None:
        told.append(f"{format_quantity(load['damping_resistor_ohm'], OHM)} across it to damp")
    elif load.get("tap_turns") is not None:
        told.append(f"load at turn {load['tap_turns']} from the earthed end")
    elif load.get("link_turns") is not None:
        turns = "1 turn" if load["link_turns"] == 1 else f"{load['link_turns']} turns"
        coupled = figure(load["link_coupling"], 2)
        told.append(f"load on a link of {turns} over the earthed end, coupled by {coupled}")
    elif load.get("divider"):
        upper, lower = load["divider"]
        told.append(f"load across {lower}, {upper} from there to the hot end")
    elif load.get("across_ohm") is not None:
        told.append(f"load to look like {format_quantity(load['across_ohm'], OHM, 3)} across it")
    rejection = load.get("rejection_db")
    if isinstance(rejection, dict) and load.get("offset_hz") is not None:
        sides = [f"{figure(rejection[side], 2)} dB {side}" for side in ("below", "above")]
        told.append(f"at {format_quantity(load['offset_hz'], 'Hz')} off down by {' and '.join(sides)}")
    return told


def _loss_in_words(band: BandFigures) -> str:
    """Return which causes take how much of the loss, such as "loss: skin 63 %, proximity 22 %"."""
    loss = band.extra.get("loss")
    total = loss.get("total") if isinstance(loss, dict) else None
    if not isinstance(loss, dict) or not total:
        return ""
    causes = [cause for cause in CAUSES if cause in loss]
    if loss.get("skin") is None:  # of a bought coil nobody says what its loss is made of
        causes.insert(0, "coil")
    shares = [(cause, loss[cause] / total) for cause in causes if loss[cause]]
    worth = [(cause, share) for cause, share in shares if share >= LEAST_SHARE]
    return "loss: " + ", ".join(f"{cause} {format_percent(share, 2)}" for cause, share in worth)


def _parted_resonances(band: BandFigures) -> str:
    """Return the resonances of a lossy tank where they are apart by more than errors that count."""
    parted = band.extra.get("lossy_resonances")
    if not isinstance(parted, dict) or not band.resonance:
        return ""
    unity, peak, ringing = (parted[f"{name}_hz"] for name in ("unity_power_factor", "greatest_impedance", "ringing"))
    if max(abs(f / band.resonance - 1) for f in (unity, peak, ringing)) <= PARTED:
        return ""
    shown = [format_quantity(f, "Hz", 5) for f in (unity, peak, ringing)]
    return f"real at {shown[0]}, greatest impedance at {shown[1]}, rings at {shown[2]}"


def _in_circuit(band: BandFigures, candidate: Candidate) -> str:
    """Return coil, capacitors and what else belongs to the band, in words."""
    tap = f" (tap at turn {band.tap_turns})" if band.tap_turns is not None else ""
    network = with_labels(band.connection, candidate.parts, keep=True) or "no capacitor"
    told = [f"{band.coil}{tap}: {network}"]
    if band.capacitance is not None:
        told.append(f"{quantity(band.capacitance, 'F', 4)} in circuit with strays")
    if band.trimmer is not None:
        told.append(f"trimmer about {quantity(band.trimmer, 'F')}")
    if band.contacts:
        told.append(f"contacts {', '.join(band.contacts)}")
    if band.bandwidth is not None:
        told.append(f"{_loaded_q(band)}bandwidth {format_quantity(band.bandwidth, 'Hz')}")
    told += _load_in_words(band)
    told += selectivity_in_words(band)
    told += oscillator_in_words(band)
    if loss := _loss_in_words(band):
        told.append(loss)
    if parted := _parted_resonances(band):
        told.append(parted)
    if band.drift is not None:
        spread = "" if not band.drift_spread else f" \u00b1{figure(band.drift_spread * 1e6, 2)}"
        told.append(f"drift {figure(band.drift * 1e6, 2, '+')}{spread} ppm/K")
    return "; ".join(told)
