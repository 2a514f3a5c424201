"""What a plan does not say of its own trimmer and tuning element: nothing is taken or unknown in silence."""

from __future__ import annotations

from pathlib import Path

import pytest
from workbench import Run, run, write_drawer

BAND = '[[band]]\nname = "b"\n'
WARM = '[temperature]\nfrom = "10 °C"\nto = "30 °C"\n'
SWEPT = '[tuning]\nkind = "variable capacitor"\nlow = "20 pF"\nhigh = "150 pF"\n' + BAND
HEAD = '[coil]\nforms = ["bought"]\n[stray]\nshare = "none"\n'


@pytest.fixture
def drawer(tmp_path: Path) -> Path:
    return write_drawer(tmp_path / "drawer")


def planned(drawer: Path, text: str, *options: object) -> Run:
    path = drawer.parent / "plan.toml"
    path.write_text(HEAD + text, encoding="utf-8")
    return run("bands", path, "--drawer", drawer, "--json", "-", *options)


def trimmed(more: str = "") -> str:
    return BAND + f'at = "6.6 MHz"\ntrimmer = {{ low = "3 pF", high = "20 pF"{more} }}\n'


def test_an_unknown_drift_names_the_key_that_is_missing(drawer: Path) -> None:
    """The limit refuses at once and says why; the same plan with the key is judged on its drift."""
    limit = '[limits]\ndrift = "500 ppm"\n'
    done = planned(drawer, limit + trimmed())
    assert done.code == 1
    ruled = done.json["ruled_out_by"]
    assert ruled["limit"] == "drift" and "trimmer's tempco is not stated" in ruled["text"] and "b" in ruled["text"]
    assert planned(drawer, limit + trimmed(', tempco = "-200 ppm"')).code == 0
    swept = planned(drawer, limit + SWEPT + 'from = "6.0 MHz"\nto = "7.0 MHz"\n')
    assert swept.json["ruled_out_by"]["limit"] == "drift" and "tuning.tempco" in swept.json["ruled_out_by"]["text"]


def test_a_range_of_temperature_says_which_coefficient_is_missing(drawer: Path) -> None:
    """A question mark in the table has its reason below it; without the range nobody asked."""
    warm = planned(drawer, WARM + trimmed()).json["candidates"][0]
    assert warm["bands"][0]["temperature"] is None
    assert any("tempco is not stated, so the drift is unknown: b" in text for text in warm["warnings"])
    for text in (trimmed(), WARM + trimmed(', tempco = "-200 ppm"')):
        first = planned(drawer, text).json["candidates"][0]
        assert not any("tempco" in said for said in first["warnings"])


def test_a_loss_that_is_taken_is_told(drawer: Path) -> None:
    """Q of a trimmer and of a tuning element; a stated one is nothing to tell."""
    taken = planned(drawer, trimmed()).json["candidates"][0]["warnings"]
    assert "trimmer: Q not stated, 400 taken (common practice)" in taken
    stated = planned(drawer, trimmed(", q = 300")).json["candidates"][0]["warnings"]
    assert not any("trimmer: Q" in text for text in stated)
    swept = planned(drawer, SWEPT + 'from = "6.0 MHz"\nto = "7.0 MHz"\n').json["candidates"][0]["warnings"]
    assert "variable capacitor: Q of 1000 taken (common practice)" in swept


def test_a_measured_drift_that_no_swap_mends_is_told(drawer: Path) -> None:
    """A band without a capacitor has none to give; one with a choice of grades is told its swaps instead."""
    measured = WARM + 'measured_drift = "-18 ppm"\n'
    bare = planned(drawer, measured + SWEPT + 'from = "6.5 MHz"\nto = "7.5 MHz"\n').json["candidates"][0]
    assert any("b: no capacitor in circuit and in stock can be swapped" in text for text in bare["warnings"])
    asked_nothing = planned(drawer, SWEPT + 'from = "6.5 MHz"\nto = "7.5 MHz"\n').json["candidates"][0]
    assert not any("swapped" in text for text in asked_nothing["warnings"])


def test_what_tunes_a_band_without_capacitors_is_named(drawer: Path) -> None:
    """Strays alone only where there is neither a trimmer nor a capacitor that tunes."""
    told = {}
    for name, text in {
        "trimmer": BAND + 'at = "18.6 MHz"\ntrimmer = { low = "3 pF", high = "30 pF" }\n',
        "tuned": SWEPT + 'from = "6.5 MHz"\nto = "7.5 MHz"\n',
    }.items():
        first = planned(drawer, text).json["candidates"][0]
        assert first["part_count"] == 0, name
        told[name] = " ".join(text for text in first["warnings"] if "no capacitor" in text)
    assert told["tuned"] == "" and "strays and trimmer alone" in told["trimmer"]
