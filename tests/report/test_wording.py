import copy
import re
import subprocess
import tomllib
from html import unescape
from pathlib import Path
from typing import Any

import pytest

from loadsum.errors import InputError
from loadsum.report.document import compose, material, render
from loadsum.report.notation import Notation
from loadsum.report.templates import catalogue, templates_folder
from tests.report.invented_results import without_figures
from tests.report.pdf_structure import structure_faults

MONTHS = ["January", "February", "March", "April", "May", "June", "July", "August", "September", "October"]
NOTATION = Notation(decimal=",", group=".", date_form="{day}. {month} {year}", months=[*MONTHS, "N", "D"], none="–")


def page_text(results: dict[str, Any]) -> str:
    """The report's words, tags and styles left out."""
    html = compose(without_figures(results)).html
    body = unescape(html[html.index("<body>") :])
    return " ".join(re.sub(r"<[^>]+>", " ", body).replace("\u00a0", " ").split())


@pytest.mark.parametrize(
    ("value", "printed"),
    [
        (0.0, "0"),
        (1234.5678, "1230"),
        (12345.678, "12.300"),
        (0.012345, "0,0123"),
        (-2.5, "−2,50"),
        (3.2e-7, "3,20 × 10⁻⁷"),
    ],
)
def test_numbers_follow_the_notation(value: float, printed: str) -> None:
    assert NOTATION.significant(value).replace("\u00a0", " ") == printed


def test_a_number_that_is_not_known_is_a_dash_everywhere() -> None:
    assert {NOTATION.fixed(None), NOTATION.significant(float("nan")), NOTATION.percent(None), NOTATION.date("")} == {
        "–"
    }


def test_a_probability_below_what_the_record_supports_is_printed_as_less_than_that() -> None:
    assert NOTATION.probability(1e-9, 0.004).replace("\u00a0", " ") == "< 0,4 %"
    assert NOTATION.probability(0.0123, 0.004).replace("\u00a0", " ") == "1,2 %"


def test_page_1_holds_question_rating_probability_hours_interval_criterion_coverage_and_status(
    results: dict[str, Any],
) -> None:
    text = page_text(results)[:4000]
    for words in (
        "Which rating should replace the 25 kVA unit",
        "37.5 kVA is the smallest rating that meets every criterion.",
        "0.13 h in an average year",
        "90 % interval 0.079 to 0.22 h",
        "of demand intervals of 60 min (winter, workday, 19:00)",
        "Least room at 37.5 kVA: expected exceedance hours per year, 0.13 h against a limit of 10 h",
        "Readings of 9 customers on 363 days, 1 January 2030 to 31 December 2030. They speak for 8766 of the 8766 h",
        "Exact convolution of the customers' own readings",
        "Voltage, protection, fault duty",
        "For review.",
    ):
        assert words in text


def test_three_months_of_readings_never_yield_annual_figures_without_the_hours_covered(results: dict[str, Any]) -> None:
    short = copy.deepcopy(results)
    short["coverage"].update(days=90, covered_hours=2160.0, uncovered=["summer, workday: all hours"], whole_year=False)
    text = page_text(short)
    assert "They speak for 2160 of the 8766 h of an average year (24.6 %)" in text
    assert "No readings for: summer, workday: all hours. Annual figures leave these hours out." in text


@pytest.mark.parametrize(
    ("verdict", "sentence"),
    [
        ("no criterion", "The study file states no criterion, so the ratings are compared and none is recommended."),
        ("none suffices", "No rating of the list meets every criterion."),
        (
            "not decided",
            "A limit lies inside the interval of the figure it is held against: not decided by these data.",
        ),
    ],
)
def test_without_a_verdict_no_rating_is_recommended(results: dict[str, Any], verdict: str, sentence: str) -> None:
    changed = copy.deepcopy(results)
    changed["transformers"][0]["selection"].update(verdict=verdict, rating_kva=None)
    text = page_text(changed)
    assert sentence in text
    assert "smallest rating that meets" not in text


