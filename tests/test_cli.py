"""Tests of the command line: options to a request, exit codes, one line for every refusal, no file after it.

The search is replaced by results made by hand; what it finds is tested elsewhere.
"""

from __future__ import annotations

import csv
import json
import os
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import handmade
import pytest

from partpick.cli import main
from partpick.errors import CatalogueError
from partpick.options import PAIR_OPTIONS, tables_of
from partpick.request import Request
from partpick.result import Proof, Result

ROOT = Path(__file__).resolve().parent.parent
PLAN = """
title = "invented plan"
[[band]]
name = "beacon"
at = "7.1 MHz"
[[band]]
name = "weather"
at = "5 MHz"
"""


class Canned:
    """Stands in for catalogue and search: gives back a result, keeps what it was asked."""

    def __init__(self) -> None:
        self.results: list[Result] = [handmade.result(handmade.candidate())]
        self.coils: tuple[Any, ...] = ()
        self.requests: list[Request] = []
        self.asked: dict[str, Any] = {}
        self.drawers: list[str | None] = []
        self.during: Callable[[Any], None] = lambda monitor: None

    def solve(self, request: Request, catalogue: object, *, top: int, monitor: Any) -> Result:
        """Return the next result."""
        self.requests.append(request)
        self.asked = {"top": top}
        self.during(monitor)
        return self.results[min(len(self.requests), len(self.results)) - 1]

    def windings(self, request: Request, catalogue: object, **asked: Any) -> tuple[Any, ...]:
        """Return the coils."""
        self.requests.append(request)
        self.asked = asked
        return self.coils

    def load_catalogue(self, drawer: str | None) -> object:
        """Return no catalogue."""
        self.drawers.append(drawer)
        return SimpleNamespace()


@pytest.fixture
def canned(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Canned:
    """Return the stand-in, in force in an empty folder."""
    stand_in = Canned()
    search, catalogue = ModuleType("partpick.solving"), ModuleType("partpick.catalogue")
    search.solve, search.windings = stand_in.solve, stand_in.windings  # type: ignore[attr-defined]
    catalogue.load_catalogue = stand_in.load_catalogue  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "partpick.solving", search)
    monkeypatch.setitem(sys.modules, "partpick.catalogue", catalogue)
    monkeypatch.chdir(tmp_path)
    return stand_in


