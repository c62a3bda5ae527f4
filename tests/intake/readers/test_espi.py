"""ESPI XML: a feed built from the rules of the public schema, in the shapes that meter systems send."""

import datetime as dt
import time

import numpy as np
import pytest

from loadsum.errors import InputError
from loadsum.intake.readers.espi import parse_espi
from loadsum.intake.readers.usage import read_espi
from tests.intake.studies import accounted, load, rules, study

MIDNIGHT = int(dt.datetime(2031, 1, 1, tzinfo=dt.UTC).timestamp())
HEAD = '<?xml version="1.0" encoding="UTF-8"?><feed xmlns="http://www.w3.org/2005/Atom" xmlns:espi="http://naesb.org/espi">'


def reading(start: int, value: int, duration: int = 900, quality: str = "") -> str:
    mark = f"<ReadingQuality><quality>{quality}</quality></ReadingQuality>" if quality else ""
    period = f"<timePeriod><duration>{duration}</duration><start>{start}</start></timePeriod>"
    return f"<IntervalReading>{mark}{period}<value>{value}</value></IntervalReading>"


def entry(own: str, content: str, *related: str, up: str = "") -> str:
    links = f'<link rel="self" href="{own}"/>' + (f'<link rel="up" href="{up}"/>' if up else "")
    links += "".join(f'<link rel="related" href="{link}"/>' for link in related)
    return f"<entry>{links}<content>{content}</content></entry>"


def kind(**codes: int) -> str:
    given = {
        "accumulationBehaviour": 4,
        "commodity": 1,
        "flowDirection": 1,
        "powerOfTenMultiplier": 0,
        "uom": 72,
        **codes,
    }
    return "<ReadingType>" + "".join(f"<{k}>{v}</{k}>" for k, v in given.items()) + "</ReadingType>"


def block(readings: str, start: int = MIDNIGHT, duration: int = 86400) -> str:
    interval = f"<interval><duration>{duration}</duration><start>{start}</start></interval>"
    return f"<IntervalBlock>{interval}{readings}</IntervalBlock>"


def channel(point: str, number: int, readings: str, reading_type: str = "", **block_keys: int) -> str:
    base = f"/r/1/UsagePoint/{point}/MeterReading/{number}"
    types = f"/r/ReadingType/{point}-{number}"
    parts = entry(base, "<MeterReading/>", base + "/IntervalBlock", *([types] if reading_type else []))
    parts += entry(base + "/IntervalBlock/1", block(readings, **block_keys), up=base + "/IntervalBlock")
    return parts + (entry(types, reading_type) if reading_type else "")


def feed(*channels: str, points: tuple[str, ...] = ("01",), service: int = 0) -> str:
    about = f"<UsagePoint><ServiceCategory><kind>{service}</kind></ServiceCategory></UsagePoint>"
    return HEAD + "".join(entry(f"/r/1/UsagePoint/{p}", about) for p in points) + "".join(channels) + "</feed>"


def quarter_hours(count: int, value: int = 450, start: int = MIDNIGHT) -> str:
    return "".join(reading(start + 900 * n, value + n) for n in range(count))


def read(tmp_path, text, **keys):
    keys = {"zone": "+00:00", "interval_min": 15, "format": "espi", "unit": "Wh", **keys}
    return load(tmp_path, text, "a.xml", **keys)


def test_450_watt_hours_in_a_quarter_hour_are_1_8_kilowatts_and_zeros_lead_the_name(tmp_path):
    # METERING: mean kW = Wh/1000 x 3600/duration (provenance: computed_from_formula)
    loaded = read(tmp_path, feed(channel("01", 1, reading(MIDNIGHT, 450), kind())))
    assert loaded.readings.customers == ("01",)
    assert loaded.readings.kw.tolist() == [[1.8]]
    assert accounted(loaded)


