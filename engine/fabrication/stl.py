"""Binary STL: a header of 80 bytes, a count, 50 bytes per triangle (normal, three corners, two spare); little-endian.

The format knows no unit; lengths are written in mm. Normals are taken from the corners as stored, in single
precision, so that a reader that recomputes them finds the same.
"""

from pathlib import Path
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray

from engine.errors import TrundleError
from engine.fabrication.mesh import Array, Faces, Mesh
from engine.units import LENGTHS

RECORD = np.dtype([("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("spare", "<u2")])
HEADER = np.dtype([("text", "S80"), ("count", "<u4")])
CHUNK = 1 << 16
"""Triangles written at once: 3 MB of records; more is no faster and takes more memory."""
MOST_IN_FILE = 2**32 - 1
"""The count of a file is a 32-bit number."""


class MeshFileError(TrundleError):
    """A mesh file cannot be read."""


def header_of(text: str) -> bytes:
    """Header of 80 bytes: ASCII, one line, never beginning with the word that marks a text file."""
    plain = "".join(letter if " " <= letter <= "~" else "?" for letter in text)
    if plain[:5].casefold() == "solid":
        plain = "part " + plain
    return plain.encode("ascii")[:80].ljust(80)


def stored(mesh: Mesh, origin: Array) -> NDArray[np.float32]:
    """Vertices (n, 3) as a file holds them: mm from `origin` (3,) m, single precision."""
    return ((mesh.vertices - origin) / LENGTHS["mm"]).astype(np.float32)


def write_stl(file: BinaryIO, mesh: Mesh, text: str, origin: Array | None = None) -> None:
    """Write a mesh (m) to an open file in mm, counted from `origin` (3,) m."""
    if mesh.triangles > MOST_IN_FILE:
        raise TrundleError(
            f"{mesh.triangles} triangles are more than a mesh file can count; raise the tolerance of a chord."
        )
    vertices = stored(mesh, np.zeros(3) if origin is None else origin)
    file.write(header_of(text))
    file.write(np.array(mesh.triangles, dtype="<u4").tobytes())
    for start in range(0, mesh.triangles, CHUNK):
        file.write(records(vertices, mesh.faces[start : start + CHUNK]).data)


def records(vertices: NDArray[np.float32], faces: Faces) -> NDArray[np.void]:
    """Triangles (m,) of `RECORD`; a triangle without area has the normal (0, 0, 0)."""
    out = np.zeros(len(faces), dtype=RECORD)
    corners = vertices[faces]
    out["corners"] = corners
    first, second = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    normal = np.empty_like(first)
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        normal[:, i] = first[:, j] * second[:, k] - first[:, k] * second[:, j]
    size = np.sqrt((normal * normal).sum(axis=1, keepdims=True))
    np.divide(normal, size, out=normal, where=size > 0.0)
    out["normal"] = normal
    return out


def read_stl(path: Path) -> tuple[str, NDArray[np.void]]:
    """Header text and triangles (m,) of `RECORD` of a binary file, mm.

    Raises
    ------
    MeshFileError
        When the length of the file does not fit the count in it.
    """
    content = path.read_bytes()
    if len(content) < HEADER.itemsize:
        raise MeshFileError(
            f"{path} has {len(content)} bytes; a binary STL has at least {HEADER.itemsize}; export it again."
        )
    head = np.frombuffer(content, dtype=HEADER, count=1)[0]
    wanted = HEADER.itemsize + int(head["count"]) * RECORD.itemsize
    if len(content) != wanted:
        raise MeshFileError(f"{path} has {len(content)} bytes where its count asks for {wanted}; export it again.")
    return head["text"].decode("ascii", "replace").rstrip(), np.frombuffer(
        content, dtype=RECORD, offset=HEADER.itemsize
    )
