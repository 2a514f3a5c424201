"""The parts in use: the shipped catalogue, each file replaced by the drawer's where it has one."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from partpick import catalogue_rows as kinds
from partpick.catalogue_table import read_rows
from partpick.errors import CatalogueError, RequestError
from partpick.parts import Capacitor, Catalogue
from partpick.preferred import SERIES, series_values
from partpick.quantities import shown
from partpick.request import CapacitorRules

# What is read: the columns that must be there, and what makes parts of the rows.
_READERS: dict[str, tuple[Sequence[tuple[str, ...]], Callable[[Any], tuple[Any, ...]]]] = {
    "capacitors.csv": (kinds.VALUE_OR_FAMILY, kinds.capacitors),
    "inductors.csv": (kinds.VALUE_OR_FAMILY, kinds.inductors),
    "wires.csv": (kinds.WIRE_SIZES, kinds.wires),
    "formers.csv": (kinds.FORMER_SIZES, kinds.formers),
    "cores.csv": (kinds.CORE_SIZES, kinds.cores),
    "trimmers.csv": (kinds.TRIMMER_ENDS, kinds.trimmers),
}
# Shipped too and fine in a drawer, but no command reads them yet.
_NOT_READ_YET = ("variable_capacitors.csv", "varactors.csv")
KNOWN_FILES = (*_READERS, *_NOT_READ_YET)

STEADY_TEMPCO = 60e-6  # 1/K; grades beyond it are offered only where drift is a limit or a drawer is given
_FAMILY_ORDER = tuple(SERIES)  # from coarse to fine


def data_folder() -> Path:
    """Return the folder of the shipped parts: the installed one, else that of the checkout."""
    package = Path(__file__).resolve().parent
    installed = package / "data"
    return installed if installed.is_dir() else package.parent / "data"


def load_catalogue(drawer: str | Path | None = None) -> Catalogue:
    """Return the parts in use.

    Parameters
    ----------
    drawer : str or Path, optional
        Folder with files of the same form as the shipped ones; each replaces the shipped file.

    Raises
    ------
    CatalogueError
        The folder is missing, holds none of the known files or another CSV file, or a row is bad: the
        text names file, row and column.
    """
    own = {} if drawer is None else _drawer_files(Path(drawer))
    parts: dict[str, tuple[Any, ...]] = {}
    for name, (needed, read) in _READERS.items():
        path = own.get(name, data_folder() / name)
        parts[name] = read(read_rows(path, _shown_path(path) if name in own else name, needed))
    return Catalogue(
        capacitors=parts["capacitors.csv"],
        inductors=parts["inductors.csv"],
        wires=parts["wires.csv"],
        formers=parts["formers.csv"],
        cores=parts["cores.csv"],
        trimmers=parts["trimmers.csv"],
        drawer=drawer is not None,
        drawer_files=tuple(name for name in _READERS if name in own),
    )


def _drawer_files(folder: Path) -> dict[str, Path]:
    try:
        if not folder.is_dir():
            missing = "not a folder" if folder.exists() else "the folder is not there"
            raise CatalogueError(f"drawer {_shown_path(folder)}: {missing}")
        names = sorted(path.name for path in folder.iterdir() if not path.name.startswith("."))
    except (OSError, ValueError) as error:  # a zero byte in the path is a ValueError
        reason = error.strerror if isinstance(error, OSError) else None
        raise CatalogueError(f"drawer {_shown_path(folder)}: {(reason or str(error)).lower()}") from None
    known = ", ".join(KNOWN_FILES)
    for name in names:
        if name.casefold().endswith(".csv") and name not in KNOWN_FILES:
            where = _shown_path(folder / name)
            raise CatalogueError(f"{where}: no known file of parts; known are {known}")
    own = {name: folder / name for name in names if name in KNOWN_FILES}
    if not own.keys() & _READERS.keys():
        raise CatalogueError(f"drawer {_shown_path(folder)}: no file of parts in it; known are {known}")
    for path in own.values():
        _refuse_a_link_outside(path, folder)
    return own


def _refuse_a_link_outside(path: Path, folder: Path) -> None:
    """A drawer that someone else has packed must not have a file read that the command line did not name."""
    if path.is_symlink() and folder.resolve() not in path.resolve().parents:
        raise CatalogueError(f"{_shown_path(path)}: a link to a file outside the drawer; copy the file into it")


def _shown_path(path: Path) -> str:
    return "".join(letter if letter.isprintable() else "\ufffd" for letter in str(path))


def select_capacitors(
    catalogue: Catalogue, rules: CapacitorRules, drift_limit_set: bool
) -> tuple[Capacitor, ...]:
    """Return the capacitors that a request may use, in catalogue order.

    Parameters
    ----------
    catalogue : Catalogue
        The parts in use.
    rules : CapacitorRules
        Series, range and grades asked for.
    drift_limit_set : bool
        Whether drift is a limit, so that compensating grades are wanted too.

    Raises
    ------
    RequestError
        The series is none, or a grade is not among the parts.

    Notes
    -----
    A series thins families that are finer than itself; a coarser family and a part given by its value
    stay whole. Parts of which there are none are left out.
    """
    if rules.series not in SERIES:
        raise RequestError(
            f"capacitors.series: read {shown(rules.series)}: no series of preferred numbers; "
            f"known are {', '.join(SERIES)}"
        )
    grades = None if rules.grades is None else _wanted_grades(catalogue.capacitors, rules.grades)
    every_grade = drift_limit_set or catalogue.drawer

    def wanted(part: Capacitor) -> bool:
        if part.quantity == 0 or not _in_series(part, rules.series):
            return False
        if (rules.low is not None and part.value < rules.low) or (
            rules.high is not None and part.value > rules.high
        ):
            return False
        if grades is not None:
            return part.grade.casefold() in grades
        return every_grade or (part.tempco is not None and abs(part.tempco) <= STEADY_TEMPCO * (1 + 1e-9))

    return tuple(part for part in catalogue.capacitors if wanted(part))


def _in_series(part: Capacitor, series: str) -> bool:
    if not part.family or _FAMILY_ORDER.index(part.family) <= _FAMILY_ORDER.index(series):
        return True
    return bool(series_values(series, part.exact, part.exact))


def _wanted_grades(parts: Sequence[Capacitor], grades: Sequence[str]) -> set[str]:
    present = {part.grade.casefold(): part.grade for part in parts if part.grade}
    for grade in grades:
        if grade.casefold() not in present:
            from difflib import get_close_matches  # needed for a misspelt grade alone

            near = get_close_matches(grade.casefold(), present, n=1)
            hint = f"; {present[near[0]]}?" if near else ""
            there = ", ".join(present.values()) or "none"
            raise RequestError(f"capacitors.grades: no part of grade {shown(grade)}; there are {there}{hint}")
    return {grade.casefold() for grade in grades}
