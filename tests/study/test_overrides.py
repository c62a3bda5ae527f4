"""A study rerun with a changed assumption."""

import tomllib

import pytest

from loadsum.errors import InputError
from loadsum.study.load import study_from
from loadsum.study.overrides import with_overrides
from tests.study.test_load import GOOD

TWO = GOOD + '[[criterion]]\nquantity = "exceedance hours per year"\nlimit = 4\n' * 2


def changed(*overrides: str):
    return study_from(with_overrides(tomllib.loads(TWO), overrides), "study.toml")


def test_a_number_a_text_a_list_and_an_entry_of_a_list_can_be_changed():
    study = changed(
        "transformer.power_factor=0.9", "study.title = Mill Lane, again", "transformer.ratings_kva=[25, 50]",
        "criterion[2].limit=8",
    )  # fmt: skip
    assert study.transformer[0].power_factor == 0.9
    assert study.study.title == "Mill Lane, again"
    assert study.transformer[0].ratings_kva == (25.0, 50.0)
    assert [criterion.limit for criterion in study.criterion] == [4.0, 8.0]
    assert changed("transformer.ratings_kva[3]=50").transformer[0].ratings_kva == (15.0, 25.0, 50.0)


def test_a_table_that_the_study_file_lacks_is_made():
    assert changed("model.borrowed_days=5").model.borrowed_days == 5.0


def test_the_values_given_are_not_touched():
    tree = tomllib.loads(TWO)
    with_overrides(tree, ["criterion[1].limit=9"])
    assert tree == tomllib.loads(TWO)


def test_every_override_that_leads_nowhere_is_named_at_once():
    with pytest.raises(InputError) as caught:
        changed("power factor 0.9", "criterion.limit=5", "criterion[3].limit=5", "transformer.ratings_kva[7]=9")
    assert [str(fault) for fault in caught.value.faults] == [
        '--with power factor 0.9: must be key=value, such as "transformer.power_factor=0.9"',
        "--with criterion.limit: there are 2 tables [[criterion]]; say which, as in criterion[1]",
        "--with criterion[3].limit: there is no criterion[3]; the study file has 2",
        "--with transformer.ratings_kva[7]: there is no ratings_kva[7]; the list has 3 entries",
    ]


def test_an_unknown_key_and_a_value_that_does_not_fit_are_told_like_those_of_the_study_file():
    with pytest.raises(InputError) as caught:
        changed("transformer.power_facter=0.9", "study.demand_interval_min=hourly")
    assert [str(fault) for fault in caught.value.faults] == [
        'study.demand_interval_min: must be a whole number, got "hourly"',
        "transformer.power_facter: unknown key; did you mean power_factor, which is given already?",
    ]
