"""Switching layouts from plan to result: what is in circuit, what it counts as, what is refused."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from partpick.catalogue import load_catalogue
from partpick.errors import RequestError
from partpick.parts import Catalogue
from partpick.planfile import request_from_tables
from partpick.report.drawing import circuit
from partpick.report.netlist import netlist
from partpick.request import Request
from partpick.result import Candidate
from partpick.solving import solve

BANDS = [
    {"name": "low", "at": "3.65 MHz"},
    {"name": "middle", "at": "7.1 MHz"},
    {"name": "high", "at": "14.1 MHz"},
]


def asked(switching: str, **tables: Any) -> Request:
    limits = {"error": "1 %", "parts": 5, **tables.pop("limits", {})}
    return request_from_tables({"switching": switching, "limits": limits, "band": BANDS, **tables}, "bands")


def few_formers() -> Catalogue:
    catalogue = load_catalogue(None)
    return replace(catalogue, formers=tuple(f for f in catalogue.formers if f.support == "ribbed")[:3], inductors=())


def values_in_circuit(candidate: Candidate) -> dict[str, list[float]]:
    value = {line.reference: line.value for line in candidate.parts if line.kind == "capacitor"}
    return {band.name: [value[reference] for reference in band.capacitors] for band in candidate.bands}


@pytest.mark.parametrize("switching", ["stacked", "shared"])
def test_capacitors_that_bands_share_count_once(switching: str) -> None:
    """A piece is bought once, however many bands it serves."""
    result = solve(asked(switching), few_formers(), top=3)
    assert result.proof.status == "optimal"
    for candidate in result.candidates:
        capacitors = [line for line in candidate.parts if line.kind == "capacitor"]
        assert candidate.part_count == len(capacitors) == candidate.piece_count - 1
        for band in candidate.bands:
            assert band.network == pytest.approx(sum(values_in_circuit(candidate)[band.name]), rel=0.06)
        for line in capacitors:
            serves = {band.name for band in candidate.bands if line.reference in band.capacitors}
            assert serves == set(line.bands)


def test_each_lower_band_of_a_stack_adds_to_those_above() -> None:
    """Stacked: the capacitors of a higher band stay in circuit, and at least one comes in."""
    for candidate in solve(asked("stacked"), few_formers(), top=3).candidates:
        low, middle, high = (set(band.capacitors) for band in candidate.bands)
        assert high < middle < low
        assert set(candidate.bands[0].contacts) > set(candidate.bands[2].contacts)


def test_a_shared_set_holds_no_more_than_the_limit() -> None:
    """`parts` is the most that the set may hold; each band closes the contacts of its own capacitors."""
    for candidate in solve(asked("shared", limits={"parts": 4}), few_formers(), top=3).candidates:
        assert candidate.part_count <= 4
        for band in candidate.bands:
            assert [c.replace("S", "C") for c in band.contacts] == list(band.capacitors)


def test_sharing_never_needs_more_pieces_than_separate_capacitors() -> None:
    """A shared set with room for all separate capacitors can do what they do."""
    separate = solve(asked("separate", limits={"parts": 6}), few_formers(), top=1).candidates[0]
    shared = solve(asked("shared", limits={"parts": 6}), few_formers(), top=1).candidates[0]
    assert shared.piece_count <= separate.piece_count


@pytest.mark.parametrize(
    ("switching", "tables", "named"),
    [
        ("stacked", {"capacitors": {"connect": "any"}}, "in parallel"),
        ("shared", {"capacitors": {"connect": "any"}}, "in parallel"),
    ],
)
def test_what_a_layout_is_not_planned_with_is_refused_by_name(switching: str, tables: dict, named: str) -> None:
    """Better a clear refusal than a plan of something else."""
    with pytest.raises(RequestError, match=named):
        solve(asked(switching, **tables), few_formers())


def test_a_set_that_is_too_small_is_told_how_large_it_would_have_to_be() -> None:
    """A shared set always has a size: what is eased is the size, not the limit as such."""
    coil = {"measured": "1.5 µH", "self_capacitance": "1.2 pF"}
    result = solve(asked("shared", limits={"parts": 2}, coil=coil), few_formers(), top=1)
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    told = {ruled.limit: ruled.needed for ruled in (result.ruled_out_by, *result.ruled_out_by.others)}
    needed = told["parts"]
    assert isinstance(needed, int) and needed > 2
    assert solve(asked("shared", limits={"parts": needed}, coil=coil), few_formers(), top=1).candidates


TUNING = {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"}
SWEPT = [
    {"name": "low", "from": "3.5 MHz", "to": "3.8 MHz"},
    {"name": "middle", "from": "7.0 MHz", "to": "7.2 MHz"},
    {"name": "high", "at": "14.1 MHz"},
]
WIDER = [
    ("stacked", {}),
    ("stacked", {"limits": {"inductors": 2}}),
    ("stacked", {"band": SWEPT, "tuning": TUNING}),
    ("shared", {"limits": {"parts": 4}}),
]


@pytest.mark.parametrize(("switching", "tables"), WIDER)
def test_every_output_holds_each_capacitor_once(switching: str, tables: dict[str, Any]) -> None:
    """A capacitor that several bands use is one piece in the drawing and the bill, and in each band's deck."""
    plan = {**tables, "limits": {"error": "2 %", "parts": 8, **tables.get("limits", {})}}
    request = asked(switching, **{key: value for key, value in plan.items() if key != "band"})
    if "band" in plan:
        coil = {"measured": "6 µH", "self_capacitance": "1.2 pF"}
        plan = {"switching": switching, "band": plan["band"], "tuning": TUNING, "coil": coil}
        plan |= {"stray": {"share": "60 %"}, "limits": {"error": "2 %"}}
        request = request_from_tables(plan, "bands")
    result = solve(request, few_formers(), top=1)
    assert result.candidates
    first = result.candidates[0]
    drawn = "".join(circuit(first, coil.reference) for coil in first.coils)
    deck = netlist(result)
    for line in first.parts:
        if line.kind != "capacitor":
            continue
        assert drawn.count(f">{line.reference} ") == 1, line.reference
        serves = [band for band in first.bands if line.reference in band.capacitors]
        assert [band.name for band in serves] == list(line.bands)
        tanks = sum(1 if band.target is not None else 2 for band in serves)  # both ends of a swept band
        assert deck.count(f"\nC{line.reference}t") == tanks
    used = {reference for band in first.bands for reference in band.capacitors}
    assert used == {line.reference for line in first.parts if line.kind == "capacitor"}
