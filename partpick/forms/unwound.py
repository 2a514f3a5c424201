"""Formers and cores that no wire of the stock fits, each with the column that says why."""

from __future__ import annotations

from collections.abc import Sequence

from partpick.forms.copper import covered
from partpick.forms.solenoid import wire_pitch
from partpick.parts import Catalogue, Core, Former, Wire
from partpick.physics.cores import ring_turns_that_fit
from partpick.physics.geometry import window_turns_that_fit
from partpick.physics.pot_core import pot_window
from partpick.quantities import format_quantity


def unwound(catalogue: Catalogue) -> tuple[str, ...]:
    """Return one sentence for each former and core on which no wire goes; none where there is no wire at all."""
    if not catalogue.wires:
        return ()
    formers = [_about_former(former, catalogue.wires) for former in catalogue.formers]
    cores = [_about_core(core, [catalogue.wires[w] for w in covered(catalogue.wires)]) for core in catalogue.cores]
    return tuple(text for text in (*formers, *cores) if text)


def _about_former(former: Former, wires: Sequence[Wire]) -> str:
    pitches = [pitch for wire in wires if (pitch := wire_pitch(former, wire)) is not None]
    if not pitches:
        groove = isinstance(former.pitch, float)
        cause = f"groove of {format_quantity(float(former.pitch or 0), 'm')} (pitch)" if groove else former.support
        return f"formers.csv, {former.name}: no wire in stock goes on its {cause}"
    if all(pitch > former.winding_length * (1 + 1e-9) for pitch in pitches):
        return f"formers.csv, {former.name}: its winding_length has no room for one turn of any wire in stock"
    return ""


def _about_core(core: Core, wires: Sequence[Wire]) -> str:
    if any(_fits(core, wire.overall_diameter) for wire in wires):
        return ""
    where = {"ring": "hole (inner_diameter)", "pot": "window (outer_diameter, height)", "rod": "length (height)"}
    return f"cores.csv, {core.name}: no covered wire in stock fits its {where[core.shape]}"


def _fits(core: Core, overall: float) -> bool:
    if core.shape == "ring":
        assert core.inner_diameter is not None
        return int(ring_turns_that_fit(core.inner_diameter, overall)) > 0
    assert core.height is not None
    if core.shape == "pot":
        window = pot_window(core.outer_diameter, core.height)
        return int(window_turns_that_fit(window.width, window.depth, overall)) > 0
    return overall <= core.height
