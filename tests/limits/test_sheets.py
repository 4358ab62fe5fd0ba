import datetime
import re
from pathlib import Path

import pytest

from flicker.errors import InputError, UnreadableFileError
from flicker.limits import all_rows, chosen_limits, default_limits, judge, known_limits
from flicker.limits.limit import MODULATION, UNITS
from flicker.metrics import METRICS
from flicker.results import Measure

GOOD = """\
title  = "House rule of the pilot station"
source = "standing order 12"
basis  = "text seen"

[[limit]]
id      = "bridge-display-depth"
measure = "percent_flicker"
at_most = 40
clause  = "paragraph 3"
applies = "displays on the bridge at night"

[[limit]]
id      = "chart-table-modulation"
measure = "modulation"
clause  = "paragraph 4"
applies = "lamps at the chart table"

[[limit.band]]
to_hz = 200
at_most = 5

[[limit.band]]
from_hz = 200
to_hz = 2000
at_most_per_hz = "1/20"
"""


def sheet(tmp_path, text):
    path = tmp_path / "house.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_every_row_built_in_says_what_it_rests_on():
    for limit in all_rows():
        assert limit.measure in UNITS
        for text in (limit.name, limit.clause, limit.applies, limit.title, limit.source, limit.basis):
            assert text.strip(), limit.id
        assert any(word in limit.basis for word in ("memory", "public", "text seen")), f"{limit.id}: {limit.basis}"
        assert limit.begins is not None, limit.id


def test_the_three_practices_are_known_by_their_ids():
    assert {"ieee1789-low-risk", "ieee1789-no-effect", "ieee1789-seizure"} <= set(known_limits())


@pytest.mark.parametrize(
    ("day", "bound"),
    [
        # (EU) 2019/2020 as amended by (EU) 2021/341, read in public excerpts: 0.9 until the end of August 2024
        ("2021-08-31", None),
        ("2021-09-01", 0.9),
        ("2024-08-31", 0.9),
        ("2024-09-01", 0.4),
        (datetime.date(2030, 1, 1), 0.4),
        (None, 0.4),
    ],
)
def test_the_limit_in_force_follows_the_day(day, bound):
    limit = known_limits(on_date=day).get("eu-2019-2020-svm")
    assert (limit.bound if limit else None) == bound


def test_without_a_day_only_what_is_in_force_is_applied():
    assert all(limit.until is None for limit in default_limits())
    assert len({limit.id for limit in default_limits()}) == len(default_limits())


def test_a_limit_named_before_its_time_says_when_it_applied():
    with pytest.raises(InputError, match=r"did not apply on 2020-01-01, only from 2021-09-01 until 2024-08-31"):
        chosen_limits(["eu-2019-2020-svm"], on_date="2020-01-01")


def test_an_unknown_limit_is_answered_with_the_nearest():
    with pytest.raises(InputError, match="did you mean 'ieee1789-low-risk'"):
        chosen_limits(["ieee1789-lowrisk"])


def test_a_date_that_is_none_is_refused():
    with pytest.raises(InputError, match="'yesterday' is no date: write it as 2024-09-01"):
        known_limits(on_date="yesterday")


def test_a_sheet_of_ones_own_stands_beside_those_built_in(tmp_path):
    known = known_limits(sheet(tmp_path, GOOD))
    assert known["bridge-display-depth"].bound == 40.0
    assert known["chart-table-modulation"].bound.at(400.0) == pytest.approx(20.0)
    assert "ieee1789-low-risk" in known


