"""The same field in every dialect and container reads the same and measures the same."""

import numpy as np
import pytest

from fieldview.compute.field import Status
from fieldview.compute.region import measure_region
from fieldview.compute.shapes import rectangle
from fieldview.compute.units import METRIC
from fieldview.files import open_run
from fieldview.files.contents import Contents
from fieldview.files.formats import read_contents
from tests.files.dialects import DIALECTS, GAP, U, V, X, Y

CORNERS = ((-0.4, 1.1), (0.3, 1.6))


@pytest.fixture(scope="module")
def expected():
    from fieldview.compute.field import Field
    from fieldview.compute.grid import Grid

    return measure_region(Field(Grid(X, Y), u=U, v=V), rectangle(CORNERS))


@pytest.mark.parametrize("dialect", DIALECTS, ids=lambda dialect: dialect.name)
def test_every_dialect_gives_the_same_field_and_the_same_numbers(dialect, tmp_path, expected):
    dialect.write(tmp_path / dialect.file)
    run = open_run([dialect.file], dialect.reading, folder=tmp_path)
    field = run[0]
    assert len(run) == 1 and field.units == METRIC
    # packed integers and numbers with 8 digits come back to 1e-8, all others to round-off
    tolerance = 2e-8 if "packed" in dialect.name or "D" in dialect.name else 1e-14
    assert np.allclose(field.grid.x, X, rtol=0, atol=tolerance)
    assert np.allclose(field.grid.y, Y, rtol=0, atol=tolerance)
    assert np.allclose(field.u, U, rtol=0, atol=tolerance, equal_nan=True)
    assert np.allclose(field.v, V, rtol=0, atol=tolerance, equal_nan=True)
    assert field.count(Status.MISSING) == 1 and field.status[GAP] == Status.MISSING
    numbers = measure_region(field, rectangle(CORNERS))
    for name in ("circulation", "flux", "vorticity_integral", "divergence_integral"):
        assert getattr(numbers, name).value == pytest.approx(
            getattr(expected, name).value, rel=10 * tolerance + 1e-12
        )


def test_there_are_sixteen_dialects_at_least():
    assert len({dialect.name for dialect in DIALECTS}) >= 16


@pytest.mark.parametrize("dialect", DIALECTS, ids=lambda dialect: dialect.name)
def test_every_reader_gives_the_same_kind_of_contents(dialect, tmp_path):
    dialect.write(tmp_path / dialect.file)
    contents = read_contents(tmp_path / dialect.file)
    assert isinstance(contents, Contents) and contents.format
    for variable in contents.variables:
        values = variable.fetch({})
        assert isinstance(values, np.ndarray) and values.dtype == float and values.shape == variable.shape
        assert len(variable.dims) == len(variable.shape)
