"""Measures: a trace becomes figures, each with its interval or the reason that there is none."""

from __future__ import annotations

import inspect
from collections.abc import Callable
from dataclasses import dataclass

from flicker.errors import NotMeasurable
from flicker.metrics._observation import Observation
from flicker.registry import Registry
from flicker.results import Measure

__all__ = ["METRICS", "Metric", "Observation", "evaluate", "metric"]

MetricFunction = Callable[..., Measure]


@dataclass(frozen=True, slots=True)
class Metric:
    """A measure as the registry knows it; `needs` are the properties of an `Observation` that it takes."""

    name: str
    unit: str
    source: str
    order: int  # in reports
    function: MetricFunction
    needs: tuple[str, ...]

    def of(self, observation: Observation) -> Measure:
        """Take the measure, or say why it could not be had."""
        try:
            return self.function(**{need: getattr(observation, need) for need in self.needs})
        except NotMeasurable as error:
            return Measure.missing(self.unit, str(error))


METRICS: Registry[Metric] = Registry("flicker.metrics", "measure")


def metric(*, unit: str, source: str, order: int) -> Callable[[MetricFunction], MetricFunction]:
    """
    Register the decorated function as a measure under its own name.

    Parameters
    ----------
    unit : str
        Of the value, `1` for a bare number.
    source : str
        Document that defines the measure, with its mark of trust in words.
    order : int
        Place in reports, small numbers first.

    Notes
    -----
    The names of the function's parameters say which properties of the `Observation` it needs, such as `cycle` or
    `trace`; `observation` is the whole. It raises `NotMeasurable` where the capture cannot carry the answer.
    """

    def register(function: MetricFunction) -> MetricFunction:
        needs = tuple(inspect.signature(function).parameters)
        METRICS.add(function.__name__, Metric(function.__name__, unit, source, order, function, needs))
        return function

    return register


def evaluate(observation: Observation) -> dict[str, Measure]:
    """Take every measure of a trace, in the order of reports; those that a note makes meaningless say so."""
    measures = {}
    for one in sorted(METRICS.values(), key=lambda known: known.order):
        doubt = next((note for note in observation.trace.notes if {one.name, "*"} & set(note.voids)), None)
        measures[one.name] = Measure.missing(one.unit, doubt.message) if doubt else one.of(observation)
    return measures