def _refused(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    """Return the one line that refuses the arguments."""
    before = {path: path.read_bytes() for path in Path().rglob("*") if path.is_file()}
    code = main(list(arguments))
    out, line = capsys.readouterr()
    assert code == 2
    assert out == ""
    assert line.startswith("partpick: ") and line.count("\n") == 1 and line.endswith("\n")
    assert {path: path.read_bytes() for path in Path().rglob("*") if path.is_file()} == before
    return line


# ---------------------------------------------------------------- from options to a request


def test_options_become_the_keys_of_a_plan(canned: Canned) -> None:
    """Options and plan file fill one request; a script may use either."""
    arguments = [
        "--parts=3", "--error=0.1%", "--values=2", "--q=80", "--drift=30ppm", "--price=12.5", "--margin=2%",
        "--forms=solenoid,ring core", "--inductance=2uH,6uH", "--reactance=40ohm,1kohm", "--self-resonance=4",
        "--proportions=0.5,2", "--series=E12", "--from=10pF", "--to=1nF", "--grades=C0G,mica",
        "--connect=any",
        "--stray=4pF", "--stray-share=15%", "--stray-tempco=50ppm", "--trimmer=3pF..20pF", "--load=50ohm",
        "--loaded-q=10", "--by=error", "--all-windings", "--top=3", "--drawer=mine",
    ]  # fmt: skip
    assert main(["pair", "7.1MHz", *arguments]) == 0
    request = canned.requests[0]
    assert request.command == "pair" and request.bands[0].at == 7.1e6
    limits, coil, capacitors = request.limits, request.coil, request.capacitors
    assert (limits.parts_per_band, limits.error, limits.values, limits.q) == (3, 0.001, 2, 80)
    assert (limits.drift, limits.price, limits.margin) == (30e-6, 12.5, 0.02)
    assert (coil.forms, coil.inductance) == (("solenoid", "ring core"), (2e-6, 6e-6))
    assert (coil.reactance, coil.self_resonance, coil.proportions) == ((40, 1000), 4, (0.5, 2))
    assert (capacitors.series, capacitors.low, capacitors.high) == ("E12", 10e-12, 1e-9)
    assert (capacitors.grades, capacitors.connect) == (("C0G", "mica"), "any")
    assert (request.stray.capacitance, request.stray.share, request.stray.tempco) == (4e-12, 0.15, 50e-6)
    assert request.trimmer is not None and (request.trimmer.low, request.trimmer.high) == (3e-12, 20e-12)
    assert request.load is not None and (request.load.resistance, request.load.loaded_q) == (50, 10)
    assert (request.by, request.all_windings) == ("error", True)
    assert canned.asked["top"] == 3 and canned.drawers == ["mine"]


def test_a_coil_that_is_wound_already_is_an_option_too(canned: Canned) -> None:
    """Measured inductance and its self-capacitance go together."""
    assert main(["pair", "7.1MHz", "--measured=4.05uH", "--self-capacitance=1.2pF"]) == 0
    assert (canned.requests[0].coil.measured, canned.requests[0].coil.self_capacitance) == (4.05e-6, 1.2e-12)


def test_a_range_is_a_swept_band(canned: Canned) -> None:
    """Two points between two frequencies ask for a tuned tank."""
    tuning = "--tuning=variable capacitor:12pF..150pF"
    assert main(["pair", "7.0MHz..7.3MHz", tuning, "--excess=50%"]) == 0
    band, element = canned.requests[0].bands[0], canned.requests[0].tuning
    assert (band.at, band.low, band.high) == (None, 7.0e6, 7.3e6)
    assert element is not None and element.kind == "variable capacitor"
    assert canned.requests[0].limits.excess == 0.5


def test_none_removes_a_limit(canned: Canned) -> None:
    """As in a plan; a limit of zero would be another thing."""
    arguments = ["--error=none", "--self-resonance=none", "--proportions=none", "--stray-share=none"]
    assert main(["pair", "7.1MHz", *arguments]) == 0
    request = canned.requests[0]
    assert request.limits.error is None and request.coil.self_resonance is None
    assert request.coil.proportions is None and request.stray.share is None


def test_an_option_that_is_not_given_is_no_key() -> None:
    """Defaults live in one place, and not here."""
    assert tables_of(PAIR_OPTIONS, {}) == {}


def test_windings_pass_value_frequency_and_coil_rules(
    canned: Canned, capsys: pytest.CaptureFixture[str]
) -> None:
    """The value is optional, and so is the frequency; `--top` shortens the table only."""
    canned.coils = tuple(
        handmade.coil("", extra={"q": 187.0, "series_resistance_ohm": 1.0}) for _ in range(5)
    )
    arguments = ["4.05uH", "--at", "7.1MHz", "--forms", "solenoid", "--top", "2"]
    assert main(["windings", *arguments, "--json", "w.json"]) == 0
    assert canned.asked == {"inductance": 4.05e-6, "at": 7.1e6}
    assert canned.requests[0].coil.forms == ("solenoid",)
    assert capsys.readouterr().out.count("14 turns") == 2
    assert len(json.loads(Path("w.json").read_text())["windings"]) == 5
    canned.coils = ()
    assert main(["windings"]) == 1
    assert canned.asked == {"inductance": None, "at": None}
    assert canned.requests[1].bands == ()


# ---------------------------------------------------------------- outputs and exit codes


def test_found_is_0_with_table_json_and_bom(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """The three outputs of one run, the table on stdout, nothing on stderr of a short run."""
    assert main(["pair", "7.1MHz", "--json", "r.json", "--bom", "b.csv"]) == 0
    out, err = capsys.readouterr()
    assert out.startswith("Tank for 7.1 MHz") and err == ""
    assert json.loads(Path("r.json").read_text())["partpick_result"] == 1
    assert next(csv.reader(Path("b.csv").read_text().splitlines()))[0] == "rank"


def test_nothing_fits_is_1_and_json_is_written(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """An answer, not an error: its JSON has the reason, its BOM the header only."""
    canned.results = [handmade.nothing()]
    assert main(["pair", "7.1MHz", "--json", "r.json", "--bom", "b.csv"]) == 1
    assert "Nothing fits" in capsys.readouterr().out
    assert json.loads(Path("r.json").read_text())["candidates"] == []
    assert len(Path("b.csv").read_text().splitlines()) == 1


def test_an_interrupted_run_is_130_and_keeps_the_best(canned: Canned) -> None:
    """Ctrl-C during the search: the best so far is written, marked as stopped."""
    canned.during = lambda monitor: os.kill(os.getpid(), signal.SIGINT)
    proof = Proof(status="feasible", searched="some", stopped_by="interrupt")
    canned.results = [handmade.result(handmade.candidate(), proof=proof)]
    assert main(["pair", "7.1MHz", "--json", "r.json"]) == 130
    assert json.loads(Path("r.json").read_text())["proof"]["stopped_by"] == "interrupt"


def test_giving_up_is_130_in_one_line(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """A search that does not come back is left by a second Ctrl-C, without a traceback or a file."""

    def stuck(monitor: Any) -> None:
        os.kill(os.getpid(), signal.SIGINT)
        os.kill(os.getpid(), signal.SIGINT)

    canned.during = stuck
    assert main(["pair", "7.1MHz", "--json", "r.json"]) == 130
    assert capsys.readouterr().err == "partpick: interrupted; nothing was written\n"
    assert not Path("r.json").exists()


def test_json_on_stdout_is_all_that_stands_there(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """It can be piped into another program."""
    assert main(["pair", "7.1MHz", "--json", "-"]) == 0
    assert json.loads(capsys.readouterr().out)["partpick_result"] == 1


def test_the_time_limit_reaches_the_search(canned: Canned) -> None:
    """The monitor says when; the search asks it."""
    reasons: list[str | None] = []

    def wait(monitor: Any) -> None:
        while monitor.stopped() is None:
            pass
        reasons.append(monitor.stopped())

    canned.during = wait
    assert main(["pair", "7.1MHz", "--time-limit", "0.05"]) == 0
    assert reasons == ["time limit"]


def test_several_plans_give_the_highest_code_and_go_on_after_a_bad_one(
    canned: Canned, capsys: pytest.CaptureFixture[str]
) -> None:
    """One slip among ten plans must not cost the other nine."""
    for name, text in (("a.toml", PLAN), ("b.toml", "nonsense = 1"), ("c.toml", PLAN)):
        Path(name).write_text(text)
    Path("out").mkdir()
    canned.results = [handmade.result(handmade.candidate()), handmade.nothing()]
    assert main(["bands", "a.toml", "b.toml", "c.toml", "--json", "out", "--workers", "1"]) == 2
    assert sorted(os.listdir("out")) == ["a.json", "c.json"]
    err = capsys.readouterr().err
    assert err.count("\n") == 1 and "b.toml" in err
    assert main(["bands", "a.toml", "c.toml", "--workers", "1"]) == 1


def test_a_folder_stands_for_its_plans(canned: Canned) -> None:
    """A folder of jobs is solved in the order of the names."""
    Path("plans").mkdir()
    for name in ("b.toml", "a.toml"):
        (Path("plans") / name).write_text(PLAN.replace("invented", name[0]))
    assert main(["bands", "plans", "--workers", "1"]) == 0
    assert [request.title for request in canned.requests] == ["a plan", "b plan"]


# ---------------------------------------------------------------- refusals


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["pair"], "FREQUENCY"),
        (["pair", "7.1nF"], "unit of a capacitance"),
        (["pair", "0"], "above zero"),
        (["pair", "0Hz"], "above zero"),
        (["pair", "--", "-7.1MHz"], "above zero"),
        (["pair", "-7.1MHz"], "above zero"),
        (["pair", "inf"], "finite"),
        (["pair", "nan"], "finite"),
        (["pair", "999Hz"], "lumped"),
        (["pair", "1.1GHz"], "lumped"),
        (["pair", "7.1"], "7.1 MHz?"),
        (["pair", "7,1MHz"], "7.1MHz"),
        (["pair", "7.3MHz..7.0MHz"], "not below"),
        (["pair", "7.0MHz.."], "FREQUENCY"),
        (["pair", "7.1MHz", "--series", "E25"], "--series"),
        (["pair", "7.1MHz", "--error", "0.5"], "--error"),
        (["pair", "7.1MHz", "--parts", "two"], "--parts"),
        (["pair", "7.1MHz", "--forms", "solenoid,bogus"], "--forms"),
        (["pair", "7.1MHz", "--inductance", "2uH"], "--inductance"),
        (["pair", "7.1MHz", "--trimmer", "20pF..3pF"], "--trimmer"),
        (["pair", "7.1MHz", "--stray-shar", "20%"], "--stray-share"),
        (["pair", "7.1MHz", "--top", "0"], "--top"),
        (["pair", "7.1MHz", "--time-limit", "nan"], "--time-limit"),
        (["pair", "7.1MHz", "--time-limit", "0"], "--time-limit"),
        (["pair", "7.1MHz", "--by", "beauty"], "--by"),
        (["pair", "7.1MHz", "8.1MHz"], "8.1MHz"),
        (["windings", "7.1MHz"], "INDUCTANCE"),
        (["windings", "4uH", "--at", "4uH"], "--at"),
        (["bands"], "PLAN"),
        (["bands", "missing.toml"], "missing.toml"),
        (["bands", "-", "-"], "stdin"),
        (["unwind"], "unwind"),
        (["--bogus"], "--bogus"),
    ],
)
def test_what_is_not_understood_is_one_line_and_2(
    canned: Canned, capsys: pytest.CaptureFixture[str], arguments: list[str], said: str
) -> None:
    """The line names what was typed, or what it was taken for; nothing is solved."""
    assert said in _refused(capsys, *arguments)
    assert canned.requests == []


def test_outputs_are_refused_before_the_search(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """Folder missing, file there already, two outputs in one place: known without solving anything."""
    Path("there.json").write_text("old")
    Path("folder").mkdir()
    for arguments, said in (
        (["--json", "missing/r.json"], "not there"),
        (["--json", "there.json"], "--force"),
        (["--bom", "folder"], "folder"),
        (["--json", "-", "--bom", "-"], "two outputs"),
        (["--json", "same", "--bom", "./same"], "two outputs"),
    ):
        assert said in _refused(capsys, "pair", "7.1MHz", *arguments)
    assert canned.requests == []
    assert main(["pair", "7.1MHz", "--json", "there.json", "--force"]) == 0


def test_outputs_never_replace_plan_or_drawer(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:
    """A slip of the hand with --force must not cost the stock list."""
    Path("plan.toml").write_text(PLAN)
    Path("drawer").mkdir()
    Path("drawer/capacitors.csv").write_text("value\n47 pF\n")
    assert "also read" in _refused(capsys, "bands", "plan.toml", "--json", "plan.toml", "--force")
    bom = ["--drawer", "drawer", "--bom", "drawer/capacitors.csv", "--force"]
    assert "also read" in _refused(capsys, "bands", "plan.toml", *bom)


def test_several_plans_need_a_folder_and_different_names(
    canned: Canned, capsys: pytest.CaptureFixture[str]
) -> None:
    """Otherwise the second result would replace the first."""
    for folder in ("one", "two", "out"):
        Path(folder).mkdir()
    for name in ("one/a.toml", "two/a.toml"):
        Path(name).write_text(PLAN)
    assert "folder" in _refused(capsys, "bands", "one/a.toml", "two/a.toml", "--json", "r.json")
    assert "both" in _refused(capsys, "bands", "one/a.toml", "two/a.toml", "--json", "out")
    assert canned.requests == []


def test_an_error_from_deep_inside_is_one_line_whatever_it_holds(
    canned: Canned, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """A cell of a drawer may hold line breaks and escape sequences."""

    def bad(drawer: str | None) -> object:
        raise CatalogueError("capacitors.csv row 2: \x1b[2J\nharm")

    monkeypatch.setattr(sys.modules["partpick.catalogue"], "load_catalogue", bad)
    assert "\x1b" not in _refused(capsys, "pair", "7.1MHz")


# ---------------------------------------------------------------- the program as such


def _python(code: str, *arguments: str) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.run(
        [sys.executable, "-c", code, *arguments],
        env=environment,
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )


@pytest.mark.parametrize("command", [[], ["pair"], ["bands"], ["windings"], ["parts"], ["starter"]])
def test_help_loads_nothing_heavy_and_shows_an_example(command: list[str]) -> None:
    """Help must come at once, and a newcomer copies an example."""
    code = (
        "import sys; from partpick.cli import main; code = main(sys.argv[1:])\n"
        "heavy = {'numpy', 'scipy', 'pandas', 'ortools'} & set(sys.modules)\n"
        "sys.exit(code or (f'loaded {heavy}' if heavy else 0))"
    )
    done = _python(code, *command, "--help")
    assert (done.returncode, done.stderr) == (0, "")
    assert f"  partpick {' '.join(command) or 'pair'} " in done.stdout
    assert max(len(line) for line in done.stdout.splitlines()) <= 82


def test_a_refusal_loads_nothing_heavy_either() -> None:
    """A typing error is answered at once too."""
    code = (
        "import sys; from partpick.cli import main; main(['pair', '7.1'])\n"
        "sys.exit(len({'numpy', 'scipy', 'pandas', 'ortools'} & set(sys.modules)))"
    )
    assert _python(code).returncode == 0


def test_the_package_can_be_run_and_says_its_version() -> None:
    """`python -m partpick` is the same program as `partpick`."""
    code = "import runpy, sys; runpy.run_module('partpick', run_name='__main__')"
    done = _python(code, "--version")
    assert done.returncode == 0
    assert done.stdout.startswith("partpick ") and len(done.stdout.split()) == 2


def test_public_names_are_loaded_when_they_are_used() -> None:
    """`import partpick` costs nothing; each name of `__all__` is known, no other."""
    code = (
        "import sys, partpick\n"
        "before = set(sys.modules); assert 'partpick.request' not in before\n"
        "assert partpick.Request.__name__ == 'Request'; assert partpick.load_plan\n"
        "assert {'solve', 'load_catalogue', '__version__'} <= set(dir(partpick))\n"
        "try: partpick.bogus\n"
        "except AttributeError: sys.exit(0)\n"
        "sys.exit(1)"
    )
    done = _python(code)
    assert (done.returncode, done.stderr) == (0, "")
