"""One light in every dialect that instruments and spreadsheets write: the same readings at the same times."""

import dataclasses

import numpy as np
import pytest

from flicker.errors import InputError, UnreadableFileError
from flicker.readers import read
from flicker.trace import Segment

RATE = 20_000.0
ROWS = 3000


def light_at(times):
    """A bridge display's light: 239.7 Hz with a second harmonic, between 0.2 V and 1.43 V."""
    phase = 2 * np.pi * 239.7 * np.asarray(times)
    return 1.0 + 0.6 * np.sin(phase) + 0.2 * np.cos(2 * phase)


TIMES = np.arange(ROWS) / RATE
LIGHT = light_at(TIMES)


def rows(line="{t:.6f},{y:.6f}", times=TIMES, light=LIGHT, scale=1.0):
    return [line.format(t=t * scale, y=y, i=i) for i, (t, y) in enumerate(zip(times, light, strict=True))]


def joined(*lines, end="\n"):
    return end.join(part for line in lines for part in ([line] if isinstance(line, str) else line)) + end


def comma(lines):
    return [line.replace(".", ",") for line in lines]


HEAD = "Time (s),light (V)"
PLAIN = joined(HEAD, rows())
FACTS = [f"Fact {number},some words {number}" for number in range(20)]

# name: (file's content, options, codes of notes that must be there)
DIALECTS = {
    "plain": (PLAIN, {}, ()),
    "no head": (joined(rows()), {}, ("time-unit-assumed",)),
    "long head": (joined(FACTS, "Record length,3000", "Sample interval,5.0e-05,s", "", HEAD, rows()), {}, ()),
    "comments #": (joined("# pilot station, bridge", "# lamp: radar display", "# " + HEAD, rows()), {}, ()),
    "comments %": (joined("% pilot station", "%" + HEAD, rows()), {}, ()),
    "comments ;": (joined("; pilot station", "; taken at night", HEAD, rows()), {}, ()),
    "names above values": (
        joined("pilot station", "", "Points,Sample rate (Hz),Channels", "3000,20000,1", "light [V]", rows("{y:.6f}")),
        {},
        (),
    ),
    "start and increment beside names": (
        joined("X,CH1,Start,Increment,", "Sequence,Volt,0.0,5.0e-05,", rows("{i},{y:.5e},")),
        {},
        (),
    ),
    "units in the second row": (joined("Time,light", "s,V", rows()), {}, ()),
    "bracketed units in the second row": (joined("Time,light", "(ms),(V)", "", rows(scale=1e3)), {}, ()),
    "three rows of head": (joined("Time,light", "ms,V", "clock,radar display", rows(scale=1e3)), {}, ()),
    "units after in": (joined("in ms,in V", rows(scale=1e3)), {}, ()),
    "milliseconds": (joined("Time [ms],light [V]", rows("{t:.3f},{y:.6f}", scale=1e3)), {}, ()),
    "microseconds": (joined("Time (us),light (V)", rows("{t:.0f},{y:.6f}", scale=1e6)), {}, ()),
    "microseconds in Latin-1": (
        joined("Time (µs);light (V)", rows("{t:.0f};{y:.6f}", scale=1e6)).encode("latin-1"),
        {},
        (),
    ),
    "microseconds in UTF-8": (joined("t/µs;light/V", rows("{t:.0f};{y:.6f}", scale=1e6)), {}, ()),
    "nanoseconds": (joined("Time (ns),light (V)", rows("{t:.0f},{y:.6f}", scale=1e9)), {}, ()),
    "unit that the rate reveals": (
        joined("Sample rate: 20 kHz", "Time,light", rows(scale=1e3)),
        {},
        ("time-unit-assumed",),
    ),
    "interval": (joined("Sample interval: 50 us", "light (V)", rows("{y:.6f}")), {}, ()),
    "interval in its key": (joined("dt [us],50", "light (V)", rows("{y:.6f}")), {}, ()),
    "interval with decimal comma": (joined("Interval;5,0E-5;s", "light (V)", comma(rows("{y:.6f}"))), {}, ()),
    "rate in kHz": (joined("Sampling rate = 20 kHz", "light (V)", rows("{y:.6f}")), {}, ()),
    "rate in MS/s": (joined("Sample Rate,0.02 MS/s", "light (V)", rows("{y:.6f}")), {}, ()),
    "rate in kSa/s": (joined("# Sampling frequency: 20 kSa/s", "# light (V)", rows("{y:.6f}")), {}, ()),
    "rate in the key's name": (joined("# sample_rate_hz: 20000", "light [V]", rows("{y:.6f}")), {}, ()),
    "first and last time": (joined("First time,0.0", f"Last time,{TIMES[-1]:.6f}", "light", rows("{y:.6f}")), {}, ()),
    "rate from the option": (joined("light (V)", rows("{y:.6f}")), {"sample_rate": RATE}, ()),
    "index and rate": (joined("Sample rate,20000,Hz", "No,light (V)", rows("{i},{y:.6f}")), {}, ()),
    "index and time": (joined("No,Time (s),light (V)", rows("{i},{t:.6f},{y:.6f}")), {}, ()),
    "index without a name, and rate": (joined(rows("{i},{y:.6f}")), {"sample_rate": RATE}, ()),
    "empty first column": (joined("," + HEAD, rows(",{t:.6f},{y:.6f}")), {}, ()),
    "semicolon and decimal comma": (joined("Time (s);light (V)", comma(rows("{t:.6f};{y:.6f}"))), {}, ()),
    "tab and decimal comma": (joined("Time (s)\tlight (V)", comma(rows("{t:.6f}\t{y:.6f}"))), {}, ()),
    "decimal comma and comma": (joined("Time (s),light (V)", comma(rows("{t:.6f},{y:.6f}"))), {}, ()),
    "decimal comma and comma, exponents": (joined("Time (s),light (V)", comma(rows("{t:.6e},{y:.6e}"))), {}, ()),
    "decimal comma alone": (joined("Sample rate: 20000 Hz", "light (V)", comma(rows("{y:.6f}"))), {}, ()),
    "tabs": (joined("Time (s)\tlight (V)", rows("{t:.6f}\t{y:.6f}")), {}, ()),
    "blanks": (joined("Time (s)   light (V)", rows("{t:12.6f}   {y:10.6f}")), {}, ()),
    "blanks, decimal comma": (joined("Time (s)   light (V)", comma(rows("{t:12.6f} {y:10.6f}"))), {}, ()),
    "bars": (joined("Time (s)|light (V)", rows("{t:.6f}|{y:.6f}")), {}, ()),
    "padded cells": (joined(HEAD, rows("{t:12.6f},{y:12.6f}")), {}, ()),
    "padded after the comma": (joined("Time (s), light (V)", rows("{t:.6f}, {y:.6f}")), {}, ()),
    "quotes": (joined('"Time (s)","light (V)"', rows('"{t:.6f}","{y:.6f}"')), {}, ()),
    "quotes and decimal comma": (
        joined('"Time (s)","light (V)"', [line.replace(".", ",") for line in rows('"{t:.6f}";"{y:.6f}"')]),
        {},
        (),
    ),
    "quotes, decimal comma, comma": (
        joined('"Time (s)","light (V)"', [line.replace(".", ",") for line in rows('"{t:.6f}","{y:.6f}"')]),
        {},
        (),
    ),
    "trailing delimiter": (joined(HEAD + ",", rows("{t:.6f},{y:.6f},")), {}, ()),
    "several trailing delimiters": (joined(HEAD, rows("{t:.6f},{y:.6f},,,")), {}, ()),
    "footer": (joined(HEAD, rows(), "", "End of record", "Checksum,7f3a"), {}, ()),
    "blank lines": (joined(HEAD, "", [part for line in rows() for part in (line, "")]), {}, ()),
    "lines of delimiters": (joined(HEAD, rows(), ",", ",", ","), {}, ()),
    "CRLF": (joined(HEAD, rows(), end="\r\n"), {}, ()),
    "CR alone": (joined(HEAD, rows(), end="\r"), {}, ()),
    "UTF-8 with mark": (PLAIN.encode("utf-8-sig"), {}, ()),
    "UTF-16 little end first": (b"\xff\xfe" + PLAIN.encode("utf-16-le"), {}, ()),
    "UTF-16 big end first": (b"\xfe\xff" + PLAIN.encode("utf-16-be"), {}, ()),
    "UTF-16 without mark": (PLAIN.encode("utf-16-le"), {}, ()),
    "NUL tail": (PLAIN.encode() + b"\x00" * 5000, {}, ()),
    "Control-Z": (PLAIN.encode() + b"\x1a", {}, ()),
    "no last line end": (PLAIN.rstrip(), {}, ()),
    "capital exponents": (joined(HEAD, rows("{t:.6E},{y:.6E}")), {}, ()),
    "signs everywhere": (joined(HEAD, rows("{t:+.6E},{y:+.6e}")), {}, ()),
    "Fortran exponents": (joined(HEAD, [line.replace("e", "D") for line in rows("{t:.6e},{y:.6e}")]), {}, ()),
    "zeros in front": (joined(HEAD, rows("{t:015.6f},{y:+010.6f}")), {}, ()),
    "no zero before the point": (joined(HEAD, [line.replace("0.", ".") for line in rows("{t:.6f},{y:.6f}")]), {}, ()),
    "shortest spelling": (joined(HEAD, rows("{t!r},{y!r}", times=TIMES.tolist(), light=LIGHT.tolist())), {}, ()),
    "eighteen decimals": (joined(HEAD, rows("{t:.18e},{y:.18e}")), {}, ()),
    "general format": (joined(HEAD, rows("{t:.6g},{y:.6g}")), {}, ()),
    "rounded times": (joined(HEAD, rows("{t:.3f},{y:.6f}")), {}, ("rounded-time",)),
    "rounded times, short mantissa": (joined(HEAD, rows("{t:.3e},{y:.6f}")), {}, ("rounded-time",)),
    "head disagrees": (joined("Sample rate,40000,Hz", HEAD, rows()), {}, ("rate-disagrees",)),
    "text column": (joined("state,Time (s),light (V),remark", rows("run,{t:.6f},{y:.6f},ok")), {}, ()),
    "date beside": (joined("Date,Time (s),light (V)", rows("2026-12-01 22:00:{i:06d},{t:.6f},{y:.6f}")), {}, ()),
    "column by name": (
        joined("Time (s),temperature,light (V)", rows("{t:.6f},21.5,{y:.6f}")),
        {"columns": ["light"]},
        (),
    ),
    "column by number": (
        joined(rows("{y:.6f},{t:.6f},3")),
        {"columns": ["1"], "time_column": "2"},
        ("time-unit-assumed",),
    ),
}


