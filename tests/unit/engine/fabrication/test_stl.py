"""Binary STL: layout, single-precision normals, readers other than our own, memory."""

import io
import re
import shutil
import subprocess
import tracemalloc

import meshio
import numpy as np
import pytest
import stl
import trimesh

from engine.fabrication.mesh import Mesh
from engine.fabrication.stl import CHUNK, HEADER, RECORD, MeshFileError, header_of, read_stl, stored, write_stl
from engine.fabrication.sweep import sweep, tube_profile
from tests import curves

TOLERANCE = 1e-4
MEMORY_LIMIT = 300e6
"""bytes for a million triangles."""


def helix() -> Mesh:
    return sweep(curves.helix(0.08, 6.0, 0.05), tube_profile(0.012, 0.003, TOLERANCE), TOLERANCE)


def written(path, mesh: Mesh, text: str = "a part") -> None:
    with path.open("wb") as file:
        write_stl(file, mesh, text)


def test_record_is_fifty_bytes_and_header_eighty_four():
    assert (RECORD.itemsize, HEADER.itemsize) == (50, 84)


def test_file_is_as_long_as_its_count_says(tmp_path):
    mesh = helix()
    written(tmp_path / "a.stl", mesh)
    assert (tmp_path / "a.stl").stat().st_size == 84 + 50 * mesh.triangles


def test_chunks_join_without_a_seam(tmp_path):
    mesh = helix()
    many = Mesh(mesh.vertices, np.resize(mesh.faces, (2 * CHUNK + 7, 3)), mesh.places)
    written(tmp_path / "a.stl", many)
    _, rows = read_stl(tmp_path / "a.stl")
    assert np.array_equal(rows["corners"], stored(many, np.zeros(3))[many.faces])


def test_lengths_are_in_millimetres_from_the_origin_asked_for():
    mesh, file = helix(), io.BytesIO()
    write_stl(file, mesh, "x", mesh.box()[0])
    corners = np.frombuffer(file.getvalue(), dtype=RECORD, offset=84)["corners"].reshape(-1, 3)
    assert corners.min(axis=0).tolist() == [0.0, 0.0, 0.0]
    assert corners.max(axis=0) == pytest.approx(1e3 * np.ptp(mesh.vertices, axis=0), rel=1e-6)


def test_normals_are_those_of_the_stored_corners(tmp_path):
    written(tmp_path / "a.stl", helix())
    _, rows = read_stl(tmp_path / "a.stl")
    a, b, c = (rows["corners"][:, i] for i in range(3))
    normal = np.cross(b - a, c - a)
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    assert np.abs(normal - rows["normal"]).max() < 1e-6


def test_triangle_without_area_has_no_normal():
    file = io.BytesIO()
    flat = Mesh(np.array([[0.0, 0, 0], [1, 0, 0], [2, 0, 0]]), np.array([[0, 1, 2]], dtype=np.int32), np.zeros(3))
    write_stl(file, flat, "x")
    assert np.frombuffer(file.getvalue(), dtype=RECORD, offset=84)["normal"].tolist() == [[0.0, 0.0, 0.0]]


@pytest.mark.parametrize("text", ["solid gold", "SOLID", "solid", "Bögen\nund 管", "x" * 200, ""])
def test_header_never_looks_like_a_text_file(text):
    header = header_of(text)
    assert len(header) == 80 and header.isascii() and b"\n" not in header
    assert not header.lower().startswith(b"solid")


def test_header_is_read_back(tmp_path):
    written(tmp_path / "a.stl", helix(), "bend, unit mm")
    assert read_stl(tmp_path / "a.stl")[0] == "bend, unit mm"


@pytest.mark.parametrize(("cut", "words"), [(40, "at least 84"), (1000, "where its count asks for")])
def test_cut_file_is_refused(tmp_path, cut, words):
    path = tmp_path / "a.stl"
    written(path, helix())
    path.write_bytes(path.read_bytes()[:cut])
    with pytest.raises(MeshFileError, match=words) as caught:
        read_stl(path)
    assert str(caught.value).endswith("export it again.")


def test_million_triangles_stay_within_their_memory(tmp_path):
    mesh = helix()
    many = Mesh(mesh.vertices, np.resize(mesh.faces, (1_000_000, 3)), mesh.places)
    tracemalloc.start()
    try:
        written(tmp_path / "a.stl", many)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert peak < MEMORY_LIMIT


# -- other readers --------------------------------------------------------------------------------
def test_read_by_numpy_stl(tmp_path):
    mesh = helix()
    written(tmp_path / "a.stl", mesh)
    read = stl.Mesh.from_file(str(tmp_path / "a.stl"))
    assert len(read.vectors) == mesh.triangles and read.is_closed(exact=True)
    assert float(read.get_mass_properties()[0]) == pytest.approx(1e9 * mesh.volume(), rel=1e-5)


def test_read_by_meshio(tmp_path):
    mesh = helix()
    written(tmp_path / "a.stl", mesh)
    read = meshio.read(tmp_path / "a.stl")
    assert len(read.cells_dict["triangle"]) == mesh.triangles
    assert len(read.points) == len(mesh.vertices)


def test_read_by_trimesh(tmp_path):
    mesh = helix()
    written(tmp_path / "a.stl", mesh)
    read = trimesh.load(tmp_path / "a.stl")
    assert read.is_watertight and read.is_winding_consistent and read.euler_number == 0
    assert read.volume == pytest.approx(1e9 * mesh.volume(), rel=1e-5)


if shutil.which("admesh"):

    def test_checked_by_admesh(tmp_path):
        """Collected only where the program is installed."""
        mesh = helix()
        written(tmp_path / "a.stl", mesh)
        command = ["admesh", str(tmp_path / "a.stl")]
        said = subprocess.run(command, capture_output=True, text=True, check=True).stdout
        figures = dict(re.findall(r"^\s*(.+?)\s*:\s*(-?\d+)\b", said, flags=re.MULTILINE))
        assert int(figures["Number of facets"]) == mesh.triangles
        for fault in ("Degenerate facets", "Edges fixed", "Facets removed", "Facets added", "Facets reversed"):
            assert int(figures[fault]) == 0
