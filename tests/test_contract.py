"""The outside contract, tested as a stranger would: command line in, files out, drawers of a few invented parts.

Nothing here looks into the package; every expected figure is computed from the drawer and the contract.
"""

from __future__ import annotations

import csv
import io
import json
import math
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from workbench import (
    CAPACITORS,
    FORMERS,
    INDUCTORS,
    Run,
    capacitors_of,
    plan,
    ranked,
    read_json,
    run,
    write_drawer,
)

ROOT = Path(__file__).resolve().parent.parent
WIDE = ("--error", "5 %", "--stray-share", "none")  # limits under which the tiny drawer has answers
FORMS = ("--forms", "solenoid,bought")  # further kinds of coil would be wound of the same wire
HEAD = """[coil]
forms = ["solenoid", "bought"]
[limits]
error = "12 %"
[stray]
capacitance = "5 pF"
share = "none"
"""
RESULT_KEYS = {
    "partpick_result", "version", "request", "proof", "nearest_miss", "ruled_out_by", "front", "candidates",
}  # fmt: skip
CANDIDATE_KEYS = {
    "rank", "on_front", "worst_error_ppm", "worst_excess", "part_count", "inductor_count", "piece_count",
    "value_count", "price", "alternatives", "bands", "coils", "parts", "warnings",
}  # fmt: skip
BAND_KEYS = {
    "name", "target_hz", "resonance_hz", "error_ppm", "inductance_h", "capacitance_f", "network_f", "stray_f",
    "self_capacitance_f", "trimmer_f", "coil", "tap_turns", "contacts", "capacitors", "connection",
    "reactance_ohm", "q", "bandwidth_hz",
}  # fmt: skip
COIL_KEYS = {
    "reference", "form", "label", "turns", "former", "wire", "winding_length_m", "wire_length_m",
    "inductance_h", "inductance_dc_h", "self_capacitance_f",
}  # fmt: skip
PART_KEYS = {"reference", "kind", "label", "grade", "tolerance", "tempco_per_k", "bands"}
BOM_COLUMNS = (
    "rank,reference,quantity,kind,value,value_si,unit,tolerance,description,bands,unit_price,line_price,source"
)


@pytest.fixture
def drawer(tmp_path: Path) -> Path:
    """Return the tiny drawer."""
    return write_drawer(tmp_path / "drawer")


def pair(drawer: Path, *options: object, at: str = "7.1MHz") -> list[dict[str, Any]]:
    forms = () if "--measured" in options else FORMS
    return ranked("pair", at, "--drawer", drawer, *WIDE, *forms, *options)


def bom_rows(done: Run) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(done.out)))


def one_former(**changes: object) -> tuple[dict[str, object], ...]:
    return ({**FORMERS[0], **changes},)


def chosen(*values: str, **columns: object) -> tuple[dict[str, object], ...]:
    """Return capacitor rows of these values."""
    return tuple({**CAPACITORS[0], "value": value, **columns} for value in values)


# ---------------------------------------------------------------- the result file


def numbers(value: object, path: str = "") -> Iterator[tuple[str, float]]:
    """Yield every number of a JSON value with its path."""
    if isinstance(value, dict):
        for key, item in value.items():
            yield from numbers(item, f"{path}.{key}")
    elif isinstance(value, list):
        for item in value:
            yield from numbers(item, path)
    elif isinstance(value, (int, float)) and not isinstance(value, bool):
        yield path, value


def test_every_promised_key_is_there_and_of_its_type(drawer: Path) -> None:
    """Scripts read the file by these keys; they may be added to, never taken away."""
    result = run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--json", "-").json
    assert set(result) >= RESULT_KEYS
    assert result["partpick_result"] == 1 and isinstance(result["version"], str)
    assert isinstance(result["request"]["floor"], float)
    assert {"status", "searched", "stages", "stopped_by"} <= set(result["proof"])
    assert result["proof"]["status"] == "optimal" and result["proof"]["stopped_by"] is None
    for candidate in result["candidates"] + result["front"]:
        assert set(candidate) >= CANDIDATE_KEYS
        assert isinstance(candidate["on_front"], bool) and isinstance(candidate["part_count"], int)
        assert candidate["worst_excess"] is None
        for kind, keys in (("bands", BAND_KEYS), ("coils", COIL_KEYS), ("parts", PART_KEYS)):
            for entry in candidate[kind]:
                assert keys <= set(entry), kind
        for part in candidate["parts"]:
            assert ("value_h" if part["kind"] == "coil" else "value_f") in part
            assert isinstance(part["bands"], list)


def test_what_does_not_apply_is_null(drawer: Path) -> None:
    """Null is "unknown" or "not here"; a 0 in its place would be believed."""
    by_form = {c["coils"][0]["form"]: c for c in pair(drawer, "--top", 10)}
    bought, wound = by_form["bought"], by_form["solenoid"]
    for key in ("turns", "former", "wire", "winding_length_m", "wire_length_m"):
        assert bought["coils"][0][key] is None
        assert wound["coils"][0][key] is not None
    band = wound["bands"][0]
    assert band["trimmer_f"] is None and band["tap_turns"] is None
    assert isinstance(wound["coils"][0]["turns"], int)


def test_figures_are_si(drawer: Path) -> None:
    """A reader who takes picofarad or millimetre for SI would be off by a trillion."""
    for candidate in pair(drawer):
        band, coil = candidate["bands"][0], candidate["coils"][0]
        assert band["target_hz"] == 7.1e6
        assert 1e-12 < band["network_f"] < 1e-9 and 1e-7 < band["inductance_h"] < 1e-4
        assert band["stray_f"] == 5e-12  # the default of pair
        if coil["form"] == "solenoid":
            assert coil["winding_length_m"] == pytest.approx(coil["turns"] * 1.07e-3)
            turn = math.hypot(math.pi * 21.07e-3, 1.07e-3)
            assert coil["turns"] * turn <= coil["wire_length_m"] <= coil["turns"] * turn + 0.2
        tolerances = {p["kind"]: p["tolerance"] for p in candidate["parts"]}
        assert tolerances["capacitor"] == 0.05


