"""The bands of a video found: a first search, the lowest frequency that explains them, all lines fitted at once."""

from __future__ import annotations

import dataclasses

import numpy as np
import numpy.typing as npt

from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.results import Note
from flicker.signal.stripes_fit import STANDING, Rows, StripeFit, fit_stripes, shows_between, standing_of
from flicker.signal.stripes_search import Deviation, search_frequency, search_turns
from flicker.trace import FloatArray

_FAINTEST = 5e-3  # share of the variation that a tone must explain
_LOWEST_BAND = 2e-3  # amplitude over the mean below which compression makes bands of its own
_FRAMES_USED = 64
_HELD = 0.6  # of the height of the bands in most frames, below which a frame holds those of its neighbours
_UNEVEN = 0.45  # height in the frames with the faintest bands over that in most, below which bands may be ghosts
_FAINT = 0.015  # contrast of bands that compression may renew in some frames only
_MISFIT = 0.1  # of the level, left by a fit: more than any noise
_NEARLY_STILL = 0.75  # how well the phases of a harmonic agree over the frames where it is hard to tell from the scene
_STRONG = 5  # harmonics that a deep light cannot do without
_FEWEST_BANDS = 3  # from which the bands of each frame can be weighed by themselves
_FEWEST_FRAMES = 10
_EVEN = 0.002  # of the time between frames: they come evenly
_TOLD = 0.002  # relative error of a line time that is told
_RATES = (24.0, 25.0, 30.0, 48.0, 50.0, 60.0)


def find_bands(footage: Footage, line_time: float | None) -> StripeFit:
    """Find the bands and fit them in the channel that holds all light; `NotMeasurable` if there are none."""
    lines = footage.lines_of("all")
    deviation = Deviation.of(lines, footage.times)
    if line_time is not None:
        tones = [(t.frequency, t.turns_per_line, t.power) for t in search_frequency(deviation, line_time)]
    else:
        rate = footage.frame_rate
        tones = [(turns * rate, per_line, power) for per_line, turns, power in search_turns(deviation, rate)]
    tones = [tone for tone in tones if _moving(tone[0], footage)]
    least = max(100.0 / (deviation.lines * len(deviation.times)), _FAINTEST)
    tones.sort(key=lambda tone: -tone[2])
    if not tones or tones[0][2] < least:
        raise NotMeasurable(_no_bands(lines, footage, line_time))
    first = frames_of(footage, first=True)
    fit = fit_stripes(rows_of(footage, "all", first), tones[0][0], tones[0][1])
    fit = _lowest(footage, fit)
    if footage.frames > _FRAMES_USED:
        longer = fit_stripes(rows_of(footage, "all", frames_of(footage)), fit.frequency, fit.turns_per_line)
        if longer.noise < 1.5 * fit.noise:
            fit = longer
    if not (np.abs(fit.amplitudes) > np.maximum(8 * fit.errors, _LOWEST_BAND)).any():
        raise NotMeasurable(_no_bands(lines, footage, line_time))
    return fit if line_time is None else _at_line_time(footage, fit, line_time)


def _at_line_time(footage: Footage, fit: StripeFit, line_time: float) -> StripeFit:
    """
    Of the frequencies a whole frame rate apart, which even frames cannot tell, take the one that the line time means.

    A readout that fills little of the frame shows few bands, so that the search may take a neighbour.
    """
    steps = np.diff(footage.times)
    if float(np.std(steps)) > _EVEN * float(np.mean(steps)):
        return fit
    meant = abs(fit.turns_per_line) / line_time
    shift = round((meant - fit.frequency) / footage.frame_rate)
    near = abs(fit.frequency + shift * footage.frame_rate - meant)
    doubt = 3.0 * fit.turns_error / line_time + _TOLD * meant  # what is told of a line time is not exact either
    if shift == 0 or abs(shift) > 3 or near > doubt or abs(fit.frequency - meant) < doubt:
        return fit
    added = shift * footage.frame_rate  # whole turns from frame to frame; the middle of the footage is no frame
    turned = np.exp(-2j * np.pi * fit.harmonics * added * float(footage.times[0] - np.mean(footage.times)))
    return dataclasses.replace(fit, frequency=fit.frequency + added, amplitudes=fit.amplitudes * turned)


def without_held(footage: Footage) -> tuple[Footage, tuple[Note, ...]]:
    """
    Leave out the frames whose bands compression did not renew, where there are such.

    A frame that is coded from its neighbours may keep their faint bands in place of its own; bands that alternate
    from frame to frame then seem to have another frequency.
    """
    height = _heights(footage)
    if footage.lossless or height is None:
        return footage, ()
    strong = height > _HELD * np.quantile(height, 0.9)
    if not 0.25 < strong.mean() < 0.9 or strong.sum() < _FEWEST_FRAMES:
        return footage, ()
    message = (
        f"{int((~strong).sum())} of {strong.size} frames show their bands much fainter than the others: compression "
        "did not renew them; they were left out: film with less compression"
    )
    kept = dataclasses.replace(
        footage,
        light=footage.light[strong],
        times=footage.times[strong],
        alone=None if footage.alone is None else footage.alone[strong],
    )
    return kept, (Note("bands-held", "warning", message),)


