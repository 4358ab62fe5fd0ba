"""`flicker bands`: what a camera will record of a light, and what to dial in."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from flicker.cli.options import (
    DEVIATION,
    PERCENT,
    STAGGERED,
    TIME,
    camera_from_options,
    camera_options,
    filmed_options,
    light_from_options,
    light_options,
    page_option,
    several,
)
from flicker.cli.output import (
    colour_wanted,
    command_line,
    make_folder,
    print_words,
    spare_the_captures,
    terminal_width,
    write_json,
)

if TYPE_CHECKING:
    from flicker.camera.answer import Answer

_what_to_predict = several(
    click.option(
        "--exposure",
        "exposures",
        type=STAGGERED,
        multiple=True,
        help="Exposure, repeatable; 1/50+1/400 is a sensor that takes both, one after the other, and adds them up.",
    ),
    click.option("--tolerance", type=DEVIATION, help="How far the light's frequency may be off."),
    click.option("--wander", type=DEVIATION, help="How far it wanders to either side (dither); else as measured."),
    click.option("--light-scan", type=TIME, help="By how much a scanning backlight lags at the end of the picture."),
    click.option("--light-scan-against", is_flag=True, help="The backlight scans against the way the lines are read."),
    click.option("--contrast-limit", type=PERCENT, help="Up to which bands a setting is called clean; 1 if left out."),
    click.option("--viewing-distance", type=float, metavar="HEIGHTS", help="Of the eye, in picture heights."),
    click.option("--grade-gain", type=float, metavar="FACTOR", help="By which grading raises the contrast."),
)
_outputs = several(
    click.option("--json", "json_target", metavar="FILE|-", help="Write the answer as JSON; - for standard output."),
    click.option("--figures", metavar="DIR", help="Write pictures of the predicted frames into a folder."),
    click.option("--clip", metavar="FILE.mp4|.gif", help="Write a clip of the first exposure that rolls as it will."),
    click.option(
        "--scene", metavar="IMAGE", help="A still of your own for pictures and clip, in place of a plain one."
    ),
)


@click.command(short_help="What a camera will record: bands, how deep, which way they roll.")
@click.argument("capture", metavar="[CAPTURE]", required=False)
@light_options
@filmed_options
@camera_options
@_what_to_predict
@_outputs
@page_option
def command(
    capture: str | None,
    exposures: tuple[tuple[float, ...], ...],
    tolerance: float | None,
    wander: float | None,
    light_scan: float | None,
    light_scan_against: bool,
    contrast_limit: float | None,
    viewing_distance: float | None,
    grade_gain: float | None,
    json_target: str | None,
    figures: str | None,
    clip: str | None,
    scene: str | None,
    html_target: str | None,
    **options: Any,
) -> None:
    """Predict what a camera will record of a light: bands, how deep, how many, which way they roll.

    The light comes from a CAPTURE, or is typed in with --frequency and --duty. A video gives its light best through
    its stripes: say what filmed it with --filmed-with. The camera to predict comes from a file or from options; what
    is unknown of it leaves gaps in the answer, which say how to fill them. Contrasts are (max - min)/(max + min) of
    light within one frame, those of the worst frame.

    Example:

        flicker bands --frequency 240 --duty 0.05 --camera dock-camera.toml
    """
    from flicker.camera.answer import predict_all
    from flicker.report.bands import bands_words
    from flicker.report.typesetting import wrap

    spare_the_captures([] if capture is None else [capture], [json_target, clip, html_target])
    light, source = light_from_options(capture, options)
    camera = camera_from_options(options)
    answer = predict_all(
        light,
        camera,
        exposures=exposures,
        tolerance=tolerance,
        limit=contrast_limit,
        light_scan=-(light_scan or 0.0) if light_scan_against else light_scan or 0.0,
        wander=wander,
        viewing_distance=viewing_distance,
        gain=1.0 if grade_gain is None else grade_gain,
    )
    notes = _draw(answer, figures, clip, scene) if figures or clip else ()
    write_json({"capture": capture, "light_from": source or None, **answer.to_dict()}, json_target)
    if html_target:
        from flicker.files import write_text
        from flicker.report.pages import bands_page

        write_text(html_target, bands_page(answer, command_line(), capture, source))
    words = bands_words(answer, width=terminal_width(), colour=colour_wanted())
    told = wrap(f"i The light was read from {source}.", terminal_width(), "  ", hang=2) if source else []
    print_words("\n".join([words, *told, *notes]), json_target)


def _draw(answer: Answer, figures: str | None, clip: str | None, scene: str | None) -> list[str]:
    """Write the pictures that are asked for, and say so."""
    from flicker.camera.filmed import need_lines
    from flicker.plots.clip import read_scene, write_clip
    from flicker.plots.frame import save_frames
    from flicker.report.bands import clip_words

    need_lines(answer.camera)
    still = None if scene is None else read_scene(scene)
    notes = []
    if clip is not None:
        notes.append(clip_words(write_clip(answer, clip, scene=still)))
    if figures is not None:
        notes.append(f"  pictures: {', '.join(str(path) for path in save_frames(answer, make_folder(figures), still))}")
    return notes