def test_resonance_is_that_of_the_bands_own_figures(drawer: Path) -> None:
    """1/(2 pi sqrt(LC)) to double precision: whoever checks by hand must come out there."""
    bands = [band for c in pair(drawer, "--connect", "any", "--parts", 3) for band in c["bands"]]
    assert bands
    for band in bands:
        expected = 1 / (2 * math.pi * math.sqrt(band["inductance_h"] * band["capacitance_f"]))
        assert band["resonance_hz"] == pytest.approx(expected, rel=4e-16)
        parts = band["network_f"] + band["stray_f"] + band["self_capacitance_f"] + (band["trimmer_f"] or 0)
        assert band["capacitance_f"] == pytest.approx(parts, rel=4e-16)
        assert band["error_ppm"] == pytest.approx((band["resonance_hz"] / 7.1e6 - 1) * 1e6, abs=1e-9)
        reactance = 2 * math.pi * 7.1e6 * band["inductance_h"]
        assert band["reactance_ohm"] == pytest.approx(reactance, rel=1e-12)


def test_errors_are_signed_and_the_worst_is_their_largest_size(tmp_path: Path, drawer: Path) -> None:
    """Too much capacitance is a resonance below the target: minus."""
    bands = [("low", "5.6 MHz"), ("high", "7.1 MHz")]
    for candidate in ranked("bands", plan(tmp_path / "p.toml", bands, HEAD), "--drawer", drawer):
        for band in candidate["bands"]:
            assert (band["error_ppm"] < 0) == (band["resonance_hz"] < band["target_hz"])
        sizes = [abs(band["error_ppm"]) for band in candidate["bands"]]
        assert candidate["worst_error_ppm"] == max(sizes)


def test_pieces_values_and_prices_add_up(tmp_path: Path) -> None:
    """Counts are of this candidate's own parts; `parts` has one entry a piece."""
    drawer = write_drawer(tmp_path / "d", formers=())
    path = plan(tmp_path / "p.toml", [("a", "7.1 MHz"), ("b", "5.0 MHz"), ("c", "6.0 MHz")], HEAD)
    unit = {47e-12: 0.10, 100e-12: 0.12, 220e-12: 0.15}
    for candidate in ranked("bands", path, "--drawer", drawer):
        parts = [p for p in candidate["parts"] if p["kind"] == "capacitor"]
        assert candidate["part_count"] == len(parts) == sum(len(b["capacitors"]) for b in candidate["bands"])
        assert candidate["inductor_count"] == len(candidate["coils"]) == 1
        assert candidate["piece_count"] == candidate["part_count"] + 1
        assert candidate["value_count"] == len({p["value_f"] for p in parts})
        references = [p["reference"] for p in candidate["parts"]]
        assert len(set(references)) == len(references)
        assert {name for b in candidate["bands"] for name in b["capacitors"]} == {
            p["reference"] for p in parts
        }
        coil = {1e-6: 1.0, 4.7e-6: 1.5}[candidate["coils"][0]["inductance_h"]]
        assert candidate["price"] == pytest.approx(sum(unit[p["value_f"]] for p in parts) + coil)
        assert [b["name"] for b in candidate["bands"]] == ["a", "b", "c"]  # plan order
        for part in parts:
            users = [b["name"] for b in candidate["bands"] if part["reference"] in b["capacitors"]]
            assert part["bands"] == users


def test_a_price_is_null_as_soon_as_one_piece_has_none(tmp_path: Path) -> None:
    """A sum over some of the parts would look cheap."""
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("100 pF", unit_price=""), formers=())
    candidates = pair(drawer)
    assert candidates and all(candidate["price"] is None for candidate in candidates)
    assert run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--price", 100).code == 1


def test_wound_coils_cost_former_and_wire(drawer: Path) -> None:
    """Wire is bought by the metre; a former alone is no coil."""
    wound = next(c for c in pair(drawer) if c["coils"][0]["form"] == "solenoid")
    capacitors = sum({47e-12: 0.10, 100e-12: 0.12, 220e-12: 0.15}[v] for v, _ in capacitors_of(wound))
    expected = 0.80 + 0.05 * wound["coils"][0]["wire_length_m"] + capacitors
    assert wound["price"] == pytest.approx(expected)


def test_q_is_that_of_coil_and_capacitors_together(tmp_path: Path) -> None:
    """1/Q = 1/Q of the coil + each capacitor's share of the total over its own Q; strays have no loss."""
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("100 pF", q=500), formers=())
    band = pair(drawer)[0]["bands"][0]
    loss = 1 / 80 + (100e-12 / band["capacitance_f"]) / 500
    assert band["q"] == pytest.approx(1 / loss)
    assert band["bandwidth_hz"] == pytest.approx(band["resonance_hz"] * loss)


def test_an_unknown_q_is_null_and_never_passes_a_limit(tmp_path: Path) -> None:
    """A loss that nobody stated is not a loss of zero."""
    for changed in ({"capacitors": chosen("100 pF"), "inductors": ({"value": "4.7 µH"},)},):
        drawer = write_drawer(tmp_path / "d", formers=(), **changed)
        candidate = pair(drawer)[0]
        assert candidate["bands"][0]["q"] is None and candidate["bands"][0]["bandwidth_hz"] is None
        assert candidate["warnings"]
        assert run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--q", 1).code == 1


