"""The one place where readers, metrics, limits and cameras meet."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from flicker import readers
from flicker.aliases import SameLight, Seen, settle
from flicker.along import measure_along
from flicker.conditioning import condition
from flicker.conditioning.detector import undo_detector
from flicker.conditioning.frames import ALIASING, aliasing, exposure_undone
from flicker.doubts import doubts
from flicker.errors import InputError
from flicker.light import Light
from flicker.limits import Conditions, Limit, chosen_limits, judge, risk_region
from flicker.metrics import Observation, evaluate
from flicker.reports import CaptureReport, ChannelReport, Report
from flicker.results import Measure
from flicker.trace import Capture, Trace
from flicker.workers import in_threads

_UNSEEN = 3.0  # percent flicker [%]
_CONDITIONS = ("dark_level", "dark_capture", "mean", "dc_coupled", "inverted", "start", "duration", "coupling_corner")


def read(path: str | Path, **options: Any) -> Capture:
    """
    Read a capture and condition it: sign, dark level, mean, part.

    Parameters
    ----------
    path : path
        WAV, CSV or video; recognised by its content.
    **options
        The options of the command line as keywords: those of `flicker.readers.read` (`sample_rate`, `columns`,
        `time_column`, `channels`, `frame_rate`, ...) and of `flicker.conditioning.condition` (`dark_level`,
        `dark_capture` as a path, `mean`, `dc_coupled`, `inverted`, `start`, `duration`), and `detector_bandwidth` [Hz].

    Returns
    -------
    Capture
        Its traces carry notes on every doubt and a history of what was done.

    Raises
    ------
    InputError, UnreadableFileError
        If the file or an option cannot be right; one sentence with the cure.
    """
    conditions = {name: options.pop(name) for name in _CONDITIONS if name in options}
    if isinstance(conditions.get("dark_capture"), str | Path):
        conditions["dark_capture"] = readers.read(conditions["dark_capture"], **options)
    bandwidth = options.pop("detector_bandwidth", None)
    part = {name: conditions[name] for name in ("start", "duration") if name in conditions}
    capture = condition(readers.read(path, **options, **part), **conditions)
    if bandwidth is None:
        return capture
    return replace(capture, traces=tuple(undo_detector(trace, bandwidth) for trace in capture.traces))


def measure(
    *captures: Capture, clock_ppm: float = 0.0, dark_uncertainty: float = 0.0, window: float | None = None
) -> Report:
    """
    Measure every channel of one or several captures.

    Parameters
    ----------
    *captures : Capture
        From `read`, or made from traces.
    clock_ppm : float
        Standard uncertainty of the sample clock, which no capture can show. [1e-6]
    dark_uncertainty : float
        Standard uncertainty of the dark level, in the unit of the capture.
    window : float, optional
        Take every measure along the capture too, in windows of this length. [s]

    Returns
    -------
    Report
        One entry a capture, in order.

    Raises
    ------
    InputError
        If no window of that length fits, or it holds too few samples.
    """

    def measured(trace: Trace) -> ChannelReport:
        return _measure_trace(trace, clock_ppm, dark_uncertainty, window)

    return Report(
        tuple(
            CaptureReport(
                str(capture.path) if capture.path else None, capture, tuple(in_threads(measured, capture.traces))
            )
            for capture in captures
        )
    )


def _measure_trace(trace: Trace, clock_ppm: float, dark_uncertainty: float, window: float | None) -> ChannelReport:
    def observed(part: Trace) -> Observation:
        return Observation(part, clock=clock_ppm * 1e-6, dark_uncertainty=dark_uncertainty)

    observation = observed(trace)
    measures = evaluate(observation)
    depth_known = measures["percent_flicker"].value is not None
    components = observation.components if depth_known else ()
    families = observation.families
    if not depth_known:
        reason = measures["percent_flicker"].reason
        families = tuple(replace(family, percent_flicker=Measure.missing("%", reason)) for family in families)
    seen = measures["fundamental_frequency"].value
    measures = _with_exposure_undone(observation, measures)
    notes = trace.notes + doubts(observation)
    if seen is not None and any(note.code == ALIASING for note in notes):
        doubt = aliasing(seen, trace.sample_rate)
        notes = tuple(doubt if note.code == ALIASING else note for note in notes)
        components = ()  # no line of them need be a line of the light
        families = tuple(replace(one, percent_flicker=Measure.missing("%", doubt.message)) for one in families)
    region = risk_region(components, families) if depth_known and not _hidden(measures["percent_flicker"]) else None
    along = measure_along(trace, window, lambda part: _all_measures(observed(part))) if window else None
    return ChannelReport(observation, measures, notes, components, families, region, along=along)


def _hidden(depth: Measure) -> bool:
    """Whether a light without flicker could have as much as no observable effect allows at 100 Hz, unseen."""
    return depth.value == 0.0 and (depth.high or 0.0) > _UNSEEN


def _all_measures(observation: Observation) -> dict[str, Measure]:
    return _with_exposure_undone(observation, evaluate(observation))


def _with_exposure_undone(observation: Observation, measures: dict[str, Measure]) -> dict[str, Measure]:
    """Give back to the depths what the exposure of the samples took."""
    seen, exposure = measures["fundamental_frequency"].value, observation.trace.exposure
    if seen is None or not exposure or measures["percent_flicker"].value is None:
        return measures
    fit = observation.fit
    relative = (fit.amplitudes / observation.level, fit.amplitude_error / observation.level)
    undone = exposure_undone(*relative, seen, exposure)
    return measures | {name: measure for name, measure in undone.items() if name != "svm"}


def light_of(path: str | Path, *, filmed: Mapping[str, Any] | None = None, **options: Any) -> tuple[Light, str]:
    """
    Take the light of a capture for prediction.

    Parameters
    ----------
    path : path
        WAV, CSV or video.
    filmed : mapping, optional
        What is known of the camera that filmed a video, by the keywords of `flicker.filmed.read_back`, and
        `camera_file`: with a line time the light is read back from the stripes.
    **options
        As for `read`.

    Returns
    -------
    light : Light
        Of all channels.
    source : str
        What of a video it was read from; empty for other captures.

    Raises
    ------
    InputError
        If a camera is stated for a capture that is no video.
    """
    known = {name: value for name, value in (filmed or {}).items() if value is not None}
    if readers.kind_of(path) != "video":
        if known:
            raise InputError(f"{Path(path).name} is no video: leave out what filmed it (--filmed-with and the like)")
        return measure(read(path, **options)).light, ""
    from flicker.filmed import from_camera, read_back

    file = known.pop("camera_file", None)
    how = known if file is None else from_camera(file, known)
    if not any(how.get(name) for name in ("line_time", "line_rate", "readout_time")):
        source = "the means of its frames, in which light faster than half the frame rate shows as slower light"
        return measure(read(path, **options)).light, f"{source}: state what filmed it with --filmed-with"
    kept = {name: options[name] for name in ("start", "duration", "region", "transfer") if name in options}
    report = read_back(path, **how, **kept)
    told = "stated" if report.stripes.exposure_told else "fitted"
    return report.light, (
        f"its stripes, {1e6 * (report.stripes.line_time or 0):.4g} µs a line, "
        f"exposure {1e3 * (report.stripes.exposure or 0):.4g} ms ({told})"
    )


def same_light(report: Report, clock_ppm: float | None = None) -> SameLight:
    """
    Settle the frequency of one light that several captures show at different sample or frame rates.

    Parameters
    ----------
    report : Report
        Of the captures; the first channel of each counts.
    clock_ppm : float, optional
        Standard uncertainty of each sample clock; 100 where it is not stated. [1e-6]

    Returns
    -------
    SameLight
        The one frequency that fits, or those that do.

    Raises
    ------
    InputError
        If fewer than two captures show a frequency, or all have one rate.
    """
    seen = [one for capture in report.captures if (one := seen_in(capture)) is not None]
    return settle(seen, None if clock_ppm is None else 1e-6 * clock_ppm)


def seen_in(capture: CaptureReport) -> Seen | None:
    """Give what the first channel of a capture shows of a light's frequency; None for steady light."""
    fundamental = capture.channels[0].measures["fundamental_frequency"] if capture.channels else None
    if fundamental is None or fundamental.value is None or fundamental.high is None:
        return None
    error = (fundamental.high - fundamental.value) / 1.96
    return Seen(capture.path or "", fundamental.value, error, capture.channels[0].trace.sample_rate)


