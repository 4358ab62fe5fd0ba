"""What measuring gives: a report of captures, of their channels, with measures, families and verdicts."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flicker import __version__
from flicker.along import Along
from flicker.figures import measure_name, measured
from flicker.light import ChannelLight, Light
from flicker.limits import RiskRegion, Verdict
from flicker.markup import Markup, element, items, markup, table
from flicker.metrics import Observation
from flicker.results import Component, Family, Measure, Note
from flicker.trace import Capture, Trace


@dataclass(frozen=True, slots=True, eq=False)
class ChannelReport:
    """What was found in one channel; `observation` keeps the trace, the cycle and the spectrum for pictures."""

    observation: Observation
    measures: dict[str, Measure]
    notes: tuple[Note, ...]
    components: tuple[Component, ...]
    families: tuple[Family, ...]
    risk_region: RiskRegion | None
    verdicts: tuple[Verdict, ...] = ()
    along: Along | None = None

    @property
    def trace(self) -> Trace:
        """The trace that was measured."""
        return self.observation.trace

    @property
    def light(self) -> ChannelLight:
        """The light for prediction: its lines relative to the mean."""
        return self.observation.light

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        trace = self.trace
        return {
            "name": trace.name,
            "level": {
                "mean": self.observation.mean if trace.mean_known else None,
                "unit": trace.unit,
                "dark": trace.dark_level or 0.0,
                "mean_known": trace.mean_known,
            },
            "notes": [note.to_dict() for note in self.notes],
            "measures": {name: measure.to_dict() for name, measure in self.measures.items()},
            "components": [component.to_dict() for component in self.components],
            "families": [family.to_dict() for family in self.families],
            "risk_region": self.risk_region.to_dict() if self.risk_region else None,
            "verdicts": [verdict.to_dict() for verdict in self.verdicts],
            "history": list(trace.history),
            **({"along": self.along.to_dict()} if self.along else {}),
        }


@dataclass(frozen=True, slots=True, eq=False)
class CaptureReport:
    """What was found in one capture, or the error that kept it from being read."""

    path: str | None
    capture: Capture | None
    channels: tuple[ChannelReport, ...] = ()
    error: str = ""

    @property
    def light(self) -> Light:
        """The light of all channels, for prediction."""
        return Light(tuple(channel.light for channel in self.channels))

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        if self.capture is None:
            return {"capture": {"path": self.path}, "error": self.error}
        first = self.capture.traces[0]
        recorded = first.whole or first
        return {
            "capture": {
                "path": self.path,
                "kind": self.capture.kind,
                "sha256": self.capture.sha256,
                "sample_rate_hz": first.sample_rate,
                "samples": recorded.samples,
                "duration_s": recorded.duration,
                "start_s": first.whole.first_part if first.whole else first.start,
                **({"excerpt": {"start_s": first.start, "duration_s": first.duration}} if first.whole else {}),
                **self.capture.details,
            },
            "channels": [channel.to_dict() for channel in self.channels],
        }


@dataclass(frozen=True, slots=True, eq=False)
class Report:
    """The JSON of `flicker measure` and `flicker check` as objects."""

    captures: tuple[CaptureReport, ...]

    @property
    def light(self) -> Light:
        """The light of the first capture, for prediction."""
        return self.captures[0].light

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "format": "flicker-report",
            "version": 1,
            "program": __version__,
            "captures": [capture.to_dict() for capture in self.captures],
        }

    def rows(self) -> list[dict[str, Any]]:
        """
        List the measures, one row each: what `pandas.DataFrame` and its like take.

        Returns
        -------
        list of dict
            Keys `capture`, `channel`, `measure`, `value`, `low`, `high`, `unit`, `reason`; `value` is None exactly
            where `reason` says why. `low` and `high` are the ends of the 95 % interval.
        """
        return [
            {
                "capture": capture.path,
                "channel": channel.trace.name,
                "measure": name,
                "value": measure.value,
                "low": measure.low,
                "high": measure.high,
                "unit": measure.unit,
                "reason": measure.reason,
            }
            for capture in self.captures
            for channel in capture.channels
            for name, measure in channel.measures.items()
        ]

    def _repr_html_(self) -> str:
        """Show the report in a notebook: a table a channel, with its region, verdicts and notes."""
        shown: list[Markup | None] = []
        for capture in self.captures:
            name = Path(capture.path).name if capture.path else "capture"
            if capture.error:
                shown.append(element("p", capture.error))
            for channel in capture.channels:
                title = name if len(capture.channels) == 1 else f"{name}, {channel.trace.name}"
                shown.append(element("p", element("strong", title), f": {_said_of(channel)}"))
                known = {name: one for name, one in channel.measures.items() if one.value is not None}
                rows = [[measure_name(name), *measured(one), one.method] for name, one in known.items()]
                shown.append(table(["measure", "value", "95 % interval", "how"], rows))
                shown += [items(note.message for note in channel.notes)]
        return markup(*shown)


def _said_of(channel: ChannelReport) -> str:
    region = channel.risk_region
    words = [f"{region.region.replace('-', ' ')} (IEEE 1789-2015)" if region else "no risk region"]
    words += [f"{one.verdict.upper()} by {one.limit.id}" for one in channel.verdicts]
    return "; ".join(words)
