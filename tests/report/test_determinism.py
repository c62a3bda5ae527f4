"""The same results give the same bytes, wherever and however they are drawn."""

import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from loadsum.report.document import compose

SCRIPT = """
import hashlib, json, sys
from pathlib import Path
from loadsum.report.document import render
from loadsum.report.archive import Attachment
results = json.loads(Path(sys.argv[1]).read_text(encoding="utf-8"))
attachments = [Attachment(name="results.json", content=Path(sys.argv[1]).read_bytes(), description="Results")]
print(hashlib.sha256(render(results, attachments=attachments)).hexdigest())
"""


def _digest(results: Path, folder: Path, **environment: str) -> str:
    """Digest of the report drawn by a process of its own."""
    folder.mkdir(exist_ok=True)
    done = subprocess.run(
        [sys.executable, "-c", SCRIPT, str(results)],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(Path(__file__).parents[2]), **environment},
        check=True,
        capture_output=True,
        text=True,
    )
    return done.stdout.strip()


@pytest.fixture(scope="module")
def on_disk(tmp_path_factory: pytest.TempPathFactory, results: dict[str, Any]) -> Path:
    path = tmp_path_factory.mktemp("results") / "results.json"
    path.write_text(json.dumps(results), encoding="utf-8")
    return path


def test_a_report_is_the_same_to_the_byte_in_other_folders_zones_locales_and_with_other_fonts_about(
    on_disk: Path, tmp_path: Path
) -> None:
    plain = _digest(on_disk, tmp_path / "a", TZ="UTC", LC_ALL="C", PYTHONHASHSEED="1")
    other = _digest(
        on_disk,
        tmp_path / "b",
        TZ="Pacific/Auckland",
        LC_ALL="C.UTF-8",
        PYTHONHASHSEED="2",
        HOME=str(tmp_path),
        FONTCONFIG_FILE="/nonexistent/fonts.conf",
        SOURCE_DATE_EPOCH="1700000000",
        MPLBACKEND="pdf",
    )
    assert plain == other


def test_figures_are_the_same_to_the_byte_when_drawn_again(results: dict[str, Any]) -> None:
    first, second = compose(results).figure_files(), compose(results).figure_files()
    assert {n: hashlib.sha256(c).hexdigest() for n, c in first.items()} == {
        n: hashlib.sha256(c).hexdigest() for n, c in second.items()
    }
    assert {name.rpartition(".")[2] for name in first} == {"svg", "png"}
    assert all(b"<dc:date>" not in content for name, content in first.items() if name.endswith(".svg"))
