"""The catalogue: what a drawer may hold, what is filled in, and the one line that refuses the rest."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from partpick import catalogue, catalogue_labels, catalogue_table
from partpick.catalogue import KNOWN_FILES, data_folder, load_catalogue, select_capacitors
from partpick.errors import CatalogueError, RequestError
from partpick.parts import Capacitor, Catalogue
from partpick.request import CapacitorRules

Drawer = Callable[..., Path]
CAPACITORS = "value,series,from,to,grade,tolerance,quantity,label\n"
FORMERS = "name,support,diameter,winding_length,pitch\n"
LOSSY = "name,diameter,winding_length,loss_tangent\n"
CORES = "name,shape,outer_diameter,inner_diameter,height,permeability,al\n"


@pytest.fixture
def drawer(tmp_path: Path) -> Drawer:
    def write(file: str = "capacitors.csv", content: str | bytes = "") -> Path:
        data = content if isinstance(content, bytes) else content.encode()
        (tmp_path / file).write_bytes(data)
        return tmp_path

    return write


def refused(folder: Path) -> str:
    with pytest.raises(CatalogueError) as caught:
        load_catalogue(folder)
    message = str(caught.value)
    assert "\n" not in message
    return message


# ---------------------------------------------------------------- files and folders


def test_the_shipped_parts_need_no_drawer() -> None:
    """The data must be found from a checkout, an editable install and a wheel alike."""
    parts = load_catalogue(None)
    assert (data_folder() / "capacitors.csv").is_file()
    assert not parts.drawer
    assert parts.drawer_files == ()
    assert all((parts.capacitors, parts.inductors, parts.wires, parts.formers, parts.cores))


def test_the_installed_data_go_before_those_of_the_checkout(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A wheel holds the data inside the package, a checkout beside it."""
    monkeypatch.setattr(catalogue, "__file__", str(tmp_path / "partpick" / "catalogue.py"))
    assert data_folder() == tmp_path.resolve() / "data"
    (tmp_path / "partpick" / "data").mkdir(parents=True)
    assert data_folder() == tmp_path.resolve() / "partpick" / "data"


def test_reading_parts_loads_no_heavy_library() -> None:
    """`partpick parts` and every start pay for what the catalogue imports."""
    code = (
        "import sys, partpick.catalogue as c; c.load_catalogue(None); "
        "print(sorted({'numpy', 'scipy', 'pandas', 'ortools'} & set(sys.modules)))"
    )
    root = Path(catalogue.__file__).resolve().parent.parent
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=root, check=True)
    assert done.stdout.strip() == "[]"


def test_a_file_of_the_drawer_replaces_the_shipped_one_and_no_other(drawer: Drawer) -> None:
    """A drawer with capacitors alone still winds on the shipped formers."""
    parts = load_catalogue(drawer("capacitors.csv", "value\n47 pF\n"))
    assert [part.value for part in parts.capacitors] == [47e-12]
    assert parts.formers == load_catalogue(None).formers
    assert parts.drawer
    assert parts.drawer_files == ("capacitors.csv",)


def test_the_shipped_folder_is_itself_a_drawer() -> None:
    """Copying data/ is the natural way to begin a drawer of one's own."""
    own, shipped = load_catalogue(data_folder()), load_catalogue(None)
    assert (own.capacitors, own.formers) == (shipped.capacitors, shipped.formers)


@pytest.mark.parametrize("name", ["spares.csv", "Capacitors.csv", "resistors.CSV"])
def test_another_csv_file_is_refused_with_the_known_names(drawer: Drawer, name: str) -> None:
    """A misspelt file would otherwise leave the shipped parts in use unseen."""
    drawer("wires.csv", "name,bare_diameter,overall_diameter\n")
    message = refused(drawer(name, "value\n1 pF\n"))
    assert name in message
    assert all(known in message for known in KNOWN_FILES)


