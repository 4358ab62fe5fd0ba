import pytest
from startup import PAIRS, ratio


@pytest.mark.parametrize("name", PAIRS)
def test_starts_fast_enough(name):
    command, reference, bound = PAIRS[name]
    assert ratio(command, reference) <= bound
