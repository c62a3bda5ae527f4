import copy
import hashlib
import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import pytest

from loadsum import __version__
from loadsum.errors import InputError
from loadsum.report.archive import Attachment
from loadsum.report.audit import audit
from loadsum.report.differences import differences
from loadsum.report.document import render
from loadsum.report.received import read_report, read_results
from loadsum.report.signature import sign
from tests.report.certificates import PASSPHRASE, pkcs12_of
from tests.report.invented_results import without_figures

INPUT = b"customer,time,kWh\nC-01,2030-01-01T00:00,0.5\n"


def made(results: dict[str, Any]) -> bytes:
    """A report with its results and study file attached."""
    return render(
        results,
        attachments=[
            Attachment(name="study.toml", content=b"[study]\n", description="Study file", relationship="Source"),
            Attachment(name="results.json", content=json.dumps(results).encode(), description="Results"),
        ],
    )


@pytest.fixture(scope="module")
def study(results: dict[str, Any]) -> dict[str, Any]:
    changed = without_figures(copy.deepcopy(results))
    changed["program"]["version"] = __version__
    changed["inputs"] = [{"name": "meters.csv", "sha256": hashlib.sha256(INPUT).hexdigest(), "bytes": len(INPUT)}]
    return changed


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("inputs")
    (folder / "meters.csv").write_bytes(INPUT)
    return folder


@pytest.fixture(scope="module")
def plain(study: dict[str, Any]) -> bytes:
    return made(study)


@pytest.fixture
def on_disk(tmp_path: Path, plain: bytes) -> Path:
    path = tmp_path / "report.pdf"
    path.write_bytes(plain)
    return path


def test_an_untouched_report_agrees(on_disk: Path, folder: Path, study: dict[str, Any]) -> None:
    seen: list[str] = []

    def recompute(path: Path, inputs: Path) -> dict[str, Any]:
        seen.append(path.read_text(encoding="utf-8"))
        assert inputs == folder
        return copy.deepcopy(study)

    found = audit(on_disk, inputs=folder, recompute=recompute)
    assert found.differs == []
    assert found.exit_status == 0
    assert seen == ["[study]\n"]
    assert any("the same to the byte" in line for line in found.checked)
    assert any("numbers: all computed again" in line for line in found.checked)


def test_a_number_that_comes_out_otherwise_is_named_with_both_values(
    on_disk: Path, folder: Path, study: dict[str, Any]
) -> None:
    def recompute(path: Path, inputs: Path) -> dict[str, Any]:
        other = copy.deepcopy(study)
        other["transformers"][0]["exceedance"][1]["hours_per_year"] = 99.25
        return other

    found = audit(on_disk, inputs=folder, recompute=recompute)
    assert found.exit_status == 3
    (line,) = found.differs
    assert line.startswith("transformers[0].exceedance[1].hours_per_year: 21.69")
    assert line.endswith("in the report, 99.25 recomputed")


def test_an_edited_number_in_the_results_and_pages_is_caught_by_computing_again(
    tmp_path: Path, folder: Path, study: dict[str, Any]
) -> None:
    edited = copy.deepcopy(study)
    edited["transformers"][0]["exceedance"][1]["hours_per_year"] = 1.0
    path = tmp_path / "edited.pdf"
    path.write_bytes(made(edited))
    found = audit(path, inputs=folder, recompute=lambda p, i: copy.deepcopy(study))
    assert [line.split(":")[0] for line in found.differs] == ["transformers[0].exceedance[1].hours_per_year"]


def test_a_report_of_another_version_says_made_by_rather_than_differs(
    tmp_path: Path, folder: Path, study: dict[str, Any]
) -> None:
    older = copy.deepcopy(study)
    older["program"]["version"] = "0.0.9"
    path = tmp_path / "older.pdf"
    path.write_bytes(made(older))

    def recompute(path: Path, inputs: Path) -> dict[str, Any]:
        other = copy.deepcopy(study)
        other["seed"] = 2
        return other

    found = audit(path, inputs=folder, recompute=recompute)
    assert found.exit_status == 0
    assert any(f"numbers: made by 0.0.9; 1 are otherwise with {__version__}" in line for line in found.checked)


