"""Ways in which instruments write a capture: three kinds of CSV, and WAV."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

import numpy as np

from flicker.files import whole_file, write_text
from flicker.trace import Trace

_DECIMALS = 6


def write_comma(path: Path, traces: Sequence[Trace]) -> None:
    """Write key and value lines, a head with units, then time and readings with commas between."""
    first = traces[0]
    head = [
        "Instrument,two-channel oscilloscope",
        f"Record length,{first.samples},points",
        f"Sample interval,{1 / first.sample_rate:.6e},s",
        "",
        "Time (s)," + ",".join(f"{trace.name} ({trace.unit})" for trace in traces),
    ]
    _write_lines(path, head, _rows(traces, ",", "."))


def write_semicolon(path: Path, traces: Sequence[Trace]) -> None:
    """Write a head, its units in a row of their own, then decimal commas with semicolons between."""
    head = [
        ";".join(["Time", *(trace.name for trace in traces)]),
        ";".join(["s", *(trace.unit for trace in traces)]),
    ]
    _write_lines(path, head, _rows(traces, ";", ","))


def write_single_column(path: Path, traces: Sequence[Trace]) -> None:
    """Write the sample rate in a comment and the readings of the only channel one to a line."""
    (trace,) = traces
    head = [f"# sample_rate_hz: {trace.sample_rate:.0f}", f"{trace.name} [{trace.unit}]"]
    _write_lines(path, head, (f"{reading:.{_DECIMALS}f}" for reading in trace.light))


def write_wav(path: Path, traces: Sequence[Trace]) -> None:
    """Write 24-bit PCM; full scale is 1."""
    import soundfile

    with whole_file(path) as temporary:
        samples = np.column_stack([trace.light for trace in traces])
        soundfile.write(temporary, samples, round(traces[0].sample_rate), subtype="PCM_24", format="WAV")


def _rows(traces: Sequence[Trace], delimiter: str, decimal: str) -> Iterable[str]:
    columns = np.column_stack([traces[0].times() - traces[0].start, *(trace.light for trace in traces)])
    for row in columns:
        yield delimiter.join(f"{value:.{_DECIMALS}f}" for value in row).replace(".", decimal)


def _write_lines(path: Path, head: Sequence[str], rows: Iterable[str]) -> None:
    write_text(path, "\n".join([*head, *rows]) + "\n")
