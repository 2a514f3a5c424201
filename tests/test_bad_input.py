"""What cannot be understood: one clear line on stderr, exit 2, nothing on stdout, no output file left."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from workbench import FORMERS, Run, run, table, write_drawer

BAND = '[[band]]\nname = "a"\nat = "7.1 MHz"\n'


@pytest.fixture(autouse=True)
def bench(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Work in an empty folder with a drawer beside it."""
    write_drawer(tmp_path / "drawer")
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    return tmp_path / "here"


def refused(*arguments: object) -> str:
    """Return the one line of a run that must leave nothing behind."""
    before = {path: path.read_bytes() for path in Path().rglob("*") if path.is_file()}
    done = run(*arguments)
    assert_refused(done)
    assert {path: path.read_bytes() for path in Path().rglob("*") if path.is_file()} == before
    return done.err


def assert_refused(done: Run) -> None:
    assert done.code == 2, done
    assert done.out == ""
    assert done.err.count("\n") == 1 and done.err.endswith("\n") and len(done.err) < 400
    assert done.err.startswith("partpick: ")
    assert "Traceback" not in done.err and "internal error" not in done.err


OUTPUTS = ("--json", "r.json", "--bom", "b.csv")


@pytest.mark.parametrize(
    ("frequency", "said"),
    [
        ("7.1 nF", "capacitance"),
        ("7.1 ohm", "resistance"),
        ("0", "zero"),
        ("0 Hz", "zero"),
        ("-7.1 MHz", ""),
        ("inf", "inf"),
        ("Infinity", ""),
        ("1e999", ""),
        ("nan", "nan"),
        ("NaN Hz", ""),
        ("999 Hz", "lumped"),
        ("1.01 GHz", "lumped"),
        ("1e12", "lumped"),
        ("7.1", "7.1 MHz?"),
        ("7.1mhz", "MHz"),
        ("7,1 MHz", "7.1"),
        ("1_000_000", ""),
        ("７.1 MHz", ""),
        ("", ""),
        ("   ", ""),
        ("MHz", ""),
        ("7.1 MHz MHz", ""),
        ("7.1 xHz", ""),
        ("7.3MHz..7.0MHz", ""),
        ("7MHz..", ""),
        ("7.0MHz..7.3MHz", "--tuning"),  # a range without an element to sweep it
    ],
)
def test_a_frequency_that_makes_no_sense_is_refused_with_what_would(frequency: str, said: str) -> None:
    """Unit, sign, size and form; outside 1 kHz to 1 GHz the reason is that parts are taken as lumped."""
    assert said in refused("pair", *OUTPUTS, "--", frequency)
    Path("p.toml").write_text(f'[[band]]\nname = "a"\nat = "{frequency}"\n', encoding="utf-8")
    assert "p.toml" in refused("bands", "p.toml", *OUTPUTS)


@pytest.mark.parametrize("value", ["inf", "-inf", "nan", "0", "-1", "true", "[]", "{}", '""', "1979-05-27", "1e300"])
def test_a_number_in_a_plan_must_be_a_frequency(value: str) -> None:
    """TOML has numbers of its own that are no quantities."""
    Path("p.toml").write_text(f'[[band]]\nname = "a"\nat = {value}\n')
    assert "at" in refused("bands", "p.toml", *OUTPUTS)