def test_a_changed_input_file_is_caught(on_disk: Path, tmp_path: Path) -> None:
    (tmp_path / "meters.csv").write_bytes(INPUT.replace(b"0.5", b"0.6"))
    found = audit(on_disk, inputs=tmp_path)
    assert found.differs == ["input meters.csv: is not the file that the study was made from"]


def test_an_input_outside_the_folder_is_not_read(tmp_path: Path, study: dict[str, Any]) -> None:
    secret = tmp_path / "secret.csv"
    secret.write_bytes(INPUT)
    folder = tmp_path / "inputs"
    folder.mkdir()
    (folder / "link.csv").symlink_to(secret)
    hostile = copy.deepcopy(study)
    digest = hashlib.sha256(INPUT).hexdigest()
    hostile["program"]["version"] = "0.0.9"
    hostile["inputs"] = [{"name": name, "sha256": digest} for name in ("../secret.csv", str(secret), "link.csv")]
    path = tmp_path / "hostile.pdf"
    path.write_bytes(made(hostile))
    found = audit(path, inputs=folder)
    assert [line for line in found.differs if ": not in" in line] == found.differs
    assert len(found.differs) == 3


def test_a_swapped_attachment_is_caught(plain: bytes, study: dict[str, Any], tmp_path: Path) -> None:
    import io

    import pikepdf

    with pikepdf.open(io.BytesIO(plain)) as pdf:
        spec = pdf.attachments["study.toml"]
        pdf.attachments["study.toml"] = pikepdf.AttachedFileSpec(
            pdf, b"[study]\ntitle='x'\n", filename="study.toml", relationship=pikepdf.Name.Source
        )
        assert spec is not None
        path = tmp_path / "swapped.pdf"
        pdf.save(path)
    found = audit(path)
    assert "attachment study.toml is not the one that the report was made with" in found.differs
    assert "the pages are not those that the attached results give" in found.differs


def test_an_edited_page_is_caught(plain: bytes, tmp_path: Path) -> None:
    import io

    import pikepdf

    with pikepdf.open(io.BytesIO(plain)) as pdf:
        page = pdf.pages[0]
        text = page.Contents.read_bytes()
        page.Contents = pdf.make_stream(text.replace(b" 10 Tf", b" 11 Tf", 1) + b"\n")
        path = tmp_path / "edited.pdf"
        pdf.save(path)
    assert "the pages are not those that the attached results give" in audit(path).differs


def test_cutting_off_the_last_signature_leaves_a_name_missing(study: dict[str, Any], tmp_path: Path) -> None:
    issued = copy.deepcopy(study)
    issued["study"]["status"] = "issued"
    issued["people"] = issued["people"][1:]
    issued["program"]["version"] = "0.0.9"  # so that the pages, which are not in question here, are not drawn again
    once = sign(made(issued), role="checked", certificate=pkcs12_of("B. Checker"), passphrase=PASSPHRASE)
    twice = sign(once, role="responsible engineer", certificate=pkcs12_of("C. Engineer"), passphrase=PASSPHRASE)
    path = tmp_path / "signed.pdf"
    path.write_bytes(twice)
    whole = audit(path)
    assert whole.differs == []
    assert sum("stands" in line for line in whole.checked) == 2
    path.write_bytes(twice[: len(once)])
    assert audit(path).differs == ["signatures missing: responsible engineer C. Engineer"]


