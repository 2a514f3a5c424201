"""Writes the outputs of one command: every one of them whole, or none.

`check_outputs` says before the search what would fail after it. `write_outputs` first writes each file
under a passing name in its own folder, then standard output, and only then gives the files their names.
"""

from __future__ import annotations

import contextlib
import errno
import os
import secrets
import stat
import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import BinaryIO

from partpick.errors import OutputError

STDOUT = "-"


@dataclass(frozen=True)
class Output:
    """One output: where it goes ("-" is standard output), and its bytes."""

    path: str
    content: bytes


@dataclass
class _Staged:
    """A file on its way: written under a passing name, perhaps with the one it replaces kept aside."""

    target: str
    passing: str
    kept: str | None = None
    in_place: bool = False


# ---------------------------------------------------------------- before the search


def check_outputs(paths: Iterable[str], force: bool, inputs: Iterable[str] = ()) -> None:
    """Refuse outputs that could not be written, before any work is done.

    Parameters
    ----------
    paths : iterable of str
        Where the outputs go; "-" is standard output, which takes one.
    force : bool
        Whether a file that is there already may be replaced.
    inputs : iterable of str
        Files that are read; none of them may be replaced, not even with `force`.

    Raises
    ------
    OutputError
        Folder missing or closed, a folder in place of the file, a file there already, an input, a
        link or device, two outputs in one place.
    """
    taken: set[str] = set()
    inputs = tuple(inputs)
    for path in paths:
        place = path if path == STDOUT else _place(path)
        if place in taken:
            where = "standard output (-)" if path == STDOUT else path
            raise OutputError(f"two outputs on {where}; one of them has to go elsewhere")
        taken.add(place)
        if path != STDOUT:
            _check_file(path, force)
            _check_no_input(path, inputs)


def _place(path: str) -> str:
    folder, name = os.path.split(os.path.abspath(path))
    return os.path.join(os.path.realpath(folder), name)


def _check_file(path: str, force: bool) -> None:
    if not path or "\0" in path:
        raise OutputError("an output needs the name of a file, or - for standard output")
    folder = os.path.dirname(path) or "."
    if not os.path.exists(folder):
        raise OutputError(f"cannot write {path}: the folder {folder} is not there")
    if not os.path.isdir(folder):
        raise OutputError(f"cannot write {path}: {folder} is not a folder")
    if os.path.isdir(path) or path.endswith(os.sep):
        raise OutputError(f"cannot write {path}: it is a folder; name a file in it")
    if os.path.lexists(path):
        _check_replaceable(path, force)
    if not os.access(folder, os.W_OK | os.X_OK):
        raise OutputError(f"cannot write {path}: no permission to write in the folder {folder}")


def _check_replaceable(path: str, force: bool) -> None:
    """A device or a link stays what it is: replacing /dev/null by a file would be a fine mess."""
    if not stat.S_ISREG(os.lstat(path).st_mode):
        raise OutputError(f"cannot write {path}: it is a link or device, not a plain file")
    if not force:
        raise OutputError(f"{path} is there already; --force replaces it")


def _check_no_input(path: str, inputs: Iterable[str]) -> None:
    for other in inputs:
        with contextlib.suppress(OSError):
            if os.path.samefile(path, other):
                raise OutputError(f"cannot write {path}: it is also read by this command")


# ---------------------------------------------------------------- after the search


def write_outputs(outputs: Sequence[Output], force: bool) -> None:
    """Write every output, or none and raise.

    A reader of standard output that has gone away is no failure: it has seen what it wanted.

    Raises
    ------
    OutputError
        An output cannot be written; the files are then as they were before.
    """
    staged: list[_Staged] = []
    try:
        for output in outputs:
            if output.path != STDOUT:
                _stage(output, staged)
        for output in outputs:
            if output.path == STDOUT:
                write_stdout(output.content)
        for file in staged:
            _put_in_place(file, force)
    except BaseException:
        for file in reversed(staged):
            _undo(file)
        raise
    finally:
        for file in staged:
            _clear(file)


def write_stdout(content: bytes) -> None:
    """Write bytes to standard output and see them through to the other end."""
    if sys.stdout is None:
        raise OutputError("cannot write to standard output: it is closed")
    stream: BinaryIO | None = getattr(sys.stdout, "buffer", None)
    try:
        sys.stdout.flush()
        if stream is None:
            sys.stdout.write(content.decode())
        else:
            stream.write(content)
        sys.stdout.flush()
    except BrokenPipeError:
        _discard_stdout()
    except (OSError, ValueError) as error:
        _discard_stdout()
        raise OutputError(f"cannot write to standard output: {_reason(error)}") from None


def _discard_stdout() -> None:
    """Send what is still buffered nowhere, or the interpreter complains about it when it ends."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
        os.close(nowhere)


def _stage(output: Output, staged: list[_Staged]) -> None:
    folder = os.path.dirname(output.path) or "."
    try:
        descriptor, passing = _new_file(folder)
    except OSError as error:
        raise OutputError(f"cannot write {output.path}: {_reason(error)}") from None
    staged.append(_Staged(output.path, passing))
    try:
        with os.fdopen(descriptor, "wb") as stream:
            stream.write(output.content)
            stream.flush()
            os.fsync(stream.fileno())
    except OSError as error:
        raise OutputError(f"cannot write {output.path}: {_reason(error)}") from None


def _new_file(folder: str) -> tuple[int, str]:
    """Return a new file of a passing name; not `tempfile`, whose files are for the owner's eyes only."""
    flags = os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0)
    passing = _passing_name(folder)
    return os.open(passing, flags, 0o666), passing


def _passing_name(folder: str) -> str:
    return os.path.join(folder, f".partpick-{secrets.token_hex(6)}.tmp")


def _put_in_place(file: _Staged, force: bool) -> None:
    try:
        if os.path.lexists(file.target):
            _check_replaceable(file.target, force)
            file.kept = _keep(file.target)
            os.replace(file.passing, file.target)
        else:
            _name_new(file.passing, file.target)
        file.in_place = True
    except OSError as error:
        raise OutputError(f"cannot write {file.target}: {_reason(error)}") from None


def _keep(target: str) -> str:
    """Keep the file that is to be replaced under a second name, to bring it back if a later one fails."""
    kept = _passing_name(os.path.dirname(target) or ".")
    try:
        os.link(target, kept)
    except OSError:  # a file system without links
        import shutil

        try:
            shutil.copy2(target, kept)
        except OSError:
            with contextlib.suppress(OSError):
                os.unlink(kept)
            raise
    return kept


def _name_new(passing: str, target: str) -> None:
    """Give the file its name without replacing one that came in between, where the file system can."""
    try:
        os.link(passing, target)
    except FileExistsError:
        raise OutputError(f"{target} is there already; --force replaces it") from None
    except OSError:
        os.rename(passing, target)


def _undo(file: _Staged) -> None:
    with contextlib.suppress(OSError):
        if file.kept is not None and file.in_place:
            os.replace(file.kept, file.target)
        elif file.in_place:
            os.unlink(file.target)


def _clear(file: _Staged) -> None:
    for leftover in (file.passing, file.kept):
        if leftover is not None:
            with contextlib.suppress(OSError):
                os.unlink(leftover)


def _reason(error: BaseException) -> str:
    """Return an error of the system in plain words."""
    if isinstance(error, OSError) and error.errno == errno.ENOSPC:
        return "no space left there"
    text = error.strerror if isinstance(error, OSError) else None
    return (text or str(error) or type(error).__name__).lower()