def test_other_kinds_of_files_are_left_alone(drawer: Drawer) -> None:
    """A note, a spreadsheet or its lock file beside the CSV files is nobody's business."""
    drawer("notes.txt", "value")
    drawer("stock.ods", b"\0")
    drawer(".~lock.capacitors.csv#", "")
    drawer(".hidden.csv", "")
    assert load_catalogue(drawer("capacitors.csv", "value\n1 pF\n")).drawer_files == ("capacitors.csv",)


def test_a_folder_without_any_known_file_is_refused(drawer: Drawer, tmp_path: Path) -> None:
    """It is the wrong folder; the shipped parts would be taken for the user's own."""
    assert "capacitors.csv" in refused(drawer("notes.txt", ""))
    assert "not there" in refused(tmp_path / "missing")
    assert "not a folder" in refused(tmp_path / "notes.txt")


def test_something_that_is_no_plain_file_is_refused(tmp_path: Path) -> None:
    """A folder or a pipe of that name would stop the program or hang it."""
    (tmp_path / "capacitors.csv").mkdir()
    assert "not a plain file" in refused(tmp_path)


# ---------------------------------------------------------------- the table


@pytest.mark.parametrize(
    "content",
    [
        b"\xef\xbb\xbfvalue,grade\r\n47 pF,C0G\r\n",
        b"value,grade\r47 pF,C0G",
        b'grade , value,shelf,\n"C0G"," 47 pF ",3,\n\n,,,\n',
    ],
    ids=["byte order mark and CRLF", "CR", "other order, further columns, blank rows"],
)
def test_what_spreadsheets_write_is_read(drawer: Drawer, content: bytes) -> None:
    """Byte order mark, line ends, order of columns and blank rows differ between programs."""
    (part,) = load_catalogue(drawer("capacitors.csv", content)).capacitors
    assert (part.exact, part.grade) == (Fraction(47, 10**12), "C0G")


def test_a_header_alone_says_that_there_are_none(drawer: Drawer) -> None:
    """Nobody has to delete the shipped inductors one by one to have none."""
    assert load_catalogue(drawer("inductors.csv", "value,label\n")).inductors == ()


