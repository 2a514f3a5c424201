"""Coils, cores and capacitors that were measured: what the bench found goes before what is computed."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from workbench import CAPACITORS, WIRES, read_json, run, table, write_drawer

from partpick.errors import RequestError
from partpick.forms.measured import coil_from_dips
from partpick.physics.resonance import resonance_frequency

L, OWN = 4.05e-6, 1.2e-12


def dips(first: float, second: float) -> tuple[tuple[float, float], tuple[float, float]]:
    """Return the dips of one coil with its own capacitance, by Thomson's formula."""
    return (float(resonance_frequency(L, first + OWN)), float(resonance_frequency(L, second + OWN))), (first, second)


@pytest.mark.parametrize(("first", "second"), [(100e-12, 22e-12), (22e-12, 100e-12), (47e-12, 0.0)])
def test_two_dips_give_inductance_and_self_capacitance(first: float, second: float) -> None:
    """Two equations, two unknowns; either order, and a dip with nothing across the coil too."""
    inductance, own = coil_from_dips(*dips(first, second))
    assert inductance == pytest.approx(L, rel=1e-9)
    assert own == pytest.approx(OWN, rel=1e-6)


@pytest.mark.parametrize(
    ("at", "with_capacitance", "said"),
    [
        ((5e6, 9e6), (22e-12, 100e-12), "contradict"),  # the larger capacitor dips higher
        ((5e6, 5e6), (22e-12, 100e-12), "contradict"),  # another capacitor, the same dip
        ((5e6, 9e6), (100e-12, 100e-12), "contradict"),  # the same capacitor, another dip
        ((5e6, 30e6), (100e-12, 22e-12), "below zero"),  # more of a change than any coil can make
    ],
)
def test_dips_that_contradict_each_other_are_refused(
    at: tuple[float, float], with_capacitance: tuple[float, float], said: str
) -> None:
    """One clear line that says what cannot be."""
    with pytest.raises(RequestError, match=said) as refused:
        coil_from_dips(at, with_capacitance)
    assert str(refused.value).startswith("coil.measured") and "\n" not in str(refused.value)


def test_contradicting_dips_of_a_plan_end_with_two(tmp_path: Path) -> None:
    """From the command line: exit 2, nothing written, no traceback."""
    plan = tmp_path / "plan.toml"
    plan.write_text(
        "[coil]\nmeasured = [{ at = \"5 MHz\", with = \"22 pF\" }, { at = \"9 MHz\", with = \"100 pF\" }]\n"
        '[[band]]\nname = "beacon"\nat = "7.1 MHz"\n',
        encoding="utf-8",
    )
    done = run("bands", plan, "--json", tmp_path / "out.json")
    assert done.code == 2 and "contradict" in done.err and done.err.count("\n") == 1
    assert not (tmp_path / "out.json").exists()


def test_a_measured_coil_spreads_by_the_measurement_alone() -> None:
    """1 % (common practice, no source); its Q is unknown, and nothing is said of turns."""
    done = run("pair", "7.1MHz", "--measured", "4.05uH", "--top", "1", "--json", "-")
    (candidate,) = done.json["candidates"]
    (coil,) = candidate["coils"]
    assert coil["inductance_spread"] == pytest.approx(0.01)
    assert coil["q_spread"] == {"below": None, "above": None}
    assert coil["turns"] is None and candidate["bands"][0]["q"] is None


def cores(folder: Path, *rows: dict[str, object]) -> Path:
    """Write a drawer of the workbench with these cores in it."""
    drawer = write_drawer(folder, formers=(), inductors=())
    (drawer / "cores.csv").write_text(table(rows), encoding="utf-8")
    return drawer


RING = {"name": "ring A", "shape": "ring", "outer_diameter": "20 mm", "inner_diameter": "10 mm", "height": "7 mm",
        "permeability": 9, "q": 150, "tolerance": "5 %"}  # fmt: skip


def test_a_measured_al_goes_before_the_permeability(tmp_path: Path) -> None:
    """Contract: `al` wins; 20 turns on 12.5 nH are 5 uH."""
    drawer = cores(tmp_path / "drawer", {**RING, "al": "12.5 nH", "tolerance": "1 %"})
    listed = read_json(run("windings", "--drawer", drawer, "--at", "7.1MHz", "--json", "-").out)["windings"]
    by_turns: dict[int, Any] = {coil["turns"]: coil for coil in listed}
    assert by_turns[20]["inductance_h"] == pytest.approx(5e-6)
    assert by_turns[20]["inductance_spread"] == pytest.approx(0.01)


def test_a_capacitor_as_measured_is_taken_to_the_last_figure(tmp_path: Path) -> None:
    """46.83 pF in a drawer is no 47 pF: the resonance is that of what was measured."""
    measured = {**CAPACITORS[0], "value": "46.83 pF", "tolerance": "0.5 %", "label": "measured"}
    drawer = write_drawer(tmp_path / "drawer", capacitors=(measured,), wires=WIRES)
    done = run("pair", "14.5MHz", "--drawer", drawer, "--error", "5%", "--top", "3", "--json", "-")
    for candidate in done.json["candidates"]:
        (band,) = candidate["bands"]
        (part,) = [part for part in candidate["parts"] if part["kind"] == "capacitor"]
        assert part["value_f"] == pytest.approx(46.83e-12, rel=1e-12)
        assert band["network_f"] == pytest.approx(46.83e-12, rel=1e-12)


@pytest.mark.parametrize(
    ("changes", "column"),
    [
        ({"inner_diameter": "20 mm"}, "inner_diameter"),
        ({"outer_diameter": "-20 mm"}, "outer_diameter"),
        ({"height": "0 mm"}, "height"),
        ({"permeability": 0.5}, "permeability"),
        ({"shape": "pot"}, "al"),
        ({"shape": "rod", "height": ""}, "height"),
        ({"shape": "pot", "al": "100 nH", "height": ""}, "height"),
        ({"frequency_low": "5 MHz", "frequency_high": "1 MHz"}, "frequency_high"),
    ],
)
def test_a_bad_core_names_row_and_column(tmp_path: Path, changes: dict[str, object], column: str) -> None:
    """One line: file, row, column, what is wrong."""
    drawer = cores(tmp_path / "drawer", RING, {**RING, "name": "ring B", **changes})
    done = run("parts", "--drawer", drawer)
    assert done.code == 2 and done.err.count("\n") == 1
    assert "cores.csv" in done.err and "row 3" in done.err and column in done.err