@pytest.fixture
def written(tmp_path):
    def write(content, name="capture.csv"):
        path = tmp_path / name
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return path

    return write


def assert_same_light(trace, *, start=0.0, tolerance=2e-5, rate=RATE, rate_tolerance=1e-6):
    assert trace.sample_rate == pytest.approx(rate, rel=rate_tolerance)
    assert trace.start == pytest.approx(start, abs=0.02 / rate)
    assert np.abs(trace.light - light_at(trace.times())).max() < tolerance + 0.02 * 2 * np.pi * 239.7 / rate


@pytest.mark.parametrize("name", DIALECTS)
def test_every_dialect_gives_the_same_light(written, name):
    content, options, codes = DIALECTS[name]
    capture = read(written(content), **options)
    (trace,) = capture.traces
    assert trace.samples == ROWS
    if "rounded-time" in codes:
        assert_same_light(trace, rate_tolerance=1e-4, tolerance=0.01)
    else:
        assert_same_light(trace)
    assert {note.code for note in trace.notes} == set(codes)
    named = "light" in (content if isinstance(content, str) else "light")
    assert trace.name == ("CH1" if name.startswith("start and") else "light") or not named
    if "rounded-time" not in codes:
        assert any(f"{RATE:.8g} Hz" in line for line in trace.history), trace.history


