"""Cells that carry a unit with the number: one light, however an instrument spreads prefixes over its rows."""

import numpy as np
import pytest

from flicker.errors import UnreadableFileError
from flicker.readers import csv, read

RATE = 20_000.0
TICKS = np.arange(3000) * 50  # microseconds
MILLIVOLTS = np.round(1000 + 800 * np.sin(2 * np.pi * 239.7e-6 * TICKS))


def volts(value, decimals=3):
    return f"{value:.0f} mV" if abs(value) < 1000 else f"{value / 1000:.{decimals}f} V"


def clock(tick):
    return f"{tick} us" if tick < 1000 else f"{tick / 1000:.2f} ms"


def table(line, head="time,light\n", end="\n"):
    return head + "".join(
        line(tick, value) + end for tick, value in zip(TICKS.tolist(), MILLIVOLTS.tolist(), strict=True)
    )


def comma(line):
    return lambda tick, value: line(tick, value).replace(".", ",")


@pytest.fixture
def written(tmp_path):
    def write(content):
        path = tmp_path / "bridge.csv"
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return path

    return write


# name: (content, unit that the trace must have)
UNITED = {
    "one unit a column": (table(lambda t, y: f"{t / 1000:.2f} ms,{y / 1000:.3f} V"), "V"),
    "no blank between": (table(lambda t, y: f"{t}us,{y:.0f}mV"), "mV"),
    "prefixes by row": (table(lambda t, y: f"{clock(t)},{volts(y)}"), "V"),
    "readings only": (table(lambda t, y: f"{t / 1e6:.6f},{volts(y)}", "Time (s),light\n"), "V"),
    "times only": (table(lambda t, y: f"{clock(t)},{y / 1000:.3f}", "time,light (V)\n"), "V"),
    "no head": (table(lambda t, y: f"{clock(t)},{volts(y)}", ""), "V"),
    "a head with other units": (table(lambda t, y: f"{clock(t)},{volts(y)}", "time (s),light (mV)\n"), "V"),
    "semicolon, decimal comma": (table(comma(lambda t, y: f"{clock(t)};{volts(y)}"), "time;light\n"), "V"),
    "decimal comma and comma": (table(comma(lambda t, y: f"{t / 1e6:.6f} s,{y / 1000:.3f} V")), "V"),
    "tabs": (table(lambda t, y: f"{clock(t)}\t{volts(y)}", "time\tlight\n"), "V"),
    "blanks": (table(lambda t, y: f"{clock(t)}   {volts(y)}", "time light\n"), "V"),
    "quotes": (table(lambda t, y: f'"{clock(t)}","{volts(y)}"'), "V"),
    "quotes and commas": (table(comma(lambda t, y: f'"{clock(t)}";"{volts(y)}"')), "V"),
    "padded": (table(lambda t, y: f"{clock(t):>12}, {volts(y):>12} "), "V"),
    "exponents": (table(lambda t, y: f"{t * 1e-6:.6e} s,{y:.6E} mV"), "mV"),
    "micro sign": (table(lambda t, y: f"{t} µs;{volts(y)}"), "V"),
    "Greek mu": (table(lambda t, y: f"{t} μs;{volts(y)}"), "V"),
    "micro sign in Latin-1": (table(lambda t, y: f"{t} µs;{volts(y)}").encode("latin-1"), "V"),
    "UTF-16": (table(lambda t, y: f"{t} µs;{volts(y)}").encode("utf-16"), "V"),
    "CRLF": (table(lambda t, y: f"{clock(t)},{volts(y)}", end="\r\n"), "V"),
    "luminance": (table(lambda t, y: f"{clock(t)};{y} cd/m²"), "cd/m²"),
    "irradiance": (table(lambda t, y: f"{t} us;{y:.0f} mW/m2"), "mW/m²"),
    "a meter's volts": (table(lambda t, y: f"{t} us;{volts(y)}DC"), "V"),
    "per cent": (table(lambda t, y: f"{t} us;{y:.0f}%"), "%"),
    "illuminance": (table(lambda t, y: f"{t} us;{y:.0f} Lux"), "lx"),
    "words": (table(lambda t, y: f"{t} microseconds;{y / 1000} volts"), "V"),
    "units in the next cell": (table(lambda t, y: f"{clock(t)},{volts(y)}".replace(" ", ",")), "V"),
    "a remark behind": (table(lambda t, y: f"{clock(t)},{volts(y)},lamp 3"), "V"),
    "counted rows": (table(lambda t, y: f"{t // 50},{clock(t)},{volts(y)}", "No,time,light\n"), "V"),
    "rate in the head": (table(lambda t, y: volts(y), "Sample interval: 50 us\nlight\n"), "V"),
    "facts beside": (
        table(lambda t, y: f"{'Sample interval,50 us' if t == 0 else ','},{clock(t)},{volts(y)}", ",,time,light\n"),
        "V",
    ),
}


@pytest.mark.parametrize("name", UNITED)
def test_units_in_cells_are_those_of_the_column(written, name):
    content, unit = UNITED[name]
    (trace,) = read(written(content)).traces
    assert trace.sample_rate == pytest.approx(RATE, rel=1e-9)
    assert trace.start == 0.0
    assert trace.unit == unit
    assert trace.light == pytest.approx(MILLIVOLTS / (1000 if unit == "V" else 1), abs=1e-12)
    assert not trace.notes
    assert any("units stand in the cells" in line for line in trace.history)


