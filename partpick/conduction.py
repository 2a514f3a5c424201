"""Whether a drive takes a varactor into conduction at the least bias of its range."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from partpick.physics.varactor import junction_capacitance, junction_rf_peak, least_bias, network_capacitance
from partpick.request import Tuning
from partpick.result import BandFigures
from partpick.units import format_quantity


def conduction_warnings(tuning: Tuning | None, bands: Sequence[BandFigures]) -> Iterator[str]:
    """Yield one warning a swept band whose varactor the rf drives into conduction, or close to it.

    Looked at with the load off, at the least bias, where the junctions hold the least and bear a share of the
    tank's peak that a series padder and the element's own series capacitor leave them. The least bias is that of
    the band's lower end. A reserve of 1 V below the peak is common practice, no source.
    """
    if tuning is None or tuning.kind != "varactor":
        return
    for band in bands:
        stress = band.extra.get("stress")
        if "tuned_low_hz" not in band.extra or not isinstance(stress, Mapping):
            continue
        bias = _number(tuning.get("from"))
        low_end, _ = stress["ends"]
        peak = junction_peak(tuning, band, _number(low_end["voltage_load_off_peak_v"]))
        wanted = float(least_bias(peak))
        if bias >= wanted:
            continue
        what = "drives the varactor into conduction" if peak > bias else "comes close to conduction in the varactor"
        yield (
            f"{band.name}: at the stated drive, load off, the rf {what}: {format_quantity(peak, 'V', digits=3)} peak "
            f"on a junction at {format_quantity(bias, 'V', digits=3)} of bias; tuning.from at "
            f"{format_quantity(wanted, 'V', digits=3)} keeps clear of it"
        )


def junction_peak(tuning: Tuning, band: BandFigures, tank_peak: float) -> float:
    """Return the peak rf voltage on one junction at the least bias. [V]

    Parameters
    ----------
    tuning : Tuning
        A varactor.
    band : BandFigures
        With its series padder among the further keys.
    tank_peak : float
        Across the tank. [V]
    """
    law = (_number(tuning.get(key)) for key in ("zero_bias", "potential", "grading"))
    junction = junction_capacitance(_number(tuning.get("from")), *law)
    opposed = tuning.get("connection") == "back to back"
    whole = network_capacitance(junction, _number(tuning.get("count") or 1), opposed)
    padder, element = band.extra["series_padder_f"], _number(band.extra["tuning_high_f"])
    share = 1.0 if padder is None else 1.0 / (1.0 + element / _number(padder))
    series = tuning.get("series")
    behind = float("inf") if series is None else _number(series)
    return float(junction_rf_peak(tank_peak * share, whole, behind, opposed))


def _number(value: object) -> float:
    assert isinstance(value, (int, float))
    return float(value)