PLANS = {
    "no bands": ('title = "x"\n', "band"),
    "an empty file": ("", "band"),
    "only blanks": ("\n\n  \n", "band"),
    "two bands of one name": (BAND + BAND.replace("7.1", "5"), '"a"'),
    "at together with from": (BAND + 'from = "7 MHz"\nto = "7.2 MHz"\n', "from"),
    "from without to": ('[[band]]\nname = "a"\nfrom = "7 MHz"\n', "to"),
    "from above to": (
        '[tuning]\nkind = "variable capacitor"\nlow = "12 pF"\nhigh = "150 pF"\n'
        '[[band]]\nname = "a"\nfrom = "7.3 MHz"\nto = "7.0 MHz"\n',
        "from",
    ),
    "a band without a frequency": ('[[band]]\nname = "a"\n', "at"),
    "a band without a name": ('[[band]]\nat = "7 MHz"\n', "name"),
    "a nonsense series": (f'[capacitors]\nseries = "E25"\n{BAND}', "E24"),
    "a series that is a number": (f"[capacitors]\nseries = 24\n{BAND}", "series"),
    "an unknown key": (f"[limits]\nparts_per_bnd = 2\n{BAND}", "parts_per_band"),
    "an unknown table": (f"[limitz]\nerror = 0.01\n{BAND}", "limits"),
    "an unknown key at the top": (f"unit = 2\n{BAND}", "units"),
    "an unknown value": (f'switching = "parallel"\n{BAND}', "separate"),
    "a wrong unit": (f'[stray]\ncapacitance = "5 MHz"\n{BAND}', "frequency"),
    "a fraction that looks like a percentage": (f"[limits]\nerror = 0.5\n{BAND}", "%"),
    "a negative limit": (f'[limits]\nerror = "-1 %"\n{BAND}', "error"),
    "a limit that is not a number": (f"[limits]\nq = nan\n{BAND}", "q"),
    "a limit that is infinite": (f"[limits]\nprice = inf\n{BAND}", "price"),
    "a limit of true": (f"[limits]\nparts = true\n{BAND}", "parts"),
    "parts of the wrong number": (f"[limits]\nparts_per_band = 7\n{BAND}", "parts_per_band"),
    "half a part": (f"[limits]\nparts_per_band = 1.5\n{BAND}", "parts_per_band"),
    "no units": (f"units = 0\n{BAND}", "units"),
    "a range upside down": (f'[coil]\nreactance = ["1 kΩ", "40 Ω"]\n{BAND}', "reactance"),
    "a range of one": (f'[coil]\ninductance = ["2 µH"]\n{BAND}', "inductance"),
    "an unknown form": (f'[coil]\nforms = ["toroidd"]\n{BAND}', "forms"),
    "self-capacitance without a coil": (f'[coil]\nself_capacitance = "1 pF"\n{BAND}', "measured"),
    "a table in place of a value": (f"[limits.error]\nx = 1\n{BAND}", "error"),
    "a value in place of a table": (f"limits = 3\n{BAND}", "limits"),
    "bands that are no list": ('[band]\nname = "a"\nat = "7 MHz"\n', "band"),
    "no TOML": ("[[band]\nname = ", "TOML"),
    "a key twice": ('title = "a"\ntitle = "b"\n' + BAND, "TOML"),
    "deep nesting": ("x = " + "[" * 5000 + "]" * 5000 + "\n" + BAND, ""),
    "deep dotted keys": (".".join(["a"] * 5000) + " = 1\n" + BAND, ""),
    "deep inline tables": ("x = " + "{a = " * 3000 + "1" + "}" * 3000 + "\n" + BAND, ""),
    "a number of ten thousand digits": ("units = " + "9" * 10_000 + "\n" + BAND, ""),
    "a shared set without its size": (f'switching = "shared"\n{BAND}', "parts"),
    "two stacked bands at one frequency": (f'switching = "stacked"\n{BAND}{BAND.replace("a", "b", 1)}', ""),
}


@pytest.mark.parametrize("name", PLANS)
def test_a_bad_plan_is_refused(name: str) -> None:
    """The line names the file and what in it is meant."""
    text, said = PLANS[name]
    Path("p.toml").write_text(text, encoding="utf-8")
    line = refused("bands", "p.toml", *OUTPUTS)
    assert "p.toml" in line and said in line


@pytest.mark.parametrize("data", [b"\xff\xfe[\x00", b'title = "caf\xe9"\n' + BAND.encode(), b"\x00" * 40, b"\x93NUMPY"])
def test_a_plan_in_another_encoding_is_refused(data: bytes) -> None:
    """UTF-8 is wanted, and the line says so or that it is no TOML."""
    Path("p.toml").write_bytes(data)
    assert "p.toml" in refused("bands", "p.toml", *OUTPUTS)


def test_a_plan_that_is_not_there_is_refused() -> None:
    """As is a folder in the place of a file inside it."""
    assert "absent.toml" in refused("bands", "absent.toml", *OUTPUTS)
    assert "nowhere" in refused("bands", "nowhere/absent.toml", *OUTPUTS)
    Path("empty").mkdir()
    assert "empty" in refused("bands", "empty", *OUTPUTS)


def test_a_plan_that_is_far_too_long_is_refused() -> None:
    """A wrong file named by mistake is not read for minutes."""
    Path("p.toml").write_text("# " + "x" * 1_000_000 + "\n" + BAND)
    assert "p.toml" in refused("bands", "p.toml", *OUTPUTS)


