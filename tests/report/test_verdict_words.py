import pytest

from flicker.light import pwm_light
from flicker.limits import Limit, Verdict, all_rows, known_limits, margin
from flicker.report.margin import column_notes, margin_words
from flicker.report.results import Spool, table_head, table_rows, table_text
from flicker.report.sweep import sweep_headline, sweep_words
from flicker.report.verdicts import allowance_words, cures, limits_words, verdict_words
from flicker.sweep.course import Point
from flicker.tunable import TunableLight

LIMITS = known_limits()
LOW_RISK, SVM = LIMITS["ieee1789-low-risk"], LIMITS["eu-2019-2020-svm"]
FAIL = Verdict(LOW_RISK, "fail", 50.0, 49.5, 50.5, 9.6, 120.0, "family")
OPEN = Verdict(SVM, "undecided", bound=0.4, reason="at least 1 s is needed, and the capture has 0.4 s: record longer")
PASS = Verdict(LOW_RISK, "pass", 1.0, 0.9, 1.1, 9.6, 120.0, "line")


def test_the_answer_comes_first_and_fails_before_the_rest():
    lines = verdict_words("lamp.csv", [PASS, OPEN, FAIL], ["To keep it: dim it."]).splitlines()
    assert lines[0] == "lamp.csv: FAIL, breaks 1 of 3 limits"
    assert lines[1] == "  To keep it: dim it."
    assert [line.split()[0] for line in lines[3:] if line[:1].strip()][:4] == ["verdict", "FAIL", "UNDECIDED", "pass"]
    table = "\n".join(lines)
    for part in ("50.00 % (± 0.50) at 120 Hz", "line of 1.00 %", "≤ 9.6 %", "-421 %", "+90 %", "≤ 0.4"):
        assert part in table, part


@pytest.mark.parametrize(
    ("verdicts", "headline"),
    [
        ([PASS], "PASS, keeps the limit"),
        ([PASS, PASS], "PASS, keeps all 2 limits"),
        ([OPEN], "UNDECIDED, cannot be decided for the limit"),
        ([PASS, OPEN], "UNDECIDED, cannot be decided for 1 of 2 limits"),
        ([Verdict(SVM, "not-applicable", reason="full load")], "NOT APPLICABLE, no limit holds for this capture"),
        ([PASS, Verdict(SVM, "not-applicable", reason="full load")], "PASS, keeps the limit"),
    ],
)
def test_the_headline_says_how_many(verdicts, headline):
    assert verdict_words("a", verdicts).splitlines()[0] == f"a: {headline}"


def test_a_cure_is_rounded_to_the_safe_side():
    found = {"limit": "x", "to_pass": {"least_frequency_hz": 1234.5, "ripple_factor": 2.0301, "ripple_db": 6.15}}
    assert cures([found]) == ["To keep x: raise the frequency to 1240 Hz or shrink the modulation 2.04-fold (6.15 dB)."]
    assert cures([{"limit": "x"}]) == []


@pytest.mark.parametrize("width", [60, 80, 100])
@pytest.mark.parametrize("detailed", [False, True])
def test_the_list_of_limits_fits_the_terminal(width, detailed):
    text = limits_words(all_rows(), detailed=detailed, width=width)
    assert max(map(len, text.splitlines())) <= width


def test_allowances_are_spelled_out():
    assert allowance_words(SVM) == "SVM ≤ 0.4"
    assert allowance_words(LIMITS["california-ja8-below-200hz"]) == "percent flicker below 200 Hz < 30 %"
    assert allowance_words(LIMITS["ieee1789-seizure"]) == "modulation ≤ 5 % below 90 Hz"
    own = Limit("a", "a", "flicker_index", 0.1, "1", "all", "t", "s", "b")
    assert allowance_words(own) == "flicker index ≤ 0.1"


def test_a_margin_says_the_one_change_that_keeps_all():
    light = TunableLight.typed(pwm_light(240.0, 0.5).channels[0])
    margins = [margin(LIMITS[name], light, "fail") for name in ("ieee1789-low-risk", "ieee1789-no-effect")]
    words = margin_words("lamp", light, margins)
    assert words.splitlines()[0] == "lamp: 240 Hz, percent flicker 100 %"
    assert "To keep the 2 broken limits: raise the frequency to 3000 Hz or shrink the modulation 16-fold" in words
    assert "reservoir" not in words + column_notes(margins)


def test_mains_ripple_has_no_frequency_to_raise_but_a_reservoir():
    light = TunableLight.typed(pwm_light(100.0, 0.5, 0.6).channels[0])
    margins = [margin(LOW_RISK, light, "fail")]
    words = margin_words("lamp", light, margins)
    assert "raise the frequency" not in words
    assert "× 4.11" in words
    assert "single-stage converter" in " ".join(column_notes(margins).split())


def test_of_very_many_captures_the_worst_are_shown():
    points = [
        Point(f"{n}.csv", "light", "", None, 1.0, 120.0, 5.0, None, "low-risk", "fail" if n == 77 else "pass", 1.0, "x")
        for n in range(100)
    ]
    lines = sweep_words(points, [("torn.csv", "torn.csv: is empty")]).splitlines()
    assert lines[0] == "FAIL: of 100 captures, 1 breaks a limit, 99 keep every limit, 1 more could not be read"
    assert "the 60 worst of 100" in lines[1]
    assert "77.csv" in lines[4]
    assert lines[-1] == "  not read: torn.csv: is empty"


def test_results_are_one_object_however_many_come():
    import json

    for count in (0, 1, 3):
        spool = Spool()
        for number in range(count):
            spool.add({"capture": {"path": f"ä-{number}.csv"}, "channels": [{"value": None}]})
        text = b"".join(spool.pieces({"format": "flicker-report"}, {"verdict": "pass", "record": {}})).decode()
        spool.close()
        data = json.loads(text)
        assert list(data) == ["format", "captures", "verdict", "record"]
        assert [one["capture"]["path"] for one in data["captures"]] == [f"ä-{number}.csv" for number in range(count)]
        if count:
            assert text == json.dumps(data, ensure_ascii=False, indent=2) + "\n"


def test_a_row_of_the_table_has_a_field_for_every_column():
    head = table_head(["x"])
    torn = {"capture": {"path": "torn.csv"}, "error": "torn.csv: is empty, it seems"}
    (row,) = table_rows(torn, ["x"], [])
    assert len(row) == len(head)
    assert table_text(head, [row]).splitlines()[1].endswith('"torn.csv: is empty, it seems"')


def test_a_pass_beside_a_capture_that_cannot_be_read_is_no_pass():
    assert sweep_headline([], [("torn.csv", "is empty")]).startswith("NOTHING JUDGED")
    points = [Point("lamp.csv", "light", "", None, 1.0, 120.0, 5.0, None, "low-risk", "pass", 1.0, "x")]
    assert sweep_headline(points, []) == "PASS: of 1 capture, 1 keeps every limit"
    incomplete = "INCOMPLETE: of 1 capture, 1 keeps every limit, 1 more could not be read"
    assert sweep_headline(points, [("torn.csv", "torn.csv: is empty")]) == incomplete
