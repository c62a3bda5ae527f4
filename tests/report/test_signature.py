import copy
import io
import random
from collections.abc import Sequence
from typing import Any

import pikepdf
import pytest

from loadsum.errors import InputError
from loadsum.report.archive import Attachment
from loadsum.report.document import render
from loadsum.report.received import read_report
from loadsum.report.signature import sign, signatures
from loadsum.report.stampfont import letter_by_letter
from tests.report.certificates import PASSPHRASE, pkcs12_of
from tests.report.invented_results import without_figures
from tests.report.pdf_structure import structure_faults


def test_one_and_two_signatures_keep_both_standards_and_the_bytes_before(
    issued: bytes, once: bytes, twice: bytes
) -> None:
    assert once.startswith(issued)
    assert twice.startswith(once)
    assert structure_faults(once) == []
    assert structure_faults(twice) == []


def test_signing_leaves_the_metadata_of_the_report_alone(issued: bytes, twice: bytes) -> None:
    with pikepdf.open(io.BytesIO(issued)) as before, pikepdf.open(io.BytesIO(twice)) as after:
        assert before.Root.Metadata.read_bytes() == after.Root.Metadata.read_bytes()


def test_the_letters_of_a_stamp_are_listed_one_by_one(issued: bytes, once: bytes) -> None:
    table = b"1 beginbfrange\n<001f> <0020> [<0064> <00660069>]\nendbfrange\n1 beginbfchar\n<0022> <0067>\nendbfchar"
    assert letter_by_letter(table) == (
        b"2 beginbfchar\n<001f> <0064>\n<0020> <00660069>\nendbfchar\n1 beginbfchar\n<0022> <0067>\nendbfchar"
    )
    with pikepdf.open(io.BytesIO(issued)) as before, pikepdf.open(io.BytesIO(once)) as after:
        tables = [
            thing.ToUnicode.read_bytes()
            for thing in list(after.objects)[len(before.objects) :]
            if isinstance(thing, pikepdf.Dictionary) and "/ToUnicode" in thing
        ]
    assert len(tables) == 1
    assert b"beginbfrange" not in tables[0]


def test_both_signatures_stand_and_name_their_signers(twice: bytes) -> None:
    states = signatures(read_report(twice))
    assert [(s.field, s.signer, s.good) for s in states] == [
        ("signature-checked", "B. Checker", True),
        ("signature-responsible-engineer", "C. Engineer", True),
    ]


def test_a_draft_is_not_signed(report: bytes) -> None:
    with pytest.raises(InputError, match='"for review"; only an issued report is signed'):
        sign(report, role="checked", certificate=b"", passphrase="")


def test_a_role_signs_once(once: bytes) -> None:
    with pytest.raises(InputError, match="has signed already"):
        sign(once, role="checked", certificate=pkcs12_of("B. Checker"), passphrase=PASSPHRASE)


def test_a_role_that_the_study_does_not_have_is_refused_with_those_it_has(issued: bytes) -> None:
    with pytest.raises(InputError, match="the report has: checked, prepared, responsible engineer"):
        sign(issued, role="janitor", certificate=b"", passphrase="")


def test_a_wrong_passphrase_is_told_without_repeating_it(issued: bytes) -> None:
    with pytest.raises(InputError) as told:
        sign(issued, role="checked", certificate=pkcs12_of("B. Checker"), passphrase="battery")
    assert "wrong passphrase" in str(told.value)
    assert "battery" not in str(told.value)


def test_any_flipped_byte_of_a_signed_report_is_caught(twice: bytes) -> None:
    places = random.Random(7).sample(range(len(twice)), 60)
    for place in places:
        broken = bytearray(twice)
        broken[place] ^= 1 << (place % 8)
        try:
            states = signatures(read_report(bytes(broken)))
        except InputError:
            continue
        assert len(states) < 2 or not all(s.good for s in states), f"byte {place}"


def test_what_is_added_after_the_last_signature_is_caught(twice: bytes) -> None:
    from pyhanko.pdf_utils.generic import pdf_name
    from pyhanko.pdf_utils.incremental_writer import IncrementalPdfFileWriter

    writer = IncrementalPdfFileWriter(io.BytesIO(twice))
    writer.root[pdf_name("/Extra")] = pdf_name("/Yes")
    writer.update_root()
    target = io.BytesIO()
    writer.write(target)
    assert not all(s.good for s in signatures(read_report(target.getvalue())))


@pytest.fixture(scope="module")
def issued(results: dict[str, Any], attachments: Sequence[Attachment]) -> bytes:
    import json

    changed = without_figures(copy.deepcopy(results))
    changed["study"]["status"] = "issued"
    others = [a for a in attachments if a.name != "results.json"]
    own = Attachment(name="results.json", content=json.dumps(changed).encode(), description="Results")
    return render(changed, attachments=[*others, own])


@pytest.fixture(scope="module")
def once(issued: bytes) -> bytes:
    return sign(issued, role="checked", certificate=pkcs12_of("B. Checker"), passphrase=PASSPHRASE)


@pytest.fixture(scope="module")
def twice(once: bytes) -> bytes:
    return sign(once, role="responsible engineer", certificate=pkcs12_of("C. Engineer"), passphrase=PASSPHRASE)
