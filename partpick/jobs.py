"""Which plans a command solves, and where the outputs of each go."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from partpick.errors import RequestError
from partpick.report.files import STDOUT, Output, check_outputs, write_outputs

_ENDINGS = {
    "json": ".json", "bom": ".csv", "sheet": ".html", "netlist": ".cir", "dial": ".csv", "tracking": ".csv"
}  # fmt: skip


class Outputs:
    """Where the outputs of one job go."""

    def __init__(
        self, paths: Mapping[str, str | None], force: bool, inputs: Sequence[str] = (), headline: str = ""
    ) -> None:
        """Keep where outputs go.

        Parameters
        ----------
        paths : mapping
            Name of the output ("json", "bom", "sheet" ...) to its file, "-" for stdout; None where it is not wanted.
        force : bool
            Whether files that are there already are replaced.
        inputs : sequence of str
            Files that the command reads; an output never replaces one.
        headline : str
            Stands above the table, to tell several plans apart.
        """
        self.paths = {name: path for name, path in paths.items() if path is not None}
        self._force = force
        self._inputs = inputs
        self._headline = headline

    @property
    def shows_table(self) -> bool:
        """Whether stdout is free for the table."""
        return STDOUT not in self.paths.values()

    def check(self) -> None:
        """Refuse what could not be written, before anything is solved."""
        check_outputs(self.paths.values(), self._force, self._inputs)

    def write(self, table: Callable[[], str], **renderers: Callable[[], str]) -> None:
        """Write what was asked for, all of it or nothing; the table too if stdout is free."""
        outputs = [Output(path, renderers[name]().encode()) for name, path in self.paths.items()]
        if self.shows_table:
            outputs.append(on_stdout(self._headline + table()))
        write_outputs(outputs, self._force)


def on_stdout(text: str) -> Output:
    """Return text for stdout in its own encoding, with "?" for what that cannot write."""
    encoding = getattr(sys.stdout, "encoding", None) or "utf-8"
    return Output(STDOUT, text.encode(encoding, errors="replace"))


def plan_files(plans: Sequence[str]) -> list[str]:
    """Return the plans, those of a folder in order of their names."""
    every: list[str] = []
    for plan in plans:
        if not os.path.isdir(plan):
            every.append(plan)
            continue
        found = sorted(name for name in _names_in(plan) if name.endswith(".toml"))
        if not found:
            raise RequestError(f"{plan}: no plan (*.toml) in this folder")
        every += [os.path.join(plan, name) for name in found]
    if every.count("-") > 1:
        raise RequestError("stdin (-) can be read once only")
    return every


def paths_of(given: Mapping[str, Any]) -> dict[str, str | None]:
    """Return where each output of a ranking command goes, from its options."""
    return {name: given.get(f"{name}_path") for name in _ENDINGS}


def outputs_of_plans(plans: Sequence[str], drawer: str | None, given: Mapping[str, Any]) -> list[Outputs]:
    """Return where each plan's outputs go: of several plans, one file each in the folder that is named.

    Raises
    ------
    RequestError
        Several plans, and no folder is named; or two of them would write one file.
    """
    paths = paths_of(given)
    if len(plans) == 1:
        return [Outputs(paths, given["force"], files_read(drawer, plans[0]))]
    for name, folder in paths.items():
        if folder is not None and not os.path.isdir(folder):
            raise RequestError(f"--{name} {folder}: with several plans, a folder that is there is wanted")
    outputs = []
    taken: dict[str | None, str] = {}
    for plan in plans:
        stem = "stdin" if plan == "-" else os.path.splitext(os.path.basename(plan))[0]
        if stem in taken and any(folder is not None for folder in paths.values()):
            raise RequestError(f"{taken[stem]} and {plan} would both write a file named {stem}")
        taken[stem] = plan
        files = {name: _in_folder(paths[name], stem + ending) for name, ending in _ENDINGS.items()}
        outputs.append(Outputs(files, given["force"], files_read(drawer, plan), f"== {plan}\n\n"))
    return outputs


def _in_folder(folder: str | None, name: str) -> str | None:
    return None if folder is None else os.path.join(folder, name)


def files_read(drawer: str | None, plan: str = "-") -> list[str]:
    """Return the files that a command reads: those of the drawer, and a plan."""
    own = [] if drawer is None else [os.path.join(drawer, name) for name in _names_in(drawer)]
    return own if plan == "-" else [*own, plan]


def _names_in(folder: str) -> list[str]:
    try:
        return os.listdir(folder)
    except OSError:  # whoever reads the folder says what is wrong with it
        return []
