"""Predictions against worked figures, each to its printed digits, through the public functions."""

import numpy as np
import pytest

import flicker
from flicker.camera.shutter import advise, exposure_label, standing_frame_rates
from flicker.camera.visibility import threshold
from flicker.light import ChannelLight, Light

BY_HAND = "derived by hand; exact integration of the rectangle"
MANY_LINES = flicker.Camera(lines=2000, line_time=8e-6, frame_rate=25.0)


def sine(frequency, depth=1.0):
    return Light((ChannelLight("all", [frequency], [depth + 0j], fundamentals=(frequency,)),))


def predict(light, exposure, camera=MANY_LINES, **how):
    return flicker.predict_bands(light, camera, exposure, **how)


def contrast(light, exposure, **how):
    return predict(light, exposure, **how).contrast_percent["all"]


RECTANGLES = [
    # frequency, duty, exposure             contrast [%], half a printed digit
    (1000.0, 0.05, 5.005 / 1000.0, 0.990, 0.0005),
    (1000.0, 0.02, 5.005 / 1000.0, 2.44, 0.005),
    (1000.0, 0.10, 5 * 1.005 / 1000.0, 2.44, 0.005),
    (240.0, 0.05, 1 / 50, 11.11, 0.005),
    (240.0, 0.30, 1 / 50, 7.14, 0.005),
    (240.0, 0.05, 1 / 250, 66.67, 0.005),
    (1000.0, 0.05, 1 / 48, 2.44, 0.005),
    (1000.0, 0.30, 1 / 48, 1.34, 0.005),
    (2400.0, 0.05, 1 / 48, 0.0, 0.005),
    (2400.0, 0.05, 1 / 47.95, 1.0, 0.05),
]


@pytest.mark.parametrize(("frequency", "duty", "exposure", "expected", "digit"), RECTANGLES)
def test_rectangle(frequency, duty, exposure, expected, digit):
    assert contrast(flicker.pwm_light(frequency, duty), exposure) == pytest.approx(expected, abs=digit), BY_HAND


FREQUENCIES = {  # contrast at duty 5 % / 30 % for the exposures 1/48 1/50 1/60 1/120 1/250 1/1000
    240: "0/0 11/7 0/0 0/0 67/7 100/100",
    300: "7.7/6.5 0/0 0/0 20/20 33/25 100/100",
    1000: "2.4/1.3 0/0 3.0/3.0 5.9/5.9 0/0 0/0",
    1200: "0/0 0/0 0/0 0/0 11/7 33/25",
    2000: "1.2/1.2 0/0 1.5/1.5 3.0/3.0 0/0 0/0",
    2400: "0/0 0/0 0/0 0/0 5.3/5.3 20/20",
    12000: "0/0 0/0 0/0 0/0 0/0 0/0",
}


@pytest.mark.parametrize("frequency", FREQUENCIES)
def test_frequencies_that_suit_cameras(frequency):
    for cell, number in zip(FREQUENCIES[frequency].split(), (48, 50, 60, 120, 250, 1000), strict=True):
        for text, duty in zip(cell.split("/"), (0.05, 0.3), strict=True):
            digit = 0.05 if "." in text else 0.5
            got = contrast(flicker.pwm_light(frequency, duty), 1 / number)
            assert got == pytest.approx(float(text), abs=digit), (BY_HAND, frequency, number, duty)


MAINS = [  # frame rate, shutter angles of whole cycles and beat for 100 Hz, the same for 120 Hz
    (24000 / 1001, "86.31 172.63 258.94 345.25", 4.10, "71.93 143.86 215.78 287.71 359.64", 0.120),
    (24.0, "86.4 172.8 259.2 345.6", 4, "72 144 216 288 360", 0),
    (25.0, "90 180 270 360", 0, "75 150 225 300", -5),
    (30000 / 1001, "107.89 215.78 323.68", 10.09, "89.91 179.82 269.73 359.64", 0.120),
    (30.0, "108 216 324", 10, "90 180 270 360", 0),
    (48.0, "172.8 345.6", 4, "144 288", 24),
    (50.0, "180 360", 0, "150 300", 20),
    (60000 / 1001, "215.78", -19.9, "179.82 359.64", 0.12),
    (60.0, "216", -20, "180 360", 0),
    (100.0, "360", 0, "300", 20),
    (120.0, "", -20, "360", 0),
    (240.0, "", None, "", None),
]


