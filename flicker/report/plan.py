"""A plan in words: the setting that keeps every light clean, what spoils the others, one table for the wall."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from flicker.camera.shutter import exposure_label
from flicker.figures import quantity
from flicker.report.bands import percent
from flicker.report.typesetting import Paint, wrap

if TYPE_CHECKING:
    from flicker.camera.plan import Plan, PlanSetting

_CELL = 9
_NAME = 24  # columns that a light's name may fill
_LABEL = 9
_SEEN = 0.1  # contrast below which nobody sees whether a band stands [%]


def plan_words(plan: Plan, *, width: int = 100, colour: bool = False) -> str:
    """Put a plan into words for a terminal or one page of paper; `width` is that of a line."""
    paint = Paint(colour=colour)
    blocks = [[*(paint.bold(line) for line in wrap(head_words(plan), width, "")), *left_out_words(plan)]]
    if not plan.settings:
        return "\n".join(blocks[0])
    blocks.append(list(_answers(plan, width, paint)))
    blocks.append(list(_table(plan, width, paint)))
    return "\n\n".join("\n".join(block) for block in blocks)


def head_words(plan: Plan) -> str:
    """Say what was planned, up to which contrast a setting is clean, and within which tolerance."""
    within = (
        "with the lights' frequencies taken as exact"
        if plan.tolerance is None
        else f"with the lights' frequencies up to {quantity(100 * plan.tolerance, '%', 3)} off"
    )
    return (
        f"{_count(len(plan.lights), 'light')}, {_count(len(plan.cameras), 'camera')}, "
        f"{_count(len(plan.settings), 'setting')}; clean up to {quantity(100 * plan.limit, '%', 3)}, {within}"
    )


def left_out_words(plan: Plan) -> Iterable[str]:
    """Count what does not fit into a frame."""
    if plan.impossible:
        left_out = _count(plan.impossible, "combination")
        yield f"{left_out} left out: the exposure or the readout does not fit into the frame"


def _count(number: int, what: str) -> str:
    return f"{number} {what}{'' if number == 1 else 's'}"


def _answers(plan: Plan, width: int, paint: Paint) -> Iterable[str]:
    texts = {
        "Best": list(best_words(plan)),
        "Together": list(together_words(plan)),
        "Spoilt by": list(spoiler_words(plan)),
    }
    for label, sentences in texts.items():
        for number, sentence in enumerate(sentences):
            first, *rest = wrap(sentence, width - _LABEL - 4, "")
            head = f"{label if number == 0 else '':<{_LABEL + 2}}"
            yield f"  {paint.faint(head)}{paint.bold(first) if label == 'Best' else first}"
            yield from (f"  {'':<{_LABEL + 2}}{line}" for line in rest)


def best_words(plan: Plan) -> Iterable[str]:
    """Name the best setting of each camera."""
    for camera in plan.cameras:
        best = plan.best_of(camera)
        if best is None:
            yield f"{camera}: no setting fits into a frame"
            continue
        clean = [one for one in plan.settings if one.camera == camera and one.clean]
        words = f"{camera}: {best.label}, at most {percent(best.deepest)} ({best.worst_light})"
        if not clean:
            words += "; NOT clean, and nothing on this camera is"
        elif len(clean) > 1:
            words += f"; {_count(len(clean), 'setting')} clean"
        standing = [light for light in best.standing if best.contrast_percent[light] >= _SEEN]
        if standing:
            words += f"; what is left of {' and '.join(standing)} stands still"
        yield words


def together_words(plan: Plan) -> Iterable[str]:
    """Name the best setting that all cameras have."""
    if not plan.shared:
        if len(plan.cameras) > 1:
            yield "no frame rate and exposure is common to all cameras"
        return
    best = plan.shared[0]
    label = exposure_label(best.exposure_s, best.frame_rate_hz)
    yield (
        f"all cameras at {best.frame_rate_hz:.6g} frames/s, {label}: at most {percent(best.worst_contrast_percent)} "
        f"({best.worst_light} on {best.worst_camera}){'' if best.clean else '; NOT clean'}"
    )


def spoiler_words(plan: Plan) -> Iterable[str]:
    """Name the lights that make settings unclean, and what is gained without each."""
    spoilt = [one for one in plan.settings if not one.clean]
    if not spoilt or len(plan.lights) < 2:
        return
    for light, number in Counter(one.worst_light for one in spoilt).most_common(3):
        mine = [one for one in spoilt if one.worst_light == light]
        gained = sum((one.without_worst_light_percent or 0.0) <= 100 * plan.limit for one in mine)
        words = f"{light}: the worst in {number} of {_count(len(spoilt), 'unclean setting')}; "
        yield words + (f"without it {gained} of them would be clean" if gained else "without it none of them is clean")


@dataclass(frozen=True)
class Column:
    """One exposure of one camera, with the frame rates at which it leaves the same of every light."""

    setting: PlanSetting
    frame_rates: tuple[float, ...]

    @property
    def rates(self) -> str:
        """The frame rates, as many as fit."""
        shown = ",".join(f"{rate:.5g}" for rate in self.frame_rates[:2])
        return shown if len(self.frame_rates) < 3 else f"{shown}+{len(self.frame_rates) - 2}"


def chosen_columns(plan: Plan, fitting: int) -> list[Column]:
    """Columns of the table: the best of each camera, then the next best, in the order of cameras."""
    each: dict[str, list[Column]] = {camera: [] for camera in plan.cameras}
    for one in plan.settings:
        columns = each[one.camera]
        for number, column in enumerate(columns):
            same = column.setting
            if same.exposure_s == one.exposure_s and same.contrast_percent == one.contrast_percent:
                columns[number] = Column(same, (*column.frame_rates, one.frame_rate_hz))
                break
        else:
            columns.append(Column(one, (one.frame_rate_hz,)))
    chosen: list[tuple[int, int]] = []
    for rank in range(max(len(columns) for columns in each.values())):
        chosen += [(number, rank) for number, camera in enumerate(plan.cameras) if rank < len(each[camera])]
    return [each[plan.cameras[number]][rank] for number, rank in sorted(chosen[:fitting])]


def _table(plan: Plan, width: int, paint: Paint) -> Iterable[str]:
    names = ["exposure, s", "without worst", *map(_short, plan.lights)]
    size = max(len(name) for name in names)
    columns = chosen_columns(plan, max(1, (width - size - 2) // (_CELL + 2)))
    letters = {camera: letter_of(number) for number, camera in enumerate(plan.cameras)}
    rule = "  " + "-" * (size + (_CELL + 2) * len(columns))

    def line(name: str, cells: Iterable[str]) -> str:
        return f"  {name:<{size}}" + "".join(f"  {cell:>{_CELL}}" for cell in cells).rstrip()

    settings = [column.setting for column in columns]
    yield paint.faint(line("camera", [letters[one.camera] for one in settings]))
    yield paint.faint(line("exposure, s", [exposure_label(one.exposure_s).removesuffix(" s") for one in settings]))
    yield paint.faint(line("frames/s", [column.rates for column in columns]))
    yield rule
    for light in plan.lights:
        yield line(_short(light), [cell(one.contrast_percent[light], plan.limit) for one in settings])
    yield rule
    yield paint.bold(line("all lights", ["clean " if one.clean else "NOT " for one in settings]))
    if len(plan.lights) > 1:
        yield line("without worst", [cell(one.without_worst_light_percent, plan.limit) for one in settings])
    yield ""
    yield from wrap("; ".join(f"{letter}: {camera}" for camera, letter in letters.items()), width, "  ")
    yield "  deepest bands in % of light, over the tolerance; ! is above the limit; --json lists every setting"


def letter_of(number: int) -> str:
    """Letter of a camera in the table."""
    return chr(ord("A") + number) if number < 26 else str(number + 1)


def _short(name: str) -> str:
    return name if len(name) <= _NAME else name[: _NAME - 1] + "…"


def cell(value: float | None, limit: float) -> str:
    """Give a contrast [%] for the table, with ! above the limit."""
    if value is None:
        return "–"
    digits = 2 if value < 9.995 else 1 if value < 99.95 else 0
    return f"{value:.{digits}f}{'!' if value > 100 * limit else ' '}"
