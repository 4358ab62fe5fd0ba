"""Plan files: lights, cameras and limits of a shoot, in TOML."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from flicker.camera.plan import Plan, PlannedCamera, make_plan
from flicker.camera.sensor import Camera, camera_from, read_toml, typed
from flicker.camera.shutter import CONTRAST_LIMIT
from flicker.errors import FlickerError, InputError
from flicker.light import Light, pwm_light
from flicker.registry import did_you_mean

ReadLight = Callable[..., Light]

_TOP = ("tolerance_percent", "contrast_limit_percent", "light", "camera")
_TYPED = {"frequency_hz": "frequency", "duty": "number", "low_level": "number"}
_READING = {
    "sample_rate_hz": ("sample_rate", "frequency"),
    "dark_level": ("dark_level", "number"),
    "dark_capture": ("dark_capture", "text"),
    "mean": ("mean", "number"),
    "dc_coupled": ("dc_coupled", "yes"),
    "inverted": ("inverted", "yes"),
    "detector_bandwidth_hz": ("detector_bandwidth", "frequency"),
    "start_s": ("start", "time"),
    "duration_s": ("duration", "time"),
    "columns": ("columns", "names"),
    "channels": ("channels", "numbers"),
}
_LIGHT = ("name", "capture", *_TYPED, "decay_s", "tolerance_percent", *_READING)
_CHOICE = ("file", "frame_rates_hz", "exposures_s")


def plan_from_file(path: str | Path, read_light: ReadLight) -> Plan:
    """
    Read a plan file and make the plan.

    Parameters
    ----------
    path : path
        TOML; paths in it are relative to it.
    read_light : callable
        Called with the path of a capture and the reading options as keywords; gives its light.

    Raises
    ------
    UnreadableFileError, InputError
        If a file cannot be read or an entry cannot be right; the text names file, table and key.
    """
    path = Path(path)
    table = read_toml(path, "plan file")
    _known(table, _TOP, path.name)
    lights: dict[str, Light] = {}
    tolerances: dict[str, float] = {}
    common = _percent(table, "tolerance_percent", path.name)
    for number, entry in enumerate(_tables(table, "light", path.name), 1):
        where = f"{path.name}, light {number}"
        name, light, own = _light(entry, where, path.parent, read_light)
        name = name or f"light {number}"
        if name in lights:
            raise InputError(f"{where}: a light called '{name}' is there already")
        lights[name] = light
        if own is not None or common is not None:
            tolerances[name] = own if own is not None else common or 0.0
    cameras: list[PlannedCamera] = []
    for number, entry in enumerate(_tables(table, "camera", path.name), 1):
        planned = _camera(entry, f"{path.name}, camera {number}", path.parent, number)
        if planned.name in [one.name for one in cameras]:
            raise InputError(f"{path.name}, camera {number}: a camera called '{planned.name}' is there already")
        cameras.append(planned)
    limit = _percent(table, "contrast_limit_percent", path.name)
    try:
        return make_plan(
            lights, cameras, tolerance=tolerances or None, limit=CONTRAST_LIMIT if limit is None else limit
        )
    except InputError as error:
        raise InputError(f"{path.name}: {error}") from None


def _known(table: Mapping[str, Any], keys: tuple[str, ...], where: str) -> None:
    for key in table:
        if key not in keys:
            raise InputError(f"{where}: {did_you_mean('key', key, list(keys))}")


def _tables(table: Mapping[str, Any], key: str, where: str) -> list[dict[str, Any]]:
    entries = table.get(key, [])
    if not isinstance(entries, list) or not all(isinstance(entry, dict) for entry in entries):
        raise InputError(f"{where}: write each {key} as a table of its own, headed [[{key}]]")
    return entries


def _percent(table: Mapping[str, Any], key: str, where: str) -> float | None:
    if key not in table:
        return None
    value = typed(table[key], "number", key, where)
    if not 0 <= value < 50:
        raise InputError(f"{where}: {key} = {value} must lie between 0 and 50")
    return float(value) / 100.0


def _light(
    entry: Mapping[str, Any], where: str, folder: Path, read_light: ReadLight
) -> tuple[str, Light, float | None]:
    _known(entry, _LIGHT, where)
    name = typed(entry.get("name", ""), "text", "name", where)
    tolerance = _percent(entry, "tolerance_percent", where)
    if "capture" in entry:
        given = next((key for key in (*_TYPED, "decay_s") if key in entry), None)
        if given:
            raise InputError(f"{where}: {given} types a light in, capture reads it: give one of them")
        capture = folder / typed(entry["capture"], "text", "capture", where)
        options = {_READING[key][0]: _reading(entry[key], key, where, folder) for key in _READING if key in entry}
        try:
            return name or capture.stem, read_light(capture, **options), tolerance
        except FlickerError as error:
            raise type(error)(f"{where}: {error}") from None
    missing = next((key for key in ("frequency_hz", "duty") if key not in entry), None)
    if missing:
        raise InputError(f"{where}: {missing} is missing: give capture, or frequency_hz and duty")
    surplus = next((key for key in _READING if key in entry), None)
    if surplus:
        raise InputError(f"{where}: {surplus} goes with a capture, not with a light typed in")
    frequency, duty = (typed(entry[key], _TYPED[key], key, where) for key in ("frequency_hz", "duty"))
    low_level = typed(entry.get("low_level", 0.0), "number", "low_level", where)
    decay = entry.get("decay_s", 0.0)
    times = (
        typed(decay, "times", "decay_s", where) if isinstance(decay, list) else typed(decay, "time", "decay_s", where)
    )
    try:
        return name, pwm_light(frequency, duty, low_level, times), tolerance
    except InputError as error:
        raise InputError(f"{where}: {error}") from None


def _reading(value: Any, key: str, where: str, folder: Path) -> Any:
    kind = _READING[key][1]
    if kind == "yes":
        if not isinstance(value, bool):
            raise InputError(f"{where}: {key} must be true or false, not {value!r}")
        return value
    if kind in ("names", "numbers"):
        wanted = str if kind == "names" else int
        if not isinstance(value, list) or not all(isinstance(one, wanted) for one in value):
            raise InputError(f"{where}: {key} must be a list of {kind}, not {value!r}")
        return tuple(value)
    value = typed(value, kind, key, where)
    return folder / value if key == "dark_capture" else value


def _camera(entry: Mapping[str, Any], where: str, folder: Path, number: int) -> PlannedCamera:
    own = {key: value for key, value in entry.items() if key not in _CHOICE}
    if "file" in entry:
        if own:
            raise InputError(
                f"{where}: {next(iter(own))} stands in the camera file: give file, or the keys of a camera"
            )
        file = typed(entry["file"], "text", "file", where)
        camera = Camera.load(folder / file)
        name = camera.name or Path(file).stem
    else:
        camera = camera_from(own, where=where)
        name = camera.name or f"camera {number}"
    rates = () if camera.frame_rate is None else (camera.frame_rate,)
    if "frame_rates_hz" in entry:
        rates = typed(entry["frame_rates_hz"], "frequencies", "frame_rates_hz", where)
    exposures = camera.exposures
    if "exposures_s" in entry:
        exposures = typed(entry["exposures_s"], "times", "exposures_s", where)
    for value in (*rates, *exposures):
        if value <= 0:
            raise InputError(f"{where}: frame rates and exposures must be above 0, not {value:g}")
    return PlannedCamera(camera, name, rates, exposures)
