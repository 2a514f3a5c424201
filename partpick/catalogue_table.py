"""Reads one CSV file of parts into rows that know their file, row and column when something is wrong.

Row numbers are those of a spreadsheet: the header is row 1, blank rows count. Nothing here knows what
a part is; `catalogue_rows.py` does.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from partpick.errors import CatalogueError, QuantityError
from partpick.quantities import shown

MOST_ROWS = 200_000  # keeps a drawer within some hundred megabytes of memory
MOST_LINES = 2 * MOST_ROWS  # a quoted cell may hold a line end; beyond this nothing need be parsed
MOST_BYTES = 32_000_000
LONGEST_LINE = 20_000  # characters
LONGEST_TEXT = 200  # characters in a name or label

T = TypeVar("T")


@dataclass(frozen=True)
class Row:
    """One row of a file: cells by column, stripped; a missing column is an empty cell."""

    file: str
    number: int
    cells: Mapping[str, str]

    def wrong(self, column: str, what: str) -> CatalogueError:
        """Return the error that names file, row and column."""
        return CatalogueError(f"{self.file}, row {self.number}, {column}: {what}")

    def has(self, column: str) -> bool:
        """Whether the cell is there and not empty."""
        return bool(self.cells.get(column))

    def read(self, column: str, parse: Callable[[str], T]) -> T | None:
        """Return the cell as read by `parse`, None where it is empty."""
        text = self.cells.get(column, "")
        if not text:
            return None
        try:
            return parse(text)
        except QuantityError as error:
            raise self.wrong(column, str(error)) from None

    def need(self, column: str, parse: Callable[[str], T]) -> T:
        """Return the cell as read by `parse`; an empty one is an error."""
        value = self.read(column, parse)
        if value is None:
            raise self.wrong(column, "empty, but needed")
        return value

    def text(self, column: str) -> str:
        """Return a name or label: blanks joined, every character printable, "" where empty."""
        words = " ".join(self.cells.get(column, "").split())
        if not words.isprintable():
            raise self.wrong(column, f"read {shown(words)}: a character that cannot be printed")
        if len(words) > LONGEST_TEXT:
            raise self.wrong(column, f"longer than {LONGEST_TEXT} characters")
        return words


def read_rows(path: Path, file: str, needed: Sequence[tuple[str, ...]]) -> Iterator[Row]:
    """Yield the rows of a CSV file, blank ones left out.

    Parameters
    ----------
    path : Path
        The file: UTF-8 with or without byte order mark, any line ends.
    file : str
        What the file is called in errors.
    needed : sequence of tuple of str
        Sets of columns of which the header must hold at least one set in full.

    Raises
    ------
    CatalogueError
        Unreadable, too large, not UTF-8, not CSV, no header, a column missing or twice, a row too short
        or too long.
    """
    records = _records(_decoded(path, file), file)
    _, header = next(records, (1, []))
    columns = [cell.strip() for cell in header]
    if not any(columns):
        raise CatalogueError(f"{file}: no header row; its first row must name {_choices(needed)}")
    _check_header(columns, file, needed)
    for number, record in records:
        if any(cell.strip() for cell in record):
            yield Row(file, number, _cells(columns, record, file, number))


def _decoded(path: Path, file: str) -> str:
    try:
        if not path.is_file():
            raise CatalogueError(f"{file}: not a plain file")
        with path.open("rb") as stream:
            content = stream.read(MOST_BYTES + 1)
    except OSError as error:
        raise CatalogueError(f"{file}: cannot be read: {(error.strerror or str(error)).lower()}") from None
    if len(content) > MOST_BYTES:
        raise CatalogueError(f"{file}: larger than {MOST_BYTES // 1_000_000} MB, the most that is read")
    if content.count(b"\n") > MOST_LINES:
        raise CatalogueError(f"{file}: more than {MOST_ROWS} rows, the most that is read")
    if not content.strip():
        raise CatalogueError(f"{file}: the file is empty")
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        place = content.count(b"\n", 0, error.start) + 1
        raise CatalogueError(f"{file}: not UTF-8 text (line {place}); save it as CSV in UTF-8") from None
    if "\0" in text:
        raise CatalogueError(f"{file}: not a text file, it holds zero bytes; save it as CSV in UTF-8")
    return text


def _records(text: str, file: str) -> Iterator[tuple[int, list[str]]]:
    number = 0
    try:
        for record in csv.reader(_lines(text, file), strict=True):
            number += 1
            if number > MOST_ROWS + 1:
                raise CatalogueError(f"{file}: more than {MOST_ROWS} rows, the most that is read")
            yield number, record
    except csv.Error as error:
        raise CatalogueError(f"{file}, row {number + 1}: not readable as CSV: {error}") from None


def _lines(text: str, file: str) -> Iterator[str]:
    for number, line in enumerate(io.StringIO(text, newline=""), 1):
        if len(line) > LONGEST_LINE:
            raise CatalogueError(f"{file}, line {number}: longer than {LONGEST_LINE} characters")
        yield line


def _check_header(columns: Sequence[str], file: str, needed: Sequence[tuple[str, ...]]) -> None:
    seen: set[str] = set()
    for column in filter(None, columns):
        if column in seen:
            raise CatalogueError(f"{file}, row 1, {shown(column)}: the column is there twice")
        seen.add(column)
    if any(seen.issuperset(choice) for choice in needed):
        return
    nearest = min(needed, key=lambda choice: len(set(choice) - seen))
    missing = ", ".join(column for column in nearest if column not in seen)
    separated = len(columns) == 1 and any(sign in columns[0] for sign in ";\t|")
    hint = "; columns are separated by commas" if separated else ""
    choice = f" (a header needs {_choices(needed)})" if len(needed) > 1 else ""
    raise CatalogueError(f"{file}, row 1: column missing: {missing}{choice}{hint}")


def _choices(needed: Sequence[tuple[str, ...]]) -> str:
    return " or ".join(", ".join(choice) for choice in needed)


def _cells(columns: Sequence[str], record: Sequence[str], file: str, number: int) -> dict[str, str]:
    if len(record) < len(columns):
        raise CatalogueError(
            f"{file}, row {number}, {columns[len(record)] or 'last column'}: the row is short, "
            f"{len(record)} cells where the header has {len(columns)}"
        )
    if any(cell.strip() for cell in record[len(columns) :]):
        raise CatalogueError(
            f"{file}, row {number}, after {columns[-1] or 'the last column'}: {len(record)} cells where the "
            f"header has {len(columns)}; a cell that holds a comma must be quoted"
        )
    return {column: cell.strip() for column, cell in zip(columns, record, strict=False) if column}