CAPACITORS = "value,grade,tolerance,q,quantity,unit_price,label\n"
FILES = {
    "an empty file": ("capacitors.csv", "", ""),
    "a column missing": ("capacitors.csv", "grade,tolerance\nC0G,5 %\n", "value"),
    "a column missing of formers": ("formers.csv", "name,support\nA,tube\n", "diameter"),
    "a column twice": ("capacitors.csv", "value,value\n1 pF,2 pF\n", "value"),
    "a bad number": ("capacitors.csv", CAPACITORS + "47 pF,C0G,5 %,high,,,\n", "q"),
    "a number of another unit": ("capacitors.csv", CAPACITORS + "47 uH,C0G,5 %,,,,\n", "value"),
    "a value of nothing": ("capacitors.csv", CAPACITORS + ",C0G,5 %,,,,\n", "value"),
    "a negative value": ("capacitors.csv", CAPACITORS + "-47 pF,C0G,5 %,,,,\n", "value"),
    "a value of zero": ("capacitors.csv", CAPACITORS + "0 pF,C0G,5 %,,,,\n", "value"),
    "an infinite value": ("capacitors.csv", CAPACITORS + "inf,C0G,5 %,,,,\n", "value"),
    "a value that is not a number": ("capacitors.csv", CAPACITORS + "nan,C0G,5 %,,,,\n", "value"),
    "a figure code": ("capacitors.csv", CAPACITORS + "104,C0G,5 %,,,,\n", "100 nF"),
    "a tolerance over 100 %": ("capacitors.csv", CAPACITORS + "47 pF,C0G,120 %,,,,\n", "tolerance"),
    "a negative tolerance": ("capacitors.csv", CAPACITORS + "47 pF,C0G,-5 %,,,,\n", "tolerance"),
    "a negative quantity": ("capacitors.csv", CAPACITORS + "47 pF,C0G,5 %,,-1,,\n", "quantity"),
    "half a quantity": ("capacitors.csv", CAPACITORS + "47 pF,C0G,5 %,,1.5,,\n", "quantity"),
    "a negative price": ("capacitors.csv", CAPACITORS + "47 pF,C0G,5 %,,,-0.1,\n", "unit_price"),
    "a label twice": ("capacitors.csv", CAPACITORS + "47 pF,,,,,,x\n56 pF,,,,,,x\n", "label"),
    "a name twice": ("formers.csv", table([FORMERS[0], FORMERS[0]]), "name"),
    "a short row": ("capacitors.csv", CAPACITORS + "47 pF,C0G\n", ""),
    "a long row": ("capacitors.csv", CAPACITORS + "47 pF,C0G,5 %,,,,,,one cell too many\n", ""),
    "a series that is none": ("capacitors.csv", "series,from,to\nE25,1 pF,1 nF\n", "series"),
    "a family upside down": ("capacitors.csv", "series,from,to\nE24,1 nF,1 pF\n", ""),
    "a family without an end": ("capacitors.csv", "series,from\nE24,1 pF\n", "to"),
    "wire thinner over its covering": (
        "wires.csv", "name,bare_diameter,overall_diameter\nw,1 mm,0.9 mm\n", "overall_diameter",
    ),
    "a hole wider than the core": (
        "cores.csv", "name,outer_diameter,inner_diameter,height,al\nc,10 mm,12 mm,4 mm,1 nH\n", "inner_diameter",
    ),
    "a support that is none": (
        "formers.csv", "name,support,diameter,winding_length\nf,cube,10 mm,20 mm\n", "support",
    ),
    "a length without unit": ("formers.csv", "name,diameter,winding_length\nf,20,20 mm\n", "diameter"),
    "another encoding": ("capacitors.csv", "value,label\n47 pF,caf\udce9\n", ""),
    "zero bytes": ("capacitors.csv", "value\n47 pF\n\0\n", ""),
    "an open quote": ("capacitors.csv", 'value,label\n47 pF,"open\n', ""),
}  # fmt: skip


@pytest.mark.parametrize("name", FILES)
def test_a_bad_drawer_is_refused_with_file_row_and_column(name: str) -> None:
    """Whoever keeps the list must find the cell."""
    file, text, column = FILES[name]
    (Path("../drawer") / file).write_bytes(text.encode("utf-8", "surrogateescape"))
    line = refused("pair", "7.1MHz", "--drawer", "../drawer", *OUTPUTS)
    assert file in line and column in line
    if column:
        in_header = name.startswith(("a column", "a family without"))
        assert f"row {1 if in_header else text.count(chr(10))}" in line  # the last line has the slip
    assert_refused(run("parts", "--drawer", "../drawer"))
    assert_refused(run("windings", "--drawer", "../drawer"))


def test_a_drawer_of_other_files_is_refused() -> None:
    """A misspelt file name would silently leave the shipped parts in force."""
    drawer = Path("../drawer")
    (drawer / "capacitor.csv").write_text("value\n47 pF\n")
    line = refused("pair", "7.1MHz", "--drawer", drawer, *OUTPUTS)
    assert "capacitor.csv" in line and "capacitors.csv" in line
    assert "absent" in refused("pair", "7.1MHz", "--drawer", "absent", *OUTPUTS)
    Path("file").write_text("")
    assert "file" in refused("pair", "7.1MHz", "--drawer", "file", *OUTPUTS)
    Path("nothing").mkdir()
    assert "nothing" in refused("pair", "7.1MHz", "--drawer", "nothing", *OUTPUTS)


