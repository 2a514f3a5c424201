"""Plans: what a plan file or options may state, and the one line that refuses the rest."""

from __future__ import annotations

import io
import json
import math
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick import plankeys
from partpick.errors import RequestError
from partpick.planfile import load_plan, request_from_tables
from partpick.report.request_json import request_as_json
from partpick.request import CapacitorRules, CoilRules, Limits, MeasuredDips, Request, Stray, Trimmer

BAND = '[[band]]\nname = "beacon"\nat = "3.58 MHz"\n'
SWEPT = '[[band]]\nname = "weather"\nfrom = "7.0 MHz"\nto = "7.3 MHz"\n'
TUNING = '[tuning]\nkind = "variable capacitor"\nlow = "12 pF"\nhigh = "150 pF"\n'

# Every key of the contract's plan, in an invented example.
FULL = """
title = "Skerry Point workshop, invented"
units = 3
switching = "stacked"
[limits]
error = "0.4 %"
parts_per_band = 3
parts = 10
values = 5
inductors = 2
q = 80
drift = "30 ppm"
price = 12.0
excess = "none"
margin = "2 %"
alignable = "99 %"
[coil]
forms = ["solenoid", "ring core"]
taps = true
inductance = ["2 \u00b5H", "6 \u00b5H"]
reactance = ["40 \u03a9", "1 k\u03a9"]
self_resonance = 4
proportions = [0.5, 2.0]
measured = "4.05 \u00b5H"
self_capacitance = "1.2 pF"
[capacitors]
series = "E12"
from = "1 pF"
to = "10 nF"
grades = ["C0G"]
connect = "any"
[stray]
capacitance = "5 pF"
tolerance = "25 %"
share = "15 %"
tempco = "90 ppm"
inductance = "4 nH"
[trimmer]
low = "3 pF"
high = "20 pF"
tempco = "-200 ppm"
[tuning]
kind = "variable capacitor"
low = "12 pF"
high = "150 pF"
[load]
resistance = "50 ohm"
loaded_q = 10
connection = "tap"
[drive]
power = "5 W"
supply = "12 V"
[oscillator]
circuit = "colpitts"
transconductance = "5 mS"
[receiver]
intermediate = "455 kHz"
[temperature]
from = "-10 \u00b0C"
to = 40
measured_drift = "-18 ppm"
[spread]
builds = 5000
seed = 7
parts = "normal"
batch = "50 %"
[[band]]
name = "beacon"
at = "3.58 MHz"
[[band]]
name = "weather"
from = "7.0 MHz"
to = "7.3 MHz"
trimmer = { low = "5 pF", high = "30 pF" }
stray = "8 pF"
q = 60
forms = ["solenoid"]
load = { bandwidth = "20 kHz" }
"""


def plan(text: str | bytes) -> Request:
    data = text if isinstance(text, bytes) else text.encode()
    return load_plan("-", stdin=io.BytesIO(data))


def refused(text: str | bytes) -> str:
    with pytest.raises(RequestError) as caught:
        plan(text)
    message = str(caught.value)
    assert message.startswith("stdin: ") and len(message.splitlines()) == 1
    return message


def band_shown(request: Request) -> dict[str, object]:
    bands = request_as_json(request)["bands"]
    assert isinstance(bands, list) and isinstance(bands[0], dict)
    return bands[0]


