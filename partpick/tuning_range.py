"""How far a tuning element reaches by itself: the bound that no choice of coil and capacitors can pass."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from partpick.candidates import Coils
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import RuledOut
from partpick.tuning import ElementEnds, element_ends

if TYPE_CHECKING:
    from partpick.moved.coils import MovedCoils

MOST_BANDS_TOLD = 12
_GRAIN = 1e-9  # a design exactly on a limit is inside it


@dataclass(frozen=True, kw_only=True)
class Reach:
    """The widest range that an element tunes with any coil in play, nothing across it but the strays.

    A padder in series makes the range of the element smaller, anything further across it adds to both ends;
    inductance of leads makes capacitors act larger towards high frequencies. So this is a bound.
    """

    kind: str
    element: ElementEnds
    strays: float  # F, the least: wiring, trimmer at its middle, self-capacitance of the best coil
    coil_ratio: float  # inductance at the low end over that at the high end, the greatest of any coil
    moved_ratio: float | None = None  # of an element that moves inductance: highest over lowest frequency

    @property
    def frequency_ratio(self) -> float:
        """Highest over lowest frequency. [-]"""
        if self.moved_ratio is not None:
            return self.moved_ratio
        capacitance = (self.element.high + self.strays) / (self.element.low + self.strays)
        return math.sqrt(capacitance * self.coil_ratio)


def reach(request: Request, coils: Coils, index: int) -> Reach | None:
    """Return how far the tuning element reaches at a swept band; None where there is no coil at all.

    Parameters
    ----------
    request : Request
        With its tuning element.
    coils : Coils
        Of that request; those out of play count too, so that the bound holds under other coil rules.
    index : int
        Of the band, in plan order.
    """
    if request.tuning is None or len(coils) == 0:
        return None
    band = request.bands[index]
    ratio = coils.inductance_low[:, index] / coils.inductance[:, index]
    known = ratio[np.isfinite(ratio)]
    trimmer = band.trimmer.middle if band.trimmer else 0.0
    own = 0.0 if request.coil.taps else float(coils.self_capacitance.min())  # a section has less than its coil
    strays = band.stray + trimmer + own
    if coils.moved is not None:
        widest, moved_ratio = _moved_ratios(coils, coils.moved, index, band.stray + trimmer)
        return Reach(
            kind=request.tuning.kind,
            element=element_ends(request.tuning),
            strays=strays,
            coil_ratio=widest,
            moved_ratio=moved_ratio,
        )
    return Reach(
        kind=request.tuning.kind,
        element=element_ends(request.tuning),
        strays=strays,
        coil_ratio=max(1.0, float(known.max(initial=1.0))),
    )


def _moved_ratios(coils: Coils, moved: MovedCoils, index: int, strays: float) -> tuple[float, float]:
    """Return the greatest ratio of inductance, and of frequency with any network, of all coils with the element.

    A network adds as much or less at the low end, so that the capacitances differ most with the strays alone.
    """
    rows = np.flatnonzero(moved.able)
    if not len(rows):
        return 1.0, 1.0
    ratio = coils.inductance_low[rows, index] / coils.inductance[rows, index]
    own = coils.self_capacitance[rows] + strays
    capacitance = (own + moved.own_low[rows, index]) / (own + moved.own_high[rows, index])
    return float(ratio.max()), math.sqrt(max(1.0, float((ratio * np.maximum(capacitance, 1.0)).max())))


def needed_ratio(band: Band, margin: float) -> float:
    """Return the frequency ratio that a swept band needs, its margin at both ends included. [-]"""
    return band.highest * (1 + margin) / (band.lowest * (1 - margin))


def least_bands(ratio: float, reached: float, margin: float) -> int | None:
    """Return the number of bands below which none can do, whatever their edges; None: the margin takes all.

    Of n bands that together span `ratio`, the widest is at least ratio^(1/n); equal ones are the best.
    """
    net = reached * (1 - margin) / (1 + margin)
    return None if net <= 1.0 else max(1, math.ceil(math.log(ratio) / math.log(net) - _GRAIN))


def beyond_reach(request: Request, coils: Coils) -> RuledOut | None:
    """Return why the tuning element alone rules the plan out: a band wider than it can tune with any parts."""
    margin = request.limits.margin
    for index, band in enumerate(request.bands):
        far = reach(request, coils, index) if band.swept else None
        if far is None or needed_ratio(band, margin) <= far.frequency_ratio * (1 + _GRAIN):
            continue
        count = least_bands(band.highest / band.lowest, far.frequency_ratio, margin)
        split = f"{_COUNTS.get(count, str(count))} bands, " if count and count <= MOST_BANDS_TOLD else ""
        needed = needed_ratio(band, margin)
        with_margin = f" with {100 * margin:.3g} % at each end" if margin else ""
        if far.moved_ratio is not None:
            reached = (
                f"the {far.kind} moves the inductance {_down(far.coil_ratio)} to 1 at most, on the coil that suits it "
                f"best, which gives at most {_down(far.moved_ratio)} in frequency"
            )
            ways = f"{split}or {_WIDER[far.kind]}"
            text = f"{reached}; band {band.name} needs {_up(needed)}{with_margin}: {ways}"
            return RuledOut(limit="tuning", needed=needed, text=text)
        text = (
            f"the capacitance ratio {far.element.high / far.element.low:.2g} with "
            f"{format_quantity(far.strays, 'F', digits=2)} of strays gives at most {_down(far.frequency_ratio)} in "
            f"frequency; band {band.name} needs {_up(needed)}{with_margin}: less strays, {split}or a larger element"
        )
        return RuledOut(limit="tuning", needed=needed, text=text)
    return None


_WIDER = {
    "sliding core": "a core that fills its coil better, or moves further",
    "moving contact": "longer coils, or fewer turns that stay in use",
    "variometer": "a rotor that fits its stator closer, or turns further",
}
_COUNTS = {2: "two", 3: "three", 4: "four", 5: "five", 6: "six"}


def _down(value: float) -> str:
    return f"{math.floor(value * 1000) / 1000:.4g}"


def _up(value: float) -> str:
    return f"{math.ceil(value * 1000) / 1000:.4g}"
