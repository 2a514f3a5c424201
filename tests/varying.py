"""Tanks that vary, made by hand, for tests of what built units do."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from partpick.built.tank import Swept, VaryingTank
from partpick.built.variation import CAPACITOR, COIL, SELF_CAPACITANCE, TUNING, WIRING, Source, Variation
from partpick.request import Trimmer
from partpick.search.networks import PARALLEL

COIL_PLACE, WINDING_PLACE = 0, 1


def on_one_coil(
    networks: Sequence[Sequence[float]],
    *,
    inductance: float = 4e-6,
    coil_size: float = 0.05,
    part_size: float = 0.05,
    stray_size: float = 0.3,
    strays: float = 10e-12,
    winding: float = 1.5e-12,
    trimmers: Sequence[Trimmer | None] = (),
    shape: int = PARALLEL,
    off: float = 0.0,
    **changes: Any,
) -> Variation:
    """Return one band for each list of capacitances, tuned with nominal parts `off` its target (a fraction)."""
    sources = [
        Source(reference="L1", kind=COIL, label="coil", size=coil_size),
        Source(reference="self-capacitance of L1", kind=SELF_CAPACITANCE, label="", size=stray_size, tempco=0.0),
    ]
    tanks = []
    for number, values in enumerate(networks):
        wiring = len(sources)
        sources.append(Source(reference=f"wiring {number}", kind=WIRING, label="", size=stray_size, tempco=0.0))
        parts = tuple(range(len(sources), len(sources) + len(values)))
        sources += [
            Source(reference=f"C{place}", kind=CAPACITOR, label=f"C{place}", size=part_size, batch=0, tempco=0.0)
            for place in parts
        ]
        tank = VaryingTank(
            name=f"band {number}",
            frequency=1e6,
            inductance=inductance,
            coil=COIL_PLACE,
            coil_tempco=0.0,
            parts=parts,
            values=tuple(values),
            series_inductances=(0.0,) * len(values),
            shape=shape,
            leads=0.0,
            wiring=wiring,
            wiring_capacitance=strays,
            winding=WINDING_PLACE,
            winding_capacitance=winding,
            trimmer=trimmers[number] if trimmers else None,
        )
        resonance = float(tank.resonance(np.zeros((len(sources), 1)))[0])
        tanks.append(replace(tank, frequency=resonance / (1 + off), **changes))
    return Variation(sources=tuple(sources), tanks=tuple(tanks))


def without_strays(variation: Variation) -> Variation:
    """Return the same with no stray capacitance at all."""
    tanks = [replace(t, wiring_capacitance=0.0, winding_capacitance=0.0) for t in variation.tanks]
    nothing = np.zeros((len(variation.sources), 1))
    tanks = [replace(tank, frequency=float(tank.resonance(nothing)[0])) for tank in tanks]
    return replace(variation, tanks=tuple(tanks))


def swept(
    variation: Variation, *, low: float, high: float, size: float = 0.05, padder: float | None = None, wanted: float
) -> Variation:
    """Return the first band swept by an element from `low` to `high` (farad); `wanted` is asked of its full range."""
    first = variation.tanks[0]
    sources = [*variation.sources, Source(reference="T", kind=TUNING, label="", size=size)]
    element = len(sources) - 1
    if padder is not None:
        sources.append(Source(reference="C9", kind=CAPACITOR, label="", size=0.05, batch=9))

    def end(capacitance: float) -> VaryingTank:
        own = Swept(
            source=element,
            capacitance=capacitance,
            padder=None if padder is None else element + 1,
            padder_capacitance=padder or 0.0,
            padder_inductance=5e-9,
        )
        return replace(first, swept=own)

    nothing = np.zeros((len(sources), 1))
    ends = [end(low), end(high)]
    reached = [float(tank.resonance(nothing)[0]) for tank in ends]
    middle, half = sum(reached) / 2, (reached[0] - reached[1]) / 2 * wanted
    lower = replace(ends[1], frequency=middle - half)
    upper = replace(ends[0], frequency=middle + half, low_end=lower)
    return Variation(sources=tuple(sources), tanks=(upper,))