BROKEN = [
    ('title  = "House', "title  = House", UnreadableFileError, "house.toml: no TOML: .*line 1"),
    ('source = "standing order 12"\n', "", InputError, "line 1: source: is missing"),
    (
        'measure = "percent_flicker"',
        'measure = "percent_flick"',
        InputError,
        "line 7: measure: no measure .*'percent_flicker'",
    ),
    (
        'measure = "percent_flicker"',
        'measures = "percent_flicker"',
        InputError,
        "line 7: no key is called 'measures'; did",
    ),
    ("at_most = 40", "at_most = true", InputError, "line 8: at_most: must be a number from 0 up, not True"),
    ("at_most = 40", 'at_most = "forty"', InputError, "line 8: at_most: must be a number or a fraction"),
    ("at_most = 40", "at_most = -1", InputError, "line 8: at_most: must be a number from 0 up"),
    ("at_most = 40", "at_most = nan", InputError, "line 8: at_most: must be a number from 0 up"),
    ("at_most = 40", "at_most = 40\nbelow = 30", InputError, "line 6: id: a limit needs exactly one of"),
    ("at_most = 40", "", InputError, "line 6: id: a limit needs exactly one of"),
    ("at_most = 40", "at_most = 40\nfrom = 2024", InputError, "line 9: from: must be a date like 2024-09-01"),
    (
        "at_most = 40",
        "at_most = 40\nfrom = 2024-09-01\nuntil = 2023-01-01",
        InputError,
        "line 10: until: ends on 2023-01-01, before it begins",
    ),
    ("at_most = 40", "at_most = 40\nlevels_percent = [120]", InputError, "line 9: levels_percent: must be a list"),
    ("at_most = 40", 'at_most = 40\nmains_only = "yes"', InputError, "line 9: mains_only: must be true or false"),
    ('clause  = "paragraph 3"', 'clause  = " "', InputError, "line 9: clause: must be a text that says something"),
    ('"bridge-display-depth"', '"Bridge display"', InputError, "line 6: id: 'Bridge display' must be small letters"),
    (
        '"chart-table-modulation"',
        '"bridge-display-depth"',
        InputError,
        "line 13: id: 'bridge-display-depth' stands twice",
    ),
    (
        '"chart-table-modulation"',
        '"ieee1789-low-risk"',
        InputError,
        "'ieee1789-low-risk' is the id of a limit built in",
    ),
    ('measure = "modulation"', 'measure = "svm"', InputError, "line 14: measure: 'svm' has no frequency of its own"),
    ("to_hz = 200\n", "to_hz = 0\n", InputError, "line 19: to_hz: a band cannot run from 0 Hz to 0 Hz"),
    ("from_hz = 200", "from_hz = 150", InputError, "line 23: from_hz: starts at 150 Hz, inside the band before"),
    ('at_most_per_hz = "1/20"', "", InputError, "line 22: at_most: a band needs exactly one of"),
    ('at_most_per_hz = "1/20"', 'at_most_per_hz = "1/0"', InputError, "line 25: at_most_per_hz: must be a number or"),
]


@pytest.mark.parametrize(("old", "new", "error", "said"), BROKEN)
def test_a_broken_sheet_is_refused_with_line_and_reason(tmp_path, old, new, error, said):
    assert old in GOOD
    with pytest.raises(error, match=said):
        known_limits(sheet(tmp_path, GOOD.replace(old, new, 1)))


def test_a_sheet_that_cannot_be_read_is_named(tmp_path):
    with pytest.raises(UnreadableFileError, match=r"nowhere.toml: cannot be read: No such file"):
        known_limits(tmp_path / "nowhere.toml")
    (tmp_path / "bytes.toml").write_bytes(b"title = '\xff'")
    with pytest.raises(UnreadableFileError, match=r"bytes.toml: a sheet of limits is UTF-8 text"):
        known_limits(tmp_path / "bytes.toml")
    with pytest.raises(InputError, match="at least one"):
        known_limits(sheet(tmp_path, 'title = "a"\nsource = "b"\nbasis = "c"\n'))


def test_the_sheet_in_the_method_note_is_accepted(tmp_path):
    note = Path(__file__).resolve().parents[2] / "docs" / "methods" / "verdicts.md"
    (text,) = re.findall(r"^```toml\n(.*?)^```", note.read_text(encoding="utf-8"), re.M | re.S)
    known = known_limits(sheet(tmp_path, text))
    assert known["bridge-display-depth"].bound == 40.0
    assert known["chart-table-modulation"].bound.at(1000.0) == pytest.approx(50.0)


def test_a_level_in_decibels_may_be_negative(tmp_path):
    text = GOOD.replace('"percent_flicker"', '"display_flicker_level"').replace("at_most = 40", "at_most = -30")
    limit = known_limits(sheet(tmp_path, text))["bridge-display-depth"]
    assert (limit.bound, limit.unit) == (-30.0, "dB")
    level = {"display_flicker_level": Measure(-36.0, "dB", -36.1, -35.9)}
    verdict = judge(limit, level, (), ())
    assert (verdict.verdict, verdict.margin) == ("pass", 20.0)


def test_every_measure_that_can_be_limited_is_one_that_is_taken():
    taken = {name: metric.unit for name, metric in METRICS.items()}
    assert {name: unit for name, unit in UNITS.items() if name != MODULATION}.items() <= taken.items()
