"""What must be said of a driven tank: warnings of single parts, and the cautions that nothing turns off."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from partpick.catalogue_defaults import is_class_2
from partpick.ratings import DriveTable
from partpick.result import PartLine
from partpick.stressed import PartStress, Stressed
from partpick.units import format_quantity

CAUTION_POWER = 1.0  # W of drive, and
CAUTION_VOLTAGE = 30.0  # V peak anywhere: from there cautions are told; common practice, no source
MOST_RISE = 300.0  # K; above, no figure is worth telling: it burns

LOCAL_RULES = (
    "Local law, electrical codes and the advice of a licensed or otherwise qualified person come first. A computed "
    "figure is no permission to energise anything."
)

_VERDICTS = {
    "over": "over the rating",
    "near": "inside the rating, but past half of its voltage or 0.7 of its current (common practice)",
    "not rated": "not rated, so that nothing says that it is fine",
}


def stress_warnings(every: Sequence[Stressed], unknown: Sequence[str]) -> Iterator[str]:
    """Yield one warning a verdict, of cores beyond the usual flux, and of bands whose stress is unknown.

    No coil that is wound has a rating, and its heat is told instead.
    """
    for verdict, words in _VERDICTS.items():
        found = [
            f"{one.part.reference} at {one.band}{_by_how_much(one.part)}"
            for one in every
            if one.part.verdict == verdict and not (one.part.kind == "coil" and verdict == "not rated")
        ]
        if found:
            yield f"at the stated drive, load off, {words}: {', '.join(found)}"
    for one in every:
        flux, usual = one.part.flux_density, one.part.usual_flux_density
        if flux is not None and usual is not None and flux > usual:
            yield (
                f"{one.band}: {format_quantity(flux, 'T')} peak in the core of {one.part.reference}, load off, where "
                f"{format_quantity(usual, 'T')} is usual at {format_quantity(one.part.frequency, 'Hz')} (common "
                "practice); it will run hot, or change its inductance"
            )
    for name in unknown:
        yield f"{name}: stress is unknown, because a Q is; take it for dangerous"


def _by_how_much(part: PartStress) -> str:
    """Return the figure beside the rating that it is most over, nothing for a part that is not rated."""
    voltage, current = part.voltage_use or 0.0, part.current_use or 0.0
    if part.verdict == "not rated":
        return ""
    if voltage >= current:
        assert part.voltage_rating is not None
        volts = voltage * part.voltage_rating
        return f" ({format_quantity(volts, 'V')} of {format_quantity(part.voltage_rating, 'V')})"
    assert part.current_rating is not None
    amperes = current * part.current_rating
    return f" ({format_quantity(amperes, 'A')} of {format_quantity(part.current_rating, 'A')})"


def cautions_of(
    drive: DriveTable,
    every: Sequence[Stressed],
    device: float | None,
    unknown: bool,
    parts: Sequence[PartLine],
) -> list[str]:
    """Return the cautions that apply, each with the figure that triggered it; no option turns them off.

    Parameters
    ----------
    drive : DriveTable
        [drive] of the plan.
    every : sequence of Stressed
        Each part at each band.
    device : float or None
        Peak voltage of the active device. [V]
    unknown : bool
        Whether the stress of a band is unknown.
    parts : sequence of PartLine
        What was picked: class 2 capacitors among them are named.
    """
    power = drive.power or 0.0
    worst = max(every, key=lambda one: _volts(one.part), default=None)
    volts = max(_volts(worst.part) if worst else 0.0, device or 0.0)
    if power < CAUTION_POWER and volts < CAUTION_VOLTAGE and not unknown:
        return []
    high = "a voltage that is not known"
    if worst is not None:
        high = f"{format_quantity(_volts(worst.part), 'V')} peak on {worst.part.reference} at {worst.band}"
        high += ", and one that is not known elsewhere" if unknown else ""
    drawn = format_quantity(power, "W") if power else high
    seen = f"{format_quantity(power, 'W')} of drive" if power else f"{high}, load off"
    told = [
        LOCAL_RULES,
        f"Radio-frequency burns and flash-over: {high} with the load off or the tank mistuned. Never touch or tune the "
        "live tank by hand; use insulated tools and shafts, leave room between plates and turns, more at altitude, in "
        "dust and in damp.",
        f"Supplies and capacitors hold charge after switching off ({_device(device, drawn)}): unplug, discharge "
        "through a resistor, measure before touching. Never work alone on mains or high voltage.",
        f"Transmitting needs a licence nearly everywhere ({drawn}): test into a shielded dummy load, keep to local "
        "exposure limits, keep wearers of medical devices away; bond, bypass and shield other wiring.",
        f"Class 2 ceramic and electrolytic capacitors are no tank capacitors: at this drive ({seen}) they heat and "
        f"can burst.{_class_2(parts)}",
    ]
    return [*told, *_heat(every, power)]


def _volts(part: PartStress) -> float:
    return max(part.voltage or 0.0, part.voltage_load_off) + part.bias


def _class_2(parts: Sequence[PartLine]) -> str:
    found = [part.reference for part in parts if part.kind == "capacitor" and is_class_2(part.grade or "")]
    return f" Here: {', '.join(found)}." if found else ""


def _heat(every: Sequence[Stressed], power: float) -> Iterator[str]:
    """Yield the hottest part, loaded and with the load off, or the whole power where no part's loss is known."""
    told = []
    for words, name in (("with the load", "heat"), ("with the load off", "heat_load_off")):
        known = [(float(heat), one) for one in every if (heat := getattr(one.part, name))]
        if not known:
            continue
        heat, one = max(known, key=lambda pair: pair[0])
        rise = one.part.rise(heat)
        about = "" if rise is None else f", about {_rise_words(rise)} warmer than the air"
        told.append(f"{format_quantity(heat, 'W')} in {one.part.reference} at {one.band} {words}{about}")
    if not told and power:
        told = [f"up to {format_quantity(power, 'W')} in the tank with the load off"]
    if told:
        told = told[:1] if len(told) == 2 and told[0].split(" with ")[0] == told[1].split(" with ")[0] else told
        guess = " (estimates, within a factor of two)" if "warmer" in " ".join(told) else ""
        yield f"Heat: {'; '.join(told)}{guess}. Keep formers and wire off what burns or softens."


def _rise_words(rise: float) -> str:
    if rise < 0.5:
        return "less than 1 K"
    return f"{rise:.0f} K" if rise <= MOST_RISE else f"more than {MOST_RISE:.0f} K"


def _device(device: float | None, drawn: str) -> str:
    return drawn if device is None else f"the device sees about {format_quantity(device, 'V')} peak"
