"""How each figure was obtained, after which source, from which readings."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.figures import measure_name, quantity
from flicker.markup import Markup, element, markup, table
from flicker.metrics import METRICS
from flicker.report.page import section

if TYPE_CHECKING:
    from flicker.reports import CaptureReport


@section(of="capture", title="Method", order=80)
def method(capture: CaptureReport) -> Markup:
    """Say what was read, what was done to it, and how each measure follows from it."""
    assert capture.capture is not None
    first = capture.capture.traces[0]
    recording = (
        f"{capture.capture.kind}, {quantity(first.duration, 's')} at {quantity(first.sample_rate, 'Hz', 6)}, "
        f"{first.samples} samples a channel"
    )
    steps = dict.fromkeys(step for trace in capture.capture.traces for step in trace.history)
    ways: dict[str, dict[str, None]] = {}
    for channel in capture.channels:
        for name, measure in channel.measures.items():
            if measure.value is not None:
                ways.setdefault(name, {})[measure.method] = None
    rows = [(measure_name(name), "; ".join(filter(None, found)), METRICS[name].source) for name, found in ways.items()]
    return markup(
        element("p", f"Read: {recording}."),
        element("ol", *(element("li", step) for step in steps)) if steps else None,
        table(("measure", "how it was obtained", "source"), rows, kind="stacked") if rows else None,
    )
