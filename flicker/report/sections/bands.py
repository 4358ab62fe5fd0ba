"""What a camera records of a light: the answer, every exposure, what to dial in."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from flicker.figures import quantity
from flicker.markup import Content, Markup, element, items, markup, pairs, table
from flicker.report.bands import (
    camera_words,
    cell,
    colour_words,
    dial_in,
    frames_words,
    light_words,
    name_of,
    notes_of,
    see,
    seen_words,
    why,
)
from flicker.report.page import section

if TYPE_CHECKING:
    from flicker.camera.answer import Answer
    from flicker.camera.bands import Prediction

_CAUTION = (
    "Banding is what the camera shows; what the light does to people is another question: see flicker measure. Check "
    "a setting with a test shot before the shoot."
)


@section(of="bands", title="Answer", order=10)
def bands_answer(answer: Answer) -> Markup:
    """Say of the worst exposure what will be seen, and why."""
    light, camera = answer.light, answer.camera
    worst = max(answer.predictions, key=lambda one: one.deepest)
    entries: list[tuple[str, Content]] = [
        ("Light", light_words(light)),
        ("Camera", camera_words(camera)),
        ("Why", why(light, camera, worst)),
    ]
    entries += [("Colour", words) for words in colour_words(worst)]
    entries += [("Frames", words) for words in frames_words(light, camera, answer.predictions)]
    first = "" if len(answer.predictions) == 1 else "The worst is "
    sentence = element(
        "p",
        f"{first}{name_of(worst, camera)}: {see(worst, camera)}.".replace(" %", "\N{NO-BREAK SPACE}%"),
        class_="sentence",
    )
    return markup(sentence, pairs(entries))


@section(of="bands", title="Exposures", order=20)
def bands_table(answer: Answer) -> Markup:
    """List every exposure that was asked for."""
    camera, tolerance = answer.camera, answer.tolerance
    channels = [] if not answer.predictions else list(answer.predictions[0].contrast_percent)
    head = ["exposure", *(f"contrast{'' if one == 'all' else f', {one}'}" for one in channels), "frame flicker"]
    if tolerance:
        head.append(f"worst over ±{quantity(100 * tolerance, '%', 3)}")
    head.append("what you see")
    rows = []
    for one, seen in zip(answer.predictions, seen_words(answer.predictions, camera), strict=True):
        row = [name_of(one, camera), *(cell(one.contrast_percent[name]) for name in channels), _deepest_frame(one)]
        if tolerance:
            row.append(cell(max(one.worst_contrast_percent, one.worst_frame_flicker_percent or 0.0)))
        rows.append([*row, seen])
    return table(head, rows, numbers=range(1, len(head) - 1), kind="exposures")


def _deepest_frame(one: Prediction) -> str:
    known = [value for value in one.frame_flicker_percent.values() if value is not None]
    return cell(max(known) if known else None)


@section(of="bands", title="Dial in", order=40)
def bands_advice(answer: Answer) -> Markup | None:
    """Name the exposures that cure it."""
    return items(re.sub(" {2,}", ": ", words) for words in dial_in(answer))


@section(of="bands", title="Notes", order=50)
def bands_notes(answer: Answer) -> Markup:
    """Say what does not fit and what is unknown, and what the page does not judge."""
    notes = items(note.removeprefix("! ").removeprefix("i ") for note in notes_of(answer))
    return markup(notes, element("p", _CAUTION, class_="reason"))
