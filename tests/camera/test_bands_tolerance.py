"""What is stated over a tolerance, and what is advised, against the simulated sensor."""

import numpy as np
import pytest
from sensor_simulation import Wave, contrast, rectangle, worst_frame

import flicker
from flicker.camera import Camera, predict_bands
from flicker.camera.shutter import advise
from flicker.light import ChannelLight, Light, pwm_light


def case(seed):
    rng = np.random.default_rng(seed)
    frame_rate = float(rng.uniform(20, 60))
    camera = Camera(
        lines=int(rng.integers(60, 300)), readout_time=float(rng.uniform(0.3, 1)) / frame_rate, frame_rate=frame_rate
    )
    frequency = float(np.exp(rng.uniform(np.log(20), np.log(8_000))))
    duty, tolerance = float(rng.uniform(0.03, 0.97)), float(rng.choice([0.001, 0.01, 0.05]))
    exposure = float(np.exp(rng.uniform(np.log(1 / 2000), np.log(1 / frame_rate))))
    return rng, camera, frequency, duty, tolerance, exposure


def simulated(cycle, frequency, exposure, camera):
    return worst_frame(Wave(cycle, frequency), exposure, camera.line_time, camera.lines, phases=120, zooms=2)


@pytest.mark.parametrize("seed", range(24))
@pytest.mark.parametrize("decay", [0.0, 1e-3])
def test_no_frequency_within_the_tolerance_exceeds_the_worst_contrast_and_one_reaches_it(seed, decay):
    _, camera, frequency, duty, tolerance, exposure = case(seed)
    if decay and seed % 4:
        return
    bands = predict_bands(pwm_light(frequency, duty, decay=decay), camera, exposure, tolerance)
    corners = np.array([whole + rest for whole in range(400) for rest in (0, duty, 0.5, 1 - duty)]) / exposure
    inside = corners[abs(corners / frequency - 1) < tolerance][:4]
    frequencies = [*np.linspace(1 - tolerance, 1 + tolerance, 15) * frequency, *inside]
    found = []
    for one in frequencies:
        cycle = rectangle(duty, 0.0, 1 / (one * decay) if decay else None, samples=20_000)
        found.append(simulated(cycle, one, exposure, camera))
    assert max(found) <= bands.worst_contrast_percent + 0.1
    assert max(found) >= bands.worst_contrast_percent - max(0.4, 0.02 * bands.worst_contrast_percent)
    assert bands.worst_contrast_percent >= bands.contrast_percent["all"]


@pytest.mark.parametrize("seed", range(100, 112))
def test_every_advised_exposure_keeps_what_is_stated_for_it(seed):
    rng, camera, frequency, duty, tolerance, _ = case(seed)
    light = pwm_light(frequency, duty)
    advice = advise(light, camera, tolerance=tolerance, most=5)
    assert [one.deepest for one in advice] == sorted((one.deepest for one in advice), key=lambda value: round(value, 3))
    for one in advice:
        assert one.exposure_s <= 1.000001 / camera.frame_rate
        assert one.clean == (one.deepest <= 1.0)
        for off in rng.uniform(-tolerance, tolerance, 6):
            got = simulated(rectangle(duty, samples=20_000), frequency * (1 + off), one.exposure_s, camera)
            assert got <= one.worst_contrast_percent + 0.05
        if one.window_percent is not None:
            for share, sign in zip(one.window_percent, (-1, 1), strict=True):
                edge = one.exposure_s * (1 + sign * share / 100)
                assert simulated(rectangle(duty, samples=20_000), frequency, edge, camera) <= 1.05


