"""The wheel and the editable install both work from another folder."""

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    command = [
        sys.executable,
        "-m",
        "pip",
        "wheel",
        "--quiet",
        "--disable-pip-version-check",
        "--no-deps",
        "-w",
        folder,
        ROOT,
    ]
    subprocess.run([str(part) for part in command], check=True, capture_output=True)
    (built,) = folder.glob("loadsum-*.whl")
    return built


def test_the_wheel_carries_templates_demo_and_licence_and_one_package(wheel: Path) -> None:
    names = zipfile.ZipFile(wheel).namelist()
    assert {name.split("/")[0] for name in names if "dist-info" not in name} == {"loadsum"}
    assert any(name.startswith("loadsum/_data/report_templates/") for name in names)
    assert any(name.startswith("loadsum/_data/demo_feeders/pole_transformer/") for name in names)
    assert any(name.endswith("LICENSE.txt") for name in names)


def _templates_found(folder: Path, path: str) -> str:
    code = "import loadsum.report.document as d; print(d.__file__); print(d.templates_folder())"
    done = subprocess.run(
        [sys.executable, "-c", code],
        cwd=folder,
        env={"PYTHONPATH": path, "PATH": ""},
        check=True,
        capture_output=True,
        text=True,
    )
    module, templates = done.stdout.splitlines()
    assert module.startswith(path)
    assert list(Path(templates).glob("*.html*"))
    return templates


def test_the_wheel_finds_its_templates_from_another_folder(wheel: Path, tmp_path: Path) -> None:
    site = tmp_path / "site"
    zipfile.ZipFile(wheel).extractall(site)
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    assert _templates_found(elsewhere, str(site)).startswith(str(site))


def test_an_editable_install_finds_its_templates_from_another_folder(tmp_path: Path) -> None:
    assert _templates_found(tmp_path, str(ROOT)) == str(ROOT / "report_templates")
