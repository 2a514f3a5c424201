"""The docstrings of physics/ are a contract: units, shapes, source; here they are read and compared."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import re
from collections.abc import Callable, Iterator
from typing import Any

import pytest

import partpick.physics

UNIT = re.compile(r"\[[^\[\]]+\]")
RANGE = re.compile(r"\b(within|exact|exactly|range|first order|derivative|above|below|up to|any)\b", re.I)
ENTRY = re.compile(r"^\*{0,2}(\w+(?:, \w+)*) : (.+)$")


def modules() -> Iterator[Any]:
    for found in pkgutil.iter_modules(partpick.physics.__path__):
        yield importlib.import_module(f"partpick.physics.{found.name}")


def own(kind: Callable[[Any], bool]) -> list[Any]:
    """Public members defined in physics/ itself."""
    return [
        member
        for module in modules()
        for name, member in inspect.getmembers(module, kind)
        if member.__module__ == module.__name__ and not name.startswith("_")
    ]


def name_of(member: Any) -> str:
    return f"{member.__module__.rsplit('.', 1)[-1]}.{member.__name__}"


def sections(member: Any) -> dict[str, list[str]]:
    """Split a docstring at its underlined headings; what stands before them is the summary."""
    lines = (inspect.getdoc(member) or "").splitlines()
    parts: dict[str, list[str]] = {"summary": []}
    heading = "summary"
    for line, following in zip(lines, [*lines[1:], ""], strict=True):
        if re.fullmatch(r"-{3,}", following) and line:
            heading = line
            parts[heading] = []
        elif not re.fullmatch(r"-{3,}", line):
            parts[heading].append(line)
    return parts


def entries(lines: list[str]) -> dict[str, tuple[str, str]]:
    """Return name -> (type, description) of a numpy section."""
    found: dict[str, tuple[str, str]] = {}
    current: list[str] = []
    for line in lines:
        if match := ENTRY.match(line):
            current = match[1].split(", ")
            found.update((name, (match[2], "")) for name in current)
        elif line.startswith(" "):
            found.update((name, (found[name][0], f"{found[name][1]} {line.strip()}")) for name in current)
    return found


def has_unit(kind: str, text: str) -> bool:
    """Whether a unit stands in brackets, or the type is one of ours, whose fields have theirs."""
    return bool(UNIT.search(text)) or any(re.search(rf"\b{one.__name__}\b", kind) for one in own(inspect.isclass))


@pytest.mark.parametrize("function", own(inspect.isfunction), ids=name_of)
def test_every_parameter_is_documented_with_its_unit(function: Any) -> None:
    """A metre taken for a millimetre is the likeliest of all errors here."""
    documented = entries(sections(function).get("Parameters", []))
    assert list(documented) == list(inspect.signature(function).parameters)
    without = [name for name, (kind, text) in documented.items() if not has_unit(kind, text)]
    assert not without, "no unit in brackets"
    without = [name for name, (kind, _) in documented.items() if not kind.strip()]
    assert not without, "no type or shape"


@pytest.mark.parametrize("function", own(inspect.isfunction), ids=name_of)
def test_every_result_has_its_unit(function: Any) -> None:
    """What comes back is as much of a contract as what goes in."""
    returned = entries(sections(function).get("Returns", []))
    assert returned
    assert all(has_unit(kind, text) for kind, text in returned.values())


@pytest.mark.parametrize("function", own(inspect.isfunction), ids=name_of)
def test_every_formula_names_its_source(function: Any) -> None:
    """A figure without a source cannot be checked; an own derivation says so."""
    parts = sections(function)
    source = parts.get("References", parts.get("Source", []))
    assert any(line.strip() for line in source)


@pytest.mark.parametrize("function", own(inspect.isfunction), ids=name_of)
def test_every_function_says_where_it_holds(function: Any) -> None:
    """A formula used outside its range gives a number all the same; its notes must say how far it can be trusted."""
    parts = sections(function)
    assert any(line.strip() for line in parts.get("Notes", [])), "no notes"
    text = " ".join(" ".join(parts.get(name, [])) for name in ("Parameters", "Returns", "Notes"))
    assert RANGE.search(text), "no word of range or accuracy"


@pytest.mark.parametrize("function", own(inspect.isfunction), ids=name_of)
def test_every_error_raised_is_documented(function: Any) -> None:
    """`raise` in the body and a Raises section go together."""
    raises = bool(re.search(r"^\s+raise \w", inspect.getsource(function), re.MULTILINE))
    assert not raises or "Raises" in sections(function)


@pytest.mark.parametrize("kind", own(inspect.isclass), ids=name_of)
def test_every_field_of_a_result_has_its_unit(kind: Any) -> None:
    """Named results are read far from the formula."""
    documented = entries(sections(kind).get("Parameters", []))
    assert list(documented) == list(inspect.signature(kind).parameters)
    assert all(UNIT.search(text) for _, text in documented.values())


def test_there_is_something_to_read() -> None:
    """A renamed folder must not leave this module without cases."""
    assert len(own(inspect.isfunction)) > 40