@pytest.mark.parametrize("seed", range(200, 210))
def test_families_that_drift_against_each_other(seed):
    rng, camera, frequency, duty, _, exposure = case(seed)
    other = frequency * float(rng.uniform(1.3, 9.7))
    pulse = pwm_light(frequency, duty)["all"].amplitudes[:6] * 0.3
    frequencies = np.concatenate([frequency * np.arange(1, 7), [other]])
    channel = ChannelLight("all", frequencies, np.concatenate([pulse, [0.2]]), fundamentals=(frequency, other))
    exposure = min(exposure, 15 / frequencies.max())  # the sum below takes 40 steps of the exposure
    bands = predict_bands(Light((channel,)), camera, exposure)
    times = np.arange(camera.lines) * camera.line_time
    deepest = 0.0
    for start in rng.uniform(0, 1000, 400):
        moments = start + times[:, None] + exposure * (np.arange(40) + 0.5) / 40
        lines = channel.at(moments.ravel()).reshape(moments.shape).mean(axis=1)
        deepest = max(deepest, float(contrast(lines)))
    got = bands.contrast_percent["all"]
    assert deepest <= got + 0.1
    assert deepest >= 0.9 * got - 0.1  # random starts come near the worst


@pytest.mark.parametrize("seed", range(300, 308))
def test_staggered_exposures_and_binned_lines(seed):
    _, camera, frequency, duty, _, exposure = case(seed)
    pair = (exposure, exposure / 8)
    wave = Wave(rectangle(duty), frequency)
    times = np.arange(camera.lines) * camera.line_time
    starts = np.linspace(0, 1, 400, endpoint=False)[:, None] / frequency
    first, second = wave.exposed(starts + times, pair[0]), wave.exposed(starts + times + pair[0], pair[1])
    together = (first * pair[0] + second * pair[1]) / sum(pair)
    bands = predict_bands(pwm_light(frequency, duty), camera, pair)
    assert bands.contrast_percent["all"] == pytest.approx(contrast(together).max(), abs=0.3)
    binned = camera.changed(line_binning=3)
    lines = np.mean([wave.exposed(starts + times + part * camera.line_time / 3, exposure) for part in range(3)], axis=0)
    bands = predict_bands(pwm_light(frequency, duty), binned, exposure)
    assert bands.contrast_percent["all"] == pytest.approx(contrast(lines).max(), abs=0.3)


def test_lines_of_a_rectangle_agree_with_the_exact_rectangle():
    camera = Camera(lines=1000, readout_time=16e-3, frame_rate=25.0)
    exact = pwm_light(239.7, 0.2, 0.1)["all"]
    lines = ChannelLight("all", exact.frequencies, exact.amplitudes, fundamentals=(239.7,))
    for exposure in (1 / 50, 1 / 60, 1 / 250):
        one, other = (predict_bands(Light((channel,)), camera, exposure, 0.01) for channel in (exact, lines))
        assert other.contrast_percent["all"] == pytest.approx(one.contrast_percent["all"], abs=0.1)
        assert other.worst_contrast_percent == pytest.approx(one.worst_contrast_percent, abs=0.1)


def test_what_is_unknown_leaves_gaps_with_reasons():
    light = pwm_light(240.0, 0.1)
    nothing = predict_bands(light, Camera(), 1 / 50).to_dict()
    assert nothing["band_period_lines"] is None
    assert nothing["drift_lines_per_frame"] is None
    assert nothing["contrast_percent"]["all"] == pytest.approx(100 / 9)
    assert "--line-time" in nothing["reason"]
    assert "--frame-rate" in nothing["reason"]
    only_readout = predict_bands(light, Camera(readout_time=16e-3), 1 / 50)
    assert only_readout.bands_per_frame == pytest.approx(240 * 16e-3)
    assert only_readout.band_period_lines is None
    with pytest.raises(flicker.InputError, match="exposure is unknown"):
        predict_bands(light, Camera())


def test_steady_light_has_no_bands():
    bands = predict_bands(pwm_light(240.0, 1.0), Camera(lines=100, readout_time=1e-2, frame_rate=25.0), 1 / 50, 0.01)
    assert bands.contrast_percent == {"all": 0.0}
    assert bands.worst_contrast_percent == 0
    assert not bands.visible
    assert bands.bands_per_frame == 0
    assert "steady" in bands.to_dict()["reason"]