def test_the_head_is_believed_where_rounded_steps_were_added_up(written):
    times = np.arange(ROWS) / 30e6
    light = light_at(times * 1000)
    lines = [f"{i * 33:d},{y:.6f}" for i, y in enumerate(light)]  # 33.33 ns in whole nanoseconds
    (trace,) = read(written(joined("Sample rate,30,MS/s", "Time (ns),light (V)", lines))).traces
    assert trace.sample_rate == 30e6
    assert trace.times() == pytest.approx(times, abs=1e-12)
    assert [note.code for note in trace.notes] == ["rate-disagrees"]


def test_side_by_side_metadata(written):
    side = ["Record Length,3.0e+03,", "Sample Interval,5.0e-05,", ",,", "Vertical Units,V,", "Model,pilot scope,"]
    body = rows(",{t:18.12f},{y:10.5f},")
    content = joined([(side[i] if i < len(side) else ",,") + line for i, line in enumerate(body)])
    (trace,) = read(written(content)).traces
    assert trace.unit == "V"
    assert trace.samples == ROWS
    assert_same_light(trace, tolerance=1e-5)


def test_several_channels_keep_their_names_and_units(written):
    content = joined("Time (ms);radar;chart lamp", "ms;V;mV", comma(rows("{t:.3f};{y:.6f};{i}", scale=1e3)))
    radar, lamp = read(written(content)).traces
    assert (radar.name, radar.unit, lamp.name, lamp.unit) == ("radar", "V", "chart lamp", "mV")
    assert_same_light(radar)
    assert np.array_equal(lamp.light, np.arange(ROWS))


