"""The record of a transformer in service."""

from loadsum.study.record import transformer_record
from loadsum.study.unittables import Transformer


def test_each_figure_stands_with_its_source_and_the_missing_ones_are_listed():
    unit = Transformer(
        installed_kva=25.0,
        impedance_pct=2.1,
        cooling="ONAN",
        sources=("impedance_pct: nameplate, read 2031-02-03",),
    )
    cooling, impedance, missing = transformer_record(unit)
    assert (cooling.value, cooling.source) == ("ONAN", "no source given")
    assert (impedance.value, impedance.unit, impedance.source) == ("2.1", "%", "nameplate, read 2031-02-03")
    assert missing.value == "3"
    assert missing.source.startswith(
        "connection of the windings, average winding temperature rise at rated load, year of manufacture;"
    )


def test_a_unit_that_is_not_in_service_has_no_record():
    assert transformer_record(Transformer(ratings_kva=(25.0,))) == ()