def test_a_damaged_report_differs_and_another_file_is_refused(plain: bytes, tmp_path: Path) -> None:
    path = tmp_path / "report.pdf"
    path.write_bytes(plain[: len(plain) // 2])
    assert audit(path).exit_status == 3
    path.write_bytes(b"not a PDF")
    with pytest.raises(InputError, match="not a PDF"):
        audit(path)


def test_a_stream_that_unpacks_without_end_is_refused_before_it_is_unpacked(plain: bytes) -> None:
    import zlib

    machine = zlib.compressobj(9)
    bomb = b"".join([machine.compress(bytes(2**20)) for _ in range(200)] + [machine.flush()])
    with pytest.raises(InputError, match="unpacks to more"):
        read_report(plain + b"\nstream\n" + bomb + b"\nendstream\n")


def test_active_content_is_named_even_inside_an_object_stream(plain: bytes) -> None:
    import io

    import pikepdf

    with pikepdf.open(io.BytesIO(plain)) as pdf:
        pdf.Root.OpenAction = pikepdf.Dictionary(S=pikepdf.Name.JavaScript, JS=pikepdf.String("app.alert(1)"))
        target = io.BytesIO()
        pdf.save(target, object_stream_mode=pikepdf.ObjectStreamMode.generate)
    assert set(read_report(target.getvalue()).active) == {"/JavaScript", "/JS", "/OpenAction"}


@pytest.mark.parametrize(
    ("part", "told"),
    [
        ({"assumptions": [{"name": "x"}] * 6000}, "6000 rows of assumptions"),
        ({"quality": {"first_day": 0, "days": 1, "customers": {"C-1": [[10**12, "f"]]}}}, "more than 40000 days"),
        ({"quality": {"first_day": 0, "days": 10**12, "customers": {"C-1": [[1, "f"]]}}}, "more than 40000 days"),
    ],
)
def test_results_that_hold_more_than_any_report_are_not_drawn(
    part: dict[str, Any], told: str, plain: bytes, study: dict[str, Any], tmp_path: Path
) -> None:
    import io

    import pikepdf

    hostile = {**study, **part}
    content = json.dumps(hostile).encode()
    with pikepdf.open(io.BytesIO(plain)) as pdf:
        pdf.attachments["results.json"] = pikepdf.AttachedFileSpec(
            pdf, content, filename="results.json", relationship=pikepdf.Name.Data
        )
        path = tmp_path / "hostile.pdf"
        pdf.save(path)
    assert any("hold more than any report" in line and told in line for line in audit(path).differs)


def test_a_study_that_computes_without_end_is_stopped(
    on_disk: Path, folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("loadsum.report.audit.COMPUTING_S", 0.05)

    def recompute(path: Path, inputs: Path) -> dict[str, Any]:
        while True:
            pass

    found = audit(on_disk, inputs=folder, recompute=recompute)
    assert found.differs == ["the attached study cannot be computed within bounds: stopped after 0.05 s"]


def test_a_study_that_asks_for_endless_memory_is_stopped(on_disk: Path, folder: Path) -> None:
    def recompute(path: Path, inputs: Path) -> dict[str, Any]:
        return {"x": bytearray(2**36)}

    found = audit(on_disk, inputs=folder, recompute=recompute)
    assert found.differs == ["the attached study cannot be computed within bounds: too much memory"]


def test_numbers_within_the_tolerance_are_the_same_and_beyond_it_are_not() -> None:
    a: dict[str, Any] = {"x": [1.0, None, "t"], "program": {"version": "1"}}
    assert differences(a, {"x": [1.0 + 5e-10, None, "t"], "program": {"version": "2"}}) == []
    assert [d.where for d in differences(a, {"x": [1.0 + 5e-9, 0.0, "u", 4]})] == ["x (length)", "x[0]", "x[1]", "x[2]"]


def test_every_single_flipped_byte_of_an_unsigned_report_is_caught(
    on_disk: Path, plain: bytes, attachments: Sequence[Attachment]
) -> None:
    import random

    for place in random.Random(3).sample(range(len(plain)), 2):
        broken = bytearray(plain)
        broken[place] ^= 1
        on_disk.write_bytes(bytes(broken))
        assert audit(on_disk).exit_status == 3, f"byte {place}"


@pytest.mark.parametrize(
    ("content", "told"),
    [
        (b"not json", "not JSON"),
        (b"[1]", "no results.json"),
        (b'{"schema_version": 99, "study": {}}', "schema_version: is 99; this version reads"),
        (b"[" * 100_000, "not JSON"),
    ],
)
def test_a_file_that_is_no_results_file_is_told(content: bytes, told: str, tmp_path: Path) -> None:
    path = tmp_path / "results.json"
    path.write_bytes(content)
    with pytest.raises(InputError, match=told):
        read_results(path)


def test_a_report_is_drawn_again_from_its_results_file(study: dict[str, Any], plain: bytes, tmp_path: Path) -> None:
    path = tmp_path / "results.json"
    path.write_text(json.dumps(study), encoding="utf-8")
    assert made(read_results(path)) == plain
