"""Sound files: every sample format, heads that recorders leave unfinished, and files cut short."""

import re
import struct

import numpy as np
import pytest
import soundfile

from flicker.errors import InputError, UnreadableFileError
from flicker.readers import _long, read, wav
from flicker.readers.wav import blocks, facts

RATE = 48_000
COUNT = 1001  # odd, so that 8-bit data needs a pad byte
LIGHT = np.round((0.5 + 0.3 * np.sin(np.arange(COUNT) * 0.1)) * 2**15) / 2**15

# GUID behind the format tag of WAVE_FORMAT_EXTENSIBLE: RFC 2361, annex A (from memory)
GUID = b"\x00\x00\x00\x00\x10\x00\x80\x00\x00\xaa\x00\x38\x9b\x71"


def chunk(name, body):
    return name + struct.pack("<I", len(body)) + body + b"\0" * (len(body) % 2)


def form(tag, bits, *, valid=None, channels=1):
    block = channels * bits // 8
    head = struct.pack("<HHIIHH", tag if valid is None else 0xFFFE, channels, RATE, RATE * block, block, bits)
    return chunk(b"fmt ", head if valid is None else head + struct.pack("<HHIH", 22, valid, 0, tag) + GUID)


def riff(*chunks, name=b"RIFF", size=None):
    body = b"WAVE" + b"".join(chunks)
    return name + struct.pack("<I", len(body) if size is None else size) + body


def pcm(bits, light=LIGHT):
    if bits == 8:
        return np.round(light * 127 + 128).astype(np.uint8).tobytes()
    if bits == 24:
        return b"".join(int(value).to_bytes(3, "little", signed=True) for value in light * 2**23)
    return (light * 2.0 ** (bits - 1)).astype(f"<i{bits // 8}").tobytes()


def floating(bits):
    return LIGHT.astype(f"<f{bits // 8}").tobytes()


def unfinished(name, size):
    return name + struct.pack("<I", size)


def ds64(data_size):
    return chunk(b"ds64", struct.pack("<QQQI", 0, data_size, COUNT, 0))


UNKNOWN = 0xFFFFFFFF
HEALTHY = {
    "8-bit unsigned": riff(form(1, 8), chunk(b"data", pcm(8))),
    "16-bit": riff(form(1, 16), chunk(b"data", pcm(16))),
    "24-bit": riff(form(1, 24), chunk(b"data", pcm(24))),
    "32-bit": riff(form(1, 32), chunk(b"data", pcm(32))),
    "float 32": riff(form(3, 32), chunk(b"data", floating(32))),
    "float 64": riff(form(3, 64), chunk(b"data", floating(64))),
    "extensible 24": riff(form(1, 24, valid=24), chunk(b"data", pcm(24))),
    "extensible 24 in 32": riff(form(1, 32, valid=24), chunk(b"data", pcm(32))),
    "extensible float": riff(form(3, 32, valid=32), chunk(b"data", floating(32))),
    "other chunks": riff(
        chunk(b"bext", b"x" * 605),
        chunk(b"LIST", b"INFOabc"),
        form(1, 16),
        chunk(b"data", pcm(16)),
        chunk(b"LIST", b"end"),
    ),
    "pad byte": riff(form(1, 8), chunk(b"data", pcm(8)), chunk(b"LIST", b"INFO")),
    "data size 0": riff(form(1, 16), unfinished(b"data", 0), pcm(16), size=0),
    "data size unknown": riff(form(1, 24), unfinished(b"data", UNKNOWN), pcm(24), size=UNKNOWN),
    "file size 0": riff(form(1, 16), chunk(b"data", pcm(16)), size=0),
    "RF64": riff(ds64(2 * COUNT), form(1, 16), unfinished(b"data", UNKNOWN), pcm(16), name=b"RF64", size=UNKNOWN),
    "RF64 unfinished": riff(ds64(0), form(1, 16), unfinished(b"data", UNKNOWN), pcm(16), name=b"RF64", size=UNKNOWN),
    "BW64": riff(ds64(2 * COUNT), form(1, 16), unfinished(b"data", UNKNOWN), pcm(16), name=b"BW64", size=UNKNOWN),
}