def test_min_max_pairs_give_their_mean_and_a_note(written):
    pairs = [f"{t:.6f},{y + side * 0.01:.6f}" for t, y in zip(TIMES, LIGHT, strict=True) for side in (-1, 1)]
    (trace,) = read(written(joined(HEAD, pairs))).traces
    assert [note.code for note in trace.notes] == ["min-max-pairs"]
    assert trace.samples == ROWS
    assert_same_light(trace)


def test_gaps_split_a_trace_at_its_true_times(written):
    kept = np.r_[0:1000, 1300:2000, 2001:3000]
    (trace,) = read(written(joined(HEAD, rows(times=TIMES[kept], light=LIGHT[kept])))).traces
    assert [segment.first for segment in trace.segments] == [0, 1000, 1700]
    assert [segment.start for segment in trace.segments] == pytest.approx([0, 1300 / RATE, 2001 / RATE])
    assert [note.code for note in trace.notes] == ["gap"]
    assert_same_light(trace)


def test_a_damaged_row_becomes_a_gap_with_and_without_times(written):
    for content, options in ((joined(HEAD, rows()), {}), (joined("light", rows("{y:.6f}")), {"sample_rate": RATE})):
        lines = content.split("\n")
        lines[1500] = lines[1500].replace(".", "?")
        (trace,) = read(written("\n".join(lines)), **options).traces
        assert [segment.first for segment in trace.segments] == [0, 1499]
        assert_same_light(trace)


def test_segments_with_true_times(written):
    kept = np.concatenate([np.arange(500) + 2500 * part for part in range(4)]) / RATE
    parts = np.split(np.arange(2000), 4)
    lines = [
        [f"Segment {k}", "Time,light", "s,V", *rows(times=kept[p], light=light_at(kept[p]))]
        for k, p in enumerate(parts)
    ]
    (trace,) = read(written(joined(*lines))).traces
    assert [segment.first for segment in trace.segments] == [0, 500, 1000, 1500]
    assert [note.code for note in trace.notes] == ["segments"]
    assert_same_light(trace)


def test_segments_whose_times_start_anew_are_not_joined(written):
    lines = [["Time (s),light (V)", *rows(times=TIMES[:count], light=LIGHT[:count])] for count in (700, 1000, 700)]
    (trace,) = read(written(joined(*lines))).traces
    assert trace.samples == 1000
    assert trace.segments[0].start == 0
    assert [note.code for note in trace.notes] == ["segments"]
    assert_same_light(trace)


def test_rows_out_of_order_are_sorted_by_time(written):
    order = np.random.default_rng(5).permutation(ROWS)
    (trace,) = read(written(joined(HEAD, rows(times=TIMES[order], light=LIGHT[order])))).traces
    assert [note.code for note in trace.notes] == ["reordered"]
    assert_same_light(trace)


