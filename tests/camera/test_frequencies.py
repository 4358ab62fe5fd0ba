import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from sensor_simulation import Wave, rectangle, worst_frame

from flicker.camera import Camera
from flicker.camera.frequencies import clean_frequencies
from flicker.camera.rectangle import contrast
from flicker.errors import InputError

DOCK = Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0, name="dock")
BRIDGE = Camera(lines=720, line_time=30e-6, frame_rate=24.0, name="bridge")


def settings_of(*pairs):
    return [(camera, exposure) for camera, exposures in pairs for exposure in exposures]


@pytest.mark.parametrize(
    ("exposures", "multiple", "source"),
    [
        ((1 / 25, 1 / 50, 1 / 100), 100.0, "least common multiple, by hand"),
        ((1 / 25, 1 / 30, 1 / 50, 1 / 60, 1 / 100), 300.0, "lcm(25, 30, 50, 60, 100) = 300"),
        ((1 / 48, 1 / 50, 1 / 60, 1 / 120), 1200.0, "lcm(48, 50, 60, 120) = 1200"),
        ((1 / 48, 1 / 50, 1 / 60, 1 / 250), 6000.0, "lcm(48, 50, 60, 250) = 6000"),
    ],
)
def test_common_multiples_of_the_shutters_appear_by_themselves(exposures, multiple, source):
    found = clean_frequencies(settings_of((DOCK, exposures)), 0.005, duties=(0.05, 0.95))
    assert found.choices[0].frequency == pytest.approx(multiple, rel=1e-9), source
    assert found.choices[0].worst_contrast == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize("tolerance", [0.0, 0.002])
def test_every_choice_keeps_the_contrast_in_an_independent_simulation(tolerance):
    rng = np.random.default_rng(7)
    limit = 0.03
    settings_ = settings_of((DOCK, (1 / 50, 1 / 100)), (BRIDGE, (1 / 60, 1 / 120)))
    found = clean_frequencies(settings_, limit, duties=(0.1, 0.9), tolerance=tolerance)
    assert len(found.choices) >= 5
    deepest = 0.0
    for choice in found.choices[:5]:
        for camera, exposure in settings_:
            for duty in (0.1, float(rng.uniform(0.1, 0.9))):
                for off in (-tolerance, tolerance, float(rng.uniform(-tolerance, tolerance))):
                    wave = Wave(rectangle(duty, samples=20_000), choice.frequency * (1 + off))
                    depth = worst_frame(wave, exposure, camera.line_time, camera.lines, phases=40, zooms=2)
                    deepest = max(deepest, depth)
                    assert depth <= 100 * choice.worst_contrast + 0.05
                    assert depth <= 100 * limit
    assert deepest > (0.5 if tolerance else 0.0)


def test_from_the_stated_frequency_on_every_one_is_clean():
    found = clean_frequencies(settings_of((DOCK, (1 / 50, 1 / 1000))), 0.02, duties=(0.05, 0.95), tolerance=0.01)
    frequencies = found.all_from * np.linspace(1.0, 1.5, 4000)
    for duty in (0.05, 0.3, 0.6, 0.95):
        for exposure in (1 / 50, 1 / 1000):
            assert contrast(frequencies * 0.99 * exposure, duty, 0.0).max() <= 0.02 + 1e-12
    below = found.all_from * np.linspace(0.9, 0.999, 4000)
    assert contrast(below / 1000, 0.05, 0.0).max() > 0.02


@settings(max_examples=40)
@given(st.floats(0.02, 0.5), st.floats(0.0, 0.5), st.floats(0.5, 60.0))
def test_a_narrower_pulse_never_leaves_fainter_bands_if_the_light_goes_out(duty, wider, cycles):
    # which is why the low end of the duty range decides
    assert contrast(cycles, duty, 0.0) >= contrast(cycles, min(duty + wider, 1.0), 0.0) - 1e-12


@pytest.mark.parametrize("low_level", [0.05, 0.3])
def test_with_light_in_the_pauses_every_duty_cycle_of_the_range_keeps_the_contrast(low_level):
    duties = (0.1, 0.9)
    found = clean_frequencies(settings_of((DOCK, (1 / 60, 1 / 125))), 0.03, duties=duties, low_level=low_level)
    for choice in found.choices:
        deepest = max(
            float(contrast(choice.frequency * exposure, duty, low_level))
            for exposure in (1 / 60, 1 / 125)
            for duty in np.linspace(*duties, 1601)
        )
        assert deepest <= 0.03
        assert deepest <= choice.worst_contrast + 1e-9


def test_names_the_camera_and_exposure_that_decide():
    both = settings_of((DOCK, (1 / 50,)), (BRIDGE, (1 / 1000,)))
    found = clean_frequencies(both, 0.02, duties=(0.05, 0.95), tolerance=1e-3, lowest=900.0)
    choice = next(one for one in found.choices if one.worst_contrast > 1e-6)
    assert (choice.camera, choice.exposure) in (("dock", 1 / 50), ("bridge", 1 / 1000))
    assert choice.to_dict()["worst_contrast_percent"] == pytest.approx(100 * choice.worst_contrast)


@pytest.mark.parametrize(
    ("changes", "said"),
    [
        ({"settings": []}, "no camera"),
        ({"limit": 0.0}, "between 0 and 100 %, not 0 %"),
        ({"duties": (0.5, 0.1)}, "runs upward"),
        ({"limit": 1e-5}, "too many frequencies"),
    ],
)
def test_what_cannot_be_searched_is_refused(changes, said):
    how = {"settings": settings_of((DOCK, (1 / 50,))), "limit": 0.01, "duties": (0.1, 0.9), **changes}
    with pytest.raises(InputError, match=said):
        clean_frequencies(how.pop("settings"), how.pop("limit"), **how)
