"""The drawing of tank and switch: each capacitor stands where it is soldered, behind the contact that closes it."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import handmade
import pytest

from partpick import load_catalogue, load_plan, solve
from partpick.connection import references_of
from partpick.report.circuit_rows import rows_of
from partpick.report.drawing import circuit
from partpick.report.load_table import joined, load_table
from partpick.request import Load
from partpick.result import Candidate

PLAN = """
switching = "{switching}"
[limits]
error = "2 %"
{limit}
[coil]
forms = ["bought"]
reactance = "none"
[stray]
share = "none"
[[band]]
name = "low"
at = "3.6 MHz"
[[band]]
name = "middle"
at = "5 MHz"
[[band]]
name = "high"
at = "7.1 MHz"
"""


@pytest.mark.parametrize(("switching", "limit"), [("stacked", "parts_per_band = 2"), ("shared", "parts = 4")])
def test_every_capacitor_is_drawn_once_behind_the_contact_that_closes_it(
    switching: str, limit: str, tmp_path: Path
) -> None:
    """A capacitor drawn at each band that it serves would be bought and soldered as often."""
    (tmp_path / "plan.toml").write_text(PLAN.format(switching=switching, limit=limit), encoding="utf-8")
    candidate = solve(load_plan(str(tmp_path / "plan.toml")), load_catalogue(None), top=1).candidates[0]
    rows = rows_of(candidate, "L1")
    drawn = [reference for row in rows for reference in references_of(row.tree)]
    assert sorted(drawn) == sorted(p.reference for p in candidate.parts if p.kind == "capacitor") and drawn
    for row in rows:
        for reference in references_of(row.tree):
            serves = {band.name for band in candidate.bands if reference in band.capacitors}
            for contact in row.contacts:
                assert {band.name for band in candidate.bands if contact in band.contacts} == serves
            if not row.contacts:
                assert serves == {band.name for band in candidate.bands}
    used = [contact for row in rows for contact in row.contacts]
    assert sorted(used) == sorted({contact for band in candidate.bands for contact in band.contacts})
    picture = circuit(candidate, "L1")
    for reference in drawn:
        assert len(re.findall(rf">{reference} ", picture)) == 1


def test_bands_with_capacitors_of_their_own_have_a_row_each() -> None:
    """What one position puts across the coil stands in one row."""
    rows = rows_of(handmade.two_bands(), "L1")
    assert [row.contacts for row in rows] == [band.contacts for band in handmade.two_bands().bands]


# ---------------------------------------------------------------- the load


def loaded(connection: str) -> tuple[Load, Candidate]:
    """Return a load of 50 ohm that is to look like 1.25 kilohm, on a coil of 20 turns: a fifth of the turns."""
    load = Load(resistance=50.0, loaded_q=10.0, connection=connection)
    keys = {"loaded_q": 10.0, "across_ohm": 1250.0, "damping_resistor_ohm": None}
    own = handmade.candidate(coils=(handmade.coil(turns=20),))
    return load, replace(own, bands=(replace(own.bands[0], q=100.0, extra={"load": keys}),))


@pytest.mark.parametrize(
    ("connection", "words"),
    [
        ("tap", "tap at turn 4 (computed 4) from the earthed end"),  # 20 sqrt(50/1250)
        ("link", "link over the earthed end, turns: 4 (computed 4)"),
        # a fifth of the voltage is across the load: it has 4 times the capacitance of the other
        ("divider", "divider, the capacitor across the load 4 times the other"),
    ],
)
def test_a_load_is_told_in_turns(connection: str, words: str) -> None:
    """Worked by hand from the ideal transformer: 50 ohm over 1250 ohm is a fifth of the turns squared."""
    load, candidate = loaded(connection)
    assert joined(load, 1250.0, candidate.bands[0], candidate) == words


def test_the_share_of_power_that_reaches_a_load_is_told() -> None:
    """1 - 10/100: the tank itself keeps a tenth."""
    load, candidate = loaded("link")
    request = replace(handmade.request(candidate.bands[0].name), load=load)
    assert "90\u00a0%" in load_table(request, candidate)
    assert load_table(handmade.request(candidate.bands[0].name), handmade.candidate()) == ""
