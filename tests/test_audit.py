"""The second look: a sound result passes; one with any figure, count, limit or place put wrong does not."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache
from typing import Any

import pytest

import partpick
from partpick.audit import audit, faults_of
from partpick.errors import InternalError
from partpick.planfile import request_from_tables
from partpick.result import BandFigures, Candidate, PartLine, Result, Stage

PLANS: dict[str, dict[str, Any]] = {
    "separate": {
        "limits": {"inductors": 2, "q": 60, "drift": "90 ppm", "parts": 3, "values": 3},
        "band": [{"name": "a", "at": "3.6 MHz"}, {"name": "b", "at": "7.1 MHz"}],
        "capacitors": {"connect": "any"},
        "stray": {"inductance": "5 nH"},
        "coil": {"reactance": ["40 Ω", "150 Ω"]},
    },
    "stacked": {
        "switching": "stacked",
        "band": [{"name": "a", "at": "5.1 MHz"}, {"name": "b", "at": "7.1 MHz"}],
    },
    "swept": {
        "band": [{"name": "a", "from": "7.0 MHz", "to": "7.6 MHz"}],
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"},
        "limits": {"parts_per_band": 2, "excess": "300 %"},
        "coil": {"forms": ["ring core"]},
    },
}


@cache
def catalogue() -> partpick.Catalogue:
    """Return the shipped parts, of which one former and one capacitor are scarce."""
    return partpick.load_catalogue()


@cache
def solved(plan: str) -> Result:
    """Return what is proposed for one of the plans."""
    return partpick.solve(request_from_tables(PLANS[plan], "bands"), catalogue(), top=3)


def first(result: Result, **changes: Any) -> Result:
    """Return the result with its first candidate changed."""
    return replace(result, candidates=(replace(result.candidates[0], **changes), *result.candidates[1:]))


def band(result: Result, **changes: Any) -> Result:
    """Return the result with the first band of its first candidate changed."""
    bands = result.candidates[0].bands
    return first(result, bands=(replace(bands[0], **changes), *bands[1:]))


def limited(result: Result, table: str, **changes: Any) -> Result:
    """Return the result as if its request had had other limits."""
    request = result.request
    return replace(result, request=replace(request, **{table: replace(getattr(request, table), **changes)}))


@pytest.mark.parametrize("plan", PLANS)
def test_what_is_proposed_passes(plan: str) -> None:
    """Nothing is found fault with that the search, the assessment and the brute force agree on."""
    result = solved(plan)
    assert result.candidates and faults_of(result, catalogue()) == []
    assert audit(result, catalogue()) is result


def own(result: Result) -> BandFigures:
    return result.candidates[0].bands[0]


def best(result: Result) -> Candidate:
    return result.candidates[0]


def staged(result: Result, stage: Stage) -> Result:
    return replace(result, proof=replace(result.proof, stages=(stage,)))


def strangers(result: Result) -> tuple[PartLine, ...]:
    return (replace(best(result).parts[0], bands=("c",)), *best(result).parts[1:])


def worse(result: Result) -> tuple[Candidate, ...]:
    return tuple(replace(choice, worst_error=0.9) for choice in result.front)


FAULTS: dict[str, tuple[str, Callable[[Result], Result]]] = {
    "network is": ("separate", lambda r: band(r, network=(own(r).network or 0) * (1 + 1e-8))),
    "capacitance is": ("separate", lambda r: band(r, capacitance=(own(r).capacitance or 0) * (1 - 1e-8))),
    "resonance is": ("separate", lambda r: band(r, resonance=(own(r).resonance or 0) * (1 + 1e-8))),
    "error is": ("separate", lambda r: band(r, error=(own(r).error or 0) + 1e-8)),
    "reactance is": ("separate", lambda r: band(r, reactance=own(r).reactance * 1.001)),
    "connected are": ("separate", lambda r: band(r, connection="C9")),
    "cannot be read": ("separate", lambda r: band(r, connection="C1 |")),
    "excess is": ("swept", lambda r: band(r, extra={**own(r).extra, "excess": 0.01})),
    "tuned high end is": ("swept", lambda r: band(r, inductance=own(r).inductance * 1.01)),
    "no margin": ("swept", lambda r: limited(r, "limits", margin=1.0)),
    "an excess of": ("swept", lambda r: limited(r, "limits", excess=1e-3)),
    "capacitors are told": ("separate", lambda r: first(r, part_count=best(r).part_count + 1)),
    "coils are told": ("separate", lambda r: first(r, inductor_count=9)),
    "pieces are told": ("separate", lambda r: first(r, piece_count=1)),
    "different values are told": ("separate", lambda r: first(r, value_count=0)),
    "its price is": ("separate", lambda r: first(r, price=(best(r).price or 0.0) + 1.0)),
    "worst error is told": ("separate", lambda r: first(r, worst_error=0.0)),
    "is listed for": ("separate", lambda r: first(r, parts=strangers(r))),
    "not among the parts": ("separate", lambda r: first(r, parts=best(r).parts[1:])),
    "not those of the plan": ("separate", lambda r: first(r, bands=best(r).bands[::-1])),
    "capacitors, 0 are allowed": ("separate", lambda r: limited(r, "limits", parts=0)),
    "different values, 0 are allowed": ("separate", lambda r: limited(r, "limits", values=0)),
    "coils, 0 are allowed": ("separate", lambda r: limited(r, "limits", inductors=0)),
    "a price of": ("separate", lambda r: limited(r, "limits", price=1e-6)),
    "an error of": ("separate", lambda r: limited(r, "limits", error=1e-9)),
    "a drift of": ("separate", lambda r: limited(r, "limits", drift=1e-9)),
    "outside the values allowed": ("separate", lambda r: limited(r, "capacitors", high=1e-15)),
    "is of grade": ("separate", lambda r: limited(r, "capacitors", grades=("mica",))),
    "strays of": ("separate", lambda r: limited(r, "stray", share=1e-6)),
    "an inductance of": ("separate", lambda r: limited(r, "coil", inductance=(1.0, 2.0))),
    "a reactance of": ("separate", lambda r: limited(r, "coil", reactance=(1e6, 2e6))),
    "a coil of form": ("separate", lambda r: limited(r, "coil", forms=("pot core",))),
    "resonates by itself": ("separate", lambda r: limited(r, "coil", self_resonance=1e6, self_resonance_stated=True)),
    "a Q of": (
        "separate",
        lambda r: replace(r, request=replace(r.request, bands=tuple(replace(b, q=1e6) for b in r.request.bands))),
    ),
    "ranks are not": ("separate", lambda r: first(r, rank=7)),
    "rank before it": ("separate", lambda r: replace(r, candidates=r.candidates[:1] + r.candidates[:0:-1])),
    "gains nothing": ("stacked", lambda r: replace(r, front=(r.front[0], r.front[0]))),
    "better than the front": ("stacked", lambda r: replace(r, front=worse(r))),
    "optimal of nothing": ("stacked", lambda r: replace(r, candidates=(), front=())),
    "infeasible of": ("stacked", lambda r: replace(r, proof=replace(r.proof, status="infeasible"))),
    "nothing stopped it": ("stacked", lambda r: replace(r, proof=replace(r.proof, status="feasible"))),
    "below its bound": (
        "stacked",
        lambda r: staged(r, Stage(objective="worst_error", value=0.001, bound=0.002)),
    ),
    "pieces are below the bound": (
        "stacked",
        lambda r: staged(r, Stage(objective="pieces", value=99, bound=99)),
    ),
}  # fmt: skip


@pytest.mark.parametrize("fault", FAULTS)
def test_each_fault_is_found(fault: str) -> None:
    """A result is refused for it, in words that name it."""
    plan, spoil = FAULTS[fault]
    spoilt = spoil(solved(plan))
    assert any(fault in found for found in faults_of(spoilt, catalogue()))
    with pytest.raises(InternalError, match="nothing is shown"):
        audit(spoilt, catalogue())


def test_more_than_the_stock_has_is_found() -> None:
    """Of capacitors, formers and bought inductors, times the units built."""
    result = solved("separate")
    assert best(result).parts[0].kind == "capacitor"
    own_parts = catalogue()
    one_each = replace(
        own_parts,
        capacitors=tuple(replace(part, quantity=1) for part in own_parts.capacitors),
        inductors=tuple(replace(part, quantity=1) for part in own_parts.inductors),
        formers=tuple(replace(part, quantity=1) for part in own_parts.formers),
        cores=tuple(replace(part, quantity=1) for part in own_parts.cores),
    )
    two_units = replace(result, request=replace(result.request, units=2))
    found = faults_of(two_units, one_each)
    assert any("'capacitor'" in fault for fault in found)
    assert any("'former'" in fault or "'bought'" in fault for fault in found)
    assert not any("are there" in fault for fault in faults_of(two_units, own_parts))
