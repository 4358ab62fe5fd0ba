"""Tables of numbers as text: any delimiter, any header, with or without a time column."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np

from flicker.errors import InputError, UnreadableFileError
from flicker.quantities import parse_quantity
from flicker.readers import ReadOptions, reader
from flicker.trace import Capture, Segment, Trace

_NUMBER = re.compile(r"\s*[-+]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][-+]?\d+)?\s*")


def _is_text(head: bytes) -> bool:
    if head[:3] == b"\xef\xbb\xbf" or head[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return True
    strange = sum(head.count(code) for code in range(32) if code not in b"\t\n\r\f\x1a\x00")
    return strange * 50 <= len(head) and b"\n" in head + b"\n"


def _number(cell: str) -> float | None:
    return float(cell.replace("D", "E").replace("d", "e")) if _NUMBER.fullmatch(cell) else None


@reader("csv", suffixes=(".csv", ".txt", ".tsv"), recognises=_is_text, order=100)
def read_csv(path: Path, options: ReadOptions) -> Capture:
    """Read the numeric columns of a table of text."""
    raw = path.read_bytes()
    encoding = "utf-16" if raw[:2] in (b"\xff\xfe", b"\xfe\xff") else "utf-8-sig"
    lines = [line for line in raw.decode(encoding, errors="replace").splitlines() if line.strip("\x00\x1a ,;\t")]
    best: tuple[int, str, bool, list[list[str]], list[list[str]]] = (0, ",", False, [], [])
    for delimiter, comma in ((",", False), (";", True), (";", False), ("\t", False), ("\t", True), (" ", False)):
        cells = [
            (line.replace(",", ".") if comma else line).split(None if delimiter == " " else delimiter) for line in lines
        ]
        body = [row for row in cells if sum(_number(cell) is not None for cell in row) >= max(1, len(row) / 2)]
        numeric = sum(_number(cell) is not None for row in body for cell in row)
        if numeric > best[0] and body:
            first = cells.index(body[0])
            best = (numeric, delimiter, comma, body, cells[:first])
    body, head = best[3], best[4]
    if len(body) < 2:
        raise UnreadableFileError(f"{path}: holds no table of numbers; export the capture as rows of time and reading")
    width = max(len(row) for row in body)
    table = np.array(
        [[_number(cell) if cell.strip() else None for cell in row + [""] * (width - len(row))] for row in body],
        dtype=float,
    )
    numeric_columns = [column for column in range(width) if np.isfinite(table[:, column]).mean() > 0.5]
    names = [""] * width
    units = [""] * width
    for row in head:
        if len(row) >= len(numeric_columns):
            for column in range(min(width, len(row))):
                found = re.fullmatch(r"\s*\"?(.*?)\"?\s*(?:[(\[](.*?)[)\]])?\s*\"?\s*", row[column])
                if found:
                    names[column], units[column] = found.group(1).strip(), (found.group(2) or "").strip()
    time = next(
        (column for column in numeric_columns if re.match(r"time|t$|second|zeit|x$", names[column], re.I)), None
    )
    if time is None and len(numeric_columns) > 1 and options.sample_rate is None:
        steps = np.diff(table[:, numeric_columns[0]])
        if (steps > 0).all() and steps.max() < 1.5 * steps.min():
            time = numeric_columns[0]
    rate = options.sample_rate
    if rate is None:
        for row in head:
            text = " ".join(row)
            found = re.search(
                r"(sampl\w*[ _]?(?:rate|freq\w*|interval|period))[^0-9.]*([-+0-9.eE]+\s*\w*/?\w*)", text, re.I
            )
            if found:
                frequency = not re.search("interval|period", found.group(1), re.I)
                value = parse_quantity(found.group(2).strip(), "frequency" if frequency else "time")
                rate = value if frequency else 1 / value
    start = 0.0
    if time is not None:
        scale = parse_quantity("1" + (units[time] or "s"), "time")
        times = table[:, time] * scale
        start = float(times[0])
        rate = rate or (len(times) - 1) / float(times[-1] - times[0])
    if rate is None:
        raise InputError(f"{path}: neither a time column nor a sample rate is in it; state --sample-rate")
    traces = [
        Trace(
            table[:, column].copy(),
            rate,
            name=names[column] or f"column {column + 1}",
            unit=units[column],
            segments=(Segment(0, start),),
            history=(f"column {column + 1}, {len(body)} rows, {rate:g} Hz",),
        )
        for column in numeric_columns
        if column != time
    ]
    if not traces:
        raise UnreadableFileError(f"{path}: holds no column of readings beside the time")
    return Capture(tuple(traces), kind="csv")
