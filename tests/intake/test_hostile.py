"""Files that are broken, or made to do harm: a message with the place and what to do, never a traceback."""

import gzip
import io
import random
import zipfile

import pytest

from loadsum.cli import main
from loadsum.errors import InputError
from tests.intake.studies import accounted, load, rules
from tests.intake.test_load import LONG


def zipped(**members: bytes) -> bytes:
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in members.items():
            archive.writestr(name, content)
    return packed.getvalue()


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("a.csv", b"", "a.csv: is empty"),
        ("a.csv", b"  \n\n", "a.csv: is empty"),
        ("a.csv", bytes(range(256)) * 8, "cannot be read as utf-8 text"),
        ("a.csv", b"\x00\x01\x02" * 50, "it holds zero bytes"),
        (
            "a.csv",
            LONG.replace("B", "Bj\xf8rn").encode("latin-1"),
            'state its encoding (for example encoding = "latin-1")',
        ),
        ("a.csv", b"\xef\xbb\xbf" + LONG.replace("B", "Bj\xf8rn").encode("latin-1"), "cannot be read as utf-8-sig"),
        ("a.csv", b"customer,time,kwh\n", "holds no table of readings"),
        ("a.csv", (",".join(f"c{n}" for n in range(1_000_000)) + "\n1\n").encode(), "more than 20000 columns"),
        (
            "a.csv",
            b"Meter export\nmade today\n" + LONG.encode(),
            "a.csv:3: has 3 fields where the lines before have 1; if the file begins with title lines, remove them",
        ),
        ("a.csv", b"time,A,A\n2031-01-01,1,2\n", "a.csv:1: two columns are called 'A'"),
        (
            "a.csv",
            LONG.replace("05:00,5", "05:00,5,7").encode("utf-16"),
            "a.csv:7: has 4 fields where the lines before have 3; if the file begins with title lines",
        ),
        ("a.csv", LONG.replace("2031", "0001").encode(), "a.csv:2: '0001-01-01T00:00' is no stamp of 1970 to 2100"),
        ("a.csv", LONG.replace("2031", "9999").encode(), "is no stamp of 1970 to 2100"),
        ("a.csv.gz", gzip.compress(LONG.encode())[:-20], "cannot be unpacked"),
        ("a.csv.gz", gzip.compress(b"0" * 80_000_000), "unpacks to more than 200 times its size"),
        ("a.zip", zipped(**{"x.csv": b"0" * 80_000_000}), "unpacks to more than 200 times its size"),
        ("a.zip", zipped(**{"../x.csv": LONG.encode()}), "holds a file that points outside it"),
        ("a.zip", zipped(**{"/etc/x.csv": LONG.encode()}), "holds a file that points outside it"),
        ("a.zip", zipped(), "holds no file"),
        ("a.zip", b"PK\x03\x04 nonsense", "cannot be unpacked"),
    ],
)
def test_a_harmful_file_is_refused_with_its_place(tmp_path, name, content, message):
    with pytest.raises(InputError) as caught:
        load(tmp_path, content, name)
    assert message in str(caught.value)


def test_the_command_ends_with_status_2_and_writes_nothing(tmp_path, capsys):
    (tmp_path / "a.csv").write_bytes(LONG.replace("2031", "9999").encode())
    (tmp_path / "study.toml").write_text(
        '[study]\ntitle = "t"\ntime_zone = "+00:00"\ndemand_interval_min = 60\n[[readings]]\nfiles = "a.csv"\n'
        'unit = "kWh"\nstamp = "start"\n[transformer]\nratings_kva = [25]\npower_factor = 0.9\n',
        encoding="utf-8",
    )
    assert main(["study", str(tmp_path / "study.toml"), "--out", str(tmp_path / "out"), "--quiet"]) == 2
    assert "a.csv:2" in capsys.readouterr().err
    assert not (tmp_path / "out").exists()


def test_values_of_no_believable_size_are_left_out_by_line(tmp_path):
    rows = "".join(
        f"C,2031-01-01T{n:02d}:00,{value}\n" for n, value in enumerate(("nan", "inf", "-inf", "1e308", "1,5", "x"))
    )
    loaded = load(tmp_path, LONG + rows.replace("1,5", '"1,5"'))
    (finding,) = [f for f in loaded.readings.findings if f.rule == "unreadable reading"]
    assert (finding.excluded, finding.place, finding.customer) == (6, "a.csv:50", "C")
    assert accounted(loaded)


def test_a_last_line_cut_short_is_said(tmp_path):
    loaded = load(tmp_path, LONG[:-12])
    assert {"unreadable stamp", "empty reading", "off the grid"} & rules(loaded) or accounted(loaded)
    assert accounted(loaded)


def test_stamps_with_and_without_an_offset_in_one_file_are_not_mixed(tmp_path):
    text = LONG.replace(":00,", ":00+02:00,") + "B,2031-01-02T00:00,5\n"
    loaded = load(tmp_path, text)
    (finding,) = [f for f in loaded.readings.findings if f.rule == "unreadable stamp"]
    assert finding.place == "a.csv:50"
    assert accounted(loaded)


def test_one_stray_date_far_away_does_not_fill_the_memory(tmp_path):
    many = "".join(f"C{n},1970-01-01T00:00,1\nC{n},2099-01-01T00:00,1\n" for n in range(400))
    with pytest.raises(InputError, match="stamps run from 1970-01-01 to 2099-01-01, too long for a table"):
        load(tmp_path, "customer,time,kwh\n" + many, minutes=60)


@pytest.mark.parametrize("seed", range(40))
@pytest.mark.parametrize("form", ["delimited text", "nem12", "espi", "workbook", "parquet"])
def test_random_damage_is_read_or_refused_and_nothing_else(tmp_path, seed, form):
    from tests.intake.readers import test_espi, test_nem12

    draw = random.Random(seed)
    whole = {
        "nem12": test_nem12.file(test_nem12.meter("E1"), test_nem12.day(*range(48))),
        "espi": test_espi.feed(test_espi.channel("01", 1, test_espi.quarter_hours(8), test_espi.kind())),
    }.get(form, LONG)
    content = bytearray(whole.encode())
    for _ in range(draw.randint(1, 6)):
        at = draw.randrange(len(content))
        content[at : at + draw.randint(0, 3)] = bytes(draw.randrange(256) for _ in range(draw.randint(0, 3)))
    try:
        load(tmp_path, bytes(content), "a.dat", format=form, minutes=0)
    except InputError as refusal:
        assert refusal.faults
