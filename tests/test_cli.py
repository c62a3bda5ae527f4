"""The command, through its entry function."""

from pathlib import Path

import pytest

from loadsum.cli import main


def test_help_teaches_the_exit_status_and_a_first_study(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stop:
        main(["--help"])
    assert stop.value.code == 0
    text = capsys.readouterr().out
    assert "exit status" in text
    assert "loadsum study study.toml --out out/" in text


def test_an_unknown_command_is_the_users_fault(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stop:
        main(["calculate"])
    assert stop.value.code == 2


def test_a_missing_study_file_is_named_without_a_traceback(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["study", str(tmp_path / "none.toml"), "--out", str(tmp_path / "out")]) == 2
    said = capsys.readouterr()
    assert "none.toml" in said.err
    assert "Traceback" not in said.err
    assert not (tmp_path / "out").exists()
