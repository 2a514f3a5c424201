"""What a tank or a coupled pair keeps out, in words."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from partpick.quantities import format_quantity
from partpick.report.text import figure, quantity
from partpick.result import BandFigures


def selectivity_in_words(band: BandFigures) -> list[str]:
    """Return harmonics where a load is stated, the image of a receiver, and the coupled pair of a band."""
    told = []
    kept = band.extra.get("selectivity")
    if isinstance(kept, Mapping):
        if kept["harmonics_db"] and isinstance(band.extra.get("load"), Mapping):
            told.append(f"harmonics down by {_decibels(kept['harmonics_db'].values())}")
        if kept["image"]:
            low, high = (f"{format_quantity(end['image_hz'], 'Hz', 4)}" for end in kept["image"])
            sizes = _decibels(end["rejection_db"] for end in kept["image"])
            told.append(f"image {low} to {high} down by {sizes} in this circuit alone")
    pair = band.extra.get("coupling")
    return told + (_pair(pair) if isinstance(pair, Mapping) and pair["capacitor_f"] else [])


def _pair(pair: Mapping[str, Any]) -> list[str]:
    own = " | ".join(format_quantity(value, "F") for value in pair["capacitors_f"]) or "no capacitor"
    peaks = len(pair["peaks_hz"])
    shape = "one peak" if peaks <= 1 else f"{peaks} peaks, {figure(pair['ripple_db'], 2)} dB between"
    told = [
        f"two such tanks: {format_quantity(pair['capacitor_f'], 'F')} between the hot ends, {own} in each tank, "
        f"{quantity(pair['bandwidth_hz'], 'Hz', 3)} wide, {shape}"
    ]
    if pair["rejection_db"]:
        told.append(f"the pair puts the neighbours down by {_decibels(pair['rejection_db'].values())}")
    told.append(f"its harmonics down by {_decibels(pair['harmonics_db'].values())}")
    return told


def _decibels(sizes: Any) -> str:
    return " and ".join("?" if size is None else f"{figure(size, 2)} dB" for size in sizes)