@pytest.mark.parametrize("name", HEALTHY)
def test_every_head_gives_every_sample(tmp_path, name):
    path = tmp_path / "night.wav"
    path.write_bytes(HEALTHY[name])
    capture = read(path)
    (trace,) = capture.traces
    assert capture.kind == "wav"
    assert trace.sample_rate == RATE
    assert trace.samples == COUNT
    assert trace.light == pytest.approx(LIGHT, abs=0.01 if pcm(8) in HEALTHY[name] else 1e-9)
    assert f"{COUNT}" in trace.history[0]
    assert f"{RATE} Hz" in trace.history[0]


@pytest.mark.parametrize("kind", ["FLAC", "AIFF", "CAF", "W64", "AU"])
def test_other_sound_files_are_told_by_their_content(tmp_path, kind):
    path = tmp_path / "night.wav"
    soundfile.write(path, LIGHT, RATE, format=kind, subtype="PCM_16")
    (trace,) = read(path).traces
    assert trace.light == pytest.approx(LIGHT, abs=1e-4)


NOISE = np.round(np.random.default_rng(1).normal(0, 0.1, 40_000) * 2**15) / 2**15
KINDS = ["FLAC", "AIFF", "CAF", "W64", "AU", "RF64", "WAV"]


def encoded(path, kind):
    soundfile.write(path, NOISE, RATE, format=kind, subtype="PCM_16")
    return path.read_bytes()