@pytest.mark.parametrize(("unit", "divisor"), [("V", 1.0), ("mV", 1e3), ("uV", 1e6), ("nV", 1e9)])
def test_every_number_is_that_of_float_times_the_prefix(written, unit, divisor):
    rng = np.random.default_rng(4)
    cells = [f"{value!r}" for value in (rng.normal(0, 1, 4000) * 10.0 ** rng.integers(-6, 6, 4000)).tolist()]
    lines = [f"{cell} {'V' if i % 3 else unit}\n" for i, cell in enumerate(cells)]
    (trace,) = read(written("light\n" + "".join(lines)), sample_rate=RATE).traces
    truth = [float(cell) / (1.0 if i % 3 else divisor) for i, cell in enumerate(cells)]
    assert trace.light.tolist() == truth


def test_a_prefix_that_comes_late_counts_too(written):
    lines = [f"{i % 7 + 1}.25 V\n" for i in range(200_000)]
    lines[110_001] = "950 mV\n"
    (trace,) = read(written("light\n" + "".join(lines)), sample_rate=RATE).traces
    assert trace.light[110_001] == 0.95
    assert np.delete(trace.light, 110_001).tolist() == [i % 7 + 1.25 for i in range(200_000) if i != 110_001]


@pytest.mark.parametrize("mark", ["OL", "OL V", "9.9E+37 V", "9.9E+37 mV", "---", "Inf V", ""])
def test_overload_marks_need_no_unit(written, mark):
    (trace,) = read(written(table(lambda t, y: f"{clock(t)},{mark if y > 1790 else volts(y)}"))).traces
    (note,) = trace.notes
    assert note.code == "clipped"
    assert str(int((MILLIVOLTS > 1790).sum())) in note.message
    assert trace.light.max() == pytest.approx(MILLIVOLTS[MILLIVOLTS <= 1790].max() / 1000)


def test_zero_needs_no_unit_and_another_number_does(written):
    (trace,) = read(written(table(lambda t, y: f"{clock(t) if t else 0},{volts(y)}"))).traces
    assert trace.samples == 3000
    bare = table(lambda t, y: f"{clock(t)},{'1.3' if t == 50_000 else volts(y)}")
    (trace,) = read(written(bare)).traces
    assert [note.code for note in trace.notes] == ["gap"]
    assert trace.samples == 2999


def test_segments_under_heads_of_their_own(written):
    part = table(lambda t, y: f"{clock(t)},{volts(y)}", "Segment\ntime,light\ns,V\n")
    (trace,) = read(written(part + part)).traces
    assert [note.code for note in trace.notes] == ["segments"]
    assert trace.samples == 3000
    assert trace.light == pytest.approx(MILLIVOLTS / 1000)


REFUSED = {
    "resistance": (table(lambda t, y: f"{clock(t)},{y / 300:.3f}kΩ"), r"column 2 is in kΩ, which does not grow"),
    "resistance in the head": (
        table(lambda t, y: f"{t / 1e6},{y / 300:.3f}", "Time (s),sensor (Ohm)\n"),
        "column 2 is in Ohm, which does not grow",
    ),
    "decibels": (table(lambda t, y: f"{clock(t)},{y / 300:.3f} dB"), "column 2 is in dB, which does not grow"),
    "unknown": (table(lambda t, y: f"{t / 1e6},{y / 300:.3f} grue"), "grue' carry a unit that is not known; export"),
    "unknown everywhere": (table(lambda t, y: f"{t} glorp,{y / 300:.3f} grue"), "carry a unit that is not known"),
    "two quantities": (
        table(lambda t, y: f"{clock(t)},{y:.0f} {'lx' if t % 100 else 'V'}"),
        "column 2 holds numbers in V and numbers in lx; export each quantity",
    ),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_is_no_light_is_refused_in_one_clear_sentence(written, name):
    content, words = REFUSED[name]
    path = written(content)
    with pytest.raises(UnreadableFileError, match=words) as caught:
        read(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_resistance_beside_the_light_is_left_out(written):
    content = table(lambda t, y: f"{clock(t)},{volts(y)},3.3 kΩ", "time,light,divider\n")
    assert [trace.name for trace in read(written(content)).traces] == ["light"]
    with pytest.raises(UnreadableFileError, match="column 3 is in kΩ"):
        read(written(content), columns=["divider"])


def test_a_letter_beside_is_no_unit_where_the_head_states_one(written):
    content = table(lambda t, y: f"{t / 1000:.2f},s,{y / 1000:.3f},A", "time (ms),state,light (V),phase\n")
    (trace,) = read(written(content)).traces
    assert trace.sample_rate == pytest.approx(RATE)
    assert trace.unit == "V"


def test_plain_tables_take_the_plain_way(written, monkeypatch):
    monkeypatch.setattr(csv, "_explained", None)
    monkeypatch.setattr("flicker.readers._csv_table.UnitReader", None)
    for line in (
        lambda t, y: f"{t / 1e6:.6f},{y / 1000:.3f}",
        lambda t, y: f"{t / 1e6:.6e},{y / 1000:.3E}",
        lambda t, y: f"run,{t / 1e6:.6f},{y / 1000:.3f},lamp",
        lambda t, y: f"{t / 1e6:.6f},{'Inf' if y > 1790 else y / 1000}",
    ):
        (trace,) = read(written(table(line, ""))).traces
        assert trace.samples == 3000
