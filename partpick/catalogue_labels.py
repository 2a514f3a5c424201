"""Labels that tell the parts of one file apart."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Iterator

from partpick.catalogue_table import Row
from partpick.errors import CatalogueError
from partpick.parts import P, labelled_copy

MOST_PARTS = 200_000  # of one file, families written out

Words = Callable[[P], tuple[str, ...]]  # of a label: value, kind, then what may be left out


def only_once(first: dict[str, int], name: str, row: Row, column: str) -> None:
    """Refuse a name that an earlier row of the file has; `first` remembers the rows by name."""
    if name in first:
        raise row.wrong(column, f'"{name}" is there already, in row {first[name]}')
    first[name] = row.number


def labelled(rows: Iterable[Row], read: Callable[[Row], Iterator[P]], words: Words[P]) -> tuple[P, ...]:
    """Return the parts of all rows, each with a label that no other has.

    Parameters
    ----------
    rows : iterable of Row
        The rows of one file.
    read : function
        Gives the parts of a row; their label is the cell as written.
    words : function
        Gives the words of a label: value and kind, then what may be left out.

    Returns
    -------
    parts : tuple
        A single part keeps its label, a family's label goes behind each value; where none is given, the
        fewest words that tell the part from the others are taken, and a number where none do.

    Raises
    ------
    CatalogueError
        Two parts with one label given, or too many parts.
    """
    parts: list[P] = []
    first: dict[str, int] = {}
    for row in rows:
        single = row.has("value")
        for part in read(row):
            if part.label:
                part = part if single else labelled_copy(part, f"{words(part)[0]} {part.label}")
                only_once(first, part.label, row, "label")
            parts.append(part)
            if len(parts) > MOST_PARTS:
                raise CatalogueError(
                    f"{row.file}, row {row.number}: more than {MOST_PARTS} parts, the most that is read"
                )
    made = _made_labels([words(part) for part in parts if not part.label], set(first))
    return tuple(part if part.label else labelled_copy(part, next(made)) for part in parts)


def _made_labels(words: list[tuple[str, ...]], taken: set[str]) -> Iterator[str]:
    labels: dict[int, str] = {}
    for depth in range(2, max(map(len, words), default=0) + 1):
        tried = {i: _joined(w[:depth]) for i, w in enumerate(words) if i not in labels}
        counts = Counter(tried.values())
        alone = {i: label for i, label in tried.items() if counts[label] == 1 and label not in taken}
        labels.update(alone)
        taken.update(alone.values())
    copies: Counter[str] = Counter()
    for i, w in enumerate(words):
        while i not in labels:
            label = _joined(w)
            copies[label] += 1
            numbered = label if copies[label] == 1 else f"{label} ({copies[label]})"
            if numbered not in taken:
                labels[i] = numbered
                taken.add(numbered)
    return (labels[i] for i in range(len(words)))


def _joined(words: tuple[str, ...]) -> str:
    return " ".join(filter(None, words))