@pytest.mark.parametrize("prefix", ["", "espi:", "ns2:"])
@pytest.mark.parametrize("spaced", [False, True])
def test_the_fast_way_and_the_careful_parser_agree(prefix, spaced):
    text = feed(channel("01", 1, quarter_hours(50), kind()))
    if prefix:
        for tag in ("IntervalBlock", "IntervalReading", "timePeriod", "duration", "start", "value", "interval"):
            text = text.replace(f"<{tag}>", f"<{prefix}{tag}>").replace(f"</{tag}>", f"</{prefix}{tag}>")
        text = text.replace("xmlns:espi", f'xmlns:{prefix[:-1]}="x" xmlns:other')
    if spaced:
        text = text.replace("><", ">\n  <")
    fast = parse_espi(text.encode(), "a")
    slow = parse_espi(text.replace("</feed>", "<!-- no fast way --></feed>").encode(), "a")
    (ours,), (careful,) = ([e for e in found if e.blocks] for found in (fast, slow))
    for key in ("start_s", "duration_s", "value", "quality"):
        np.testing.assert_array_equal(getattr(ours.blocks[0], key), getattr(careful.blocks[0], key))
    assert ours.blocks[0].begin_s == careful.blocks[0].begin_s == MIDNIGHT


def test_multiplier_three_makes_kilowatt_hours(tmp_path):
    loaded = read(tmp_path, feed(channel("01", 1, reading(MIDNIGHT, 2), kind(powerOfTenMultiplier=3))))
    assert loaded.readings.kw.tolist() == [[8.0]]


def test_reverse_flow_is_subtracted_and_reactive_kept(tmp_path):
    text = feed(
        channel("01", 1, quarter_hours(4, 1000), kind()),
        channel("01", 2, quarter_hours(4, 250), kind(flowDirection=19)),
        channel("01", 3, quarter_hours(4, 500), kind(uom=73)),
    )
    loaded = read(tmp_path, text)
    np.testing.assert_allclose(loaded.readings.kw[0], np.full(4, 3.0))
    np.testing.assert_allclose(loaded.readings.kvar[0], 4.0 * np.arange(500, 504) / 1000)
    assert accounted(loaded)


def test_readings_in_descending_order_and_repeated_blocks_come_out_right(tmp_path):
    down = "".join(reading(MIDNIGHT + 900 * n, n) for n in reversed(range(8)))
    base = "/r/1/UsagePoint/01/MeterReading/1"
    again = entry(base + "/IntervalBlock/2", block(down), up=base + "/IntervalBlock")
    loaded = read(tmp_path, feed(channel("01", 1, down, kind()), again))
    np.testing.assert_allclose(loaded.readings.kw[0], 4.0 * np.arange(8) / 1000)
    assert sum(f.excluded for f in loaded.readings.findings if f.rule == "repeated reading") == 8
    assert accounted(loaded)


def test_several_usage_points_stay_apart(tmp_path):
    text = feed(
        channel("A", 1, quarter_hours(4, 100), kind()),
        channel("B", 1, quarter_hours(4, 200), kind()),
        points=("A", "B"),
    )
    loaded = read(tmp_path, text)
    assert loaded.readings.customers == ("A", "B")
    np.testing.assert_allclose(loaded.readings.kw[1] - loaded.readings.kw[0], 0.4)


