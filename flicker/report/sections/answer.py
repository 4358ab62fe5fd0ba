"""What a person at the bench reads first."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.errors import NotMeasurable
from flicker.figures import quantity
from flicker.limits.region import STANDARD
from flicker.markup import Content, Markup, element, markup, pairs
from flicker.report.answer import REGION_WORDS, caution, depth, next_step, risk, what
from flicker.report.page import section
from flicker.report.sections._chart import SHAPES
from flicker.report.sections._strip import light_strip
from flicker.report.verdicts import headline

if TYPE_CHECKING:
    from flicker.report.sheets import ChannelSheet
    from flicker.reports import ChannelReport

REGION_SHAPES = {"no-observable-effect": "circle", "low-risk": "diamond", "above-low-risk": "triangle"}


@section(of="channel", title="Answer", order=10)
def answer(sheet: ChannelSheet) -> Markup:
    """Say in one sentence what it is, then how deep, how risky, what to do next."""
    channel = sheet.channel
    entries: list[tuple[str, Content]] = [("What", what(channel)), ("Depth", depth(channel)), ("Risk", risk(channel))]
    if channel.verdicts:
        entries.append(("Limits", headline(channel.verdicts)))
    if care := caution(channel):
        entries.append(("Care", element("strong", care)))
    entries.append(("Next", element("strong", next_step(channel))))
    region = channel.risk_region.region if channel.risk_region else "unknown"
    return markup(
        _strip(channel),
        element("p", region_sign(region), sentence(channel), class_=f"sentence {region}"),
        pairs(entries, class_="answers"),
    )


def sentence(channel: ChannelReport) -> str:
    """Say it all in one sentence."""
    place, depth_found = channel.risk_region, channel.measures["percent_flicker"]
    frequency = channel.measures["fundamental_frequency"].value
    region = f"{REGION_WORDS[place.region]} by {STANDARD}" if place else "how risky that is cannot be told"
    if place is not None and place.modulation is None:
        return f"This light is steady: {region}."
    where = "This light flickers" if frequency is None else f"This light flickers at {quantity(frequency, 'Hz', 4)}"
    if depth_found.value is None:
        return f"{where}; how deep and {region}."
    amount = quantity(depth_found.value, "%", 3)
    return f"{where} with a percent flicker of {amount}: {region}."


def _strip(channel: ChannelReport) -> Markup | None:
    try:
        cycle = channel.observation.cycle
    except NotMeasurable:
        return None
    if not channel.trace.mean_known:
        return None
    return light_strip(cycle.levels, "Four cycles of this light as a strip, bright where the light is bright")


def region_sign(region: str) -> Markup | None:
    """Draw the mark of a region, large; the sentence beside it says the same."""
    if region not in REGION_SHAPES:
        return None
    return element("svg", element("path", d=SHAPES[REGION_SHAPES[region]]), viewBox="-8 -8 16 16", class_="sign",
                   aria_hidden="true")  # fmt: skip
