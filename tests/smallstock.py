"""A stock of a few invented parts, made by hand, and the coils that it can wind."""

from __future__ import annotations

from typing import Any

from partpick.candidates import Coils, realisable_coils
from partpick.parts import Catalogue, Core, Former, Inductor, Wire
from partpick.request import Band, CoilRules, Request


def wire(bare: float, overall: float | None = None, **changes: Any) -> Wire:
    """Return a wire by its diameters in millimetres; without a covering where `overall` is not given."""
    return Wire(
        name=f"wire {bare:g}", bare_diameter=bare / 1e3, overall_diameter=(overall or bare) / 1e3, **changes
    )


def bundle(strands: int, strand: float) -> Wire:
    """Return stranded wire by its strand in millimetres: bundle 1.15, covered 1.25 (common practice, no source)."""
    root = strands**0.5 * strand
    return wire(1.15 * root, 1.25 * root, strands=strands, strand_diameter=strand / 1e3)


def former(diameter: float, length: float, pitch: float | str | None = None, **changes: Any) -> Former:
    """Return a plain tube by its sizes in millimetres."""
    fields: dict[str, Any] = {
        "name": f"tube {diameter:g}x{length:g}",
        "support": "tube",
        "diameter": diameter / 1e3,
        "winding_length": length / 1e3,
        "pitch": pitch / 1e3 if isinstance(pitch, float) else pitch,
        "tolerance": 0.01,
        "tempco": 1e-4,
        "tempco_tolerance": 5e-5,
        "loss_tangent": 0.01,
        "quantity": None,
        "unit_price": None,
        "source": "invented row",
    }
    return Former(**{**fields, **changes})


def core(shape: str, outer: float, inner: float | None, height: float, **changes: Any) -> Core:
    """Return a core by its sizes in millimetres."""
    fields: dict[str, Any] = {
        "name": f"{shape} {outer:g}",
        "shape": shape,
        "outer_diameter": outer / 1e3,
        "inner_diameter": None if inner is None else inner / 1e3,
        "height": height / 1e3,
        "material": "invented",
        "permeability": None,
        "al": None,
        "q": 200.0,
        "frequency_low": None,
        "frequency_high": None,
        "tolerance": 0.05,
        "tempco": 1e-4,
        "tempco_tolerance": 5e-5,
        "adjust": None,
        "quantity": None,
        "unit_price": None,
        "source": "invented row",
    }
    return Core(**{**fields, **changes})


def inductor(value: float, **changes: Any) -> Inductor:
    """Return a bought inductor."""
    fields: dict[str, Any] = {
        "value": value,
        "tolerance": 0.05,
        "tempco": 1e-4,
        "tempco_tolerance": 5e-5,
        "q": 60.0,
        "q_frequency": None,
        "self_capacitance": 1e-12,
        "current": None,
        "adjust": None,
        "quantity": None,
        "unit_price": None,
        "label": "choke",
        "source": "invented row",
    }
    return Inductor(**{**fields, **changes})


def stock(*parts: Wire | Former | Core | Inductor) -> Catalogue:
    """Return a catalogue of these parts, without capacitors."""

    def of(kind: type[Any]) -> tuple[Any, ...]:
        return tuple(part for part in parts if isinstance(part, kind))

    return Catalogue(
        capacitors=(), inductors=of(Inductor), wires=of(Wire), formers=of(Former), cores=of(Core), drawer=True
    )


def wound(form: str, frequency: float, *parts: Wire | Former | Core | Inductor, **rules: Any) -> Coils:
    """Return every coil of one form that these parts give, evaluated at a frequency, no limit on coils set."""
    free: dict[str, Any] = {"self_resonance": None, "self_resonance_stated": True, "proportions": None}
    coil = CoilRules(forms=(form,), **{**free, "least_wound": 0.0, **rules})
    request = Request(command="pair", bands=(Band(name="test", at=frequency),), coil=coil)
    return realisable_coils(request, stock(*parts))


def of_turns(coils: Coils, turns: int) -> int:
    """Return the one coil of so many turns."""
    (place,) = [place for place, count in enumerate(coils.turns) if count == turns]
    return place
