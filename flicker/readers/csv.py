"""Tables of numbers as text: whatever delimiter, head and habit, with or without a time column."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from flicker.errors import FlickerError, InputError, UnreadableFileError
from flicker.readers import HEAD, ReadOptions, reader
from flicker.readers._csv_clock import past_midnight
from flicker.readers._csv_dialect import TableShape, find_shape
from flicker.readers._csv_head import Head, is_time_unit, read_head
from flicker.readers._csv_numbers import OVERLOAD
from flicker.readers._csv_table import Table, read_table
from flicker.readers._csv_text import TextFile, is_text
from flicker.readers._csv_units import OddUnit, find_shape_with_units, is_no_light, strange_cell
from flicker.readers._timebase import Evenly, evenly, longest_part
from flicker.registry import did_you_mean
from flicker.results import DEPTH_MEASURES, Note
from flicker.trace import Capture, FloatArray, Trace

_FIRST_LINES = 1 << 18  # bytes that are looked at before reading
_LATER_LINES = 1 << 15
_MOST_CHANNELS = 64  # that are measured without being asked for, if the rows are few
_EPOCH = 1e9  # seconds since 1970 that mark times of a calendar [s]
_SECONDS = {"s": 1.0, "ms": 1e3, "us": 1e6, "ns": 1e9, "min": 1 / 60}  # how many of the unit make a second
_TIME_NAME = re.compile(
    r"(?:time|zeit|temps|tiempo|tempo|elapsed|timestamp|seconds?|sec)\b.*|t|t\d|x|x-axis", re.IGNORECASE
)
_INDEX_NAME = re.compile(
    r"(?:index|idx|i|n|no\.?|nr\.?|#|num\w*|sample\w*|sequence|point\w*|count\w*|row|x|record)", re.IGNORECASE
)


@reader("csv", suffixes=(".csv", ".txt", ".tsv"), recognises=is_text, order=100)
def read_csv(path: Path, options: ReadOptions) -> Capture:
    """Read the columns of numbers of a table of text, each as a channel."""
    with path.open("rb") as file:
        text = TextFile.opened(path, file.read(HEAD))
    shape = _shape(text, options)
    head = read_head(shape)
    try:
        columns = _Columns.chosen(path, shape, head, options)
        table = read_table(text, shape, columns.every)
        return Capture(_traces(path, table, shape, head, columns, options), kind="csv")
    except _Lacking as lacking:
        raise _explained(text, lacking.error) from None


def _shape(text: TextFile, options: ReadOptions) -> TableShape:
    size = text.path.stat().st_size
    first = text.sample(text.begin, _FIRST_LINES)
    later: list[bytes] = []
    if size > 2 * _FIRST_LINES:
        later = [*text.sample(size // 2, _LATER_LINES), *text.sample(size - _LATER_LINES, _LATER_LINES)]
    wanted = [int(one) - 1 for one in (*options.columns, options.time_column or "") if one.isdecimal() and int(one) > 0]
    shape = find_shape(first, later, wanted)
    try:
        shape = find_shape_with_units(first, later, wanted, shape)
    except OddUnit as error:
        raise UnreadableFileError(f"{text.path}: {error}") from error
    if shape is None:
        raise _explained(
            text,
            UnreadableFileError(
                f"{text.path}: no table of numbers is in it; export the capture as rows of time and reading"
            ),
        )
    return shape


class _Lacking(Exception):
    """Times or readings were not found."""

    def __init__(self, error: FlickerError) -> None:
        super().__init__(error)
        self.error = error


def _explained(text: TextFile, error: FlickerError) -> FlickerError:
    """Blame units that are not known, if cells carry some, for what was not found."""
    why = strange_cell(text.sample(text.begin, _LATER_LINES))
    return UnreadableFileError(f"{text.path}: {why}") if why else error


# which column is what


@dataclass(frozen=True, slots=True)
class _Columns:
    """Columns of a table, from 0: of the time, and of the readings."""

    time: int | None
    readings: tuple[int, ...]
    index: int | None = None  # one that only counts the rows

    @property
    def every(self) -> tuple[int, ...]:
        return self.readings if self.time is None else (self.time, *self.readings)

    @classmethod
    def chosen(cls, path: Path, shape: TableShape, head: Head, options: ReadOptions) -> _Columns:
        """Follow the options, then names and units, then what the first rows look like."""
        named = tuple(_named(path, one, "--column", shape, head) for one in options.columns)
        index = None
        if options.time_column is not None:
            time: int | None = _named(path, options.time_column, "--time-column", shape, head)
        else:
            time, index = _time_and_index(shape, head, options)
            if time is None and options.sample_rate is None and head.rate is None:
                time = shape.clock
            if time in named:
                time = None
        readings = named or tuple(
            column for column in shape.numeric if column not in (time, index) and not _is_timed(column, head)
        )
        if not readings and index is not None and time is None:
            readings, index = (index,), None
        if not readings:
            raise _Lacking(
                UnreadableFileError(f"{path}: holds times but no column of readings; export the light as well")
            )
        readings = _light(path, readings, head, chosen=bool(named))
        if not named and len(readings) > _MOST_CHANNELS > len(shape.values[readings[0]]):
            raise InputError(
                f"{path}: has {len(readings)} columns of numbers in few rows; export a row for every sample, or choose "
                "columns with --column"
            )
        return cls(time, tuple(column for column in dict.fromkeys(readings) if column != time), index)


def _light(path: Path, readings: tuple[int, ...], head: Head, *, chosen: bool) -> tuple[int, ...]:
    """Leave out columns whose unit is none of light."""
    kept = tuple(column for column in readings if not is_no_light(head.units.get(column, "")))
    if kept and (len(kept) == len(readings) or not chosen):
        return kept
    column = next(column for column in readings if column not in kept)
    raise UnreadableFileError(
        f"{path}: column {column + 1} is in {head.units[column]}, which does not grow in proportion to light; export "
        "the sensor's voltage or current"
    )


def _named(path: Path, wanted: str, option: str, shape: TableShape, head: Head) -> int:
    """Find a column by its name, or by its number from 1."""
    for column, name in head.names.items():
        if name.lower() == wanted.strip().lower() and column in (*shape.numeric, shape.clock):
            return column
    if wanted.isdecimal():
        if 1 <= int(wanted) <= shape.fields:
            return int(wanted) - 1
        raise InputError(f"{path}: has no column {wanted}; {option} takes 1 to {shape.fields}")
    known = [head.names[column] for column in shape.numeric if head.names.get(column)]
    hint = did_you_mean("column", wanted, known) if known else f"its columns have no names; {option} takes a number"
    raise InputError(f"{path}: {hint}")


def _time_and_index(shape: TableShape, head: Head, options: ReadOptions) -> tuple[int | None, int | None]:
    """Find the column of times, and a column that only counts."""
    rate_known = options.sample_rate is not None or head.rate is not None or head.last is not None
    counting = [column for column in shape.numeric[:2] if _counts(shape.values[column])]
    for column in sorted(shape.numeric, key=lambda one: not is_time_unit(head.units.get(one, ""))):
        if _is_timed(column, head) and (is_time_unit(head.units.get(column, "")) or column not in counting):
            return column, next((one for one in counting if one != column), None)
    several = len(shape.numeric) > 1
    index = counting[0] if counting and (several or _INDEX_NAME.fullmatch(head.names.get(counting[0], ""))) else None
    if several:
        for column in shape.numeric[:2]:
            stated = head.units.get(column) or (rate_known and head.names.get(column))
            if column != index and not stated and _advances(shape.values[column]):
                return column, index
    return None, index


def _is_timed(column: int, head: Head) -> bool:
    """Whether name or unit of a column is one of time."""
    return is_time_unit(head.units.get(column, "")) or bool(_TIME_NAME.fullmatch(head.names.get(column, "")))


def _counts(values: FloatArray) -> bool:
    """Whether the first rows count one by one."""
    return len(values) > 2 and bool((np.diff(values) == 1).all()) and float(values[0]).is_integer()


def _advances(values: FloatArray) -> bool:
    """Whether the first rows look like times: they grow, as evenly as rounding lets them."""
    steps = np.diff(values)
    if len(steps) < 2 or not np.isfinite(values).all():
        return False
    if (steps >= 0).all() and values[-1] > values[0]:
        even = np.linspace(values[0], values[-1], len(values))
        widest = float(steps.max())
        return bool(np.abs(values - even).max() <= 1.01 * widest and widest <= 0.25 * (values[-1] - values[0]))
    typical = float(np.quantile(steps, 0.5))
    return typical > 0 and float((np.abs(steps - typical) < 0.5 * typical).mean()) > 0.8


# from rows to traces


def _traces(
    path: Path, table: Table, shape: TableShape, head: Head, columns: _Columns, options: ReadOptions
) -> tuple[Trace, ...]:
    notes: list[Note] = []
    overloads = [_without_overloads(path, column) for column in table.columns[-len(columns.readings) :]]
    if columns.time is not None:
        base = _timed(
            path, table.columns.pop(0), table.columns, head, columns.time, options, notes, columns.time == shape.clock
        )
    else:
        base = _counted(path, table, head, columns, options, notes)
    united = ", ".join(str(column + 1) for column in sorted(shape.units))
    in_cells = [f"units stand in the cells of column{'s' * (len(shape.units) > 1)} {united}"] if united else []
    common = (f"a table with {shape.dialect}", *in_cells, *_remarks(table), *base.history)
    traces = []
    for column, light, overload in zip(columns.readings, base.readings, overloads, strict=True):
        name = head.names.get(column, "") or (f"column {column + 1}" if len(columns.readings) > 1 else "light")
        unit = head.units.get(column, "") or head.reading_unit
        light, unit, scaled = _in_unit(light, unit, head)
        own = [*notes, *base.notes, *([_overloaded(overload, name)] if overload else [])]
        about = f"column {column + 1}{f' ({name})' if head.names.get(column) else ''}: {len(light)} readings"
        about += f" in {unit}" if unit else ", unit unknown"
        traces.append(
            Trace(
                light,
                base.sample_rate,
                name=name,
                unit=unit,
                segments=base.segments,
                notes=tuple(own),
                history=(about, *scaled, *common),
            )
        )
    return tuple(traces)


def _timed(
    path: Path,
    times: FloatArray,
    readings: list[FloatArray],
    head: Head,
    column: int,
    options: ReadOptions,
    notes: list[Note],
    clock: bool,
) -> Evenly:
    """Use the column of times."""
    good = np.isfinite(times.sum()) or np.isfinite(times) & (np.abs(times) < OVERLOAD)
    if good is not True and not np.all(good):
        times, readings = times[good], [one[good] for one in readings]
        notes.append(Note("no-time", "warning", f"{np.size(good) - len(times)} rows without a time were left out"))
    if not len(times):
        raise UnreadableFileError(f"{path}: column {column + 1} holds no times; name the right one with --time-column")
    if clock:
        times, unit = past_midnight(times), "s"
    else:
        unit = head.units.get(column, "") or head.time_unit
        unit = unit if unit in _SECONDS else ""
    if not unit:
        unit, why = _guessed_unit(times, options.sample_rate or (head.rate.value if head.rate else None))
        notes.append(Note("time-unit-assumed", "info", f"the time column states no unit; {why}: check the frequency"))
    if times[0] > _EPOCH * _SECONDS[unit]:
        times = times - times[0]
    if unit != "s":
        times = times / _SECONDS[unit]
    try:
        base = evenly(
            times,
            readings,
            options.sample_rate or (head.rate.value if head.rate else None),
            trusted=options.sample_rate is not None,
        )
    except InputError as error:
        raise InputError(f"{path}: {error}") from error
    base.history.insert(0, f"times {'of day ' * clock}from column {column + 1} in {unit}")
    return base


def _guessed_unit(times: FloatArray, rate: float | None) -> tuple[str, str]:
    """Take seconds, or the unit that makes times agree with a known rate."""
    if rate is not None and len(times) > 1 and times[-1] > times[0]:
        steps = float((len(times) - 1) / (times[-1] - times[0]))
        for unit in ("s", "ms", "us", "ns"):
            if abs(steps * _SECONDS[unit] / rate - 1) < 0.02:
                return unit, f"it agrees with the sample rate {rate:.6g} Hz in {unit}"
    for unit, factor in _SECONDS.items():
        if _EPOCH < times[0] / factor < 10 * _EPOCH:
            return unit, f"it seems to count {unit} since 1970"
    return "s", "seconds are assumed"


def _counted(
    path: Path,
    table: Table,
    head: Head,
    columns: _Columns,
    options: ReadOptions,
    notes: list[Note],
) -> Evenly:
    """Use a stated rate for rows without times."""
    start = head.first.value if head.first else 0.0
    rows = table.rows
    if options.sample_rate is not None:
        rate, source = options.sample_rate, "as stated by --sample-rate"
    elif head.rate is not None:
        rate, source = head.rate.value, f"from the head ('{head.rate.words}')"
    elif head.last is not None and head.last.value > start and rows > 1:
        rate = (rows - 1) / (head.last.value - start)
        source = f"from first and last time in the head ('{head.last.words}')"
    else:
        counts = f"column {columns.index + 1} only counts the rows, and " if columns.index is not None else ""
        raise _Lacking(
            InputError(f"{path}: {counts}neither a time column nor a sample rate is in it; state --sample-rate")
        )
    if table.breaks:
        readings = longest_part(table.columns, table.breaks, notes)
        base = evenly(start + np.arange(len(readings[0])) / rate, readings, rate)
    else:
        base = evenly(start + table.row_numbers() / rate, table.columns, rate)
    base.history[-1:] = [f"sample rate {rate:.8g} Hz {source}"]
    return base


def _remarks(table: Table) -> list[str]:
    """Say what was left out."""
    remarks = []
    if table.damaged:
        remarks.append(f"{len(table.damaged)} rows that are no numbers were left out")
    if table.foreign:
        remarks.append(f"{table.foreign} lines of other text below the first row were left out")
    if table.cut:
        remarks.append("the last line was incomplete and was left out")
    return remarks


# readings


def _without_overloads(path: Path, readings: FloatArray) -> int:
    """Put the nearest rail for overload marks, in place; give their number."""
    if np.isfinite(readings.sum()) and max(readings.max(), -readings.min()) < OVERLOAD:
        return 0
    with np.errstate(invalid="ignore"):
        above, below = readings >= OVERLOAD, readings <= -OVERLOAD
    either = np.isnan(readings)
    good = np.flatnonzero(~(above | below | either))
    if not good.size:
        raise UnreadableFileError(f"{path}: every reading is an overload mark; measure again with less gain")
    highest, lowest = float(readings[good].max()), float(readings[good].min())
    places = np.flatnonzero(either)
    between = np.interp(places, good, readings[good])
    readings[above], readings[below] = highest, lowest
    readings[places] = np.where(between - lowest > highest - between, highest, lowest)
    return len(readings) - len(good)


def _overloaded(count: int, name: str) -> Note:
    return Note(
        "clipped",
        "error",
        f"{count} reading{'s' * (count > 1)} of {name} "
        f"{'are overload marks' if count > 1 else 'is an overload mark'} or blank: the instrument was out of range "
        "and every depth is cut; measure again with less gain",
        voids=DEPTH_MEASURES,
    )


def _in_unit(light: FloatArray, unit: str, head: Head) -> tuple[FloatArray, str, list[str]]:
    """Turn raw counts into the unit of the head where it states how."""
    factor = head.scale.get("ymult")
    if not factor or not np.array_equal(light[:5000], np.round(light[:5000])):
        return light, unit, []
    offset, zero = head.scale.get("yoff", 0.0), head.scale.get("yzero", 0.0)
    done = f"raw counts scaled: (count - {offset:g}) * {factor:g} + {zero:g}"
    return (light - offset) * factor + zero, unit, [done]
