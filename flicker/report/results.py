"""Results of many captures as one JSON object and one table, without holding them all in memory."""

from __future__ import annotations

import csv
import io
import json
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from typing import IO, Any

_MEASURES = (
    "fundamental_frequency",
    "percent_flicker",
    "flicker_index",
    "rms_modulation",
    "duty_cycle",
    "svm",
    "pst_lm",
)


class Spool:
    """Results as they come, kept on disk in a file without a name, so that nothing is left when the run is stopped."""

    def __init__(self) -> None:
        self._file: IO[bytes] = tempfile.TemporaryFile()  # noqa: SIM115 (closed by close)
        self._count = 0

    def close(self) -> None:
        """Let go of the disk space."""
        self._file.close()

    def add(self, capture: Mapping[str, Any]) -> None:
        """Append the JSON form of one capture."""
        text = json.dumps(capture, ensure_ascii=False, allow_nan=False, indent=2).replace("\n", "\n    ")
        self._file.write((",\n    " if self._count else "    ").encode() + text.encode())
        self._count += 1

    def pieces(self, head: Mapping[str, Any], tail: Mapping[str, Any]) -> Iterator[bytes]:
        """Give the object piece by piece: the keys of `head`, `captures`, the keys of `tail`; valid JSON, UTF-8."""
        yield b"{\n"
        yield "".join(f"  {_pair(key, value)},\n" for key, value in head.items()).encode()
        yield b'  "captures": [\n' if self._count else b'  "captures": ['
        self._file.seek(0)
        while piece := self._file.read(1 << 20):
            yield piece
        yield b"\n  ]" if self._count else b"]"
        yield "".join(f",\n  {_pair(key, value)}" for key, value in tail.items()).encode()
        yield b"\n}\n"


def _pair(key: str, value: Any) -> str:
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, indent=2).replace("\n", "\n  ")
    return f"{json.dumps(key)}: {text}"


def table_head(limits: Sequence[str]) -> list[str]:
    """Name the columns of the table: what was captured, the measures, the region, each limit with its margin."""
    fixed = ["capture", "channel", "unit", "level_percent", "supply", "note", "mean"]
    measures = [column for name in _MEASURES for column in (name, f"{name}_low", f"{name}_high")]
    verdicts = [column for limit in limits for column in (limit, f"{limit} margin_percent")]
    return [*fixed, *measures, "risk_region", "verdict", *verdicts, "error"]


def table_rows(capture: Mapping[str, Any], limits: Sequence[str], overall: Sequence[str]) -> Iterator[list[Any]]:
    """Give a row for each channel of a capture, or one with the error; `overall` is the verdict of each channel."""
    conditions = capture.get("conditions", {})
    known = [conditions.get(key) for key in ("unit", "level_percent", "supply", "note")]
    width = len(table_head(limits))
    if "error" in capture:
        row = [capture["capture"]["path"], None, *known]
        yield [*row, *[None] * (width - len(row) - 1), capture["error"]]
        return
    for channel, verdict in zip(capture["channels"], overall, strict=True):
        measures = [channel["measures"].get(name, {}) for name in _MEASURES]
        region = channel["risk_region"]
        by_limit = {one["limit"]: one for one in channel["verdicts"]}
        yield [
            capture["capture"]["path"],
            channel["name"],
            *known,
            channel["level"]["mean"],
            *[measure.get(key) for measure in measures for key in ("value", "low", "high")],
            region["region"] if region else None,
            verdict,
            *[by_limit[limit][key] for limit in limits for key in ("verdict", "margin_percent")],
            None,
        ]


def table_text(head: Sequence[str], rows: Sequence[Sequence[Any]]) -> str:
    """Give the table as CSV with a head line; what is not known is an empty field."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(head)
    writer.writerows(rows)
    return text.getvalue()
