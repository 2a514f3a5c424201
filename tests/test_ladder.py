"""[steps]: what is told of a ladder of relays, what is refused, and that a wrong one is not shown."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from workbench import read_json, run

import partpick
from partpick.audit import faults_of
from partpick.errors import RequestError
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.result import Result

STEPS = {"from": "3.5 MHz", "to": "3.8 MHz", "step": "10 kHz"}
MEASURED = {"measured": "4.05 \u00b5H", "self_capacitance": "1.2 pF"}


def solved(monitor: Quiet | None = None, **tables: Any) -> Result:
    request = request_from_tables({"steps": STEPS, "coil": MEASURED, "title": "Invented", **tables}, "bands")
    return partpick.solve(request, partpick.load_catalogue(), top=1, monitor=monitor)


@pytest.fixture(scope="module")
def ladder() -> Result:
    return solved()


def test_thirty_steps_take_few_binary_weighted_relays(ladder: Result) -> None:
    """Thirty-one positions take five relays at least, with standard values one or two more; each about doubles."""
    assert ladder.proof.status == "optimal"
    (candidate,) = ladder.candidates
    told: Any = candidate.extra["ladder"]
    values = [each["value_f"] for each in told["relays"]]
    assert 5 <= len(values) <= 7
    assert all(1.3 < above / below < 3 for below, above in pairwise(sorted(values)))
    assert told["largest_gap_hz"] <= 10e3 * (1 + 1e-9)
    steps: Any = candidate.extra["steps"]
    assert [step["target_hz"] for step in steps] == pytest.approx([3.5e6 + 10e3 * k for k in range(31)], rel=1e-12)
    assert all(abs(step["off_hz"]) <= 5e3 * 1.01 for step in steps)
    assert len({tuple(step["closed"]) for step in steps}) == 31


def test_the_audit_tunes_it_again(ladder: Result) -> None:
    """Wrong relays, a part of another value, a position too few: none of it is shown."""
    catalogue = partpick.load_catalogue()
    assert faults_of(ladder, catalogue) == []
    (candidate,) = ladder.candidates
    first, second, *rest = candidate.bands
    swapped = replace(first, capacitors=second.capacitors)
    other = [
        replace(line, value=line.value * 2) if line.reference == "C3" and line.value else line
        for line in candidate.parts
    ]
    for wrong in (
        replace(candidate, bands=(swapped, second, *rest)),
        replace(candidate, parts=tuple(other)),
        replace(candidate, bands=(first, second, *rest[:-1])),
    ):
        assert any("relays" in f or "gap" in f or "nothing between" in f or "positions" in f
                   for f in faults_of(replace(ladder, candidates=(wrong,)), catalogue))  # fmt: skip


def test_steps_are_equal_and_no_coarser_than_asked() -> None:
    """A step that does not divide the span is made smaller, never larger."""
    result = solved(steps={"from": "3.5 MHz", "to": "3.6 MHz", "step": "30 kHz"})
    targets = [band.at for band in result.request.bands]
    assert targets == pytest.approx([3.5e6, 3.525e6, 3.55e6, 3.575e6, 3.6e6])


def test_tolerances_that_drown_the_steps_are_told() -> None:
    """Five per cent of the largest of six or seven relays is more than a step."""
    result = solved(steps={"from": "3.5 MHz", "to": "3.8 MHz", "step": "6 kHz"}, capacitors={"grades": ["C0G"]})
    (candidate,) = result.candidates
    told: Any = candidate.extra["ladder"]
    assert told["drowned"] and all(each["moves_hz"] > 6e3 for each in told["drowned"])


def test_a_value_too_large_for_the_step_is_the_reason() -> None:
    """1 pF across 433 pF moves 3.8 MHz by 0.5 / 433 of it, 4.4 kHz."""
    result = solved(steps={"from": "3.5 MHz", "to": "3.8 MHz", "step": "2 kHz"})
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "step"
    assert result.ruled_out_by.needed == pytest.approx(4.38e3, rel=0.01)


def test_too_few_capacitors_fit_nothing() -> None:
    """Four capacitors have sixteen subsets, and thirty-one positions are wanted."""
    result = solved(limits={"parts": 4})
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "parts"


def test_a_stop_is_no_proof() -> None:
    """Stopped at once: nothing is known, and nothing is said to fit or not."""
    assert solved(Quiet(0.0)).proof.status in ("unknown", "feasible")


@pytest.mark.parametrize(
    ("tables", "key"),
    [
        ({"limits": {"error": "1 %"}}, "limits.error"),
        ({"trimmer": "3 pF..20 pF"}, "trimmer"),
        ({"limits": {"inductors": 2}}, "limits.inductors"),
        ({"coil": {"taps": True}}, "coil.taps"),
        ({"cover": {"from": "3 MHz", "to": "4 MHz"}}, "steps"),
        ({"band": [{"name": "a", "at": "3 MHz"}]}, "steps"),
        ({"spread": {"builds": 100}}, "spread"),
        ({"steps": {**STEPS, "step": "100 Hz"}}, "steps.step"),
        ({"steps": {**STEPS, "from": "4 MHz"}}, "steps.from"),
    ],
)
def test_what_makes_no_sense_is_refused(tables: Any, key: str) -> None:
    """One line names the key."""
    with pytest.raises(RequestError, match=key.replace(".", r"\.")):
        solved(**tables)


def test_the_command_line_writes_every_output(tmp_path: Path) -> None:
    """The relay table on the screen and on the sheet, the steps in the JSON, each capacitor once in the bill."""
    plan = tmp_path / "plan.toml"
    plan.write_text('[steps]\nfrom = "7.0 MHz"\nto = "7.2 MHz"\nstep = "25 kHz"\n[coil]\nforms = ["bought"]\n')
    outputs = {name: tmp_path / f"out.{name}" for name in ("json", "bom", "sheet", "netlist")}
    options = [word for name, path in outputs.items() for word in (f"--{name}", str(path))]
    ran = run("bands", str(plan), "--top", "2", "--why", "1", *options)
    assert ran.code == 0, ran.err
    assert "relays closed" in ran.out and "8 steps of 25 kHz" in ran.out
    assert all(len(line) <= 80 for line in ran.out.splitlines())
    first = read_json(outputs["json"].read_text())["candidates"][0]
    assert len(first["steps"]) == 9 and {"position", "closed", "frequency_hz"} <= set(first["steps"][0])
    assert "Relay positions" in outputs["sheet"].read_text()
    assert outputs["bom"].read_text().count("capacitor") >= 2
