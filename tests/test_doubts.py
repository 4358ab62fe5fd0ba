"""Doubts that only measuring shows: each is provoked, and 200 clean captures raise none."""

import numpy as np
import pytest

from flicker import measure
from flicker.report.answer import next_step, risk
from flicker.trace import Capture, Segment, Trace

RATE = 20_000.0
RAISED = {"few-cycles", "undersampled", "noise-dominated", "missing-pulses", "burst", "slow-pulsing"}


def notes_of(light, rate=RATE, **how):
    report = measure(Capture((Trace(light, rate, dark_level=0.0, **how),)))
    return {note.code: note for note in report.captures[0].channels[0].notes if note.code in RAISED}


def pulses(times, frequency, duty, low=0.1, phase=0.0):
    return low + (1 - low) * ((times * frequency + phase) % 1 < duty)


def noisy(light, size, seed=1):
    return light + np.random.default_rng(seed).normal(0, size, light.size)


def seconds(length, rate=RATE):
    return np.arange(int(length * rate)) / rate


@pytest.mark.parametrize("part", range(4))
def test_two_hundred_clean_captures_raise_none(part):
    rng = np.random.default_rng([20, part])
    wrong = []
    for number in range(50):
        rate = float(rng.choice([10e3, 20e3, 48e3, 96e3]))
        frequency = float(np.exp(rng.uniform(np.log(60), np.log(rate / 25))))
        times = seconds(max(12 / frequency, rng.uniform(0.1, 0.3)), rate)
        kind = rng.integers(4)
        if kind == 0:
            light = pulses(times, frequency, rng.uniform(0.08, 0.92), rng.uniform(0, 0.7), rng.uniform())
        elif kind == 1:
            light = 1 + rng.uniform(0.02, 0.9) * np.sin(2 * np.pi * (frequency * times + rng.uniform()))
        elif kind == 2:
            light = np.abs(np.sin(np.pi * (frequency * times + rng.uniform()))) + 0.2
        else:  # two lights that beat
            times = seconds(0.25, rate)
            light = pulses(times, frequency, 0.4) + 1 + np.sin(2 * np.pi * frequency * rng.uniform(1.05, 1.6) * times)
        found = notes_of(noisy(light, light.std() * 10 ** (-rng.uniform(20, 60) / 20), number), rate)
        if found:
            wrong.append((number, int(kind), frequency, rate, {code: one.message for code, one in found.items()}))
    assert not wrong


def test_few_cycles_say_how_long_to_record():
    found = notes_of(noisy(pulses(seconds(0.05), 101.0, 0.4), 0.005))
    assert set(found) == {"few-cycles"}
    assert "only 5.05 cycles of 100.9 Hz" in found["few-cycles"].message
    assert "record 0.099 s or more" in found["few-cycles"].message


@pytest.mark.parametrize("frequency", [7003.0, 8900.0])
def test_a_line_near_the_nyquist_frequency_is_called_undersampled(frequency):
    times = seconds(0.5)
    found = notes_of(noisy(1 + 0.5 * np.sin(2 * np.pi * frequency * times), 0.005))
    assert set(found) == {"undersampled"}
    assert "--same-light" in found["undersampled"].message


def test_pulses_of_few_samples_are_called_undersampled():
    found = notes_of(noisy(pulses(seconds(0.5), 3301.7, 0.3), 0.005))
    assert "undersampled" in found
    assert "6.06 samples a cycle" in found["undersampled"].message


def test_noise_above_the_modulation_is_said():
    found = notes_of(noisy(1 + 0.02 * np.sin(2 * np.pi * 100 * seconds(1.0)), 0.05))
    assert set(found) == {"noise-dominated"}
    assert "3.6 times the modulation" in found["noise-dominated"].message


@pytest.mark.parametrize("duty", [0.1, 0.5, 0.8])
@pytest.mark.parametrize("phase", [0.0, 0.37, 0.93])
def test_missing_pulses_are_counted_with_their_times(duty, phase):
    times = seconds(1.0)
    light = pulses(times, 240.3, duty, 0.0, phase)
    gone = (50, 131, 200)
    for cycle in gone:
        light[np.floor(times * 240.3 + phase) == cycle] = 0.0
    found = notes_of(noisy(light, 0.005))
    assert set(found) == {"missing-pulses"}
    assert "3 of the cycles of 240.3 Hz" in found["missing-pulses"].message
    said = [float(word) for word in found["missing-pulses"].message.split("(at ")[1].split(" s")[0].split(", ")]
    for moment, cycle in zip(said, gone, strict=True):
        assert abs(moment - (cycle - phase) / 240.3) < 1 / 240.3


