"""Sidebands: a product of two Fourier series has lines at n f ± m g (trigonometric identity, by hand)."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from flicker.signal.sidebands import sideband_words

REFERENCE = [
    (140.0, "sideband of 240 Hz by 100 Hz"),
    (340.0, "sideband of 240 Hz by 100 Hz"),
    (40.0, "sideband of 240 Hz by 200 Hz"),
    (380.0, "sideband of 480 Hz by 100 Hz"),
    (171.3, ""),
]


@pytest.mark.parametrize(("frequency", "words"), REFERENCE)
def test_names_both_parents(frequency, words):
    assert sideband_words(frequency, [240.0, 100.0]) == words
    assert sideband_words(frequency, [100.0, 240.0]) == words


@given(
    carrier=st.floats(200.0, 5000.0),
    share=st.floats(0.02, 0.95),
    sign=st.sampled_from([-1, 1]),
    error=st.floats(1e-4, 1e-2),
    seed=st.integers(0, 999),
)
def test_random_pairs_with_errors(carrier, share, sign, error, seed):
    modulator = share * carrier
    assume(min(abs(share * m - n) for m in range(1, 11) for n in range(11)) > 1e-3)  # not locked to each other
    off = np.random.default_rng(seed).normal(0, 0.5 * error, 3)
    words = sideband_words(
        carrier + sign * modulator + off[0], [carrier + off[1], modulator + off[2]], error, [error] * 2
    )
    assert words.startswith("sideband of ") and " by " in words


def test_one_light_alone_has_no_sidebands():
    assert sideband_words(240.0, [100.0]) == ""
