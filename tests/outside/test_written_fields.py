"""Written fields as VTK's own reader and a checker of the CF conventions see them."""

import json
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from fieldview.compute.grid import Grid, Placement
from fieldview.compute.quantities import quantity
from fieldview.files.netcdf import write_netcdf
from fieldview.files.vtk import write_image, write_rectilinear
from tests.files.test_writing import EVEN, cleaned


@pytest.mark.parametrize("kind", ["vti", "vti turned", "vti mirrored", "vtr"])
def test_vtk_reads_points_and_values(kind, tmp_path):
    vtk = pytest.importorskip("vtk")
    from vtk.util.numpy_support import vtk_to_numpy

    places = {
        "vti turned": Placement().then(turn=0.4, shift=1 + 2j),
        "vti mirrored": Placement().then(turn=0.4, reflect="x"),
    }
    field = cleaned()
    if kind != "vtr":
        field = field.with_(grid=Grid(EVEN.x, EVEN.y, places.get(kind, Placement())))
    path = tmp_path / f"field.{kind[:3]}"
    (write_rectilinear if kind == "vtr" else write_image)(path, field)
    reader = vtk.vtkXMLRectilinearGridReader() if kind == "vtr" else vtk.vtkXMLImageDataReader()
    reader.SetFileName(str(path))
    reader.Update()
    data = reader.GetOutput()
    points = np.array([data.GetPoint(number) for number in range(data.GetNumberOfPoints())])
    nodes = field.grid.nodes.ravel()
    assert np.allclose(points[:, 0] + 1j * points[:, 1], nodes, rtol=0, atol=1e-14)
    held = data.GetPointData()
    velocity = vtk_to_numpy(held.GetArray("velocity"))
    assert np.array_equal(velocity[:, 0], field.u.ravel(), equal_nan=True)
    assert np.array_equal(vtk_to_numpy(held.GetArray("status")), field.status.ravel())
    units = held.GetArray("velocity").GetInformation().Get(vtk.vtkDataArray.UNITS_LABEL())
    assert units == "m/s"
    assert data.GetFieldData().GetArray("TimeValue").GetValue(0) == field.time


def test_netcdf_complies_with_cf(tmp_path):
    checker = shutil.which("compliance-checker") or shutil.which(
        "compliance-checker", path=str(Path(sys.executable).parent)
    )
    if checker is None:
        pytest.skip("needs compliance-checker")
    field = cleaned()
    path = tmp_path / "field.nc"
    values = {"vorticity": (quantity(field, "vorticity"), "1/s")}
    write_netcdf(path, field, quantities=values, attributes={"title": "invented field"})
    told = subprocess.run(
        [checker, "--test", "cf:1.11", "--format", "json", "--output", "-", str(path)],
        capture_output=True,
        text=True,
    )
    found = json.loads(told.stdout[told.stdout.index("{") :])["cf:1.11"]
    errors = [
        message
        for level in ("high_priorities", "medium_priorities")
        for check in found[level]
        for message in check["msgs"]
    ]
    assert errors == []