@pytest.mark.parametrize("row", MAINS, ids=lambda row: f"{row[0]:.5g}")
def test_shutter_angles_for_lights_on_the_mains(row):
    frame_rate = row[0]
    camera = flicker.Camera(lines=1000, readout_time=0.8 / frame_rate, frame_rate=frame_rate)
    for frequency, angles, beat in ((100.0, row[1], row[2]), (120.0, row[3], row[4])):
        nulls = [count / frequency for count in range(1, 50) if count / frequency <= (1 + 1e-9) / frame_rate]
        assert len(nulls) == len(angles.split()), "common practice, no source; by hand 360 j F / f"
        for exposure, angle in zip(nulls, angles.split(), strict=True):
            bands = flicker.predict_bands(flicker.pwm_light(frequency, 0.2, 0.3), camera, exposure)
            assert bands.contrast_percent["all"] < 1e-9
            written = float(exposure_label(exposure, frame_rate).split(", ")[1].removesuffix("°"))
            assert written == pytest.approx(float(angle), abs=0.0051)
            digits = 0.005 if abs(beat) < 11 else 0.06
            assert bands.beat_frequency_hz == pytest.approx(beat, abs=digits) or (
                beat == 24 and abs(bands.beat_frequency_hz) == 24  # half the frame rate: up or down is all the same
            )


SAFE = {  # lowest frequency [Hz] that needs no tuning, for bands of at most 5, 2, 1, 0.5 %
    1 / 48: (480, 1.2e3, 2.4e3, 4.8e3),
    1 / 60: (600, 1.5e3, 3e3, 6e3),
    1 / 120: (1.2e3, 3e3, 6e3, 12e3),
    1 / 500: (5e3, 12.5e3, 25e3, 50e3),
    1 / 1000: (10e3, 25e3, 50e3, 100e3),
    1 / 4000: (40e3, 100e3, 200e3, 400e3),
}


@pytest.mark.parametrize("exposure", SAFE, ids=lambda exposure: f"{1 / exposure:g}")
def test_frequencies_that_need_no_tuning(exposure):
    for lowest, limit in zip(SAFE[exposure], (5.0, 2.0, 1.0, 0.5), strict=True):
        for duty in (0.02, 0.2, 0.4, 0.5):
            above = predict(flicker.pwm_light(lowest * 1.25, duty), exposure, tolerance=0.2)
            assert above.worst_contrast_percent <= limit, BY_HAND
        below = predict(flicker.pwm_light(lowest - 0.5 / exposure, 0.2), exposure, tolerance=0.4 / exposure / lowest)
        assert below.worst_contrast_percent > limit, BY_HAND


@pytest.mark.parametrize("duty", [0.05, 0.2, 0.4, 0.5, 0.7, 0.9])
@pytest.mark.parametrize("whole", [1, 4, 20])
def test_worst_of_all_tunings(duty, whole):
    exposure = 1 / 100
    light = flicker.pwm_light((whole + 0.5) / exposure, duty)
    worst = predict(light, exposure, tolerance=0.4999 / (whole + 0.5)).worst_contrast_percent
    if duty <= 0.5:
        assert worst == pytest.approx(100 / (2 * whole + 1), rel=1e-6), "1/(2N + 1), by hand"
    else:
        assert worst == pytest.approx(100 * (1 - duty) / (2 * whole * duty + 1 - duty), rel=1e-6), "by hand"


def test_near_a_null():
    assert contrast(sine(1000.0), 5.005e-3) == pytest.approx(0.1, abs=0.001), "sine: |e| m, by hand"
    for duty, off in ((0.05, 0.001), (0.1, 0.002), (0.3, 0.005)):
        got = contrast(flicker.pwm_light(1000.0, duty), 5 * (1 + off) / 1000)
        assert got == pytest.approx(100 * off / (2 * duty), rel=0.03), "rectangle: |e| / (2 D), by hand"


