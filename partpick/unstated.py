"""What a plan leaves unstated of its own parts: what is taken for it, and which figures stay unknown."""

from __future__ import annotations

from partpick.objective import TRIMMER_Q
from partpick.request import Request
from partpick.tuning import element_ends


def losses_taken(request: Request) -> tuple[str, ...]:
    """Return one sentence for each loss of a trimmer or a tuning element that is taken as usual."""
    found = []
    if any(band.trimmer and band.trimmer.name is None and band.trimmer.q is None for band in request.bands):
        found.append(f"trimmer: Q not stated, {TRIMMER_Q:g} taken (common practice)")
    tuning = request.tuning
    if tuning is not None and not tuning.moves_inductance and any(band.swept for band in request.bands):
        found.append(f"{tuning.kind}: Q of {element_ends(tuning).q:g} taken (common practice)")
    return tuple(found)


def unknown_drifts(request: Request) -> tuple[str, ...]:
    """Return one sentence for each temperature coefficient without which no choice of parts has a known drift."""
    found = []
    if request.coil.measured is not None:
        found.append("the temperature coefficient of a measured coil is not known, so no drift is")
    bare = [
        band.name
        for band in request.bands
        if band.trimmer is not None and not band.trimmer.to_choose and band.trimmer.tempco is None
    ]
    if bare:
        found.append(f"the trimmer's tempco is not stated, so the drift is unknown: {', '.join(bare)}")
    tuning, swept = request.tuning, [band.name for band in request.bands if band.swept]
    if tuning is not None and swept and not tuning.moves_inductance and element_ends(tuning).tempco is None:
        found.append(f"tuning.tempco is not stated, so the drift is unknown: {', '.join(swept)}")
    return tuple(found)