@pytest.mark.parametrize(("day", "seconds"), [("2031-03-09", 82_800), ("2031-11-02", 90_000)])
def test_days_of_82800_and_90000_seconds_are_whole_local_days(tmp_path, day, seconds):
    start = int(dt.datetime.fromisoformat(day + "T05:00+00:00").timestamp()) + (3600 if seconds == 82_800 else 0)
    start -= 3600 * (start != int(dt.datetime.fromisoformat(day + "T05:00+00:00").timestamp()))
    hours = "".join(reading(start + 3600 * n, 1000, 3600) for n in range(seconds // 3600))
    start_local = start if seconds == 82_800 else start - 3600
    hours = "".join(reading(start_local + 3600 * n, 1000, 3600) for n in range(seconds // 3600))
    text = feed(channel("01", 1, hours, kind(), start=start_local, duration=seconds))
    loaded = read(tmp_path, text, zone="America/New_York", interval_min=60)
    assert len(set(loaded.readings.local_day.tolist())) == 1
    assert loaded.readings.start_utc.size == seconds // 3600
    assert accounted(loaded)


def test_readings_without_a_period_follow_at_the_interval_length(tmp_path):
    bare = "".join(f"<IntervalReading><value>{n}</value></IntervalReading>" for n in range(4))
    loaded = read(tmp_path, feed(channel("01", 1, bare, kind(intervalLength=900))))
    assert loaded.readings.start_utc.tolist() == [MIDNIGHT + 900 * n for n in range(4)]


def test_a_register_is_differenced(tmp_path):
    values = (100, 150, 260, 300)
    reads = "".join(reading(MIDNIGHT + 900 * n, v, 0) for n, v in enumerate(values))
    loaded = read(tmp_path, feed(channel("01", 1, reads, kind(accumulationBehaviour=1))))
    np.testing.assert_allclose(loaded.readings.kw[0], [0.2, 0.44, 0.16])
    assert accounted(loaded)


def test_estimated_quality_is_flagged_and_projected_values_are_left_out(tmp_path):
    marks = ("", "8", "12", "17")
    reads = "".join(reading(MIDNIGHT + 900 * n, 100, quality=mark) for n, mark in enumerate(marks))
    loaded = read(tmp_path, feed(channel("01", 1, reads, kind())))
    assert loaded.readings.estimated.tolist() == [[False, True, False, False]]
    assert np.isnan(loaded.readings.kw[0, 2])
    assert accounted(loaded)


def test_without_a_reading_type_the_study_file_is_asked(tmp_path):
    loaded = read(tmp_path, feed(channel("01", 1, reading(MIDNIGHT, 2))), unit="kWh")
    assert loaded.readings.kw.tolist() == [[8.0]]
    assert "01: no ReadingType; energy in kWh, as the study file states" in loaded.inputs[0].choices


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (feed(channel("01", 1, quarter_hours(2), kind(commodity=7))), "is about natural gas, not electricity"),
        (feed(channel("01", 1, quarter_hours(2), kind()), service=1), "is of gas, not electricity"),
        (feed(), "holds no IntervalBlock"),
        (feed(channel("01", 1, quarter_hours(2), kind()))[:900], "a.xml:1: is not complete XML"),
        (feed(channel("01", 1, quarter_hours(2).replace("451", "4x1"), kind())), "value is '4x1', not a whole number"),
        (
            '<?xml version="1.0"?><!DOCTYPE f [<!ENTITY a "ha"><!ENTITY b "&a;&a;">]><feed>&b;</feed>',
            "declares a document type or entities",
        ),
        ("plain text", "is not complete XML"),
    ],
)
def test_a_faulty_feed_is_refused_with_what_is_wrong(tmp_path, text, message):
    with pytest.raises(InputError) as caught:
        read(tmp_path, text)
    assert message in str(caught.value)


def test_a_total_of_both_directions_is_left_aside_and_counted(tmp_path):
    text = feed(channel("01", 1, quarter_hours(4), kind()), channel("01", 2, quarter_hours(4), kind(flowDirection=20)))
    loaded = read(tmp_path, text)
    assert "channel not used" in rules(loaded)
    assert accounted(loaded)


@pytest.mark.slow
def test_a_year_is_read_four_times_faster_than_by_lxml():
    etree = pytest.importorskip("lxml.etree")
    text = feed(channel("01", 1, quarter_hours(35_040), kind())).encode()
    source = study({"unit": "Wh"}).readings[0]
    ratios = []
    for _ in range(3):
        begin = time.perf_counter()
        part, rows = read_espi(text, "a", source, [], [])
        ours = time.perf_counter() - begin
        assert rows == part.kw.size == 35_040
        begin = time.perf_counter()
        starts, values = [], []
        import io

        for _, element in etree.iterparse(io.BytesIO(text), tag="{http://www.w3.org/2005/Atom}IntervalReading"):
            for leaf in element.iter():
                if leaf.tag.endswith("}start"):
                    starts.append(int(leaf.text))
                elif leaf.tag.endswith("}value"):
                    values.append(int(leaf.text))
            element.clear()
        assert len(values) == len(starts) == 35_040
        ratios.append((time.perf_counter() - begin) / ours)
    print("lxml / ours", ratios)
    assert max(ratios) > 4.0
