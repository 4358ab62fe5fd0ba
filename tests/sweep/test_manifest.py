import pytest

from flicker.errors import InputError, UnreadableFileError
from flicker.sweep.manifest import read_manifest, steps_from_names
from flicker.sweep.record import ITEMS, read_record


def manifest(tmp_path, text, encoding="utf-8"):
    path = tmp_path / "sweep.csv"
    path.write_bytes(text.encode(encoding))
    return path


@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
def test_reads_what_is_known_of_each_capture(tmp_path, delimiter):
    rows = [
        ("Capture", "unit", "level", "supply", "dark_level", "note"),
        ("day.csv", "unit 7", "100 %", "24 V DC", "0.012", "warm"),
        ("", "", "", "", "", ""),
        ("night/dim.wav", "unit 7", "5", "", "", ""),
    ]
    path = manifest(tmp_path, "\n".join(delimiter.join(row) for row in rows) + "\n")
    day, night = read_manifest(path)
    assert (day.capture, day.unit, day.level, day.supply) == (str(tmp_path / "day.csv"), "unit 7", 100.0, "24 V DC")
    assert (day.dark_level, day.note) == (0.012, "warm")
    assert (night.capture, night.level, night.dark_level) == (str(tmp_path / "night/dim.wav"), 5.0, None)
    assert night.to_dict() == {"unit": "unit 7", "level_percent": 5.0}


def test_a_decimal_comma_and_a_mark_of_byte_order_are_no_obstacle(tmp_path):
    (step,) = read_manifest(manifest(tmp_path, "capture;level\na.csv;2,5\n", "utf-8-sig"))
    assert step.level == 2.5


def test_a_field_between_quotes_may_hold_the_delimiter(tmp_path):
    (step,) = read_manifest(manifest(tmp_path, 'capture,note\na.csv,"warm, then cold"\n'))
    assert step.note == "warm, then cold"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "sweep.csv: is empty"),
        ("capture\n", "sweep.csv: lists no capture"),
        ("file,level\na.csv,5\n", "sweep.csv, line 1: no column is called 'file'"),
        ("capture,levels\na.csv,5\n", "sweep.csv, line 1: no column is called 'levels'; did you mean 'level'?"),
        ("level\n5\n", "sweep.csv, line 1: the column capture is missing"),
        ("capture,level\na.csv,5\n,7\n", "sweep.csv, line 3: the capture is missing"),
        ("capture,level\na.csv,bright\n", "sweep.csv, line 2: level: 'bright' is no number"),
        ("capture,level\na.csv,120\n", "sweep.csv, line 2: a level lies between 0 and 100 %, not 120"),
        ("capture,dark_level\na.csv,nan\n", "sweep.csv, line 2: dark_level: 'nan' is no number"),
        ("capture,level\na.csv,5,7\n", "sweep.csv, line 2: 3 fields, and the head line has 2"),
    ],
)
def test_a_broken_manifest_is_refused_with_line_and_reason(tmp_path, text, said):
    with pytest.raises(InputError, match="^" + said.replace("?", r"\?")):
        read_manifest(manifest(tmp_path, text))


def test_a_manifest_that_cannot_be_read_is_named(tmp_path):
    with pytest.raises(UnreadableFileError, match=r"nowhere.csv: cannot be read"):
        read_manifest(tmp_path / "nowhere.csv")
    with pytest.raises(UnreadableFileError, match="UTF-8"):
        read_manifest(manifest(tmp_path, "capture\nk\u00fcste.csv\n", "latin-1"))


@pytest.mark.parametrize(
    ("names", "levels"),
    [
        (["display-30pct.csv", "display-100pct.csv"], [30.0, 100.0]),
        (["a/lamp 2.5%.wav", "a/lamp 10%.wav"], [2.5, 10.0]),
        (["level_05.wav", "level_50.wav"], [5.0, 50.0]),
        (["dim-80-run2.csv", "dim-20-run2.csv"], [80.0, 20.0]),
        (["day.csv", "display-30pct.csv"], [None, None]),
        (["display-30pct.csv"], [None]),
        (["scope0012.csv", "scope0013.csv"], [None, None]),
        (["display-300pct.csv", "display-30pct.csv"], [None, None]),
    ],
)
def test_levels_come_from_names_only_where_every_name_carries_one(names, levels):
    assert [step.level for step in steps_from_names(names)] == levels
    assert [step.capture for step in steps_from_names(names)] == names


def test_a_record_keeps_the_order_of_a_report(tmp_path):
    path = tmp_path / "record.toml"
    path.write_text('operator = "deck officer"\nreport_id = "PS-12"\ntested = 2026-05-04\ntemperature = 21.5\n')
    assert list(read_record(path).items()) == [
        ("report_id", "PS-12"),
        ("tested", "2026-05-04"),
        ("operator", "deck officer"),
        ("temperature", 21.5),
    ]
    assert {"laboratory", "customer", "item", "deviations", "authorised_by"} <= set(ITEMS)  # ISO/IEC 17025:2017, 7.8.2


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('\noperater = "me"\n', "record.toml, line 2: no item is called 'operater'; did you mean 'operator'"),
        ("operator = true\n", "record.toml, line 1: operator: must be a text, a number or a date, not True"),
        ('item = "a"\n\n[dimmer]\nlevel = 5\n', "record.toml, line 3: dimmer: must be a text"),
        ("temperature = inf\n", "record.toml, line 1: temperature: must be a finite number"),
        ("operator = me\n", "record.toml: no TOML"),
    ],
)
def test_a_broken_record_is_refused_with_line_and_reason(tmp_path, text, said):
    (tmp_path / "record.toml").write_text(text)
    with pytest.raises((InputError, UnreadableFileError), match=said):
        read_record(tmp_path / "record.toml")
