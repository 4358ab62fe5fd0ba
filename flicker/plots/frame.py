"""The predicted frame: what the camera will show, and the light of its lines."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from flicker.camera.filmed import encoded, highlights_kept, line_light, on_scene, plain_scene, shown_channels
from flicker.camera.shutter import exposure_label
from flicker.plots.style import CHANNELS, DASHES, FAINT, INK, LIGHT, PAPER, dress, save_figure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flicker.camera.answer import Answer
    from flicker.trace import FloatArray

_HEIGHT, _WIDTH = 720, 960  # of the picture drawn
_LINES_DRAWN = 4000  # of the profile
_ARROWS = {"down": (0, -1), "up": (0, 1), "left": (-1, 0), "right": (1, 0)}
_OPPOSITE = {"down": "up", "up": "down", "left": "right", "right": "left"}
_MOST_SIDE_BY_SIDE = 6


def scene_for(answer: Answer, scene: FloatArray | None) -> FloatArray:
    """Give the user's scene, or the plain one."""
    return plain_scene(_HEIGHT, _WIDTH, answer.camera.read_direction) if scene is None else scene


def predicted_frame(answer: Answer, number: int, scene: FloatArray | None = None) -> Any:
    """Code values of one frame of prediction `number` over a scene, shape (height, width, 3)."""
    camera = answer.camera
    scene = scene_for(answer, scene)
    along = scene.shape[1] if camera.read_direction in ("left", "right") else scene.shape[0]
    lit = _averaged(answer, number, along)
    return encoded(on_scene(scene, lit, camera.read_direction), highlights_kept(lit, scene))


def _averaged(answer: Answer, number: int, along: int) -> FloatArray:
    """Light of the first frame in as many rows as the picture has, each the mean of the lines that it shows."""
    one = answer.predictions[number]
    lines = answer.camera.lines or along
    each = max(1, round(lines / along))
    fine = line_light(answer.light, answer.camera, one.exposure_s, lines=along * each, light_scan=answer.light_scan)[0]
    return np.asarray(fine.reshape(along, each, -1).mean(axis=1))


def draw_frame(answer: Answer, number: int, scene: FloatArray | None = None) -> Figure:
    """
    Draw one predicted frame beside the light of its lines.

    Parameters
    ----------
    answer : Answer
        What was predicted.
    number : int
        Which of its predictions.
    scene : ndarray or None
        Linear scene to put the light on, shape (height, width, 3); None: a plain one.

    Raises
    ------
    InputError
        If the camera's lines or line time are unknown.
    """
    from matplotlib.figure import Figure

    figure = Figure(figsize=(10.0, 4.8), facecolor=PAPER, layout="constrained")
    picture, profile = figure.subplots(1, 2, width_ratios=(1.45, 1))
    one = answer.predictions[number]
    depth = max(one.contrast_percent.values())
    light = "steady light" if answer.light.frequency is None else f"{answer.light.frequency:.6g} Hz"
    figure.suptitle(
        f"{light} at {_label(answer, number)}: {one.visibility}, bands {depth:.3g} % deep",
        x=0.01,
        ha="left",
        color=INK,
        fontsize=12,
    )
    _show(picture, predicted_frame(answer, number, scene))
    picture.set_title(_caption(answer, number), loc="left", color=INK, fontsize=9)
    _roll_arrow(picture, answer, number)
    _draw_profile(profile, answer, number)
    return figure


