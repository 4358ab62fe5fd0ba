import pytest
from reading import BASE, BOUNDS, OURS, compare, make_tables

ROWS = 2_000_000


@pytest.fixture(scope="module")
def tables(tmp_path_factory):
    return make_tables(tmp_path_factory.mktemp("tables"), ROWS)


@pytest.mark.parametrize("name", BOUNDS)
def test_a_large_table_reads_faster_than_with_loadtxt(tables, name):
    ratio, memory = compare(OURS, tables[name], tables["point"])
    assert ratio <= BOUNDS[name]
    assert memory <= BASE + 3 * ROWS * 16