def assert_first_part(path, at_least, at_most, tolerance=0.1):
    (trace,) = read(path).traces
    assert at_least <= trace.samples <= at_most
    assert np.array_equal(trace.light, NOISE[: trace.samples])
    (note,) = trace.notes
    assert note.code == "cut-short"
    stated = float(re.search(r"s, (\S+) % of", note.message)[1])
    assert stated == pytest.approx(100 * trace.samples / len(NOISE), abs=tolerance)
    assert f"only its first {trace.samples / RATE:.4g} s, " in note.message
    assert f"{trace.samples} 16-bit samples" in trace.history[0]


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("share", [0.3, 0.6, 0.95])
def test_of_a_file_cut_short_the_first_part_is_read_and_a_note_says_so(tmp_path, kind, share):
    path = tmp_path / "night.wav"
    whole = encoded(path, kind)
    path.write_bytes(whole[: int(share * len(whole)) // 2 * 2 + 1])
    lost = 8192 if kind == "FLAC" else 2100  # two blocks of 4096; a CAF has 4096 bytes in front of its samples
    assert_first_part(path, share * len(NOISE) - lost, share * len(NOISE))


@pytest.mark.parametrize("damage", ["bytes changed", "bytes lost", "bytes blanked", "length overstated"])
def test_of_a_damaged_flac_the_part_before_the_damage_is_read(tmp_path, damage):
    path = tmp_path / "night.flac"
    whole = encoded(path, "FLAC")
    middle = len(whole) // 2
    path.write_bytes(
        {
            "bytes changed": whole[:middle] + bytes(byte ^ 90 for byte in whole[middle:]),
            "bytes lost": whole[:middle] + whole[middle + 3001 :],
            "bytes blanked": whole[:middle] + bytes(9000) + whole[middle + 9000 :],
            "length overstated": whole[:22] + struct.pack(">I", 2 * len(NOISE)) + whole[26:],  # STREAMINFO
        }[damage]
    )
    if damage == "length overstated":
        (trace,) = read(path).traces
        assert np.array_equal(trace.light, NOISE[:-1])  # the sound library cannot go behind the last one
        assert "50 % of what its head promises" in trace.notes[0].message
    else:
        assert_first_part(path, 12_000, 20_000)


def test_a_flac_whose_head_was_never_finished_is_read_whole(tmp_path):
    path = tmp_path / "night.flac"
    whole = encoded(path, "FLAC")
    # total samples: 0 means unknown, RFC 9639, section 8.2 (from memory)
    path.write_bytes(whole[:22] + bytes(4) + whole[26:])
    (trace,) = read(path).traces
    assert np.array_equal(trace.light, NOISE[:-1])
    assert not trace.notes


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("length", [16, 20, 30])
def test_of_a_file_cut_in_its_head_nothing_is_read(tmp_path, kind, length):
    path = tmp_path / "night.wav"
    path.write_bytes(encoded(path, kind)[: min(length, 24 if kind == "AU" else length)])
    with pytest.raises(UnreadableFileError, match=r"copy (it|or record it) again|no samples|of no kind") as caught:
        read(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_of_a_flac_cut_in_its_first_block_nothing_is_read(tmp_path):
    path = tmp_path / "night.flac"
    path.write_bytes(encoded(path, "FLAC")[:5000])
    with pytest.raises(
        UnreadableFileError, match="none of its samples can be read; copy it again, or export it as WAV"
    ):
        read(path)


@pytest.mark.parametrize("lost", [1, 2, 701])
def test_a_wav_file_cut_short_is_read_as_far_as_it_goes(tmp_path, lost):
    path = tmp_path / "night.wav"
    path.write_bytes(WHOLE[:-lost])
    (trace,) = read(path).traces
    assert trace.light == pytest.approx(LIGHT[: COUNT - (lost + 1) // 2], abs=1e-9)
    assert [note.code for note in trace.notes] == ["cut-short"]


WHOLE = HEALTHY["16-bit"]
BROKEN = {
    "half the head": (WHOLE[:30], "ends before its samples"),
    "no samples": (riff(form(1, 16), chunk(b"data", b"")), "holds no samples"),
    "no data": (riff(form(1, 16)), "ends before its samples"),
    "no channels": (riff(form(1, 16, channels=0), chunk(b"data", pcm(16))), "no sound file that can be read"),
    "unknown format": (riff(form(99, 16), chunk(b"data", pcm(16))), "no sound file that can be read"),
    "not a number": (riff(form(3, 32), chunk(b"data", np.full(COUNT, np.nan, "<f4").tobytes())), "no numbers"),
}


@pytest.mark.parametrize("name", BROKEN)
def test_what_is_broken_is_refused_in_one_sentence(tmp_path, name):
    content, words = BROKEN[name]
    path = tmp_path / "night.wav"
    path.write_bytes(content)
    with pytest.raises(UnreadableFileError, match=words) as caught:
        read(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_channels_are_chosen_by_number(tmp_path):
    path = tmp_path / "night.wav"
    stereo = np.column_stack([LIGHT, -LIGHT])
    soundfile.write(path, stereo, RATE, subtype="PCM_24")
    left, right = read(path).traces
    assert (left.name, right.name) == ("channel 1", "channel 2")
    (only,) = read(path, channels=[2]).traces
    assert only.name == "channel 2"
    assert np.array_equal(only.light, right.light)
    assert np.array_equal(left.light, -right.light)
    with pytest.raises(InputError, match=r"no channel 3; --channel takes 1 to 2"):
        read(path, channels=[3])


@pytest.mark.parametrize("dtype", ["float32", "float64"])
def test_blocks_give_the_same_samples_piece_by_piece(tmp_path, dtype):
    path = tmp_path / "night.wav"
    stereo = np.column_stack([LIGHT, 0.5 * LIGHT])
    soundfile.write(path, stereo, RATE, subtype="PCM_24")
    pieces = list(blocks(path, frames=128, dtype=dtype))
    assert [len(piece) for piece in pieces] == [128] * 7 + [105]
    assert all(piece.dtype == dtype for piece in pieces)
    assert np.concatenate(pieces) == pytest.approx(stereo, abs=1e-6)
    second = np.concatenate(list(blocks(path, channels=[2], frames=500)))
    assert second.shape == (COUNT, 1)
    known = facts(path)
    assert (known.sample_rate, known.frames, known.channels, known.sample_format) == (RATE, COUNT, 2, "24-bit")


def test_of_a_damaged_recording_larger_than_memory_an_excerpt_of_the_part_before_the_damage_is_read(
    tmp_path, monkeypatch
):
    monkeypatch.setattr(wav, "_MOST_KEPT", 1 << 13)
    monkeypatch.setattr(_long, "EXCERPT", 1 << 12)
    monkeypatch.setattr(_long, "_FRAMES", 3000)
    path = tmp_path / "night.flac"
    whole = encoded(path, "FLAC")
    path.write_bytes(whole[: int(0.7 * len(whole))])
    (trace,) = read(path).traces
    first = round(trace.start * RATE)
    assert np.array_equal(trace.light, NOISE[first : first + (1 << 12)])
    assert 0.5 * len(NOISE) < trace.whole.samples <= 0.7 * len(NOISE)
    assert [note.code for note in trace.notes] == ["cut-short"]