SINES = [
    (100.0, 1 / 50, 0.0), (100.0, 1 / 60, 0.1654), (120.0, 1 / 50, 0.1261), (120.0, 1 / 60, 0.0),
    (240.0, 1 / 100, 0.1261), (240.0, 1 / 1000, 0.9079),
]  # fmt: skip


@pytest.mark.parametrize(("frequency", "exposure", "left"), SINES)
def test_what_an_exposure_leaves_of_a_sine(frequency, exposure, left):
    assert contrast(sine(frequency), exposure) == pytest.approx(100 * left, abs=0.005), "sin(pi x) / (pi x)"


def test_half_open_shutter_on_mains_light():
    frozen = predict(sine(120.0), 1 / 48, flicker.Camera(lines=1000, readout_time=0.02, frame_rate=24.0))
    assert frozen.contrast_percent["all"] == pytest.approx(12.73, abs=0.005), "|sinc(2.5)|"
    assert frozen.standing
    assert frozen.drift_lines_per_frame == 0
    assert frozen.drift_seconds_per_band is None
    rolling = predict(sine(100.0), 1 / 60, flicker.Camera(lines=1000, readout_time=0.02, frame_rate=30.0))
    assert rolling.contrast_percent["all"] == pytest.approx(16.54, abs=0.005), "|sinc(5/3)|"
    assert rolling.beat_frequency_hz == pytest.approx(10.0)
    assert not rolling.standing


def test_period_and_drift():
    bands = predict(sine(1003.0), 1e-4, flicker.Camera(lines=1080, line_time=15e-6, frame_rate=25.0))
    assert bands.band_period_lines == pytest.approx(66.467, abs=0.0005), "1 / (f t)"
    assert bands.drift_lines_per_frame == pytest.approx(-7.976, abs=0.0005), "-frac(f / F) / (f t)"
    assert bands.beat_frequency_hz == pytest.approx(3.0)
    assert bands.drift_seconds_per_band == pytest.approx(1 / 3)
    assert bands.bands_per_frame == pytest.approx(1003.0 * 1080 * 15e-6)
    slow = predict(sine(120.0), 1e-3, MANY_LINES.changed(frame_rate=24000 / 1001))
    assert slow.beat_frequency_hz == pytest.approx(0.1199, abs=5e-5)
    assert slow.drift_seconds_per_band == pytest.approx(8.34, abs=0.005)
    assert not slow.standing


@pytest.mark.parametrize(
    ("frequency", "half", "tenth"),
    [(120.0, "24", "41"), (240.0, "12", "22"), (480.0, "6.1", "11"), (1000.0, "2.9", "5.3")],
)
def test_slow_red_phosphor(frequency, half, tenth):
    for duty, text in ((0.5, half), (0.1, tenth)):
        light = flicker.pwm_light(frequency, duty, decay=(8.5e-3, 0.0, 0.0))
        red = predict(light, 1e-7).contrast_percent["red"]
        assert red == pytest.approx(float(text), abs=0.05 if "." in text else 0.5), (
            "one pole, tanh((1 - D) T / (2 tau))"
        )
    light = flicker.pwm_light(240.0, 0.5, decay=8.5e-3)
    assert contrast(light, 1e-7) == pytest.approx(12.19, abs=0.005), "tanh((1 - D) T / (2 tau))"


def test_colour_of_the_bands():
    light = flicker.pwm_light(240.0, 0.5, decay=(8.5e-3, 0.0, 0.0))
    colours = predict(light, 1 / 300).colours
    low, high = 0.79, 1.36  # ratio of red to green, exact integration
    assert colours.chroma_contrast_percent == pytest.approx(100 * (high - low) / (high + low), abs=0.5)
    assert (colours.bright_name, colours.dark_name) == ("cyan", "red")
    assert predict(light, 1 / 1000).colours.chroma_contrast_percent == pytest.approx(100.0)