def test_staggered_exposures_of_lines_agree_with_those_of_the_rectangle():
    camera = Camera(lines=400, readout_time=16e-3, frame_rate=25.0)
    exact = pwm_light(210.0, 0.3)["all"]
    lines = Light((ChannelLight("all", exact.frequencies, exact.amplitudes, fundamentals=(210.0,)),))
    for pair in ((1 / 100, 1 / 400), (1 / 400, 1 / 90), (1 / 150, 1 / 150)):
        got = predict_bands(lines, camera, pair).contrast_percent["all"]
        assert got == pytest.approx(predict_bands(Light((exact,)), camera, pair).contrast_percent["all"], abs=0.2)
    halves = predict_bands(lines, camera, (1 / 150, 1 / 150)).contrast_percent["all"]
    assert halves == pytest.approx(predict_bands(lines, camera, 1 / 75).contrast_percent["all"], abs=1e-6)


@pytest.mark.parametrize("seed", range(10, 20))
def test_few_lines_limit_what_a_tolerance_can_do(seed):
    rng = np.random.default_rng(seed)
    lines, line_time = int(rng.integers(2, 6)), float(rng.uniform(2e-5, 2e-4))
    camera = Camera(lines=lines, line_time=line_time, frame_rate=25.0)
    frequency = float(rng.uniform(0.2, 3.0)) / line_time
    duty, tolerance = float(rng.uniform(0.3, 0.7)), float(rng.uniform(0.02, 0.2))
    exposure = float(rng.uniform(1.1, 4.0)) / frequency
    got = predict_bands(pwm_light(frequency, duty), camera, exposure, tolerance).worst_contrast_percent
    tried = np.linspace(1 - tolerance, 1 + tolerance, 1001)
    each = [
        predict_bands(pwm_light(frequency * one, duty), camera, exposure).contrast_percent["all"] for one in tried[::4]
    ]
    cycle = rectangle(duty, samples=20_000)
    near = tried[::4][int(np.argmax(each))] + np.linspace(-1, 1, 41) * (tried[4] - tried[0])
    near = near[abs(near - 1) <= tolerance]
    found = max(
        worst_frame(Wave(cycle, frequency * one), exposure, line_time, lines, phases=400, zooms=2) for one in near
    )
    assert got == pytest.approx(found, abs=0.05)
    assert got >= max(each) - 1e-9


@pytest.mark.parametrize("seed", range(12))
def test_a_line_spectrum_bands_no_deeper_anywhere_within_the_tolerance(seed):
    rng = np.random.default_rng([9, seed])
    frame_rate = float(rng.uniform(20, 60))
    camera = Camera(
        lines=int(rng.integers(60, 1200)), readout_time=float(rng.uniform(0.3, 1)) / frame_rate, frame_rate=frame_rate
    )
    frequency = float(np.exp(rng.uniform(np.log(40), np.log(3000))))
    number = np.arange(1.0, int(rng.integers(2, 25)))
    amplitudes = 0.4 / number ** rng.uniform(1, 2) * np.exp(2j * np.pi * rng.uniform(size=number.size))
    amplitudes *= min(1.0, 0.9 / np.abs(amplitudes).sum())
    tolerance = float(rng.choice([0.001, 0.01, 0.05]))
    exposure = float(np.exp(rng.uniform(np.log(1 / 2000), np.log(1 / frame_rate))))

    def light(scale):
        fundamental = frequency * scale
        return Light((ChannelLight("all", number * fundamental, amplitudes, fundamentals=(fundamental,)),))

    stated = predict_bands(light(1.0), camera, exposure, tolerance).worst_contrast_percent
    tried = [*rng.uniform(-tolerance, tolerance, 60), -tolerance, tolerance]
    found = max(predict_bands(light(1 + off), camera, exposure).contrast_percent["all"] for off in tried)
    assert stated - 0.05 < found < stated + 0.002