def test_the_request_shows_every_default_in_force(drawer: Path) -> None:
    """A result must be readable without the manual of its day."""
    request = run("pair", "7.1MHz", "--drawer", drawer, "--stray-share", "none", "--error", "5%",
                  "--json", "-").json["request"]  # fmt: skip
    limits = request["limits"]
    assert (limits["error"], limits["parts_per_band"], limits["inductors"]) == (0.05, 2, 1)
    assert limits["margin"] == 0.03 and limits["q"] is None and limits["parts"] is None
    assert request["coil"]["self_resonance"] == 3 and request["coil"]["proportions"] == [0.4, 2.5]
    assert request["capacitors"]["series"] == "E24" and request["capacitors"]["connect"] == "parallel"
    assert request["stray"]["capacitance"] == 5e-12 and request["stray"]["share"] is None
    assert (request["stray"]["tolerance"], request["stray"]["tempco"]) == (0.3, 100e-6)
    assert (request["units"], request["switching"]) == (1, "separate")


def test_bands_have_10_picofarad_of_strays_by_default(tmp_path: Path, drawer: Path) -> None:
    """A band switch has more wiring than one tank."""
    head = '[limits]\nerror = "5 %"\n[stray]\nshare = "none"\n'
    path = plan(tmp_path / "p.toml", [("only", "7.1 MHz")], head)
    assert {c["bands"][0]["stray_f"] for c in ranked("bands", path, "--drawer", drawer)} == {10e-12}


def test_stages_state_pieces_and_worst_error_with_their_bounds(drawer: Path) -> None:
    """Plain figures: the first candidate's, proven."""
    result = run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--json", "-").json
    stages = {stage["objective"]: stage for stage in result["proof"]["stages"]}
    assert stages["pieces"]["value"] == stages["pieces"]["bound"] == result["candidates"][0]["piece_count"]
    error = result["candidates"][0]["worst_error_ppm"] / 1e6
    assert stages["worst_error"]["value"] == pytest.approx(error)
    least = min(c["worst_error_ppm"] for c in result["front"] if c["piece_count"] <= stages["pieces"]["value"]) / 1e6
    assert stages["worst_error"]["bound"] == pytest.approx(min(error, least))


def test_the_floor_is_half_the_uncertainty_that_tolerances_leave(tmp_path: Path) -> None:
    """JCGM 100:2008, 4.3.7: a uniform tolerance t is t/sqrt(3); f goes with 1/sqrt(LC), so half of it; half of that."""
    for tolerance, error, expected in (
        (0.05, "5 %", math.hypot(0.05, 0.05) / math.sqrt(3) / 4),
        (0.001, "5 %", 0.001),
        (0.05, "0.8 %", 0.008),
    ):
        percent = f"{tolerance * 100} %"
        drawer = write_drawer(
            tmp_path / "d",
            capacitors=chosen("100 pF", tolerance=percent),
            inductors=({**INDUCTORS[1], "tolerance": percent},),
            formers=(),
        )
        done = run("pair", "7.1MHz", "--drawer", drawer, "--error", error, "--json", "-")
        assert done.json["request"]["floor"] == pytest.approx(expected)


def test_the_front_is_the_least_error_for_each_number_of_pieces(drawer: Path) -> None:
    """Each step of the front has more pieces and less error; it holds candidates and others, those unranked."""
    options = ("--connect", "any", "--parts", 3)
    result = run("pair", "7.3MHz", "--drawer", drawer, *FORMS, *WIDE, *options, "--top", 1, "--json", "-").json
    front = result["front"]
    assert len(front) > 1 and len(result["candidates"]) == 1
    pieces = [c["piece_count"] for c in front]
    errors = [c["worst_error_ppm"] for c in front]
    assert pieces == sorted(set(pieces)) and errors == sorted(errors, reverse=True)
    assert all(c["on_front"] and c["rank"] in (None, 1) for c in front)
    everything = pair(drawer, *options, "--all-windings", "--top", 1000, "--by", "error", at="7.3MHz")
    assert errors[-1] - 1e-3 <= everything[0]["worst_error_ppm"] <= errors[-1] + 1e-3


def test_each_former_and_bought_inductor_has_one_row(drawer: Path) -> None:
    """Ten windings on one tube would crowd out the others; --all-windings lists them."""
    rows = pair(drawer, "--top", 100)
    supports = [c["coils"][0]["former"] or c["coils"][0]["label"] for c in rows]
    assert sorted(set(supports)) == sorted(supports) and len(rows) == 2
    assert len(pair(drawer, "--top", 100, "--all-windings")) > len(rows)
    assert [c["rank"] for c in rows] == [1, 2]


def test_top_limits_the_candidates(drawer: Path) -> None:
    """And only cuts: what stays is the same."""
    assert pair(drawer, "--top", 1)[0] == pair(drawer, "--top", 9)[0]
    assert len(pair(drawer, "--top", 1)) == 1


def test_order_by_error_and_by_price(drawer: Path) -> None:
    """The first step of the order decides before all others."""
    options = ("--all-windings", "--top", 1000, "--parts", 2)
    errors = [round(max(c["worst_error_ppm"] * 1e-6, 1e-9) * 1e12) for c in pair(drawer, *options, "--by", "error")]
    assert errors == sorted(errors) and len(errors) > 5
    prices = [round(c["price"] * 100) for c in pair(drawer, *options, "--by", "price")]
    assert prices == sorted(prices) and len(set(prices)) > 2
    assert prices[0] == min(round(c["price"] * 100) for c in pair(drawer, *options))


# ---------------------------------------------------------------- the bill of material


def test_the_bom_has_its_columns_and_all_candidates_in_rank_order(drawer: Path) -> None:
    """RFC 4180: CRLF, header row, quoted commas."""
    done = run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--bom", "-")
    assert done.out.split("\r\n")[0] == BOM_COLUMNS
    assert "\n" not in done.out.replace("\r\n", "")
    ranks = [int(row["rank"]) for row in bom_rows(done)]
    assert ranks == sorted(ranks) and set(ranks) == {1, 2}


