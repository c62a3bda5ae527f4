import copy
import difflib
import io
import random
import re
import subprocess
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import pikepdf
import pytest

from loadsum.report.archive import Attachment
from loadsum.report.document import compose, render
from tests.report.pdf_structure import elements, structure_faults
from tests.report.tagged_text import tagged_words


def test_a_report_on_a4_meets_the_structure_of_both_standards(report: bytes) -> None:
    assert structure_faults(report) == []


def test_a_report_on_letter_meets_the_structure_of_both_standards(
    results: dict[str, Any], attachments: Sequence[Attachment]
) -> None:
    letter = copy.deepcopy(results)
    letter["study"]["page"] = "letter"
    content = render(letter, attachments=attachments)
    assert structure_faults(content) == []
    with pikepdf.open(io.BytesIO(content)) as pdf:
        assert [float(x) for x in pdf.pages[0].MediaBox] == pytest.approx([0, 0, 612, 792], abs=0.1)


def test_every_attachment_comes_back_byte_for_byte(report: bytes, attachments: Sequence[Attachment]) -> None:
    with pikepdf.open(io.BytesIO(report)) as pdf:
        found = {name: pdf.attachments[name].get_file().read_bytes() for name in pdf.attachments}
    manifest = found.pop("manifest.json")
    assert found == {a.name: a.content for a in attachments}
    for attachment in attachments:
        assert attachment.digest().encode() in manifest


def test_a_study_without_results_still_gives_a_report_that_says_what_is_missing() -> None:
    content = render({"study": {"title": "Empty"}})
    assert structure_faults(content) == []


def test_there_is_an_empty_signature_field_for_each_person(report: bytes) -> None:
    with pikepdf.open(io.BytesIO(report)) as pdf:
        fields = {str(f.T): f for f in pdf.Root.AcroForm.Fields}
        assert sorted(fields) == ["signature-checked", "signature-prepared", "signature-responsible-engineer"]
        for field in fields.values():
            assert str(field.FT) == "/Sig"
            assert "/V" not in field


def test_running_titles_are_outside_the_reading_order(report: bytes) -> None:
    with pikepdf.open(io.BytesIO(report)) as pdf:
        kinds = {str(e.S) for e, _ in elements(pdf) if "/S" in e}
        owners = pdf.Root.StructTreeRoot.ParentTree.Nums
        assert any(owner is None for owner in owners[1])
        stream = pdf.pages[1].Contents.read_bytes()
    assert b"/Pagination" in stream
    assert {"/H1", "/P", "/Table", "/Figure", "/Form"} <= kinds


def test_the_tags_and_the_extracted_text_give_the_words_in_the_same_order(report: bytes, tmp_path: Path) -> None:
    path = tmp_path / "report.pdf"
    path.write_bytes(report)
    said = tagged_words(report)
    done = subprocess.run(["pdftotext", "-raw", path, "-"], check=True, capture_output=True, text=True)
    read = done.stdout.split()
    alike = difflib.SequenceMatcher(None, said, read, autojunk=False).get_matching_blocks()
    assert len(said) > 2000
    assert sum(block.size for block in alike) >= 0.95 * len(said)
    assert said.index("Question") < said.index("Finding") < said.index("Coverage") < said.index("Contents")


@pytest.mark.parametrize("seed", range(6))
def test_figures_that_are_missing_here_and_there_leave_gaps_and_no_crash(results: dict[str, Any], seed: int) -> None:
    dice = random.Random(seed)

    def holed(value: Any) -> Any:
        if isinstance(value, dict):
            return {name: holed(item) if name != "quality" else item for name, item in value.items()}
        if isinstance(value, list):
            return [holed(item) for item in value]
        return None if isinstance(value, float) and dice.random() < 0.02 else value

    html = compose(holed(results)).html
    assert re.findall(r">None<|\bNone[ .,]k|\bnan\b", html) == []
