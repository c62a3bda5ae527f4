"""Pseudonyms of customers."""

import stat

import pytest

from loadsum.errors import InputError
from loadsum.study.pseudonyms import key_beside, pseudonyms, read_key, write_key

KEY, OTHER = bytes(range(32)), bytes(range(1, 33))
NAMES = [f"H-{n:04d}" for n in range(3000)]


def test_pseudonyms_are_one_to_one_and_hold_nothing_of_the_identifier():
    named = pseudonyms(NAMES, KEY)
    assert len(set(named.names.values())) == len(NAMES)
    assert all(name not in named(name) for name in NAMES)


def test_the_same_key_gives_the_same_pseudonym_in_any_order_and_another_key_another():
    assert pseudonyms(NAMES, KEY).names == pseudonyms(reversed(NAMES), KEY).names
    assert pseudonyms(NAMES[:9], KEY)(NAMES[3]) == pseudonyms(NAMES[3:5], KEY)(NAMES[3])
    assert all(pseudonyms(NAMES[:50], OTHER)(name) != pseudonyms(NAMES[:50], KEY)(name) for name in NAMES[:50])


def test_customers_whose_first_signs_collide_are_told_apart_by_further_signs():
    many = [str(n) for n in range(30_000)]
    named = pseudonyms(many, KEY)
    assert len(set(named.names.values())) == len(many)
    assert {len(name) for name in named.names.values()} > {len("C-23456")}


def test_identifiers_are_replaced_wherever_they_stand_and_numbers_are_not_taken_for_them():
    named = pseudonyms(["7", "H-1", "H-12"], KEY)
    results = {
        "transformers": [{"id": "7", "customers": [{"id": "H-1", "role": "7", "days": 7}, {"id": "7", "days": 7}]}],
        "quality": {"customers": {"H-12": [[7, "f"]], "7": [[1, "p"]]}},
        "findings": [
            {"customer": "7", "message": "7 readings of meter H-12 (not H-123)", "place": "H-1.csv:7"},
            {"customer": "H-1", "message": "nothing", "place": "east/7.csv.gz:12"},
        ],
    }
    seven, one, twelve = (named(name) for name in ("7", "H-1", "H-12"))
    assert named.results(results) == {
        "transformers": [{"id": "7", "customers": [{"id": one, "role": "7", "days": 7}, {"id": seven, "days": 7}]}],
        "quality": {"customers": {twelve: [[7, "f"]], seven: [[1, "p"]]}},
        "findings": [
            {"customer": seven, "message": f"7 readings of meter {twelve} (not H-123)", "place": f"{one}.csv:7"},
            {"customer": one, "message": "nothing", "place": f"east/{seven}.csv.gz:12"},
        ],
    }


def test_a_key_file_is_read_as_it_was_written_and_is_private_and_never_overwritten(tmp_path):
    path = tmp_path / "study.key"
    write_key(path, KEY)
    assert read_key(path) == KEY
    assert stat.S_IMODE(path.stat().st_mode) == 0o600
    with pytest.raises(FileExistsError):
        write_key(path, OTHER)
    assert read_key(path) == KEY


@pytest.mark.parametrize("text", ["", "secret\n", "ab" * 31 + "\n", "ab" * 32 + "\n" + "cd" * 32 + "\n"])
def test_what_is_no_key_file_is_the_users_fault(text, tmp_path):
    (tmp_path / "study.key").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match="is no key file"):
        read_key(tmp_path / "study.key")


def test_a_key_that_can_be_guessed_is_refused():
    with pytest.raises(ValueError, match="at least 16"):
        pseudonyms(["A"], b"secret")


def test_a_study_makes_its_key_once_and_keeps_it(tmp_path):
    first, made = key_beside(tmp_path / "study.toml", "study.key")
    again, made_again = key_beside(tmp_path / "study.toml", "study.key")
    assert (made, made_again) == (True, False)
    assert first == again
    assert len(first) == 32
