import io
from pathlib import Path

import pytest

from loadsum.errors import MachineError
from loadsum.progress import TerminalLine
from loadsum.report.outputs import write_outputs


def test_all_files_appear_and_nothing_else(tmp_path: Path) -> None:
    write_outputs(tmp_path / "out", {"a.txt": b"1", "figures/b.svg": b"2"})
    assert sorted(str(p.relative_to(tmp_path)) for p in tmp_path.rglob("*") if p.is_file()) == [
        "out/a.txt",
        "out/figures/b.svg",
    ]


def test_a_failed_write_leaves_earlier_results_as_they_were(tmp_path: Path) -> None:
    write_outputs(tmp_path, {"a.txt": b"old"})
    (tmp_path / "b").write_bytes(b"in the way")
    with pytest.raises(MachineError, match="cannot write"):
        write_outputs(tmp_path, {"b/c.txt": b"new", "a.txt": b"new"})
    assert (tmp_path / "a.txt").read_bytes() == b"old"
    assert not list(tmp_path.glob(".unfinished*"))


class _Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_progress_is_silent_where_output_is_no_terminal() -> None:
    stream = io.StringIO()
    TerminalLine(stream)("reading", 0.5)
    assert stream.getvalue() == ""


def test_progress_wipes_its_line_on_a_terminal() -> None:
    stream = _Terminal()
    line = TerminalLine(stream)
    line("reading", 0.5)
    line.clear()
    assert stream.getvalue().endswith("\r" + " " * len("reading  50%") + "\r")