def test_scanning_backlight():
    camera = flicker.Camera(lines=1000, line_time=12e-6, frame_rate=30.0)
    for scan, period in ((7.7e-6, 232.6), (-7.7e-6, 50.8)):
        bands = predict(sine(1000.0), 1e-4, camera, light_scan=scan * camera.lines)
        assert bands.band_period_lines == pytest.approx(period, abs=0.05), "1 / (f |t - s|), by hand"
    assert predict(sine(1000.0), 1e-4, camera, light_scan=12e-3).contrast_percent["all"] == pytest.approx(0, abs=1e-6)


def test_wandering_frequency_leaves_no_null():
    for wander, simulated in ((0.003, 4.6), (0.01, 15.0), (0.03, 19.0)):  # sinusoidal, simulated
        bands = predict(flicker.pwm_light(1000.0, 0.05), 5e-3, wander=wander)
        assert bands.contrast_percent["all"] < 1e-9
        assert simulated - 0.05 <= bands.wander_contrast_percent < 1.5 * simulated


@pytest.mark.parametrize(
    ("cycles_per_degree", "percent"),
    [(0.1, 1.5), (0.25, 0.60), (0.5, 0.31), (1, 0.19), (2, 0.14), (3, 0.14), (4, 0.15), (8, 0.23), (16, 0.58)],
)
def test_contrast_threshold_of_the_eye(cycles_per_degree, percent):
    source = "Barten 1999, 30 degrees, 100 cd/m2, computed independently from the same constants"
    assert 100 * threshold(cycles_per_degree) == pytest.approx(percent, rel=0.03), source


def test_frame_rates_at_which_bands_stand():
    rates = standing_frame_rates(120.0)
    assert {24.0, 30.0, 48.0, 60.0, 120.0} - set(rates) == {48.0}, "common practice, no source; f a multiple of F"
    assert 25.0 not in rates


def test_advice_finds_the_null_between_two_stops():
    camera = flicker.Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0, exposures=(1 / 50, 1 / 60, 1 / 100))
    best = advise(flicker.pwm_light(240.0, 0.05), camera)[0]
    assert (best.label, best.clean) == ("1/60 s, 150°", True)
    below, above = best.window_percent
    assert below == pytest.approx(0.1, rel=0.05), "2 D x 1 %, by hand"
    assert above == pytest.approx(0.1, rel=0.05), "2 D x 1 %, by hand"
    assert best.window_deg[0] == pytest.approx(0.150, rel=0.05)


def test_aliased_by_the_line_rate():
    camera = flicker.Camera(lines=1000, line_time=20e-6, frame_rate=25.0)
    bands = predict(sine(49_000.0), 1e-6, camera)
    assert bands.aliased
    assert bands.band_period_lines == pytest.approx(1 / 0.02), "49 kHz against 50 000 lines/s: 1 kHz, by hand"
    assert bands.drift_lines_per_frame == pytest.approx(0.0, abs=1e-6)
    assert predict(sine(49_001.0), 1e-6, camera).drift_lines_per_frame > 0, "an alias rolls the other way"
    alike = predict(flicker.pwm_light(50_000.0, 0.3), 1e-6, camera)
    assert alike.contrast_percent["all"] == pytest.approx(0.0, abs=1e-6), "every line meets the same phase"
    assert alike.band_period_lines is None
    assert "same phase" in alike.to_dict()["reason"]


def test_channels_with_opposed_pulses_make_yellow_and_blue():
    pulse = flicker.pwm_light(200.0, 0.5)["all"]
    opposed = pulse.amplitudes * np.exp(1j * np.pi * np.arange(1, pulse.amplitudes.size + 1))
    yellow = dict.fromkeys(("red", "green"), (pulse.frequencies, pulse.amplitudes))
    channels = {**yellow, "blue": (pulse.frequencies, opposed)}
    light = Light(tuple(ChannelLight(name, *lines, fundamentals=(200.0,)) for name, lines in channels.items()))
    colours = predict(light, 1 / 2000).colours
    assert (colours.bright_name, colours.dark_name) == ("yellow", "blue")