def test_every_key_of_a_plan_reaches_the_request() -> None:
    """A key that is read but dropped would be a limit that binds nothing."""
    request = plan(FULL)
    assert request.title == "Skerry Point workshop, invented"
    assert (request.units, request.switching) == (3, "stacked")
    assert request.limits == Limits(
        error=0.004, error_stated=True, parts_per_band=3, parts=10, values=5, inductors=2, inductors_stated=True,
        q=80.0, drift=30e-6, price=12.0, excess=None, margin=0.02, alignable=0.99,
    )  # fmt: skip
    assert request.coil == CoilRules(
        forms=("solenoid", "ring core"), taps=True, inductance=(2e-6, 6e-6), reactance=(40.0, 1000.0),
        self_resonance=4.0, self_resonance_stated=True, proportions=(0.5, 2.0), measured=4.05e-6,
        self_capacitance=1.2e-12,
    )  # fmt: skip
    assert request.capacitors == CapacitorRules(
        series="E12", low=1e-12, high=1e-8, grades=("C0G",), connect="any"
    )
    assert request.stray == Stray(
        capacitance=5e-12, tolerance=0.25, share=0.15, tempco=90e-6, inductance=4e-9
    )
    assert request.trimmer == Trimmer(low=3e-12, high=20e-12, tempco=-200e-6)
    assert request.tuning is not None and request.tuning.get("high") == 150e-12
    assert request.load is not None and (request.load.resistance, request.load.connection) == (50.0, "tap")
    further = {name: dict(values) for name, values in request.extra}
    driven = {"power": 5.0, "voltage": None, "current": None, "supply": 12.0, "class": "C"}
    driven |= {"modulation": 0.0, "bias": 0.0}
    assert further["drive"] == driven
    assert further["oscillator"]["transconductance"] == 5e-3
    assert further["receiver"] == {"intermediate": 455e3, "side": "above", "tracking": None}
    assert further["temperature"] == {"from": -10.0, "to": 40.0, "measured_drift": -18e-6}
    assert further["spread"] == {"builds": 5000, "seed": 7, "parts": "normal", "batch": 0.5}


def test_a_band_states_its_own_or_takes_the_plans() -> None:
    """Contract: a band may have its own trimmer, stray, q, forms, load."""
    beacon, weather = plan(FULL).bands
    assert beacon.trimmer == Trimmer(low=3e-12, high=20e-12, tempco=-200e-6)
    assert (beacon.stray, beacon.q, beacon.forms) == (5e-12, 80.0, ("solenoid", "ring core"))
    assert beacon.load is not None and beacon.load.resistance == 50.0
    assert weather.trimmer == Trimmer(low=5e-12, high=30e-12)
    assert (weather.stray, weather.q, weather.forms) == (8e-12, 60.0, ("solenoid",))
    assert weather.load is not None and weather.load.bandwidth == 20e3


def test_a_plan_of_one_band_has_the_contracts_defaults() -> None:
    """Contract, "Plan file": every default is written there, and these are its figures."""
    request = plan(BAND)
    assert (request.units, request.switching, request.by) == (1, "separate", "build")
    assert request.limits == Limits()
    assert (request.limits.error, request.limits.parts_per_band, request.limits.inductors) == (0.005, 2, 1)
    assert (request.limits.margin, request.coil.self_resonance) == (0.03, 3.0)
    assert (request.coil.proportions, request.capacitors.series) == ((0.4, 2.5), "E24")
    assert request.stray == Stray(capacitance=10e-12, tolerance=0.3, share=0.2, tempco=100e-6, inductance=0.0)


def test_strays_are_5_pf_for_a_pair_and_10_pf_for_bands() -> None:
    """Contract, [stray]: a switch adds to the strays of switched bands."""
    tables = {"band": [{"name": "beacon", "at": "3.58 MHz"}]}
    assert request_from_tables(tables, "pair").bands[0].stray == 5e-12
    assert request_from_tables(tables, "bands").bands[0].stray == 10e-12


def test_none_removes_a_limit() -> None:
    """Contract: "none" removes a limit, also self_resonance, proportions, reactance and share."""
    names = ("error", "parts", "values", "q", "drift", "price", "excess", "alignable")
    text = "[limits]\n" + "".join(f'{name} = "none"\n' for name in names)
    text += '[coil]\nself_resonance = "none"\nproportions = "none"\nreactance = "none"\n'
    request = plan(text + '[stray]\nshare = "none"\n' + BAND)
    assert all(getattr(request.limits, name) is None for name in names)
    assert request.coil.self_resonance is None
    assert request.coil.proportions is None and request.coil.reactance is None
    assert request.stray.share is None
    assert request.limits.error_stated and request.coil.self_resonance_stated


def test_none_for_a_count_that_must_be_a_number_is_the_most_possible() -> None:
    """At most six capacitors a band, three in mixed networks, and one coil a band (contract)."""
    text = '[limits]\nparts_per_band = "none"\ninductors = "none"\nmargin = "none"\n'
    limits = plan(text + BAND + TUNING + SWEPT).limits
    assert (limits.parts_per_band, limits.inductors, limits.margin) == (6, 2, 0.0)
    assert plan(text + '[capacitors]\nconnect = "any"\n' + BAND).limits.parts_per_band == 3