def check(
    report: Report,
    limits: Sequence[Limit | str] = (),
    *,
    decision: str = "guarded",
    level: float | None = None,
    supply: str | None = None,
) -> Report:
    """
    Hold every channel of a report against limits.

    Parameters
    ----------
    report : Report
        From `measure`.
    limits : sequence of Limit or str
        Limits, or ids of those built in; all that are in force if none is given.
    decision : {"guarded", "simple"}
        Whether the 95 % interval counts, or the value alone.
    level : float, optional
        Dimming level at which the captures were taken, for limits that hold at some levels only. [%]
    supply : str, optional
        What the light was supplied by, such as `24 V DC`, for limits that hold on the mains only.

    Returns
    -------
    Report
        The same report with its verdicts.

    Raises
    ------
    InputError
        If no limit or no decision rule has that name.
    """
    rows = tuple(one if isinstance(one, Limit) else chosen_limits([one])[0] for one in limits) or chosen_limits(())

    def judged(channel: ChannelReport) -> ChannelReport:
        conditions = Conditions(channel.trace.sample_rate, channel.trace.duration, level, supply)
        found = (channel.measures, channel.components, channel.families)
        return replace(channel, verdicts=tuple(judge(row, *found, decision, conditions) for row in rows))

    return Report(tuple(replace(capture, channels=tuple(map(judged, capture.channels))) for capture in report.captures))
