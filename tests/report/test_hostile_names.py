"""Names that try to be more than names: they are printed as harmless text, or refused by name."""

import copy
import io
import subprocess
import sys
from pathlib import Path
from typing import Any

import pikepdf
import pytest

from loadsum.errors import InputError
from loadsum.report.cleantext import LONGEST_TEXT, clean
from loadsum.report.document import css_string, render
from loadsum.report.typeface import missing_characters
from tests.report.pdf_structure import structure_faults

MARKUP = [
    "</style><script>alert(1)</script>",
    '<img src="file:///etc/passwd">',
    "<a rel=attachment href=file:///etc/passwd>x</a>",
    '<link rel="attachment" href="file:///etc/passwd">',
    '<svg xmlns="http://www.w3.org/2000/svg"><image href="file:///etc/passwd"/></svg>',
    '"; } body { display: none } @import url("file:///etc/passwd"); a { content: "',
    "{{ 7 * 7 }}{% include '/etc/passwd' %}{{ t.__class__.__mro__ }}",
    "&lt;b&gt; &#60; &amp;",
    "$x^2$ \\LaTeX \\includegraphics{/etc/passwd} %s %(x)s {0}",
    "-->]]><!ENTITY x SYSTEM 'file:///etc/passwd'>",
]

HIDDEN = "Mill\u202eenaL\u2066 \x00\x07\u200bLane\r\n2"
SCRIPTS = "Møllestræde, Мельничный переулок, Οδός Μύλου, רחוב הטחנה, شارع الطاحونة"


def _small(results: dict[str, Any], name: str) -> dict[str, Any]:
    """The invented study with a name in every place that holds one."""
    study = copy.deepcopy(results)
    study["study"].update(title=name, reference=name, place=name, question=name, revision=name)
    study["people"] = [{"role": "checked", "name": name, "registration": name}]
    study["customers"] = [{"id": name, "customer_class": name, "role": "existing", "readings": 1, "days": 1}]
    study["inputs"] = [{"name": name, "format": name, "sha256": "0" * 64, "bytes": 1, "choices": [name]}]
    study["findings"] = [{"rule": name, "severity": "note", "customer": name, "place": name, "message": name}]
    study["assumptions"] = [{"name": name, "value": name, "unit": name, "source": name, "effect": name}]
    study["quality"]["customers"] = {name: [[365, "f"]]}
    unit = study["transformers"][0]
    for part in ("hours", "curve", "peaks", "diversity", "thermal", "scenarios", "evidence"):
        unit.pop(part)
    unit["id"] = name
    unit["hour_map"]["season"] = [name[:30]] * 8
    return study


def _text(content: bytes, tmp_path: Path) -> str:
    path = tmp_path / "report.pdf"
    path.write_bytes(content)
    return subprocess.run(["pdftotext", "-layout", path, "-"], check=True, capture_output=True, text=True).stdout


@pytest.mark.parametrize("name", [" ".join(MARKUP[:3]), " ".join(MARKUP[3:6]), " ".join(MARKUP[6:])])
def test_markup_styles_and_templates_in_names_are_printed_as_they_stand(
    results: dict[str, Any], name: str, tmp_path: Path
) -> None:
    content = render(_small(results, name))
    assert structure_faults(content) == []
    text = "".join(_text(content, tmp_path).split())
    assert "".join(name.split())[:60] in text
    assert "root:" not in text
    assert b"root:x:" not in content
    with pikepdf.open(io.BytesIO(content)) as pdf:
        assert list(pdf.attachments) == ["manifest.json"]


@pytest.fixture(scope="module")
def odd(results: dict[str, Any]) -> bytes:
    """The invented study with names that are endless, hidden in part, or in other scripts."""
    study = _small(results, "W" * 20_000)
    study["study"]["place"] = HIDDEN
    study["study"]["question"] = SCRIPTS
    return render(study)


def test_a_name_of_20_000_characters_is_cut_and_the_report_says_so(odd: bytes, tmp_path: Path) -> None:
    text = _text(odd, tmp_path)
    assert "W" * 200 not in text
    assert "study.title: cut by 199" in text
    assert structure_faults(odd) == []


def test_hidden_and_direction_characters_are_left_out_and_the_report_says_so(odd: bytes, tmp_path: Path) -> None:
    text = _text(odd, tmp_path)
    assert "MillenaL Lane  2" in text or "MillenaL Lane 2" in text
    assert "study.place: 5 hidden characters" in text


@pytest.mark.parametrize(
    ("name", "told"),
    [
        ("Mill Lane \U0001fae0", r"study.title: character U\+1FAE0 \(MELTING FACE\) is in no font"),
        ("水車小路", r"study.title: character U\+6C34 \(CJK UNIFIED IDEOGRAPH-6C34\)"),
        ("private \ue000", r"study.title: character U\+E000 \(unnamed\)"),
    ],
)
def test_a_character_without_a_glyph_is_refused_by_name_before_anything_is_drawn(
    results: dict[str, Any], name: str, told: str
) -> None:
    with pytest.raises(InputError, match=told):
        render(_small(results, name))


def test_names_in_other_scripts_are_printed(odd: bytes, tmp_path: Path) -> None:
    assert missing_characters(SCRIPTS) == ()
    text = _text(odd, tmp_path)
    assert all(word in text for word in ("Møllestræde", "Мельничный", "Μύλου"))


def test_a_text_is_never_longer_than_the_bound_after_cleaning() -> None:
    cleaned = clean({"x": "a" * 5000, "y": "word " * 4000})
    assert all(len(text) <= LONGEST_TEXT for text in cleaned.results.values())
    assert [change.what for change in cleaned.changes] == ["cut", "cut"]


def test_a_css_string_cannot_end_early() -> None:
    assert css_string('a"b\\c\n</style>') == '"a\\000022 b\\00005c c\\00000a \\00003c \\00002f style\\00003e "'


def test_a_template_that_asks_for_a_file_is_refused(results: dict[str, Any], tmp_path: Path) -> None:
    (tmp_path / "blocks").mkdir()
    block = tmp_path / "blocks" / "method.html.j2"
    block.write_text('<p><img src="file:///etc/passwd" alt="x"></p>', encoding="utf-8")
    with pytest.raises(InputError, match="may not fetch 'file:///etc/passwd'"):
        render({"study": {"title": "x"}}, overrides=tmp_path)
    block.write_text('<p><a href="javascript:alert(1)">x</a></p>', encoding="utf-8")
    with pytest.raises(InputError, match="only #, https: and mailto: are allowed"):
        render({"study": {"title": "x"}}, overrides=tmp_path)


def test_no_socket_is_opened_and_no_stray_file_is_read(tmp_path: Path) -> None:
    """Every open and connect of a render in a process of its own, as the interpreter's audit hook sees them."""
    script = """
import sys
opened = []
kinds = ("open", "socket.connect")
sys.addaudithook(lambda event, args: opened.append((event, str(args[0]))) if event in kinds else None)
from loadsum.report.document import render
render({"study": {"title": "x"}})
del opened[:]
render({"study": {"title": '<img src="http://127.0.0.1:9/x"><img src="file:///etc/passwd">'}})
print([e for e in opened if e[0] == "socket.connect" or e[1].startswith("/etc")])
"""
    done = subprocess.run([sys.executable, "-c", script], check=True, capture_output=True, text=True)
    assert done.stdout.strip() == "[]"
