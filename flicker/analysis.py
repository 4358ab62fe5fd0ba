"""The one place where readers, metrics, limits and cameras meet."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from flicker import __version__
from flicker.light import ChannelLight, Light
from flicker.limits import RiskRegion, Verdict
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
        return {
            "capture": {
                "path": self.path,
                "kind": self.capture.kind,
                "sha256": self.capture.sha256,
                "sample_rate_hz": first.sample_rate,
                "samples": first.samples,
                "duration_s": first.duration,
                "start_s": first.start,
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