def test_two_dips_measure_a_coil() -> None:
    """The contract's example; order and values are kept for the computation."""
    text = '[coil]\nmeasured = [{at = "5.214 MHz", with = "100 pF"}, {at = "9.02 MHz", with = "22 pF"}]\n'
    assert plan(text + BAND).coil.measured == MeasuredDips(
        at=(5.214e6, 9.02e6), with_capacitance=(100e-12, 22e-12)
    )


@pytest.mark.parametrize(
    ("text", "hints"),
    [
        ("", ["no band"]),
        ('title = "nothing else"\n', ["no band"]),
        ("[limits]\neror = 0.01\n" + BAND, ["limits.eror", "limits.error"]),
        ("[limit]\nerror = 0.01\n" + BAND, ["limit: ", "nearest known: limits"]),
        ("error = 0.01\n" + BAND, ["limits.error"]),
        ('switching = "stakced"\n' + BAND, ["switching", '"stakced"', '"stacked"']),
        ('[capacitors]\nseries = "E25"\n' + BAND, ["capacitors.series", '"E24"']),
        ('[coil]\nforms = ["solenod"]\n' + BAND, ["coil.forms", '"solenoid"']),
        (BAND + BAND, ["band 2: name", '"beacon"', "another band"]),
        (BAND + 'from = "3 MHz"\n', ["band 1: at", "together"]),
        (TUNING + SWEPT.replace("7.0", "7.4"), ["band 1: from", "7.4 MHz", "7.3 MHz"]),
        (TUNING + SWEPT.replace('to = "7.3 MHz"\n', ""), ["band 1: to", "missing"]),
        (SWEPT, ["band 1", "tuning"]),
        ('[[band]]\nname = "beacon"\n', ["band 1", "frequency"]),
        ('[[band]]\nat = "3.58 MHz"\n', ["band 1: name", "missing"]),
        (BAND.replace("[[band]]", "[band]"), ["[[band]]"]),
        ("band = 3\n", ["[[band]]"]),
        (BAND.replace("3.58 MHz", "3.58"), ["band 1: at", "3.58 MHz?"]),
        (BAND.replace("3.58 MHz", "2.4 GHz"), ["above 1 GHz", "lumped"]),
        (BAND.replace('"3.58 MHz"', "nan"), ["not a finite number"]),
        (BAND.replace('"3.58 MHz"', "true"), ["read true"]),
        (BAND.replace('"3.58 MHz"', "1979-05-27"), ["read a date"]),
        (BAND + 'trimmer = { low = "5 pF", hihg = "30 pF" }\n', ["trimmer.hihg", "trimmer.high"]),
        ('[trimmer]\nlow = "20 pF"\nhigh = "3 pF"\n' + BAND, ["trimmer.low", "not below"]),
        ('[trimmer]\nlow = "20 pF"\n' + BAND, ["trimmer.high", "missing"]),
        ("limits = 3\n" + BAND, ["limits", "a table is wanted"]),
        ("units = 0\n" + BAND, ["units", "at least 1"]),
        ('units = "two"\n' + BAND, ["units", "whole number"]),
        ("[limits]\nparts_per_band = 7\n" + BAND, ["limits.parts_per_band", "at most 6"]),
        ('[limits]\nparts_per_band = 4\n[capacitors]\nconnect = "any"\n' + BAND, ["at most 3"]),
        ("[limits]\nerror = 0.5\n" + BAND, ["limits.error", "write 50 %"]),
        ("[limits]\nerror = 0\n" + BAND, ["limits.error", "more than zero"]),
        ('[limits]\nalignable = "worst"\n' + BAND, ["limits.alignable", '"worst case"']),
        ('switching = "shared"\n' + BAND, ["limits.parts", "shared"]),
        ('switching = "shared"\n[limits]\nparts = 4\n' + TUNING + SWEPT, ["band 1", "separate"]),
        ('switching = "stacked"\n' + BAND + BAND.replace("beacon", "twin"), ["band 2: at", "band 1"]),
        ('[coil]\nself_capacitance = "1 pF"\n' + BAND, ["coil.self_capacitance", "coil.measured"]),
        ('[coil]\ninductance = ["6 \u00b5H", "2 \u00b5H"]\n' + BAND, ["coil.inductance", "above"]),
        ('[coil]\ntaps = "yes"\n' + BAND, ["coil.taps", "true or false"]),
        ('[coil]\nmeasured = [{at = "5 MHz", with = "9 pF"}]\n' + BAND, ["coil.measured", "two dips"]),
        ('[capacitors]\nfrom = "10 nF"\nto = "1 pF"\n' + BAND, ["capacitors.from", "capacitors.to"]),
        ('[tuning]\nkind = "varactr"\n' + BAND, ["tuning.kind", '"varactor"']),
        ('[tuning]\nkind = "sliding core"\n' + BAND, ["tuning.diameter", "missing"]),
        ('[tuning]\nlow = "12 pF"\n' + BAND, ["tuning.kind", "missing"]),
        ("[load]\n" + BAND, ["load", "states nothing"]),
        ('[load]\nloaded_q = 10\nbandwidth = "20 kHz"\n' + BAND, ["load.bandwidth", "load.loaded_q"]),
        ('[drive]\npower = "5 W"\nvoltage = "3 V"\n' + BAND, ["drive", "exactly one"]),
        ('[cover]\nfrom = "3 MHz"\nto = "30 MHz"\n', ["cover", "tuning"]),
        ('[temperature]\nfrom = 40\nto = 10\n' + BAND, ["temperature.from", "not below"]),
        ("units = 1\nunits = 2\n" + BAND, ["TOML"]),
        ("a = " + "[" * 20_000, ["nested too deeply"]),
        ("a = " + "{a = " * 20_000, ["nested too deeply"]),
        ("a." * 50_000 + "a = 1", ["nested too deeply"]),
        ("a = " + "9" * 5_000, ["too long"]),
        ("#" * 300_000, ["longer than"]),
        (b"title = \"caf\xe9\"\n", ["not UTF-8", "byte 13"]),
        ("title = 'x'".encode("utf-16"), ["not UTF-8"]),
    ],
)  # fmt: skip
def test_a_bad_plan_is_refused_in_one_line_that_names_the_key(text: str | bytes, hints: list[str]) -> None:
    """A misspelt limit that passed silently would be soldered in (issue "Bad input")."""
    message = refused(text)
    for hint in hints:
        assert hint in message


