"""The customer table beside the study file."""

from pathlib import Path

import pytest

from loadsum.errors import InputError
from loadsum.study.load import load_study
from loadsum.study.tables import Customer
from tests.study.test_load import GOOD, write

STUDY = GOOD + '[customers]\ntable = "customers.csv"\n'


def read(folder: Path, table: str) -> tuple[Customer, ...]:
    (folder / "customers.csv").write_text(table, encoding="utf-8")
    return load_study(write(folder, STUDY)).customer


def faults(folder: Path, table: str) -> list[str]:
    with pytest.raises(InputError) as caught:
        read(folder, table)
    return [str(fault) for fault in caught.value.faults]


def test_a_row_is_a_customer_and_an_empty_cell_takes_the_default(tmp_path):
    found = read(
        tmp_path,
        "id,Customer class,role,annual_kwh,devices,export\n# a remark\n007,home,existing,,heat pump; EV charger,yes\n"
        "008,home,planned,4200,,\n",
    )
    assert found == (
        Customer(id="007", customer_class="home", devices=("heat pump", "EV charger"), export=True),
        Customer(id="008", customer_class="home", role="planned", annual_kwh=4200.0),
    )


def test_a_table_with_semicolons_may_hold_decimal_commas(tmp_path):
    (customer,) = read(tmp_path, "id;annual_kwh\nA;4200,5\n")
    assert customer.annual_kwh == 4200.5


def test_every_fault_of_the_table_is_reported_with_its_line_beside_those_of_the_study_file(tmp_path):
    table = "id,clas,role,annual_kwh,count\nA,home,exsting,,\nA2,home,,lots,\n,home,,,\nB,home,,,1.5\nC,home,,-5,,x\n"
    assert faults(tmp_path, table) == [
        'customers.csv:1: unknown column "clas"; known: ' + ", ".join(Customer.__dataclass_fields__),
        "customers.csv:2 role: must be one of existing, planned, leaving, transferred in, transferred out,"
        ' reference only; got "exsting"; did you mean "existing"?',
        'customers.csv:3 annual_kwh: must be a number, got "lots"',
        "customers.csv:4 id: missing; identifier as in the meter files",
        'customers.csv:5 count: must be a whole number, got "1.5"',
        "customers.csv:6: has 6 cells under 5 columns",
        "customers.csv:6 annual_kwh: must be at least 0, got -5",
    ]


def test_a_customer_in_the_table_and_in_the_study_file_is_a_fault(tmp_path):
    (tmp_path / "customers.csv").write_text("id\nA\n", encoding="utf-8")
    with pytest.raises(InputError, match='customer "A" is listed twice'):
        load_study(write(tmp_path, STUDY + '[[customer]]\nid = "A"\n'))


def test_a_table_that_is_not_there_is_a_fault(tmp_path):
    with pytest.raises(InputError, match=r'customers\.table: no file "customers\.csv" beside the study file'):
        load_study(write(tmp_path, STUDY))


def test_a_workbook_reads_as_the_same_customers_as_delimited_text(tmp_path):
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    for row in (["id", "annual_kwh", "count", "role"], ["0042", 4200.5, 3, "planned"], [17, None, None, None]):
        book.active.append(row)
    book.save(tmp_path / "customers.xlsx")
    found = load_study(write(tmp_path, STUDY.replace("customers.csv", "customers.xlsx"))).customer
    assert found == read(tmp_path, "id,annual_kwh,count,role\n0042,4200.5,3,planned\n17,,,\n")