def need_renewed(footage: Footage, bands: StripeFit) -> None:
    """Refuse faint bands of which compression renewed so few that another frequency may be meant."""
    height = None if footage.lossless or bands.contrast > _FAINT else _heights(footage)
    if height is None or np.quantile(height, 0.1) > _UNEVEN * np.quantile(height, 0.9):
        return
    raise NotMeasurable(
        f"bands of {100 * bands.contrast:.2g} % show, but compression renewed them in some frames only, so that their "
        f"frequency may be {bands.frequency:.5g} Hz or any that differs by a share of the frame rate: film with a "
        "shorter exposure, more light or less compression"
    )


def need_fit(waves: dict[str, StripeFit]) -> None:
    """Refuse a deep light of which a strong harmonic stands still: without it the others explain the lines badly."""
    worst = max(waves.values(), key=lambda wave: wave.noise)
    still = np.flatnonzero(worst.standing[:_STRONG] > _NEARLY_STILL) + 1
    if worst.noise > _MISFIT and still.size:
        raise NotMeasurable(
            f"bands of about {worst.frequency:.5g} Hz move, but harmonic {', '.join(map(str, still))} of it stands "
            "all but still in the picture, and without it light and scene cannot be told apart: film at another frame "
            "rate"
        )


def _heights(footage: Footage) -> FloatArray | None:
    """Height of the bands in each frame, shape (t,); None where a frame holds too few bands to tell."""
    lines = footage.lines_of("all")
    level = lines.mean(axis=0)
    lit = level > 0.05 * np.median(level)
    spectrum = np.abs(np.fft.rfft((lines[:, lit] / level[lit] - 1) * np.hanning(int(lit.sum())), axis=1)) ** 2
    if spectrum.shape[1] <= 8:
        return None
    peak = int(spectrum.sum(axis=0)[_FEWEST_BANDS:].argmax()) + _FEWEST_BANDS
    if peak == _FEWEST_BANDS:
        return None
    return np.asarray(np.sqrt(spectrum[:, peak - 1 : peak + 2].sum(axis=1)))


def frames_of(footage: Footage, *, first: bool = False) -> npt.NDArray[np.intp]:
    """Numbers of the frames that are fitted: all of few, the first ones, or some all over with those coded alone."""
    chosen = np.arange(footage.frames)
    if footage.frames <= _FRAMES_USED:
        return chosen
    if first:
        return chosen[:_FRAMES_USED]
    spread = np.linspace(0, footage.frames - 1, _FRAMES_USED).astype(int)
    if footage.alone is None or footage.alone.all():
        return spread
    return np.union1d(spread, np.flatnonzero(footage.alone)[:_FRAMES_USED])


def rows_of(footage: Footage, channel: str, chosen: npt.NDArray[np.intp]) -> Rows:
    """Lines of a channel in the chosen frames, about the middle of the footage."""
    return Rows.of(footage.lines_of(channel)[chosen], footage.times[chosen], float(footage.times.mean()))


def _moving(frequency: float, footage: Footage) -> bool:
    return bool(standing_of(np.ones(1), frequency, footage.times)[0] < STANDING)


def _lowest(footage: Footage, fit: StripeFit) -> StripeFit:
    """The same light at a half, a third or a fifth of the frequency, where lines between the harmonics show it."""
    rows = rows_of(footage, "all", frames_of(footage, first=True))
    for divisor in (2, 3, 5):
        frequency = fit.frequency / divisor
        if not _moving(frequency, footage) or fit.turns_per_line * footage.lines / divisor < 0.5:
            continue
        if not shows_between(rows, fit, divisor):
            continue
        slower = fit_stripes(rows, frequency, fit.turns_per_line / divisor, rounds=3)
        between = slower.harmonics % divisor != 0
        heights = np.abs(slower.amplitudes)
        clear = heights > np.maximum(8 * slower.errors, 0.03 * heights.max())
        if (clear & between).any() and slower.noise < 0.97 * fit.noise:
            return fit_stripes(rows, frequency, fit.turns_per_line / divisor)
    return fit


def _no_bands(lines: FloatArray, footage: Footage, line_time: float | None) -> str:
    other = [rate for rate in _RATES if abs(rate / footage.frame_rate - 1) > 0.02]
    cure = (
        f"film at a frame rate other than {footage.frame_rate:.5g} Hz, such as {other[0]:g} or "
        f"{other[1]:g}, with a short "
        "exposure; or measure a plain white surface"
    )
    profile = lines.mean(axis=0)
    level = np.convolve(profile, np.ones(31) / 31, "same")[31:-31] if profile.size > 100 else profile
    rest = (profile[31:-31] if profile.size > 100 else profile) / np.where(level > 0, level, 1.0) - 1
    power = np.abs(np.fft.rfft(rest * np.hanning(rest.size))) ** 2
    power[:2] = 0
    peak = int(power.argmax())
    if power[max(peak - 2, 0) : peak + 3].sum() > 0.5 * power.sum() and rest.std() > 0.002:
        place = ""
        if line_time is not None:
            about = peak / rest.size / line_time
            multiple = max(round(about / footage.frame_rate), 1)
            place = (
                f" (about {about:.0f} Hz, perhaps {multiple} times the frame rate = "
                f"{multiple * footage.frame_rate:.6g} Hz)"
            )
        return (
            f"no band moves; a pattern of lines stands still{place}: bands that keep step with the "
            f"frames, or the scene; {cure}"
        )
    return (
        "no light was found that changes from line to line and from frame to frame: it is steady, its "
        "bands stand still, "
        f"the exposure blurs them away, or the lines run the other way (--read-direction); {cure}"
    )
