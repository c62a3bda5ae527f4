"""Delimited text that has no stamps, no header, or no identifier."""

import pytest

from loadsum.errors import InputError
from loadsum.intake.readers.delimited import read_delimited
from loadsum.study.tables import MeterFiles


def source(**more) -> MeterFiles:
    return MeterFiles(files="x.csv", unit="kW", stamp="start", quantity="power", **more)


def test_a_table_without_header_and_stamps_is_read_by_its_first_stamp():
    raw = read_delimited(
        b"0.5,1.0\n0.25,2.0\n", "x.csv", source(header=False, first_stamp="2031-01-01T00:00", interval_min=15)
    )
    assert raw.customers == ("1", "2")
    assert raw.stamps == ("2031-01-01T00:00:00", "2031-01-01T00:15:00")
    assert raw.value.tolist() == [0.5, 0.25, 1.0, 2.0]
    assert raw.line.tolist() == [1, 2, 1, 2]
    assert "no stamps: 15 min readings follow one another from 2031-01-01T00:00" in raw.choices


def test_a_file_of_one_customer_may_give_it_its_name():
    content = b"when,other,kwh\n2031-01-01T00:00,7,1.5\n"
    raw = read_delimited(content, "east/house_07.csv", source(named_by_file=True, value_column="kwh"))
    assert raw.customers == ("house_07",)
    assert raw.value.tolist() == [1.5]


def test_a_first_stamp_without_an_interval_is_a_fault():
    with pytest.raises(InputError, match="a file without stamps needs it"):
        read_delimited(b"a,b\n1,2\n", "x.csv", source(first_stamp="2031-01-01T00:00"))
