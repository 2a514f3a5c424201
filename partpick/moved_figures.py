"""What a result tells of an element that moves inductance: its part, its settings, and the coil by its setting."""

from __future__ import annotations

from typing import TYPE_CHECKING

from partpick.candidates import Coils
from partpick.circuit import Design, Tank
from partpick.request import Request
from partpick.result import PartLine
from partpick.tuning import SETTING_UNITS, element_notes

if TYPE_CHECKING:
    from partpick.moved.coils import MovedCoils


def tuned_keys(request: Request, moved: MovedCoils, coil: int) -> dict[str, object]:
    """Return what the element makes of a coil: its inductance by the setting, from the low end of a band on."""
    assert request.tuning is not None
    setting, inductance, own = moved.curve(coil)
    return {
        "element": moved.label(coil),
        "setting_unit": SETTING_UNITS[request.tuning.kind],
        "setting": setting.tolist(),
        "inductance_h": inductance.tolist(),
        "self_capacitance_f": own.tolist(),
    }


def moving_lines(request: Request, moved: MovedCoils, design: Design) -> list[PartLine]:
    """Return one line a coil that is tuned: its core, contact or rotor; all of them move together."""
    assert request.tuning is not None
    served: dict[int, list[str]] = {}
    for coil, band in zip(design.coils, request.bands, strict=True):
        if band.swept:
            served.setdefault(coil, []).append(band.name)
    stated = request.tuning.get("tempco")
    return [
        PartLine(
            reference="T" if len(served) == 1 else f"T{place}",
            kind="tuning",
            value=None,
            unit="H",
            label=request.tuning.kind,
            description=f"{request.tuning.kind}: {moved.label(coil)}",
            grade=None,
            tolerance=None,
            tempco=float(stated) if isinstance(stated, (int, float)) else None,
            bands=tuple(names),
            unit_price=0.0,
            source="stated in the plan",
        )
        for place, (coil, names) in enumerate(served.items(), 1)
    ]


def settings(tank: Tank, moved: MovedCoils) -> dict[str, object]:
    """Return further keys of a band that is tuned by the coil: where the element stands at its ends."""
    assert tank.request.tuning is not None
    return {
        "inductance_high_h": tank.inductance(),
        "self_capacitance_low_f": tank.own_capacitance(low_end=True),
        "self_capacitance_high_f": tank.own_capacitance(),
        "setting_low": moved.setting(tank.coil, low_end=True),
        "setting_high": moved.setting(tank.coil, low_end=False),
        "setting_unit": SETTING_UNITS[tank.request.tuning.kind],
    }


def element_warnings(request: Request, coils: Coils, design: Design) -> list[str]:
    """Return what must be said of an element that moves inductance, and of where it stands."""
    tuning, moved = request.tuning, coils.moved
    if tuning is None or moved is None:
        return []
    found = list(element_notes(tuning))
    if tuning.kind == "moving contact" and tuning.get("continuous") is not True:
        for coil, band in zip(design.coils, request.bands, strict=True):
            if band.swept:
                places = len(moved.curve(coil)[0])
                found.append(
                    f"{band.name}: the contact steps from turn to turn, {places} places in all; between them the "
                    "trimmer or a contact that rides on the wire (tuning.continuous) has to tune"
                )
    return found