@pytest.mark.parametrize(
    "dips",
    [
        '[{at = "5 MHz", with = "10 pF"}, {at = "6 MHz", with = "20 pF"}]',  # more capacitance dips higher
        '[{at = "5 MHz", with = "10 pF"}, {at = "5 MHz", with = "20 pF"}]',
        '[{at = "5 MHz", with = "10 pF"}, {at = "4 MHz", with = "10 pF"}]',
        '[{at = "10 MHz", with = "10 pF"}, {at = "1 MHz", with = "100 pF"}]',  # C_self < 0
    ],
)
def test_dips_that_contradict_each_other_are_refused(dips: str) -> None:
    """With a fixed L and a self-capacitance of zero or more, 1/f^2 rises with C, never faster than C."""
    assert "contradict" in refused(f"[coil]\nmeasured = {dips}\n" + BAND)


def test_sixty_four_bands_are_accepted_and_one_more_is_not() -> None:
    """The size of a search must be bounded by what a plan may ask."""
    bands = [BAND.replace("beacon", f"band {number}") for number in range(plankeys.MOST_BANDS + 1)]
    assert len(plan("".join(bands[:-1])).bands) == 64
    assert "at most 64" in refused("".join(bands))


def test_a_file_that_cannot_be_read_is_refused_by_its_name(tmp_path: Path) -> None:
    """Missing file, a folder in its place, a name that no system takes."""
    for path, reason in (
        (str(tmp_path / "none.toml"), "no such file"),
        (str(tmp_path), "is a folder"),
        ("a\0b", "cannot be read"),
    ):
        with pytest.raises(RequestError, match=reason):
            load_plan(path)


