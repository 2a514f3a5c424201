"""What a candidate takes from stock, times the units built, against what there is."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

from partpick.parts import Catalogue
from partpick.result import Candidate


def stock_faults(candidate: Candidate, units: int, catalogue: Catalogue) -> Iterator[str]:
    """Yield each part of which a candidate takes more than there is."""
    used = Counter[object]()
    for line in candidate.parts:
        if line.kind == "capacitor":
            used["capacitor", line.value, line.grade or "", line.tolerance, line.description] += units
    coils = {coil.reference: coil for coil in candidate.coils}
    for line in candidate.parts:
        if line.kind == "coil" and (coil := coils.get(line.reference)) is not None:
            bought = ("bought", line.label) if coil.form == "bought" else ("former", coil.former)
            used[bought] += units
        elif line.kind == "trimmer":
            used["trimmer", line.description] += units
    for key, quantity in _stock(catalogue):
        if used[key] > quantity:
            yield f"{used[key]} of {key} are used, {quantity} are there"


def _stock(catalogue: Catalogue) -> Iterator[tuple[object, int]]:
    """Yield each part of which there are not as many as wanted, with how many there are."""
    for part in catalogue.capacitors:
        if part.quantity is not None:
            yield ("capacitor", part.value, part.grade, part.tolerance, part.label), part.quantity
    for trimmer in catalogue.trimmers:
        if trimmer.quantity is not None:
            yield ("trimmer", trimmer.name), trimmer.quantity
    for inductor in catalogue.inductors:
        if inductor.quantity is not None:
            yield ("bought", inductor.label), inductor.quantity
    for former in catalogue.formers:
        if former.quantity is not None:
            yield ("former", former.name), former.quantity
    for core in catalogue.cores:
        if core.quantity is not None:
            yield ("former", core.name), core.quantity