def test_interleaved_channels_are_refused(written):
    lines = [f"{t:.6f},{value}" for t in TIMES for value in (f"{light_at(t):.5f}", "0.7", "0.3")]
    lines = np.random.default_rng(1).permutation(lines).tolist()
    with pytest.raises(InputError, match="interleaved"):
        read(written(joined(HEAD, lines)))


def test_a_single_misprinted_time_is_mended(written):
    times = TIMES.copy()
    times[1200] = 0.0
    (trace,) = read(written(joined(HEAD, rows(times=times)))).traces
    assert [note.code for note in trace.notes] == ["mended-times"]
    assert_same_light(trace)


def test_uneven_times_are_interpolated_and_said(written):
    times = TIMES + np.random.default_rng(2).uniform(-0.3, 0.3, ROWS) / RATE
    (trace,) = read(written(joined(HEAD, rows("{t:.9f},{y:.6f}", times=times, light=light_at(times))))).traces
    assert [note.code for note in trace.notes] == ["uneven-time"]
    assert np.abs(trace.light - light_at(trace.times())).max() < 0.01


@pytest.mark.parametrize(
    "mark",
    [
        "9.9E+37",
        "9.99999999e+37",
        "Inf",
        "inf",
        "OL",
        "O.L",
        "+OVLD",
        "****",
        "---",
        "NaN",
        "",
        "1.#INF",
        "#####",
        ">>>",
    ],
)
def test_overload_marks_count_as_clipped(written, mark):
    highest = LIGHT > 1.35
    lines = [f"{t:.6f},{mark if high else f'{y:.6f}'}" for t, y, high in zip(TIMES, LIGHT, highest, strict=True)]
    (trace,) = read(written(joined(HEAD, lines))).traces
    (note,) = trace.notes
    assert note.code == "clipped"
    assert str(int(highest.sum())) in note.message
    assert "percent_flicker" in note.voids
    assert "fundamental_frequency" not in note.voids
    assert trace.light[highest] == pytest.approx(LIGHT[~highest].max(), abs=1e-6)
    assert trace.light[~highest] == pytest.approx(LIGHT[~highest], abs=1e-6)


@pytest.mark.parametrize("mark", ["-9.9E+37", "-Inf", "-OL", "under", "---", "****"])
def test_overload_below_takes_the_lower_rail(written, mark):
    lowest = LIGHT < 0.4
    lines = [f"{t:.6f},{mark if low else f'{y:.6f}'}" for t, y, low in zip(TIMES, LIGHT, lowest, strict=True)]
    (trace,) = read(written(joined(HEAD, lines))).traces
    assert trace.light[lowest] == pytest.approx(LIGHT[~lowest].min(), abs=1e-6)


def test_raw_counts_are_scaled_where_the_head_says_how(written):
    counts = np.round(LIGHT * 100) + 7
    content = joined(
        "ymult,0.01", "yoff,7", "yzero,0", "Vertical units,V", "dt,5e-5", "counts", [f"{c:.0f}" for c in counts]
    )
    (trace,) = read(written(content)).traces
    assert trace.light == pytest.approx(np.round(LIGHT * 100) / 100)


@pytest.mark.parametrize(("unit", "scale"), [("s", 1), ("ms", 1e3), ("us", 1e6), ("ns", 1e9)])
def test_times_since_1970_count_from_the_first_row(written, unit, scale):
    ticks = [f"{(1_764_626_400 + 2 * i) * scale:.0f},{y:.6f}" for i, y in enumerate(LIGHT)]  # one reading in 2 s
    (trace,) = read(written(joined("timestamp,light", ticks))).traces
    assert trace.sample_rate == pytest.approx(0.5, rel=1e-9)
    assert trace.start == 0.0
    assert unit in trace.notes[0].message