def test_a_plan_reads_the_same_from_file_and_stdin(tmp_path: Path) -> None:
    """Also with the byte order mark that some editors put in front."""
    path = tmp_path / "plan.toml"
    path.write_bytes(b"\xef\xbb\xbf" + FULL.encode())
    assert load_plan(str(path)) == plan(FULL)


def test_options_and_plan_give_the_same_request() -> None:
    """One table of keys serves both doors; options come as texts."""
    tables = {
        "limits": {"error": "1 %", "parts_per_band": "3", "q": "80"},
        "coil": {"proportions": ["0.5", "2"], "forms": ["solenoid"]},
        "trimmer": "3pF..20pF",
        "tuning": "variable capacitor:12pF..150pF",
        "band": [{"name": "weather", "from": "7.0MHz", "to": "7.3MHz"}],
    }
    text = "[limits]\nerror = 0.01\nparts_per_band = 3\nq = 80\n[coil]\nproportions = [0.5, 2]\n"
    text += 'forms = ["solenoid"]\n[trimmer]\nlow = "3 pF"\nhigh = "20 pF"\n'
    assert request_from_tables(tables, "bands") == plan(text + TUNING + SWEPT)


def test_a_plan_is_changed_as_if_its_file_said_so(tmp_path: Path) -> None:
    """Also where every band takes the figure over, as it does a limit on Q; what is wrong is named as ever."""
    path = tmp_path / "plan.toml"
    path.write_text('[limits]\nerror = "1 %"\n[[band]]\nname = "a"\nat = "7 MHz"\n', encoding="utf-8")
    change = {"limits.q": 180, "limits.error": "0.2 %", "stray.capacitance": "12 pF"}
    request = load_plan(str(path), change=change)
    assert (request.bands[0].q, request.limits.error, request.bands[0].stray) == (180.0, 0.002, 12e-12)
    with pytest.raises(RequestError, match=r'limits\.eror.*limits\.error'):
        load_plan(str(path), change={"limits.eror": "1 %"})
    with pytest.raises(RequestError, match="no table"):
        load_plan(str(path), change={"band.a.q": 180})


def test_an_option_is_refused_by_its_own_name() -> None:
    """Who typed --error has no key limits.error; the frequency of a pair is an argument."""

    def option(path: str) -> str:
        return {"band.1.at": "FREQUENCY"}.get(path, "--" + path.rpartition(".")[2])

    with pytest.raises(RequestError, match=r'^--error: read "5": .*write 5 %'):
        request_from_tables({"limits": {"error": "5"}, "band": [{"at": "7 MHz"}]}, "pair", option)
    with pytest.raises(RequestError, match=r'^FREQUENCY: read "7\.1mhz": .*MHz\?'):
        request_from_tables({"band": [{"at": "7.1mhz"}]}, "pair", option)


def test_a_pair_is_named_by_its_frequency_and_needs_a_capacitor() -> None:
    """A pair has one band and no plan to name it in; without a capacitor it is no pair (contract)."""
    assert request_from_tables({"band": [{"at": "7.1 MHz"}]}, "pair").bands[0].name == "7.1 MHz"
    with pytest.raises(RequestError, match="at least one capacitor"):
        request_from_tables({"band": [{"at": "7 MHz"}], "limits": {"parts_per_band": 0}}, "pair")
    assert plan("[limits]\nparts_per_band = 0\n" + BAND).limits.parts_per_band == 0


@pytest.mark.parametrize(
    ("keys", "name", "value"),
    [
        ('kind = "varactor"\nzero_bias = "30 pF"\ngrading = 0.45\nfrom = "1 V"\nto = "9 V"',
         "zero_bias", 30e-12),
        ('kind = "sliding core"\ndiameter = "6 mm"\nlength = "20 mm"\npermeability = 40\ntravel = "2 cm"',
         "travel", 0.02),
        ('kind = "moving contact"\nunused = "shorted"', "unused", "shorted"),
        ('kind = "variometer"\nrotor = "30 mm"\nfrom = 0\nto = "180"', "to", 180.0),
        ('kind = "variable capacitor"\nlow = "5 pF"\nhigh = "50 pF"\nsections = 2\ntolerance = "5 %"',
         "sections", 2),
    ],
)  # fmt: skip
def test_every_kind_of_tuning_element_is_read(keys: str, name: str, value: object) -> None:
    """Contract, [tuning]: five kinds, each with its own keys, in SI (angles in degrees)."""
    tuning = plan(f"[tuning]\n{keys}\n" + SWEPT).tuning
    assert tuning is not None and tuning.get(name) == value