def test_a_criterion_without_a_source_is_printed_as_not_traced(results: dict[str, Any]) -> None:
    changed = copy.deepcopy(results)
    changed["transformers"][0]["selection"]["criteria"][0]["source"] = ""
    assert "not traced to a utility standard" in page_text(changed)


@pytest.mark.parametrize(
    ("region", "standard"),
    [
        ("international", "IEC 60076-7"),
        ("north america", "IEEE C57.91"),
        ("europe", "EN 50160"),
        ("united kingdom", "Electricity at Work Regulations 1989"),
        ("australia", "AS/NZS 3000"),
    ],
)
def test_cautions_name_the_standards_of_the_region(results: dict[str, Any], region: str, standard: str) -> None:
    changed = copy.deepcopy(results)
    changed["study"]["region"] = region
    text = page_text(changed)
    assert standard in text
    assert text.count("edition to be confirmed") == 5
    assert "nothing here" not in text
    assert "Work on or near distribution equipment can kill." in text


def test_dates_and_digit_groups_follow_the_region(results: dict[str, Any]) -> None:
    changed = copy.deepcopy(results)
    changed["study"]["region"] = "north america"
    text = page_text(changed)
    assert "May 4, 2031" in text
    assert "17,269" in text


def test_what_comes_from_memory_says_so_in_the_references(results: dict[str, Any]) -> None:
    text = page_text(results)
    assert "1932. (from memory, to be confirmed)" in text
    assert "Ferguson" in text
    assert "Rusck" not in text  # the study of this test holds no diversity figures


def test_a_utility_replaces_a_sentence_a_block_and_the_logo(results: dict[str, Any], tmp_path: Path) -> None:
    (tmp_path / "text").mkdir()
    (tmp_path / "text" / "en.toml").write_text('document_kind = "Loading note"\n', encoding="utf-8")
    (tmp_path / "blocks").mkdir()
    (tmp_path / "blocks" / "cautions.html.j2").write_text("<p>Our own cautions for {{ study.title }}.</p>", "utf-8")
    (tmp_path / "logo.svg").write_text(
        '<svg xmlns="http://www.w3.org/2000/svg" width="30" height="10"><rect width="30" height="10"/></svg>', "utf-8"
    )
    composed = compose(results, overrides=tmp_path)
    html, assets = composed.html, composed.assets
    assert "Loading note" in html
    assert "Our own cautions for Pole transformer at Mill Lane." in html
    assert "IEC 60076-7 (loading guide)" not in html
    assert assets["logo"][0] == "image/svg+xml"
    assert structure_faults(render({"study": {"title": "x"}}, overrides=tmp_path)) == []


def test_a_broken_text_file_of_the_utility_is_told_by_name(tmp_path: Path) -> None:
    (tmp_path / "text").mkdir()
    (tmp_path / "text" / "en.toml").write_text("[word\n", encoding="utf-8")
    with pytest.raises(InputError, match=r"en.toml"):
        render({"study": {}}, overrides=tmp_path)


def test_every_sentence_that_the_program_asks_for_is_in_the_catalogue() -> None:
    """Each literal place given to the catalogue, in modules and in templates, exists."""
    t = catalogue("en")
    asked = set()
    package = Path(render.__code__.co_filename).parent
    for path in [*package.rglob("*.py"), *templates_folder().rglob("*.j2")]:
        asked |= set(re.findall(r"""\bt\(\s*["']([a-z_]+(?:\.[a-z_]+)*)["']""", path.read_text(encoding="utf-8")))
    assert len(asked) > 80
    assert [place for place in sorted(asked) if not t.has(place)] == []