def draw_exposures(answer: Answer, scene: FloatArray | None = None) -> Figure:
    """Draw the predicted frames of up to six exposures side by side, as a strip."""
    from matplotlib.figure import Figure

    count = min(len(answer.predictions), _MOST_SIDE_BY_SIDE)
    across = min(count, 3)
    down = -(-count // across)
    figure = Figure(figsize=(3.6 * across, 3.1 * down + 0.3), facecolor=PAPER, layout="constrained")
    axes = np.atleast_1d(figure.subplots(down, across)).ravel()
    for number, axis in enumerate(axes):
        if number >= count:
            axis.set_axis_off()
            continue
        one = answer.predictions[number]
        _show(axis, predicted_frame(answer, number, scene))
        depth = max(one.contrast_percent.values())
        axis.set_title(f"{_label(answer, number)}\n{one.visibility}, {depth:.3g} %", loc="left", color=INK, fontsize=9)
    return figure


def save_frames(answer: Answer, folder: Path, scene: FloatArray | None = None) -> tuple[Path, ...]:
    """Write the picture of every prediction, and all side by side where there are several; give the files."""
    written = []
    names: list[str] = []
    for number in range(len(answer.predictions)):
        name = _file_name(answer, number)
        names.append(name)
        repeated = names.count(name)
        written.append(folder / f"{name}{f'-{repeated}' if repeated > 1 else ''}.png")
        save_figure(draw_frame(answer, number, scene), written[-1])
    if len(answer.predictions) > 1:
        written.append(folder / "frames-side-by-side.png")
        save_figure(draw_exposures(answer, scene), written[-1])
    return tuple(written)


def _lengths(answer: Answer, number: int) -> tuple[float, ...]:
    exposure = answer.predictions[number].exposure_s
    return exposure if isinstance(exposure, tuple) else (exposure,)


def _label(answer: Answer, number: int) -> str:
    lengths = _lengths(answer, number)
    if len(lengths) == 1:
        return exposure_label(lengths[0], answer.camera.frame_rate)
    return " + ".join(exposure_label(length) for length in lengths)


def _file_name(answer: Answer, number: int) -> str:
    words = "+".join(
        exposure_label(length).removesuffix(" s").replace("1/", "1-") for length in _lengths(answer, number)
    )
    return f"frame-{words}-s"


def _caption(answer: Answer, number: int) -> str:
    one = answer.predictions[number]
    if answer.camera.shutter == "global":
        return "global shutter: the whole picture pulses"
    words = "" if one.bands_per_frame is None else f"{one.bands_per_frame:.3g} bands in the picture"
    if one.standing:
        return f"{words}, standing still"
    if one.drift_seconds_per_band and one.drift_lines_per_frame is not None:
        words += f", rolling {_way(answer, number)}, one every {one.drift_seconds_per_band:.2g} s"
    return words


def _way(answer: Answer, number: int) -> str:
    direction = answer.camera.read_direction
    return direction if (answer.predictions[number].drift_lines_per_frame or 0.0) > 0 else _OPPOSITE[direction]


def _show(axes: Axes, image: Any) -> None:
    axes.imshow(image, aspect="equal", interpolation="antialiased")
    axes.set_xticks([])
    axes.set_yticks([])
    axes.spines[:].set_color(FAINT)


def _roll_arrow(axes: Axes, answer: Answer, number: int) -> None:
    one = answer.predictions[number]
    if not one.visible or one.standing or one.drift_lines_per_frame is None or answer.camera.shutter == "global":
        return
    from matplotlib.patheffects import withStroke

    across, up = _ARROWS[_way(answer, number)]
    centre = (0.94, 0.5) if across == 0 else (0.5, 0.06)
    end = (centre[0] + 0.12 * across, centre[1] + 0.12 * up)
    start = (centre[0] - 0.12 * across, centre[1] - 0.12 * up)
    arrow = {"arrowstyle": "-|>", "color": INK, "linewidth": 3, "mutation_scale": 22}
    drawn = axes.annotate("", end, start, xycoords="axes fraction", textcoords="axes fraction", arrowprops=arrow)
    if drawn.arrow_patch is not None:
        drawn.arrow_patch.set_path_effects([withStroke(linewidth=7, foreground=PAPER)])


def _draw_profile(axes: Axes, answer: Answer, number: int) -> None:
    dress(axes)
    one, camera = answer.predictions[number], answer.camera
    lines = camera.lines or 1000
    drawn = min(lines, _LINES_DRAWN)
    lit = line_light(answer.light, camera, one.exposure_s, lines=drawn, light_scan=answer.light_scan)[0]
    position = (np.arange(drawn) + 0.5) * lines / drawn
    for column, name in enumerate(shown_channels(answer.light)):
        axes.plot(
            position,
            100 * lit[:, column],
            color=CHANNELS.get(name, LIGHT),
            linestyle=DASHES.get(name, "solid"),
            label=name,
        )
    if lit.shape[1] > 1:
        axes.legend(loc="lower right", fontsize=8, frameon=True, framealpha=0.9)
    axes.set_xlim(0, lines)
    axes.set_ylim(0, max(110.0, 108 * float(lit.max())))
    axes.set_xlabel(f"line, in the order read ({camera.read_direction})", color=INK, fontsize=9)
    axes.set_ylabel("light of the line / % of its mean", color=INK, fontsize=9)
    axes.set_title("light of the lines", loc="left", color=INK, fontsize=9)