@pytest.mark.parametrize("outputs", [("--json", "missing/r.json"), ("--bom", "missing/b.csv")])
def test_a_missing_output_folder_is_refused(outputs: tuple[str, str]) -> None:
    """Known before the search, and the other output is not written either."""
    other = ("--bom", "b.csv") if outputs[0] == "--json" else ("--json", "r.json")
    assert "missing" in refused("pair", "7.1MHz", "--drawer", "../drawer", *outputs, *other)


def test_an_output_that_is_there_is_refused() -> None:
    """And so is a folder in its place, with --force too."""
    Path("r.json").write_text("old")
    assert "r.json" in refused("pair", "7.1MHz", "--drawer", "../drawer", "--json", "r.json", "--bom", "b.csv")
    Path("folder").mkdir()
    line = refused("pair", "7.1MHz", "--drawer", "../drawer", "--json", "folder", "--bom", "b.csv", "--force")
    assert "folder" in line


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="root may write anywhere")
def test_an_output_folder_that_is_closed_is_refused() -> None:
    """No permission is told before the search."""
    Path("closed").mkdir(mode=0o500)
    assert "closed" in refused("pair", "7.1MHz", "--drawer", "../drawer", "--json", "closed/r.json")


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--series", "E25"], "--series"),
        (["--error", "0.5"], "--error"),
        (["--error", "1 pF"], "--error"),
        (["--parts", "0"], "--parts"),
        (["--parts", "-1"], "--parts"),
        (["--parts", "4", "--connect", "any"], "--parts"),
        (["--values", "1.5"], "--values"),
        (["--q", "nan"], "--q"),
        (["--price", "-1"], "--price"),
        (["--stray", "5 uH"], "--stray"),
        (["--trimmer", "20pF..3pF"], "--trimmer"),
        (["--trimmer", "3pF"], "--trimmer"),
        (["--measured", "0"], "--measured"),
        (["--self-capacitance", "1pF"], "--measured"),
        (["--from", "1nF", "--to", "1pF"], "--from"),
        (["--proportions", "2.5,0.4"], "--proportions"),
        (["--time-limit", "0"], "--time-limit"),
        (["--top", "0"], "--top"),
        (["--by", "beauty"], "--by"),
        (["--grades", "C0X"], "C0X"),
        (["--bogus"], "--bogus"),
    ],
)
def test_an_option_that_makes_no_sense_is_refused_by_its_name(arguments: list[str], said: str) -> None:
    """The line names what was typed, not the key of a plan that it stands for."""
    assert said in refused("pair", "7.1MHz", "--drawer", "../drawer", *arguments, *OUTPUTS)


@pytest.mark.parametrize("arguments", [["4 MHz"], ["0"], ["-1uH"], ["nan"], ["4uH", "--at", "4 uH"], ["4uH", "5uH"]])
def test_windings_refuse_what_is_no_inductance(arguments: list[str]) -> None:
    """The same reader, the same line."""
    arguments = ["--json", "w.json", *(["--", *arguments] if arguments[0].startswith("-") else arguments)]
    refused("windings", "--drawer", "../drawer", *arguments)


def test_a_starter_does_not_write_over_anything() -> None:
    """Nor into a place that is a file."""
    Path("file").write_text("old")
    assert_refused(run("starter", "file"))
    assert Path("file").read_text() == "old"


@pytest.mark.parametrize(
    ("element", "said"),
    [
        ("variable capacitor:150pF..12pF", "low: is not below"),
        ("variable capacitor:12pF..12pF", "low: is not below"),
        ("variable capacitor:150pF", "LOW..HIGH"),
        ("variable capacitor:12pF..150pF;sections=9", "sections: read"),
        ("variable capacitor:12pF..150pF;sections=0", "sections: read"),
        ("variable capacitor:12pF..150pF;sections=1.5", "whole number"),
        ("variable capacitor:12pF..150pF;law=straight", "straight-line frequency"),
        ("varactor:-1V..9V;zero_bias=500pF;grading=0.5", "zero or more"),
        ("varactor:9V..1V;zero_bias=500pF;grading=0.5", "from: is not below"),
        ("varactor:1V..9V;grading=0.5", "zero_bias: is missing"),
        ("varactor:1V..9V;zero_bias=500pF;grading=0", "grading"),
        ("varactor:1V..9V;zero_bias=500pF;grading=0.5;count=99", "count: read"),
    ],
)
def test_a_tuning_element_that_makes_no_sense_is_refused_by_its_key(element: str, said: str) -> None:
    """Ends the wrong way round, a junction driven into conduction, more sections than there are."""
    line = refused("pair", "7.0MHz..7.3MHz", "--tuning", element, *OUTPUTS)
    assert said in line and "--tuning" in line


def test_a_limit_on_the_excess_of_one_frequency_is_refused() -> None:
    """It would be accepted without effect."""
    done = run("pair", "7.1MHz", "--excess", "50%")
    assert done.code == 2 and "--excess" in done.err and "no effect" in done.err