def test_the_catalogue_is_toml_with_no_sentence_empty_but_where_meant() -> None:
    texts = tomllib.loads((templates_folder() / "text" / "en.toml").read_text(encoding="utf-8"))
    empty = []

    def walk(value: Any, place: str) -> None:
        if isinstance(value, dict):
            for name, item in value.items():
                walk(item, f"{place}.{name}")
        elif value == "":
            empty.append(place)

    walk(texts, "")
    assert empty == [".verdict.chosen.headline"]


def test_temperatures_are_printed_in_the_unit_of_the_study(results: dict[str, Any]) -> None:
    m, _ = material(results)
    assert m.temperature(110.0).replace("\u00a0", " ") == "110 °C"
    changed = copy.deepcopy(results)
    changed["study"]["temperature_unit"] = "F"
    m, _ = material(changed)
    assert m.temperature(110.0).replace("\u00a0", " ") == "230 °F"


def test_several_transformers_are_listed_and_those_that_need_attention_get_a_section(results: dict[str, Any]) -> None:
    many = copy.deepcopy(results)
    first = many["transformers"][0]
    fine, broken = copy.deepcopy(first), {"id": "T-3", "reason": "no customer of it has readings"}
    fine.update(id="T-2", installed_kva=50.0)
    many["transformers"] = [first, fine, broken]
    text = page_text(many)
    assert "2 of 3 need attention" in text
    assert "no customer of it has readings" in text
    assert "Transformer T-204" in text
    assert "Transformer T-2 " not in text
    assert structure_faults(render(without_figures(many))) == []


def test_extracted_text_keeps_the_reading_order_of_the_pages(report: bytes, tmp_path: Path) -> None:
    path = tmp_path / "report.pdf"
    path.write_bytes(report)
    text = subprocess.run(["pdftotext", path, "-"], check=True, capture_output=True, text=True).stdout
    places = [
        text.index(words)
        for words in (
            "Pole transformer at Mill Lane",
            "Question",
            "Which rating should replace",
            "Finding",
            "Decision",
            "Coverage",
            "Not checked",
            "Contents",
            "How to read the figures",
            "Exceedance by rating",
            "Findings on the readings",
            "Danger to life",
            "Each signature field below",
        )
    ]
    assert places == sorted(places)


def test_a_failed_hold_out_test_is_a_caution_on_page_1(results: dict[str, Any]) -> None:
    failed = copy.deepcopy(results)
    failed["transformers"][0]["evidence"].update(
        passed=False,
        sentence="Held-out demand exceeded the 99 % level 3.1 % of the time, expected 1 %: treat exceedance below"
        " 1 % as understated.",
    )
    text = page_text(failed)
    place = text.index("Caution. Held-out demand exceeded the 99 % level 3.1 % of the time")
    assert place < text.index("Finding")


def test_the_caution_on_personal_data_says_what_the_document_really_shows(results: dict[str, Any]) -> None:
    assert "show customers under the identifiers of the study file" in page_text(results)
    assert "identifiers are replaced by pseudonyms" in page_text({**results, "pseudonymised": True})


@pytest.mark.parametrize(
    ("half_width", "said"),
    [
        (0.0, "Rounding: none that shows."),
        (0.003, "within the 1 % aimed at"),
        (0.02, "wider than the 1 % aimed at"),
    ],
)
def test_the_report_says_how_far_rounding_leaves_the_hours_open(
    half_width: float, said: str, results: dict[str, Any]
) -> None:
    results = copy.deepcopy(results)
    for row in results["transformers"][0]["exceedance"]:
        row["hours_lower"] = row["hours_per_year"] * (1.0 - half_width)
        row["hours_upper"] = row["hours_per_year"] * (1.0 + half_width)
    text = page_text(results)
    assert said in text
    assert ("leaves the expected hours open by" in text) == (half_width > 0.0)


def test_results_without_a_rounding_bracket_say_nothing_of_it(results: dict[str, Any]) -> None:
    results = copy.deepcopy(results)
    for row in results["transformers"][0]["exceedance"]:
        del row["hours_lower"], row["hours_upper"]
    assert "steps of the calculation leaves" not in page_text(results)
