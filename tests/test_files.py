"""Tests of the outputs: whole or not at all, nothing replaced unasked, refused before the work is done."""

from __future__ import annotations

import errno
import os
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from partpick.errors import OutputError
from partpick.report import files
from partpick.report.files import Output, check_outputs, write_outputs

ROOT = Path(__file__).resolve().parent.parent


def _refused(path: object, force: bool = False, inputs: tuple[str, ...] = ()) -> str:
    with pytest.raises(OutputError) as caught:
        check_outputs([str(path)], force, inputs)
    assert "\n" not in str(caught.value)
    return str(caught.value)


# ---------------------------------------------------------------- before the search


def test_a_missing_folder_is_refused_before_the_work(tmp_path: Path) -> None:
    """Nobody wants to wait for a proof and then lose it to a misspelt folder."""
    assert "is not there" in _refused(tmp_path / "missing" / "out.json")


def test_a_file_that_is_there_already_is_refused_without_force(tmp_path: Path) -> None:
    """A result that someone built from must not vanish by a second run."""
    (tmp_path / "out.json").write_text("old")
    assert "--force" in _refused(tmp_path / "out.json")
    check_outputs([str(tmp_path / "out.json")], force=True)


def test_a_folder_is_no_file_even_with_force(tmp_path: Path) -> None:
    """A folder can be neither replaced nor written as a file."""
    assert "folder" in _refused(tmp_path, force=True)
    assert "folder" in _refused(f"{tmp_path}/new/", force=True)


def test_a_file_in_place_of_the_folder_is_refused(tmp_path: Path) -> None:
    """A path through a plain file leads nowhere."""
    (tmp_path / "plain").write_text("")
    assert "not a folder" in _refused(tmp_path / "plain" / "out.json")


@pytest.mark.parametrize("path", ["", "a\0b"])
def test_a_name_that_is_none_is_refused(path: str) -> None:
    """An empty variable in a script, or a zero byte, names no file."""
    assert "name of a file" in _refused(path)


def test_two_outputs_on_stdout_are_refused() -> None:
    """JSON and CSV in one stream can be read by nobody."""
    with pytest.raises(OutputError, match="two outputs on standard output"):
        check_outputs(["-", "-"], force=False)


def test_two_outputs_in_one_file_are_refused_under_any_spelling(tmp_path: Path) -> None:
    """The second would replace the first."""
    (tmp_path / "sub").mkdir()
    same = [str(tmp_path / "out"), str(tmp_path / "sub" / ".." / "out")]
    with pytest.raises(OutputError, match="two outputs"):
        check_outputs(same, force=True)


def test_an_input_is_never_replaced_by_an_output(tmp_path: Path) -> None:
    """`--force` is meant for old results, not for the plan that is being read."""
    plan = tmp_path / "plan.toml"
    plan.write_text("")
    assert "also read" in _refused(plan, force=True, inputs=(str(plan),))


def test_devices_and_links_are_not_replaced(tmp_path: Path) -> None:
    """Replacing /dev/null by a file, or a link by what it pointed to, surprises everybody."""
    (tmp_path / "real").write_text("kept")
    (tmp_path / "link").symlink_to(tmp_path / "real")
    assert "link or device" in _refused(tmp_path / "link", force=True)
    assert "link or device" in _refused("/dev/null", force=True)


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write everywhere")
def test_a_folder_closed_for_writing_is_refused(tmp_path: Path) -> None:
    """Told before the search, as a missing folder is."""
    tmp_path.chmod(0o500)
    try:
        assert "permission" in _refused(tmp_path / "out")
    finally:
        tmp_path.chmod(0o700)


# ---------------------------------------------------------------- after the search


def test_outputs_are_written_whole_and_nothing_else_is_left(tmp_path: Path) -> None:
    """No passing file stays in the user's folder."""
    write_outputs([Output(str(tmp_path / "a"), b"one"), Output(str(tmp_path / "b"), b"two\r\n")], force=False)
    assert {path.name: path.read_bytes() for path in tmp_path.iterdir()} == {"a": b"one", "b": b"two\r\n"}


def test_files_get_the_permissions_that_the_user_wishes_for_new_files(tmp_path: Path) -> None:
    """A passing file for the owner's eyes only must not make the result unreadable for others."""
    before = os.umask(0o022)
    try:
        write_outputs([Output(str(tmp_path / "a"), b"")], force=False)
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "a").stat().st_mode) == 0o644


def test_force_replaces_the_old_file(tmp_path: Path) -> None:
    """The whole new content, and no copy of the old one left over."""
    (tmp_path / "a").write_text("a much longer old content")
    write_outputs([Output(str(tmp_path / "a"), b"new")], force=True)
    assert [path.read_bytes() for path in tmp_path.iterdir()] == [b"new"]