@pytest.mark.parametrize(
    "line",
    [
        "{clock},{y:.6f}",
        "2026-12-{day:02d} {clock},{y:.6f}",
        "{day:02d}.12.2026 {clock};{y:.6f}",
        "2026-12-{day:02d} {clock} {y:.6f}",
        '"2026-12-{day:02d}T{clock}Z","{y:.6f}"',
        "2026-12-{day:02d}T{clock}+01:00,{y:.6f}",
        "12/{day:02d}/2026 {twelve},{y:.6f}",
    ],
)
def test_times_of_day_go_on_past_midnight(written, line):
    ticks = np.arange(ROWS) * 50 + 86_399_900_000  # microseconds, the last tenth of a second before midnight first
    lines = []
    for tick, y in zip(ticks.tolist(), LIGHT, strict=True):
        day, rest = 1 + tick // 86_400_000_000, tick % 86_400_000_000
        second, micro = divmod(rest, 1_000_000)
        clock = f"{second // 3600:02d}:{second // 60 % 60:02d}:{second % 60:02d}.{micro:06d}"
        twelve = f"{(second // 3600 + 11) % 12 + 1}{clock[2:]} {'AM' if second < 43_200 else 'PM'}"
        lines.append(line.format(clock=clock, twelve=twelve, day=day, y=y))
    (trace,) = read(written(joined(lines))).traces
    assert trace.sample_rate == pytest.approx(RATE, rel=1e-6)
    assert trace.light == pytest.approx(LIGHT, abs=1e-6)
    assert len(trace.segments) == 1
    assert not trace.notes


@pytest.mark.parametrize("column", ["Clock", "2"])
def test_times_of_day_where_the_option_names_them(written, column):
    content = joined("No,Clock,light (V)", [f"{i},22:59:59.{i * 50:06d},{y:.6f}" for i, y in enumerate(LIGHT)])
    (trace,) = read(written(content), time_column=column, columns=["light"]).traces
    assert_same_light(dataclasses.replace(trace, segments=(Segment(0, 0.0),)))
    assert trace.start == pytest.approx(82_799.0)


def test_every_channel_with_times_of_its_own(written):
    content = joined("t1,radar,t2,lamp", rows("{t:.6f},{y:.6f},{t:.6f},{i}"))
    assert [trace.name for trace in read(written(content)).traces] == ["radar", "lamp"]


def test_a_column_of_frequencies_is_no_time(written):
    with pytest.raises(InputError, match="--sample-rate"):
        read(written(joined("Frequency (Hz),Amplitude (V)", rows("{t:.6f},{y:.6f}"))))


def test_rows_instead_of_columns_are_refused(written):
    with pytest.raises(InputError, match="3000 columns of numbers in few rows"):
        read(written(joined(*(",".join(f"{value:.6f}" for value in row) for row in (TIMES, LIGHT)))))


def test_an_incomplete_last_line_is_left_out(written):
    (trace,) = read(written(PLAIN.rstrip()[:-5])).traces
    assert trace.samples == ROWS - 1
    assert not trace.notes
    assert any("incomplete" in line for line in trace.history)


REFUSED = [
    ("a letter from the pilot station\nwithout any numbers\n", "no table of numbers", UnreadableFileError),
    (
        "Dear pilot,\nthe lamp of 2026 flickers at 100 Hz,\nseen at 22:00, 3 times.\n",
        "no table of numbers",
        UnreadableFileError,
    ),
    ('{"light": [1, 2, 3]}\n', "no table of numbers", UnreadableFileError),
    ("time,light\n", "no table of numbers", UnreadableFileError),
    (joined("light", rows("{y:.6f}")), "--sample-rate", InputError),
    (joined(rows("{i},{y:.6f}")), "column 1 only counts", InputError),
    (joined("Time (s)", rows("{t:.6f}")), "no column of readings", UnreadableFileError),
    (joined(HEAD, rows("{t:.6f},OL")), "export", UnreadableFileError),
]


@pytest.mark.parametrize(("content", "words", "kind"), REFUSED)
def test_what_cannot_be_read_is_refused_in_one_sentence(written, content, words, kind):
    path = written(content)
    with pytest.raises(kind, match=words) as caught:
        read(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"columns": ["lihgt"]}, "did you mean 'light'"),
        ({"columns": ["7"]}, "has no column 7; --column takes 1 to 2"),
        ({"time_column": "clock"}, "no column is called 'clock'"),
    ],
)
def test_a_column_that_is_not_there(written, options, words):
    with pytest.raises(InputError, match=words):
        read(written(PLAIN), **options)