@pytest.mark.parametrize(
    ("content", "named"),
    [
        ("", ["empty"]),
        (" \n\n", ["empty"]),
        ("\ufeff", ["header"]),
        ("grade\nC0G\n", ["row 1", "column missing: value"]),
        ("series,from\nE12,1 pF\n", ["row 1", "missing"]),
        ("value;grade\n1 pF;C0G\n", ["row 1", "commas"]),
        ("value,value\n1 pF,1 pF\n", ["row 1", "twice"]),
        (CAPACITORS + "47 pF,,,\n", ["row 2", "grade", "short"]),
        (CAPACITORS + "47 pF,,,,C0G,5 %,,a,b\n", ["row 2", "9 cells"]),
        ('value,label\n1 pF,"open\n', ["row 2", "CSV"]),
        (b"\xff\xfev\0a\0l\0u\0e\0\n\0", ["UTF-8"]),
        ("value,label\n1 pF,µ\n".encode("latin-1"), ["UTF-8", "line 2"]),
        (b"value\n1\0 pF\n", ["zero bytes"]),
        ("value\n" + "1" * 30000 + "\n", ["line 2", "longer"]),
        (CAPACITORS + ",,,,C0G,5 %,,\n", ["row 2", "value", "family"]),
        (CAPACITORS + "47 pF,E12,,,,,,\n", ["row 2", "series", "not both"]),
        (CAPACITORS + ",E12,10 pF,,,,,\n", ["row 2", "to", "needed"]),
        (CAPACITORS + ",E7,10 pF,20 pF,,,,\n", ["row 2", "series", "E7", "E12"]),
        (CAPACITORS + ",E12,20 pF,10 pF,,,,\n", ["row 2", "to", "below"]),
        (CAPACITORS + ",E12,1.01 pF,1.02 pF,,,,\n", ["row 2", "series", "no value"]),
        (CAPACITORS + "47 pF,,,,,,,\n\n104,,,,,,,\n", ["row 4", "value", "100 nF"]),
        (CAPACITORS + "-47 pF,,,,,,,\n", ["row 2", "value"]),
        (CAPACITORS + "0 pF,,,,,,,\n", ["row 2", "value"]),
        (CAPACITORS + "nan,,,,,,,\n", ["row 2", "value"]),
        (CAPACITORS + "47 \u00b5H,,,,,,,\n", ["row 2", "value", "inductance"]),
        (CAPACITORS + "47 pF,,,,,5,,\n", ["row 2", "tolerance", "5 %"]),
        (CAPACITORS + "47 pF,,,,,-5 %,,\n", ["row 2", "tolerance"]),
        (CAPACITORS + "47 pF,,,,,101 %,,\n", ["row 2", "tolerance", "100 %"]),
        (CAPACITORS + "47 pF,,,,,48 pF,,\n", ["row 2", "tolerance", "100 %"]),
        (CAPACITORS + "47 pF,,,,,,-1,\n", ["row 2", "quantity"]),
        (CAPACITORS + "47 pF,,,,,,1.5,\n", ["row 2", "quantity"]),
        (CAPACITORS + "47 pF,,,,,,,a\n22 pF,,,,,,,a\n", ["row 3", "label", '"a"', "row 2"]),
        (CAPACITORS + "47 pF,,,,,,,a\u202eb\n", ["row 2", "label"]),
        (CAPACITORS + "47 pF,,,,,,," + "a" * 201 + "\n", ["row 2", "label", "longer"]),
        ("value,q\n47 pF,0\n", ["row 2", "q", "more than zero"]),
        ("value,unit_price\n47 pF,-0.1\n", ["row 2", "unit_price"]),
        ("value,tempco_tolerance\n47 pF,-30\n", ["row 2", "tempco_tolerance"]),
        ("value,voltage\n47 pF,-30 V\n", ["row 2", "voltage"]),
    ],
)
def test_a_bad_capacitor_file_is_refused_by_row_and_column(
    drawer: Drawer, content: str | bytes, named: list[str]
) -> None:
    """One clear line, so that the cell can be found and mended."""
    message = refused(drawer("capacitors.csv", content))
    for word in ["capacitors.csv", *named]:
        assert word in message