def test_a_file_that_came_during_the_search_is_not_replaced(tmp_path: Path) -> None:
    """The check before the search cannot see it; the writing must."""
    check_outputs([str(tmp_path / "a")], force=False)
    (tmp_path / "a").write_text("came in between")
    with pytest.raises(OutputError, match="there already"):
        write_outputs([Output(str(tmp_path / "a"), b"new")], force=False)
    assert [path.read_text() for path in tmp_path.iterdir()] == ["came in between"]


@pytest.mark.parametrize("force", [False, True])
def test_one_failing_output_leaves_all_as_it_was(tmp_path: Path, force: bool) -> None:
    """A BOM beside an old JSON would describe another set than it."""
    if force:
        (tmp_path / "a").write_text("old")
    (tmp_path / "b").mkdir()  # in the way of the second
    with pytest.raises(OutputError):
        write_outputs([Output(str(tmp_path / "a"), b"new"), Output(str(tmp_path / "b"), b"")], force=force)
    assert {path.name for path in tmp_path.iterdir()} == ({"a", "b"} if force else {"b"})
    if force:
        assert (tmp_path / "a").read_text() == "old"


def test_a_full_disk_leaves_no_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """ENOSPC may come as late as at fsync; half a file must not keep the name."""

    def full(descriptor: int) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(files.os, "fsync", full)
    with pytest.raises(OutputError, match="no space left"):
        write_outputs([Output(str(tmp_path / "a"), b"content")], force=False)
    assert list(tmp_path.iterdir()) == []


def test_a_file_system_without_links_is_written_too(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A memory stick knows no hard links."""

    def no_links(*names: str) -> None:
        raise PermissionError(errno.EPERM, os.strerror(errno.EPERM))

    monkeypatch.setattr(files.os, "link", no_links)
    (tmp_path / "old").write_text("old")
    write_outputs([Output(str(tmp_path / "new"), b"1"), Output(str(tmp_path / "old"), b"2")], force=True)
    assert {path.name: path.read_bytes() for path in tmp_path.iterdir()} == {"new": b"1", "old": b"2"}


def test_an_interrupt_while_writing_leaves_nothing_half_done(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Ctrl-C at the worst moment: either the old state or the new one."""
    real = files._put_in_place

    def interrupted(file: files._Staged, force: bool) -> None:
        if file.target.endswith("b"):
            raise KeyboardInterrupt
        real(file, force)

    monkeypatch.setattr(files, "_put_in_place", interrupted)
    with pytest.raises(KeyboardInterrupt):
        write_outputs([Output(str(tmp_path / "a"), b"1"), Output(str(tmp_path / "b"), b"2")], force=False)
    assert list(tmp_path.iterdir()) == []


# ---------------------------------------------------------------- standard output, in a process of its own


def _child(code: str, **how: object) -> subprocess.CompletedProcess[bytes]:
    program = f"import sys; sys.path.insert(0, {str(ROOT)!r}); from partpick.report.files import *\n{code}"
    return subprocess.run(  # type: ignore[call-overload, no-any-return]
        [sys.executable, "-c", program], stderr=subprocess.PIPE, timeout=60, check=False, **how
    )


def test_bytes_reach_standard_output_unchanged() -> None:
    """CSV has CRLF, JSON has UTF-8: neither may be translated."""
    done = _child("write_outputs([Output('-', 'a\\r\\n\\u00b5'.encode())], False)", stdout=subprocess.PIPE)
    assert done.stdout == "a\r\n\u00b5".encode()


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="this system has no /dev/full")
def test_a_full_standard_output_keeps_the_files_back(tmp_path: Path) -> None:
    """Nothing is written where one output fails, whichever it is."""
    code = (
        f"try: write_outputs([Output({str(tmp_path / 'a')!r}, b'1'), Output('-', b'2')], False)\n"
        "except OutputError as error: print(error, file=sys.stderr); sys.exit(2)"
    )
    with open("/dev/full", "wb") as full:
        done = _child(code, stdout=full)
    assert done.returncode == 2
    assert done.stderr == b"cannot write to standard output: no space left there\n"
    assert list(tmp_path.iterdir()) == []


def test_a_reader_that_has_gone_away_is_no_failure(tmp_path: Path) -> None:
    """`partpick ... | head -1` ends quietly, and the files are there."""
    reader, writer = os.pipe()
    os.close(reader)
    code = f"write_outputs([Output({str(tmp_path / 'a')!r}, b'1'), Output('-', b'2' * 10**6)], False)"
    try:
        done = _child(code, stdout=writer)
    finally:
        os.close(writer)
    assert (done.returncode, done.stderr) == (0, b"")
    assert (tmp_path / "a").read_bytes() == b"1"
