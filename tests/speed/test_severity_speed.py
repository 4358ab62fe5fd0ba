from severity import BOUND, ratio


def test_the_severity_costs_little_more_than_its_filters():
    assert ratio() <= BOUND