def test_equal_parts_share_a_row(tmp_path: Path) -> None:
    """`C1 C4`, quantity 2, bands joined by `; `: what is bought together stands together."""
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("50 pF"), inductors=INDUCTORS[1:], formers=())
    path = plan(tmp_path / "p.toml", [("a", "9.7 MHz"), ("b", "7.1 MHz")], HEAD)
    rows = bom_rows(run("bands", path, "--drawer", drawer, "--bom", "-"))
    capacitor = next(row for row in rows if row["kind"] == "capacitor")
    assert capacitor["reference"] == "C1 C2 C3" and capacitor["quantity"] == "3"
    assert capacitor["bands"] == "a; b"
    assert (float(capacitor["unit_price"]), float(capacitor["line_price"])) == (0.1, pytest.approx(0.3))
    assert (capacitor["value"], float(capacitor["value_si"]), capacitor["unit"]) == ("50 pF", 50e-12, "F")
    assert capacitor["tolerance"] == "5 %"


def test_wire_is_a_row_with_its_length_and_lines_add_up_to_the_price(drawer: Path) -> None:
    """The column of line prices is what the candidate costs."""
    arguments = ("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE)
    rows, candidates = bom_rows(run(*arguments, "--bom", "-")), ranked(*arguments)
    for candidate in candidates:
        own = [row for row in rows if int(row["rank"]) == candidate["rank"]]
        assert sum(float(row["line_price"]) for row in own) == pytest.approx(candidate["price"])
        wires = [row for row in own if row["kind"] == "wire"]
        assert len(wires) == (candidate["coils"][0]["form"] == "solenoid")
        for wire in wires:
            assert wire["unit"] == "m"
            assert float(wire["value_si"]) == candidate["coils"][0]["wire_length_m"]


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t=", " ="])
def test_a_cell_that_a_spreadsheet_would_run_is_defused(tmp_path: Path, start: str) -> None:
    """A label from a drawer is somebody else's text."""
    label = f'{start}HYPERLINK("http://x")'
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("100 pF", label=label), formers=())
    rows = bom_rows(run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--bom", "-"))
    assert any("HYPERLINK" in cell for row in rows for cell in row.values())
    for row in rows:
        for name, cell in row.items():
            if name not in ("value_si",):
                assert cell.lstrip()[:1] not in ("=", "+", "-", "@")


# ---------------------------------------------------------------- exit codes and outputs


def test_nothing_fits_writes_json_and_an_empty_bom(tmp_path: Path, drawer: Path) -> None:
    """Exit 1 is an answer: the JSON has the reason, the BOM its header only."""
    files = ("--json", tmp_path / "r.json", "--bom", tmp_path / "b.csv")
    done = run("pair", "7.1MHz", "--drawer", drawer, "--error", "1ppm", *files)
    assert done.code == 1 and done.out
    result = read_json((tmp_path / "r.json").read_text())
    assert result["candidates"] == [] and result["proof"]["status"] == "infeasible"
    assert (tmp_path / "b.csv").read_bytes() == BOM_COLUMNS.encode() + b"\r\n"


def test_the_nearest_miss_shows_what_the_limit_would_have_to_be(drawer: Path) -> None:
    """The least error that these parts reach, and with that error as the limit it fits."""
    result = run("pair", "7.1MHz", "--drawer", drawer, "--stray-share", "none", "--error", "0.01 %",
                 "--json", "-").json  # fmt: skip
    assert result["ruled_out_by"]["limit"] == "error"
    needed = result["ruled_out_by"]["needed"]
    assert needed == pytest.approx(result["nearest_miss"]["worst_error_ppm"] / 1e6)
    limit = ("--error", f"{needed * 1e6 * (1 + 1e-9):.12g} ppm")
    assert run("pair", "7.1MHz", "--drawer", drawer, "--stray-share", "none", *limit).code == 0
    limit = ("--error", f"{needed * 1e6 * (1 - 1e-3):.12g} ppm")
    assert run("pair", "7.1MHz", "--drawer", drawer, "--stray-share", "none", *limit).code == 1


@pytest.mark.parametrize(
    ("limit", "options", "eased"),
    [
        ("q", ["--q", "75"], ["--q", "70"]),
        ("price", ["--price", "1.50"], ["--price", "1.70"]),
        ("drift", ["--drift", "1ppm"], ["--drift", "500ppm"]),
        ("share", ["--stray-share", "1%"], ["--stray-share", "10%"]),
        ("reactance", ["--reactance", "1ohm,2ohm"], ["--reactance", "100ohm,400ohm"]),
        ("inductance", ["--inductance", "1uH,2uH"], ["--inductance", "1uH,5uH"]),
    ],
)
def test_the_limit_that_rules_everything_out_is_named(
    tmp_path: Path, limit: str, options: list[str], eased: list[str]
) -> None:
    """Whoever reads it must know which number to change; changed, it fits."""
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("100 pF", q=1000), inductors=INDUCTORS[1:], formers=())
    base = ("pair", "7.1MHz", "--drawer", drawer, "--error", "1%")
    done = run(*base, *options, "--json", "-")
    assert done.code == 1
    assert done.json["ruled_out_by"]["limit"] == limit
    assert done.json["nearest_miss"] is not None
    assert run(*base, *eased).code == 0