@pytest.mark.parametrize(
    ("file", "content", "named"),
    [
        ("wires.csv", "name,bare_diameter\na,1 mm\n", ["overall_diameter"]),
        ("wires.csv", "name,bare_diameter,overall_diameter\n,1 mm,1 mm\n", ["row 2", "name"]),
        ("wires.csv", "name,bare_diameter,overall_diameter\na,1 mm,0.9 mm\n", ["row 2", "overall_diameter"]),
        ("wires.csv", "name,bare_diameter,overall_diameter\na,1,1\n", ["row 2", "bare_diameter", "1 mm"]),
        ("wires.csv", "name,bare_diameter,overall_diameter\na,1 mm,1 mm\na,2 mm,2 mm\n", ["row 3", "name"]),
        (
            "wires.csv",
            "name,bare_diameter,overall_diameter,strands\na,1 mm,1 mm,7\n",
            ["row 2", "strand_diameter"],
        ),
        (
            "wires.csv",
            "name,bare_diameter,overall_diameter,strands,strand_diameter\na,1 mm,1 mm,7,0.4 mm\n",
            ["row 2", "strand_diameter", "room"],
        ),
        ("formers.csv", "name,support,diameter\na,tube,1 mm\n", ["winding_length"]),
        ("formers.csv", FORMERS + "a,tub,1 mm,1 mm,\n", ["row 2", "support", "mandrel"]),
        ("formers.csv", FORMERS + "a,tube,0 mm,1 mm,\n", ["row 2", "diameter"]),
        ("formers.csv", FORMERS + "a,tube,1 mm,,\n", ["row 2", "winding_length"]),
        ("formers.csv", FORMERS + "a,tube,1 mm,1 mm,0 mm\n", ["row 2", "pitch"]),
        ("formers.csv", FORMERS + "a,tube,1 mm,1 mm,close\n", ["row 2", "pitch"]),
        ("formers.csv", LOSSY + "a,1 mm,1 mm,-0.01\n", ["row 2", "loss_tangent"]),
        ("formers.csv", LOSSY + "a,1 mm,1 mm,2\n", ["row 2", "loss_tangent", "above 0.5"]),
        ("formers.csv", LOSSY + "a,1 mm,1 mm,nan\n", ["row 2", "loss_tangent"]),
        ("cores.csv", CORES + "a,,10 mm,10 mm,4 mm,9,\n", ["row 2", "inner_diameter"]),
        ("cores.csv", CORES + "a,,10 mm,,4 mm,9,\n", ["row 2", "inner_diameter"]),
        ("cores.csv", CORES + "a,ring,10 mm,5 mm,0 mm,9,\n", ["row 2", "height"]),
        ("cores.csv", CORES + "a,ring,10 mm,5 mm,4 mm,0.9,\n", ["row 2", "permeability"]),
        ("cores.csv", CORES + "a,ring,10 mm,5 mm,4 mm,,\n", ["row 2", "permeability", "al"]),
        ("cores.csv", CORES + "a,cube,10 mm,5 mm,4 mm,9,\n", ["row 2", "shape", "ring"]),
        ("cores.csv", CORES + "a,ring,10 mm,5 mm,4 mm,9,-4 nH\n", ["row 2", "al"]),
        ("inductors.csv", "value,adjust\n1 µH,120 %\n", ["row 2", "adjust"]),
        ("inductors.csv", "value,q_frequency\n1 µH,7.9\n", ["row 2", "q_frequency", "7.9 MHz"]),
    ],
)
def test_impossible_sizes_are_refused_by_row_and_column(
    drawer: Drawer, file: str, content: str, named: list[str]
) -> None:
    """A coil that cannot exist must not be offered."""
    message = refused(drawer(file, content))
    for word in [file, *named]:
        assert word in message


