import pytest
from reading import BASE, BOUNDS, COLUMNS, WHOLE_BOUNDS, make_tables, measuring, reading

ROWS = 2_000_000


@pytest.fixture(scope="module")
def tables(tmp_path_factory):
    return make_tables(tmp_path_factory.mktemp("tables"), ROWS)


@pytest.mark.parametrize("name", BOUNDS)
def test_a_large_table_reads_faster_than_with_loadtxt(tables, name):
    ratio, memory = reading(tables[name], tables["point"])
    assert ratio <= BOUNDS[name]
    assert memory <= BASE + COLUMNS * ROWS * 16


@pytest.mark.timeout(1200)
def test_ten_million_rows_are_measured_about_as_fast_as_loadtxt_reads_them(tmp_path):
    rows = 10_000_000
    tables = make_tables(tmp_path, rows)
    for name, bound in WHOLE_BOUNDS.items():
        ratio, memory = measuring(tables[name], tables["point"])
        assert ratio <= bound, name
        assert memory <= COLUMNS * rows * 16, name