def test_none_stands_for_no_trimmer_tuning_or_load() -> None:
    """A script may pass --trimmer none; the plan's trimmer may be left out of one band."""
    tables = {"trimmer": "none", "tuning": "none", "load": "none", "band": [{"at": "7 MHz"}]}
    request = request_from_tables(tables, "pair")
    assert request.trimmer is None and request.tuning is None and request.load is None
    text = '[trimmer]\nlow = "3 pF"\nhigh = "20 pF"\n' + BAND + 'trimmer = "none"\n'
    assert plan(text).bands[0].trimmer is None


def test_cover_needs_no_bands_of_its_own() -> None:
    """It finds the bands that a tuning element needs."""
    cover = '[cover]\nfrom = "3 MHz"\nto = "30 MHz"\n'
    assert plan(cover + TUNING).bands == ()
    assert "leave out" in refused(cover + TUNING + BAND)


def test_the_request_shows_every_key_by_its_plan_name() -> None:
    """Contract, "Result": request holds every limit and default in force."""
    shown = request_as_json(plan(FULL))
    for table, keys in plankeys.TABLES.items():
        section = shown[table]
        assert isinstance(section, dict) and set(keys) <= set(section)
    bands = shown["bands"]
    assert isinstance(bands, list)
    assert all(set(plankeys.BAND) <= set(band) for band in bands)
    assert set(plankeys.TOP) <= set(shown)
    assert {"by", "command", "trimmer", "tuning", "load", "drive", "temperature"} <= set(shown)
    assert json.loads(json.dumps(shown, allow_nan=False)) == shown


def test_a_default_error_limit_is_off_where_a_trimmer_is() -> None:
    """Contract, [limits] error; stated, it holds there too."""
    band = BAND + 'trimmer = "3 pF..20 pF"\n'
    default = band_shown(plan(band))
    stated = band_shown(plan('[limits]\nerror = "1 %"\n' + band))
    assert (default["error"], stated["error"]) == (None, 0.01)


def test_no_infinity_reaches_the_json() -> None:
    """JSON has none; a request made in Python may hold one."""
    request = Request(command="bands", bands=(), limits=Limits(error=math.inf, price=math.nan))
    limits = request_as_json(request)["limits"]
    assert isinstance(limits, dict) and limits["error"] is None and limits["price"] is None


VALUES = st.recursive(
    st.one_of(
        st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=8),
        st.sampled_from(["none", "7.1 MHz", "3 pF..20 pF", "5 %", "variable capacitor:1pF..9pF", "E24"]),
    ),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3),
        st.dictionaries(st.sampled_from([*plankeys.BAND, *plankeys.TRIMMER, "kind", "x"]), inner, max_size=4),
    ),
    max_leaves=8,
)  # fmt: skip
PATHS = [(table, key) for table, keys in plankeys.SECTIONS.items() for key in keys]


@settings(max_examples=300)
@given(st.lists(st.tuples(st.sampled_from(PATHS), VALUES), max_size=6), st.booleans())
def test_tables_of_any_content_give_a_request_or_one_line(
    stated: list[tuple[tuple[str, str], object]], swept: bool
) -> None:
    """No value of any type under any key may end in a traceback."""
    band: dict[str, object] = {"name": "beacon"}
    band |= {"from": "7 MHz", "to": "8 MHz"} if swept else {"at": "7 MHz"}
    tables: dict[str, object] = {"band": [band]}
    for (table, key), value in stated:
        if table == "band":
            band[key] = value
        else:
            inner = tables.setdefault(table, {})
            assert isinstance(inner, dict)
            inner[key] = value
    try:
        json.dumps(request_as_json(request_from_tables(tables, "bands")), allow_nan=False)
    except RequestError as problem:
        assert len(str(problem).splitlines()) == 1