def test_json_or_bom_on_stdout_stand_there_alone(drawer: Path) -> None:
    """Both can be piped; two outputs there would be neither."""
    arguments = ("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE)
    assert run(*arguments, "--json", "-").json["partpick_result"] == 1
    assert run(*arguments, "--bom", "-").out.startswith(BOM_COLUMNS)
    both = run(*arguments, "--json", "-", "--bom", "-")
    assert (both.code, both.out) == (2, "")


def test_a_file_that_is_there_stays_without_force(tmp_path: Path, drawer: Path) -> None:
    """Yesterday's result is worth more than a typing mistake."""
    there, other = tmp_path / "there.json", tmp_path / "other.csv"
    there.write_text("yesterday")
    arguments = ("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--json", there, "--bom", other)
    assert run(*arguments).code == 2
    assert there.read_text() == "yesterday" and not other.exists()
    assert run(*arguments, "--force").code == 0
    assert read_json(there.read_text())["candidates"] and other.exists()


def outside(*arguments: object, folder: Path, stdin: str | None = None) -> subprocess.CompletedProcess[bytes]:
    """Run the command line in a process of its own."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.run(
        [sys.executable, "-m", "partpick", *map(str, arguments)],
        cwd=folder, env=environment, capture_output=True, input=None if stdin is None else stdin.encode(), timeout=60,
    )  # fmt: skip


def test_the_same_bytes_twice_and_from_another_folder(tmp_path: Path, drawer: Path) -> None:
    """No clock, host, path or hash order in any output."""
    (tmp_path / "elsewhere").mkdir()
    names = [[], ["--json", "-"], ["--bom", "-"]]
    path = plan(tmp_path / "p.toml", [("a", "7.1 MHz"), ("b", "5.6 MHz")], HEAD)
    for output in names:
        arguments = ("bands", path, "--drawer", drawer, *output)
        first = outside(*arguments, folder=tmp_path)
        assert first.returncode == 0, first.stderr
        second = outside("bands", "../p.toml", "--drawer", "../drawer", *output, folder=tmp_path / "elsewhere")
        assert first.stdout == second.stdout
        assert str(tmp_path).encode() not in first.stdout


def test_a_plan_on_stdin_is_the_plan_in_a_file(tmp_path: Path, drawer: Path) -> None:
    """`-` reads it, for generated plans."""
    path = plan(tmp_path / "p.toml", [("a", "7.1 MHz")], HEAD)
    arguments = ("--drawer", drawer, "--json", "-")
    piped = outside("bands", "-", *arguments, folder=tmp_path, stdin=path.read_text())
    assert piped.returncode == 0
    assert piped.stdout == outside("bands", path, *arguments, folder=tmp_path).stdout


@pytest.mark.skipif(os.name != "posix", reason="signals as a shell sends them")
def test_an_interrupt_is_130_with_the_best_so_far_or_nothing(tmp_path: Path) -> None:
    """Never a half-written file: the JSON is whole and marked, or it is not there."""
    target = tmp_path / "r.json"
    bands = [(f"band {i}", f"{3 + 1.37 * i:.2f} MHz") for i in range(8)]
    path = plan(tmp_path / "p.toml", bands, "[limits]\ninductors = 3\nparts_per_band = 3\nvalues = 5\n")
    process = subprocess.Popen(
        [sys.executable, "-m", "partpick", "bands", str(path), "--json", str(target)],
        cwd=tmp_path, env={**os.environ, "PYTHONPATH": str(ROOT)}, stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    )  # fmt: skip
    time.sleep(4)  # well inside a search that takes a minute or more
    assert process.poll() is None
    process.send_signal(signal.SIGINT)
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert b"Traceback" not in err
    if target.exists():
        proof = read_json(target.read_text())["proof"]
        assert proof["stopped_by"] == "interrupt" and proof["status"] in ("feasible", "unknown")


def test_a_time_limit_is_told_in_the_proof(tmp_path: Path) -> None:
    """Not proven is not optimal: exit 1 where nothing was found yet, 0 with candidates."""
    bands = [(f"band {i}", f"{3 + 1.37 * i:.2f} MHz") for i in range(8)]
    path = plan(tmp_path / "p.toml", bands, "[limits]\ninductors = 2\nparts_per_band = 3\n")
    done = run("bands", path, "--time-limit", "0.2", "--json", "-")
    proof = done.json["proof"]
    assert proof["stopped_by"] == "time limit"
    assert (done.code, proof["status"]) == ((0, "feasible") if done.json["candidates"] else (1, "unknown"))


# ---------------------------------------------------------------- drawers


def test_the_order_of_rows_and_columns_in_drawer_files_changes_nothing(tmp_path: Path) -> None:
    """A spreadsheet sorts as it likes; ties are settled by content."""
    twins = [{**row, "grade": grade} for row in CAPACITORS for grade in ("C0G", "mica", "N150")]
    files = {"capacitors": twins, "inductors": INDUCTORS, "formers": [*FORMERS, *one_former(name="tube B")]}
    one = write_drawer(tmp_path / "one", **files)
    turned = {k: [dict(reversed(row.items())) for row in reversed(rows)] for k, rows in files.items()}
    two = write_drawer(tmp_path / "two", **turned)
    options = (*WIDE, "--connect", "any", "--all-windings", "--top", 200, "--json", "-")
    first = run("pair", "7.1MHz", "--drawer", one, *options)
    assert first.code == 0 and first.out == run("pair", "7.1MHz", "--drawer", two, *options).out


def test_stock_times_units_is_kept_over_the_whole_plan(tmp_path: Path) -> None:
    """Two bands that share one value cannot both have the last piece of it."""
    path = tmp_path / "p.toml"
    bands = [("a", "7.1 MHz"), ("b", "7.12 MHz")]
    for quantity, units, fits in ((2, 1, True), (1, 1, False), (3, 2, False), (4, 2, True), ("", 50, True)):
        capacitors = chosen("100 pF", quantity=quantity)
        drawer = write_drawer(tmp_path / "d", capacitors=capacitors, inductors=INDUCTORS[1:], formers=())
        plan(path, bands, f"units = {units}\n{HEAD}".replace("12 %", "3 %"))
        done = run("bands", path, "--drawer", drawer, "--json", "-")
        assert done.code == (0 if fits else 1), (quantity, units)
        if not fits:
            assert done.json["ruled_out_by"]["limit"] == "quantity"


def test_scarce_parts_go_where_they_are_needed(tmp_path: Path) -> None:
    """One piece of the exact value: the band that has no other choice gets it, the other takes two pieces."""
    drawer = write_drawer(
        tmp_path / "d",
        capacitors=(*chosen("100 pF", quantity=1), *chosen("52 pF", quantity=2)),
        inductors=INDUCTORS[1:],
        formers=(),
    )
    path = plan(tmp_path / "p.toml", [("a", "7.1 MHz"), ("b", "7.1 MHz"), ("c", "9.1 MHz")], HEAD)
    done = run("bands", path, "--drawer", drawer, "--json", "-")
    assert done.code == 1  # three bands, and 52 pF twice is gone with the second
    plan(path, [("a", "7.1 MHz"), ("b", "7.1 MHz")], HEAD)
    first = ranked("bands", path, "--drawer", drawer)[0]
    assert capacitors_of(first) == [(52e-12, "C0G"), (100e-12, "C0G")] or first["part_count"] == 3


def test_coils_draw_on_stock_too(tmp_path: Path) -> None:
    """Two units need two chokes; a former of which there is one carries one coil."""
    for quantity, units, code in ((1, 1, 0), (1, 2, 1), (2, 2, 0), (0, 1, 1)):
        drawer = write_drawer(
            tmp_path / "d", inductors=({**INDUCTORS[1], "quantity": quantity},), formers=(),
            capacitors=chosen("100 pF"),
        )  # fmt: skip
        path = plan(tmp_path / "p.toml", [("a", "7.1 MHz")], f"units = {units}\n{HEAD}")
        assert run("bands", path, "--drawer", drawer).code == code, (quantity, units)


def test_two_coils_on_one_former_need_two_of_it(tmp_path: Path) -> None:
    """The set of coils of one plan is wound at the same time."""
    head = HEAD.replace("[limits]", 'proportions = "none"\n[limits]\ninductors = 2').replace("12 %", "4 %")
    bands = [("a", "5.6 MHz"), ("b", "11.3 MHz")]
    inside = {}
    for quantity in (1, 2):
        drawer = write_drawer(
            tmp_path / "d", capacitors=chosen("100 pF"), inductors=(), formers=one_former(quantity=quantity)
        )
        done = run("bands", plan(tmp_path / "p.toml", bands, head), "--drawer", drawer, "--json", "-")
        inside[quantity] = [c["inductor_count"] for c in done.json["candidates"]]
    assert 2 in inside[2] and 2 not in inside[1]


def test_none_in_stock_is_not_offered_and_empty_is_as_many_as_wanted(tmp_path: Path) -> None:
    """0 and empty are opposites."""
    for quantity, code in ((0, 1), ("", 0)):
        drawer = write_drawer(tmp_path / "d", capacitors=chosen("100 pF", quantity=quantity))
        assert run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE).code == code


def test_quantity_of_a_family_is_per_value(tmp_path: Path) -> None:
    """A box of E6 with one of each holds one 47 pF and one 100 pF."""
    family = ({"series": "E6", "from": "47 pF", "to": "100 pF", "grade": "C0G", "q": 1000, "quantity": 1},)
    drawer = write_drawer(tmp_path / "d", capacitors=family, formers=())
    seen = set()
    for at in ("7.1MHz", "5.9MHz", "5.6MHz", "8.3MHz", "9.9MHz"):
        done = run("pair", at, "--drawer", drawer, *WIDE, "--all-windings", "--top", 100, "--json", "-")
        for candidate in done.json["candidates"]:
            values = [value for value, _ in capacitors_of(candidate)]
            assert len(values) == len(set(values)), "a value twice"
            seen |= set(values)
    assert seen <= {47e-12, 68e-12, 100e-12} and len(seen) == 3


def test_a_series_thins_families_but_not_single_values(tmp_path: Path) -> None:
    """E6 keeps 47 pF of an E12 family, not 56 pF; a part given by `value` stays."""
    family = {"series": "E12", "from": "10 pF", "to": "820 pF", "grade": "C0G", "q": 1000}
    single = {"value": "103 pF", "grade": "C0G", "q": 1000}
    drawer = write_drawer(tmp_path / "d", capacitors=(family, single), inductors=INDUCTORS)
    offered = set()
    for at in ("7.1MHz", "7.2MHz", "5.5MHz", "9MHz", "13MHz"):
        for candidate in pair(drawer, "--series", "E6", "--all-windings", "--top", 500, at=at):
            offered |= {value for value, _ in capacitors_of(candidate)}
    steps = (10, 15, 22, 33, 47, 68)  # IEC 60063, E6
    allowed = {float(f"{step}e{power}") for step in steps for power in (-12, -11)} | {103e-12}
    assert offered <= allowed and 103e-12 in offered and len(offered) > 4


def test_from_and_to_bound_the_values(drawer: Path) -> None:
    """Both ends are inside."""
    low = pair(drawer, "--from", "100pF", "--to", "100pF", "--all-windings", "--top", 500)
    assert {value for c in low for value, _ in capacitors_of(c)} == {100e-12}


def test_grades_follow_the_default_and_the_option(drawer: Path) -> None:
    """A drawer offers all its grades; the shipped parts only steady ones, unless drift is a limit."""
    options = ("--all-windings", "--top", 500)
    assert {g for c in pair(drawer, *options) for _, g in capacitors_of(c)} == {"C0G", "N150"}
    assert {g for c in pair(drawer, *options, "--grades", "C0G") for _, g in capacitors_of(c)} == {"C0G"}
    shipped = ("pair", "7.1MHz", "--forms", "bought", "--top", 40)
    steady = [p["tempco_per_k"] for c in ranked(*shipped) for p in c["parts"] if p["kind"] == "capacitor"]
    assert steady and all(abs(tempco) <= 60e-6 for tempco in steady)
    limited = ranked(*shipped, "--drift", "100ppm")
    tempcos = [p["tempco_per_k"] for c in limited for p in c["parts"] if p["kind"] == "capacitor"]
    assert any(abs(tempco) > 60e-6 for tempco in tempcos)
    unknown = run("pair", "7.1MHz", "--drawer", drawer, "--grades", "X7R")
    assert unknown.code == 2 and "X7R" in unknown.err


def test_connect_any_adds_series_and_mixed_networks(tmp_path: Path) -> None:
    """C1 + C2 in series is a value that no single part has; the notation says which way."""
    drawer = write_drawer(tmp_path / "d", capacitors=chosen("47 pF", "220 pF"), inductors=INDUCTORS[1:], formers=())
    c = 47 + 220 * 47 / (220 + 47)  # pF, 47 | (47 + 220)
    at = 1 / (2 * math.pi * math.sqrt(4.7e-6 * (c + 7) * 1e-12))
    options = ("--drawer", drawer, "--error", "100ppm", "--parts", 3)
    assert run("pair", f"{at}Hz", *options).code == 1
    candidate = ranked("pair", f"{at}Hz", *options, "--connect", "any")[0]
    band = candidate["bands"][0]
    assert band["network_f"] == pytest.approx(c * 1e-12)
    values = {p["reference"]: p["value_f"] for p in candidate["parts"] if p["kind"] == "capacitor"}
    outer, _, inner = band["connection"].partition(" | ")
    assert values[outer] == 47e-12 and inner.startswith("(") and inner.endswith(")")
    assert sorted(values[name] for name in inner[1:-1].split(" + ")) == [47e-12, 220e-12]


def test_empty_cells_take_a_default_that_is_told(tmp_path: Path) -> None:
    """Never a silent zero: the warnings say what was taken."""
    drawer = write_drawer(tmp_path / "d", capacitors=({"value": "100 pF"},), inductors=INDUCTORS[1:], formers=())
    candidate = pair(drawer)[0]
    text = " ".join(candidate["warnings"])
    assert "tolerance" in text
    capacitor = next(p for p in candidate["parts"] if p["kind"] == "capacitor")
    assert capacitor["tolerance"] > 0


# ---------------------------------------------------------------- limits, trimmers, measured coils


def test_none_removes_a_limit(drawer: Path) -> None:
    """A limit of none is not a limit of zero."""
    assert run("pair", "7.1MHz", "--drawer", drawer, "--error", "1ppm").code == 1
    assert run("pair", "7.1MHz", "--drawer", drawer, "--error", "none", "--stray-share", "none").code == 0
    assert run("pair", "40MHz", "--drawer", drawer, "--error", "none", "--stray-share", "none").code == 0
    few = run("windings", *FORMS, "--drawer", drawer, "--json", "-").json
    every = run("windings", *FORMS, "--drawer", drawer, "--proportions", "none", "--json", "-").json
    turns = {w["turns"] for w in every["windings"]} - {w["turns"] for w in few["windings"]}
    assert turns == set(range(1, 8))  # 0.4 of 21.07 mm is 7.9 turns of 1.07 mm


@pytest.mark.parametrize("key", ["error", "q", "drift", "price", "parts", "values", "excess"])
def test_none_is_read_for_every_limit(tmp_path: Path, drawer: Path, key: str) -> None:
    """As the plan page has it."""
    path = plan(tmp_path / "p.toml", [("a", "7.1 MHz")], f'[limits]\n{key} = "none"\n')
    done = run("bands", path, "--drawer", drawer, "--json", "-")
    assert done.code in (0, 1) and done.json["request"]["limits"][key] is None


def test_a_self_resonance_limit_keeps_coils_far_below_it(drawer: Path) -> None:
    """Bought inductors need twice the frequency unless the plan says otherwise."""
    own = 1 / (2 * math.pi * math.sqrt(4.7e-6 * 2e-12))  # 51.9 MHz, choke B
    for at, options, seen in (
        (own / 2.1, (), True),
        (own / 1.9, (), False),
        (own / 1.9, ("--self-resonance", "none"), True),
        (own / 3.1, ("--self-resonance", 3.5), False),
    ):
        done = run("windings", *FORMS, "--at", f"{at:.6g}Hz", "--drawer", drawer, "--json", "-", *options).json
        assert any("choke B" in w["label"] for w in done["windings"]) == seen


def test_a_trimmer_lifts_the_default_error_limit(drawer: Path) -> None:
    """Its range brings the parts on frequency; nominal figures take its middle."""
    options = ("--drawer", drawer, "--stray-share", "none", "--json", "-")
    assert run("pair", "6.65MHz", *options, "--parts", 1).code == 1
    done = run("pair", "6.65MHz", *options, "--trimmer", "3pF..30pF", "--parts", 1)
    assert done.code == 0
    for candidate in done.json["candidates"]:
        band = candidate["bands"][0]
        assert band["trimmer_f"] == 16.5e-12
        wanted = 1 / ((2 * math.pi * 6.65e6) ** 2 * band["inductance_h"])
        rest = wanted - (band["capacitance_f"] - band["trimmer_f"])
        assert 3e-12 * (1 - 1e-9) <= rest <= 30e-12 * (1 + 1e-9)
        trimmers = [p for p in candidate["parts"] if p["kind"] == "trimmer"]
        assert len(trimmers) == 1
        assert candidate["piece_count"] == candidate["part_count"] + 1  # no piece
        assert candidate["value_count"] == 1  # nor a value
    rows = bom_rows(run("pair", "6.65MHz", *options[:-2], "--trimmer", "3pF..30pF", "--parts", 1, "--bom", "-"))
    assert any(row["kind"] == "trimmer" for row in rows)


def test_a_measured_coil_is_the_only_coil(drawer: Path) -> None:
    """Wound and measured: only its capacitors are picked."""
    candidates = pair(drawer, "--measured", "4.7uH", "--self-capacitance", "1.5pF")
    assert [c["coils"][0]["form"] for c in candidates] == ["measured"]
    band = candidates[0]["bands"][0]
    assert (band["inductance_h"], band["self_capacitance_f"], band["q"]) == (4.7e-6, 1.5e-12, None)
    assert candidates[0]["coils"][0]["turns"] is None


def test_two_dips_give_inductance_and_self_capacitance(tmp_path: Path, drawer: Path) -> None:
    """w^2 L (C + C_self) = 1 at both: two equations, two unknowns, solved here backwards."""
    L, own = 4.05e-6, 3.2e-12
    f = [1 / (2 * math.pi * math.sqrt(L * (c + own))) for c in (100e-12, 22e-12)]
    dips = f'[{{ at = "{f[0]!r} Hz", with = "100 pF" }}, {{ at = "{f[1]!r} Hz", with = "22 pF" }}]'
    head = HEAD.replace('forms = ["solenoid", "bought"]', f"measured = {dips}")
    path = plan(tmp_path / "p.toml", [("a", "7.7 MHz")], head)
    band = ranked("bands", path, "--drawer", drawer)[0]["bands"][0]
    assert band["inductance_h"] == pytest.approx(L, rel=1e-9)
    assert band["self_capacitance_f"] == pytest.approx(own, rel=1e-6)


@pytest.mark.parametrize(
    ("text", "named", "nearest"),
    [
        ("[limits]\nerorr = \"1 %\"\n", "erorr", "error"),
        ("[limit]\nerror = \"1 %\"\n", "limit", "limits"),
        ("[coil]\nreactanc = [\"40 Ω\", \"1 kΩ\"]\n", "reactanc", "reactance"),
        ('switching = "seperate"\n', "seperate", "separate"),
        ('[capacitors]\nconnect = "paralel"\n', "paralel", "parallel"),
        ('[[band]]\nname = "b"\nfrequency = "7 MHz"\nat = "7 MHz"\n', "frequency", ""),
    ],
)
def test_an_unknown_name_is_refused_with_the_nearest_known_one(
    tmp_path: Path, drawer: Path, text: str, named: str, nearest: str
) -> None:
    """A misspelt limit that passed silently would be no limit."""
    done = run("bands", plan(tmp_path / "p.toml", [("a", "7.1 MHz")], text), "--drawer", drawer)
    assert done.code == 2 and named in done.err and nearest in done.err


def test_a_plan_counts_parts_values_and_price_over_all_bands(tmp_path: Path) -> None:
    """Limits of the whole plan bind; what is offered keeps to them."""
    drawer = write_drawer(tmp_path / "d", formers=())
    bands = [("a", "7.1 MHz"), ("b", "5.0 MHz"), ("c", "10 MHz")]
    free = ranked("bands", plan(tmp_path / "p.toml", bands, HEAD), "--drawer", drawer)[0]
    for key, figure, step in (("parts", "part_count", 1), ("values", "value_count", 1), ("price", "price", 0.01)):
        for limit, code in ((free[figure], 0), (1 if key != "price" else 1.0, 1)):
            head = HEAD.replace("[limits]", f"[limits]\n{key} = {limit}")
            done = run("bands", plan(tmp_path / "p.toml", bands, head), "--drawer", drawer, "--json", "-")
            assert done.code == code, (key, limit)
            for candidate in done.json["candidates"]:
                assert candidate[figure] <= limit + step * 1e-6


# ---------------------------------------------------------------- windings, parts, starter


def test_windings_list_every_turn_that_fits_and_every_bought_coil(drawer: Path) -> None:
    """25 mm hold 23 turns of 1.07 mm; limits on proportions are taken off."""
    no_limits = ("--proportions", "none", "--self-resonance", "none")
    done = run("windings", *FORMS, "--drawer", drawer, *no_limits, "--json", "-")
    assert done.json["partpick_windings"] == 1
    listed = done.json["windings"]
    assert sorted(w["turns"] for w in listed if w["turns"]) == list(range(1, 24))
    assert sum(w["form"] == "bought" for w in listed) == 2
    assert all(set(w) >= COIL_KEYS for w in listed)


def test_windings_with_a_value_come_nearest_first_and_at_adds_q_and_resistance(drawer: Path) -> None:
    """`--top` does not cut the JSON."""
    done = run("windings", "4.05uH", *FORMS, "--at", "7.1MHz", "--drawer", drawer, "--top", 1, "--json", "-")
    listed = done.json["windings"]
    away = [abs(math.log(w["inductance_h"] / 4.05e-6)) for w in listed]
    assert away == sorted(away) and len(away) > 3
    for w in listed:
        reactance = 2 * math.pi * 7.1e6 * w["inductance_h"]
        assert w["series_resistance_ohm"] == pytest.approx(reactance / w["q"])


def test_parts_lists_the_drawer(drawer: Path) -> None:
    """What is in use and where it comes from."""
    done = run("parts", "--drawer", drawer)
    assert done.code == 0 and "N150" in done.out and "220 pF" in done.out


def test_starter_writes_a_plan_and_a_drawer_that_work(tmp_path: Path) -> None:
    """What is written to begin from must be solved as it stands, and is not written over."""
    folder = tmp_path / "start"
    assert run("starter", folder).code == 0
    plans = list(folder.glob("**/*.toml"))
    drawers = {path.parent for path in folder.glob("**/*.csv")}
    assert len(plans) == 1 and len(drawers) == 1
    done = run("bands", plans[0], "--drawer", drawers.pop(), "--json", "-")
    assert done.code == 0 and done.json["candidates"]
    assert run("starter", folder).code == 2


def test_everything_shown_on_stderr_is_no_result(drawer: Path) -> None:
    """A short run says nothing there."""
    assert run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE).err == ""


def test_json_has_no_unknown_constant(drawer: Path) -> None:
    """NaN and Infinity are no JSON; the file is UTF-8 with figures that read back."""
    text = run("pair", "7.1MHz", "--drawer", drawer, *FORMS, *WIDE, "--json", "-").out
    assert "NaN" not in text and "Infinity" not in text
    assert all(math.isfinite(number) for _, number in numbers(json.loads(text)))