def test_too_many_rows_or_parts_are_refused_with_the_limit(
    drawer: Drawer, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One short family row can stand for thousands of parts; memory must not be the limit."""
    monkeypatch.setattr(catalogue_table, "MOST_ROWS", 60)  # more than any shipped file has
    assert len(load_catalogue(drawer("capacitors.csv", "value\n" + "1 pF\n" * 60)).capacitors) == 60
    assert "more than 60 rows" in refused(drawer("capacitors.csv", "value\n" + "1 pF\n" * 61))
    monkeypatch.setattr(catalogue_labels, "MOST_PARTS", 100)
    message = refused(drawer("capacitors.csv", "series,from,to\nE192,1 pF,1 nF\n"))
    assert "more than 100 parts" in message
    monkeypatch.setattr(catalogue_table, "MOST_BYTES", 3)
    assert "larger than" in refused(drawer("capacitors.csv", "value\n1 pF\n"))


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    cells=st.lists(
        st.lists(
            st.sampled_from(["E12", "1 pF", "10 pF", "5 %", "-1", "C0G", "1e999", "1 mm"]) | st.text(),
            max_size=6,
        ),
        max_size=4,
    ),
    file=st.sampled_from(["capacitors.csv", "inductors.csv", "wires.csv", "formers.csv", "cores.csv"]),
)
def test_whatever_stands_in_a_file_is_read_or_refused(
    tmp_path: Path, cells: list[list[str]], file: str
) -> None:
    """No traceback: an unexpected error here would reach the user."""
    header = "value,series,from,to,tolerance,grade" if file in KNOWN_FILES[:2] else ""
    header = header or "name,diameter,bare_diameter,overall_diameter,winding_length,outer_diameter"
    text = "\n".join([header, *(",".join(row) for row in cells)])
    (tmp_path / file).write_bytes(text.encode("utf-8", "surrogatepass"))
    try:
        load_catalogue(tmp_path)
    except CatalogueError as error:
        assert file in str(error)
    finally:
        (tmp_path / file).unlink()


# ---------------------------------------------------------------- what a row becomes


def test_a_family_holds_each_value_of_its_series(drawer: Drawer) -> None:
    """IEC 60063: E6 from 10 to 100 pF is seven values, both ends included."""
    folder = drawer("capacitors.csv", CAPACITORS + ",E6,10 pF,100 pF,C0G,5 %,4,\n")
    parts = load_catalogue(folder).capacitors
    assert [part.exact * 10**12 for part in parts] == [10, 15, 22, 33, 47, 68, 100]
    assert {part.family for part in parts} == {"E6"}
    assert {part.quantity for part in parts} == {4}
    assert [part.label for part in parts][:2] == ["10 pF C0G", "15 pF C0G"]


def test_an_absolute_tolerance_is_a_fraction_of_each_value(drawer: Drawer) -> None:
    """0.25 pF is 25 % of 1 pF and 2.5 % of 10 pF."""
    folder = drawer("capacitors.csv", CAPACITORS + ",E3,1 pF,10 pF,C0G,0.25 pF,,\n")
    parts = load_catalogue(folder).capacitors
    assert [part.tolerance for part in parts] == pytest.approx([0.25, 0.25 / 2.2, 0.25 / 4.7, 0.025])


def test_every_column_is_read_in_si(drawer: Drawer) -> None:
    """A column read in the wrong unit would spoil results unseen."""
    header = (
        "value,grade,tolerance,tempco_ppm_per_k,tempco_tolerance,q,q_below,voltage,rf_current,"
        "series_inductance,quantity,unit_price,label,source\n"
    )
    row = "4n7,film,2.5 %,-120,60,1500,5 MHz,160 V,300 mA,8 nH,0,0.45,big one,shelf 3\n"
    (part,) = load_catalogue(drawer("capacitors.csv", header + row)).capacitors
    assert part == Capacitor(
        value=4.7e-9,
        exact=Fraction(47, 10**10),
        grade="film",
        tolerance=0.025,
        tempco=-120e-6,
        tempco_tolerance=60e-6,
        q=1500.0,
        q_below=5e6,
        voltage=160.0,
        rf_current=0.3,
        series_inductance=8e-9,
        quantity=0,
        unit_price=0.45,
        label="big one",
        family="",
        source="shelf 3",
    )


def test_coils_wires_formers_and_cores_are_read_in_si(drawer: Drawer) -> None:
    """As for capacitors, with the columns of each kind."""
    drawer(
        "inductors.csv",
        "value,tolerance,q,q_frequency,self_capacitance,current,adjust,quantity,tempco_ppm_per_k\n"
        "4\u00b57,10 %,40,7.9 MHz,1.5 pF,50 mA,15 %,3,300\n",
    )
    drawer(
        "wires.csv",
        "name,bare_diameter,overall_diameter,strands,strand_diameter,price_per_m\n"
        "rope,0.2 mm,0.25 mm,7,0.07 mm,0.3\nbare,1 mm,1 mm,,,\n",
    )
    drawer(
        "formers.csv",
        FORMERS + "a,tube,20 mm,30 mm,\nb,tube,20 mm,30 mm,twin\nc,ribbed,25 mm,40 mm,1.5 mm\n",
    )
    drawer("cores.csv", CORES + "a,,10 mm,6 mm,4 mm,9,5.1 nH\n")
    parts = load_catalogue(drawer("capacitors.csv", "value\n"))
    (coil,), (rope, bare), (core,) = parts.inductors, parts.wires, parts.cores
    assert (coil.value, coil.q, coil.q_frequency, coil.self_capacitance) == (4.7e-6, 40, 7.9e6, 1.5e-12)
    assert (coil.tolerance, coil.current, coil.adjust, coil.quantity) == (0.1, 0.05, 0.15, 3)
    assert coil.tempco == pytest.approx(300e-6)
    assert (rope.strands, rope.strand_diameter, rope.price_per_m, rope.bare) == (7, 0.07e-3, 0.3, False)
    assert bare.bare
    assert [former.pitch for former in parts.formers] == [None, "twin", 1.5e-3]
    assert (core.shape, core.outer_diameter, core.inner_diameter, core.height) == ("ring", 0.01, 0.006, 0.004)
    assert (core.permeability, core.al) == (9, 5.1e-9)


@pytest.mark.parametrize(
    ("written", "spread"), [("30", 30e-6), ("30 ppm", 30e-6), ("0.00003", 30e-6), ("0", 0.0), ("", None)]
)
def test_a_tempco_spread_is_read_with_and_without_unit(
    drawer: Drawer, written: str, spread: float | None
) -> None:
    """The column's name states no unit, so that both habits occur; neither can mean the other."""
    folder = drawer("capacitors.csv", f"value,tempco_ppm_per_k,tempco_tolerance\n1 nF,-150,{written}\n")
    (part,) = load_catalogue(folder).capacitors
    assert part.tempco == pytest.approx(-150e-6)
    assert part.tempco_tolerance == (None if spread is None else pytest.approx(spread))


# ---------------------------------------------------------------- defaults


@pytest.mark.parametrize(
    ("grade", "tempco", "spread"),
    [("C0G", 0, 30), ("np0", 0, 30), ("N150", -150, 30), ("N330", -330, 60), ("N750", -750, 120)],
)
def test_a_class_1_grade_has_the_tempco_of_its_standard(
    drawer: Drawer, grade: str, tempco: float, spread: float
) -> None:
    """EIA-198: C0G, P2G, S2H and U2J decode to these, from memory."""
    (part,) = load_catalogue(drawer("capacitors.csv", f"value,grade\n100 pF,{grade}\n")).capacitors
    assert part.tempco == pytest.approx(tempco * 1e-6)
    assert part.tempco_tolerance == pytest.approx(spread * 1e-6)
    assert any("tempco not stated" in note and "EIA-198" in note for note in part.notes)


def test_every_default_taken_is_said(drawer: Drawer) -> None:
    """A figure that the user never wrote must not look like one that he did."""
    content = "value,grade,tolerance,tempco_ppm_per_k,q\n100 pF,C0G,,,\n22 pF,C0G,5 %,0,900\n"
    bare, full = load_catalogue(drawer("capacitors.csv", content)).capacitors
    assert [note.split(" ")[0] for note in bare.notes] == ["tolerance", "Q", "tempco"]
    assert "Q not stated: 1000 taken for C0G (common practice)" in bare.notes
    assert full.notes == ()


def test_small_ceramic_capacitors_default_to_an_absolute_tolerance(drawer: Drawer) -> None:
    """IEC 60384-8, from memory: below 10 pF tolerances are in pF; 5 % of 1 pF is not on offer."""
    parts = load_catalogue(drawer("capacitors.csv", "value,grade\n1 pF,C0G\n100 pF,C0G\n")).capacitors
    assert [part.tolerance for part in parts] == pytest.approx([0.25, 0.05])
    assert "250 fF" in parts[0].notes[0]


@pytest.mark.parametrize("grade", ["", "X7R", "glass"])
def test_an_unknown_grade_has_unknown_figures(drawer: Drawer, grade: str) -> None:
    """Never a silent zero: unknown Q and tempco stay unknown, and the notes say so."""
    (part,) = load_catalogue(drawer("capacitors.csv", f"value,grade\n100 pF,{grade}\n")).capacitors
    assert (part.tolerance, part.q, part.tempco, part.tempco_tolerance) == (0.05, None, None, None)
    assert "Q not stated: unknown" in part.notes
    assert "tempco not stated: unknown" in part.notes


def test_a_stated_tempco_gets_no_spread_that_nobody_stated(drawer: Drawer) -> None:
    """Drift adds the spread where a row states one; an invented one would rule parts out."""
    folder = drawer("capacitors.csv", "value,grade,tempco_ppm_per_k\n100 pF,C0G,0\n")
    (part,) = load_catalogue(folder).capacitors
    assert (part.tempco, part.tempco_tolerance) == (0.0, None)


def test_coils_take_and_say_their_defaults(drawer: Drawer) -> None:
    """Common practice, no source: 10 % of an inductor, 1 % of a former's diameter, 20 % of ferrite."""
    drawer("inductors.csv", "value\n10 \u00b5H\n")
    drawer("formers.csv", "name,diameter,winding_length\na,20 mm,30 mm\n")
    parts = load_catalogue(drawer("cores.csv", CORES + "a,,10 mm,6 mm,4 mm,120,\nb,,10 mm,6 mm,4 mm,9,\n"))
    (coil,), (former,), (ferrite, powder) = parts.inductors, parts.formers, parts.cores
    assert (coil.tolerance, coil.q, coil.self_capacitance, coil.tempco) == (0.1, None, None, None)
    assert (former.support, former.tolerance, former.tempco) == ("tube", 0.01, pytest.approx(100e-6))
    assert former.loss_tangent == 0.01 and "loss_tangent not stated: 0.01 taken for a tube former" in former.notes[3]
    assert (ferrite.tolerance, powder.tolerance) == (0.20, 0.05)
    assert [len(part.notes) for part in (coil, former, ferrite)] == [3, 4, 3]


# ---------------------------------------------------------------- labels


def test_labels_made_up_tell_parts_of_one_value_apart(drawer: Drawer) -> None:
    """The label is what a person looks for on the shelf."""
    content = (
        "value,grade,tolerance,voltage,label\n47 pF,mica,1 %,500 V,\n47 pF,mica,5 %,500 V,\n"
        "47 pF,mica,5 %,1 kV,\n47 pF,C0G,5 %,100 V,\n47 pF,C0G,5 %,100 V,47 pF C0G\n47 pF,,5 %,,\n"
        "22 pF,C0G,5 %,100 V,\n22 pF,C0G,5 %,100 V,\n"
    )
    labels = [part.label for part in load_catalogue(drawer("capacitors.csv", content)).capacitors]
    assert labels == [
        "47 pF mica 1 %",
        "47 pF mica 5 % 500 V",
        "47 pF mica 5 % 1 kV",
        "47 pF C0G 5 %",
        "47 pF C0G",
        "47 pF",
        "22 pF C0G 5 % 100 V",
        "22 pF C0G 5 % 100 V (2)",
    ]


def test_the_label_of_a_family_goes_behind_each_value(drawer: Drawer) -> None:
    """One cell cannot name seven parts."""
    folder = drawer("inductors.csv", "series,from,to,label\nE3,1 \u00b5H,4.7 \u00b5H,moulded\n")
    labels = [part.label for part in load_catalogue(folder).inductors]
    assert labels == ["1 µH moulded", "2.2 µH moulded", "4.7 µH moulded"]


# ---------------------------------------------------------------- selection


def stock(drawer: Drawer, content: str) -> Catalogue:
    return load_catalogue(drawer("capacitors.csv", content))


def picofarads(parts: tuple[Capacitor, ...]) -> list[float]:
    return [round(part.value * 1e12, 6) for part in parts]


def test_a_series_thins_finer_families_only(drawer: Drawer) -> None:
    """IEC 60063: E24 from 10 to 15 pF is 10 11 12 13 15, of which E12 keeps 10 12 15."""
    singles = "11.5 pF,,,,C0G,,,\n13 pF,,,,C0G,,,\n"
    own = stock(drawer, f"{CAPACITORS},E24,10 pF,15 pF,C0G,,,\n{singles},E6,22 pF,33 pF,,,,\n")
    kept = select_capacitors(own, CapacitorRules(series="E12"), False)
    assert picofarads(kept) == [10, 12, 15, 11.5, 13, 22, 33]
    # E96 has neither 11 nor 12, but a coarser family is not thinned by a finer series.
    assert picofarads(select_capacitors(own, CapacitorRules(series="E96"), False))[:5] == [10, 11, 12, 13, 15]


def test_both_ends_of_the_range_belong_to_it(drawer: Drawer) -> None:
    """A user who writes "from 10 pF" has a 10 pF part in mind."""
    own = stock(drawer, CAPACITORS + ",E12,8.2 pF,22 pF,C0G,,,\n")
    kept = select_capacitors(own, CapacitorRules(low=10e-12, high=15e-12), False)
    assert picofarads(kept) == [10, 12, 15]


def test_a_part_of_which_there_is_none_is_left_out(drawer: Drawer) -> None:
    """Quantity 0 is none, an empty one as many as wanted."""
    own = stock(drawer, CAPACITORS + "10 pF,,,,,,0,\n12 pF,,,,,,,\n15 pF,,,,,,1,\n")
    assert picofarads(select_capacitors(own, CapacitorRules(), False)) == [12, 15]


def test_shipped_grades_are_steady_ones_unless_drift_is_a_limit() -> None:
    """Contract: by default all within 60 ppm/K; compensating grades come with a drift limit."""
    parts = load_catalogue(None)
    steady = select_capacitors(parts, CapacitorRules(), False)
    every = select_capacitors(parts, CapacitorRules(), True)
    assert {"C0G", "mica"} <= {part.grade for part in steady}
    assert all(part.tempco is not None and abs(part.tempco) <= 60.001e-6 for part in steady)
    assert {"N150", "N750", "P100", "polystyrene"} <= {part.grade for part in every}


def test_a_drawer_offers_every_grade(drawer: Drawer) -> None:
    """What a user has put into his drawer he means to use."""
    own = stock(drawer, "value,grade\n10 pF,N750\n12 pF,\n")
    assert picofarads(select_capacitors(own, CapacitorRules(), False)) == [10, 12]


def test_grades_are_matched_whatever_the_case(drawer: Drawer) -> None:
    """`c0g` and `C0G` are one grade; a longer name is another one."""
    own = stock(drawer, "value,grade\n10 pF,C0G\n12 pF,N750\n15 pF,C0G high voltage\n")
    assert picofarads(select_capacitors(own, CapacitorRules(grades=("c0g",)), False)) == [10]


def test_an_unknown_grade_is_refused_with_those_present(drawer: Drawer) -> None:
    """An empty result would say "nothing fits" of a mere slip of the pen."""
    own = stock(drawer, "value,grade\n10 pF,C0G\n12 pF,N750\n")
    with pytest.raises(RequestError, match=r'grades.*"COG".*C0G, N750'):
        select_capacitors(own, CapacitorRules(grades=("COG",)), False)


def test_a_nonsense_series_is_refused() -> None:
    """There is no E13."""
    with pytest.raises(RequestError, match=r"series.*E13.*E24"):
        select_capacitors(load_catalogue(None), CapacitorRules(series="E13"), False)


def test_a_cell_with_control_characters_is_refused_in_one_line(drawer: Drawer) -> None:
    """They count as blanks to a reader of numbers, and would break the line."""
    for text in ("name,low,high\na,4 pF,3\x1dpF\n", "name,low,high,la\x0cce,la\x0cce\na,4 pF,5 pF,,\n"):
        assert refused(drawer("trimmers.csv", text)).isprintable()