def test_one_missing_pulse_across_a_gap_keeps_its_true_time():
    times = np.concatenate([seconds(0.5), 2.0 + seconds(0.5)])
    light = pulses(times, 240.3, 0.4, 0.0)
    light[np.floor(times * 240.3) == 520] = 0.0
    found = notes_of(noisy(light, 0.005), segments=(Segment(0, 0.0), Segment(10_000, 2.0)))
    assert "1 of the cycles of 240.3 Hz lacks its pulse (at 2.16" in found["missing-pulses"].message


@pytest.mark.parametrize("gate", [11.3, 31.0])
def test_bursts_are_told_with_their_pauses(gate):
    times = seconds(2.0)
    light = pulses(times, 1203.7, 0.5, 0.0) * (times * gate % 1 < 0.6)
    found = notes_of(noisy(light, 0.005))
    told = found["burst"].message
    assert abs(float(told.split("pauses of ")[1].split()[0]) - 0.4 / gate) < 1.5 / 1203.7
    assert abs(int(told.split("bursts: ")[1].split()[0]) - 2 * gate) <= 1


def test_a_lamp_switched_on_late_is_a_pause():
    times = seconds(1.0)
    light = pulses(times, 240.3, 0.5, 0.0) * (times > 0.25)
    found = notes_of(noisy(light, 0.005))
    assert "1 pause of 0.2" in found["burst"].message
    assert "--start" in found["burst"].message


@pytest.mark.parametrize("slow", [1.3, 8.8, 23.0])
def test_slow_pulsing_beside_a_pwm_is_named_with_its_rate(slow):
    times = seconds(4.0)
    light = pulses(times, 240.3, 0.5) * (1 + 0.03 * np.sin(2 * np.pi * slow * times))
    found = notes_of(noisy(light, 0.002))
    assert set(found) == {"slow-pulsing"}
    assert f"pulses {slow:g} times a second, its strongest line by 3 %:" in found["slow-pulsing"].message
    assert "epilepsy" not in found["slow-pulsing"].message, "too shallow to harm"


@pytest.mark.parametrize("slow", [1.3, 8.8])
def test_deep_pulsing_from_three_hertz_on_is_called_harmful(slow):
    times = seconds(4.0)
    found = notes_of(noisy(pulses(times, 240.3, 0.5) * (1 + 0.2 * np.sin(2 * np.pi * slow * times)), 0.002))
    assert ("epilepsy" in found["slow-pulsing"].message) == (slow >= 3)


def test_records_a_day_apart_are_looked_at_in_no_more_memory_than_they_hold():
    times = np.concatenate([seconds(0.02), 86_400.0 + seconds(0.02)])
    light = noisy(pulses(times, 240.3, 0.4, 0.0), 0.005)
    found = notes_of(light, segments=(Segment(0, 0.0), Segment(400, 86_400.0)))
    assert "only 9.63 cycles" in found["few-cycles"].message


def test_slow_pulsing_for_a_while_says_when():
    times = seconds(8.0)
    slow = 0.05 * np.sin(2 * np.pi * 9.1 * times) * ((times > 3) & (times < 6))
    found = notes_of(noisy(pulses(times, 240.3, 0.5) * (1 + slow), 0.002))
    words = found["slow-pulsing"].message.split(", from ")[1].split(":")[0]
    begin, end = (float(word.split()[0]) for word in words.split(" s to "))
    assert abs(begin - 3) < 0.3 and abs(end - 6) < 0.3


def channel_of(light, rate=RATE):
    return measure(Capture((Trace(light, rate, dark_level=0.0),))).captures[0].channels[0]


def test_less_than_two_pulses_are_no_frequency_and_no_all_clear():
    light = noisy(pulses(seconds(0.003), 239.7, 0.08, 0.0, 0.7), 0.002)
    channel = channel_of(light)
    assert channel.measures["fundamental_frequency"].value is None
    assert channel.measures["percent_flicker"].value is None
    assert channel.risk_region is None


def test_noise_that_could_hide_flicker_gives_no_region():
    channel = channel_of(noisy(np.ones(2000), 0.5))
    assert channel.measures["percent_flicker"].value == 0.0
    assert channel.measures["percent_flicker"].high > 3.0
    assert channel.risk_region is None
    assert "noise would hide a flicker of" in risk(channel)
    assert "record longer" in next_step(channel)
    assert channel_of(noisy(np.ones(20_000), 0.002)).risk_region.region == "no-observable-effect"


def test_cycles_without_any_light_give_reasons_and_no_error():
    light = np.zeros(139)
    light[100:] = 0.4 + 0.3 * np.sin(2 * np.pi * 97 * np.arange(39) / 2000)
    measures = channel_of(light, 2000.0).measures
    assert all((one.value is None) == bool(one.reason) for one in measures.values())
    assert "no light above dark" in measures["flicker_index"].reason
