"""Parts of a design as mesh files: all of them or none, and never one that could not be made.

Order: build and inspect every part; refuse the whole export when one fails; write every file into a temporary folder;
only then put the files in place, keeping what they replace until the last one stands.
"""

import os
import re
import shutil
import tempfile
import unicodedata
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from engine.errors import CancelledError, PartRefusedError, SaveError, os_reason
from engine.fabrication.mesh import Array, Mesh
from engine.fabrication.solid import build_solid, is_part, refusals
from engine.fabrication.stl import write_stl
from engine.placement import Layout, Placed
from engine.units import LENGTHS

LONGEST_NAME = 40
"""Letters of an element's name that go into a file name."""
TEMPORARY = ".parts-"
"""Beginning of the name of the temporary folder."""

Progress = Callable[[int, int], None]
"""Called with the steps done and the steps in all."""
Cancel = Callable[[], bool]
"""Asked between parts; True stops the export and leaves what stood there before."""


@dataclass(frozen=True, eq=False)
class ExportedPart:
    """One file written.

    Attributes
    ----------
    name : str
        File name.
    path : Path
    element_id : str
    triangles : int
    volume : float
        m3 of material.
    box : (2, 3)
        Low and high corner where the part stands in the design, m. The file counts from the low corner.
    mass : float or None
        kg, by the density of the wall material of its contact pair; None when that material is not known.
    """

    name: str
    path: Path
    element_id: str
    triangles: int
    volume: float
    box: Array
    mass: float | None


def export_parts(
    layout: Layout, folder: Path | str, *, progress: Progress | None = None, cancel: Cancel | None = None
) -> list[ExportedPart]:
    """Write every part of a layout as binary STL in mm, each counted from the low corner of its box.

    Parameters
    ----------
    layout : Layout
    folder : Path or str
        Made when it is not there. Files of the same name are replaced, others are left alone.
    progress, cancel : callable, optional

    Returns
    -------
    list of ExportedPart
        In the order of the design.

    Raises
    ------
    PartRefusedError
        When a part could not be made; every such part is named and nothing is written.
    CancelledError, SaveError
        Stopped, or a file could not be written; what stood in the folder before is whole.
    """
    entries = [entry for entry in layout.placed if is_part(entry)]
    if not entries:
        raise PartRefusedError("The design has no part to export; add an element that is made of something.")
    steps = _Steps(2 * len(entries), progress, cancel)
    _refuse_bad(layout, entries, steps)
    target = Path(folder)
    try:
        target.mkdir(parents=True, exist_ok=True)
        beside = Path(tempfile.mkdtemp(prefix=TEMPORARY, dir=target))
    except OSError as error:
        raise SaveError(f"{target} cannot be written to: {os_reason(error)}; choose another folder.") from error
    try:
        parts = [_write(layout, entry, beside, target, steps) for entry in entries]
        _settle(parts, beside)
    except OSError as error:
        raise SaveError(
            f"The parts cannot be written to {target}: {os_reason(error)}; what stood there before is unchanged, "
            "make room or choose another folder."
        ) from error
    finally:
        shutil.rmtree(beside, ignore_errors=True)
    return parts


class _Steps:
    """Counts steps, tells how far it is and stops when asked."""

    def __init__(self, total: int, progress: Progress | None, cancel: Cancel | None) -> None:
        self.done, self.total, self.progress, self.cancel = 0, total, progress, cancel

    def check(self) -> None:
        """Stop here when asked to."""
        if self.cancel is not None and self.cancel():
            raise CancelledError("The export was stopped; what stood in the folder before is unchanged.")

    def step(self) -> None:
        """Count one step."""
        self.done += 1
        if self.progress is not None:
            self.progress(self.done, self.total)


def _refuse_bad(layout: Layout, entries: Sequence[Placed], steps: _Steps) -> None:
    """Build and inspect every part; refuse all when one fails. Meshes are not kept: building them again is quick."""
    found: list[str] = []
    for entry in entries:
        steps.check()
        try:
            found += refusals(entry, build_solid(entry, layout.design.process), layout.design.process)
        except PartRefusedError as error:
            found.append(str(error))
        steps.step()
    if found:
        raise PartRefusedError(" ".join(found))


def _write(layout: Layout, entry: Placed, beside: Path, target: Path, steps: _Steps) -> ExportedPart:
    """Write one part into the temporary folder."""
    steps.check()
    mesh = build_solid(entry, layout.design.process)
    name, box = part_name(entry), mesh.box()
    with (beside / name).open("xb") as file:
        write_stl(file, mesh, _header(name, box), box[0])
        file.flush()
        os.fsync(file.fileno())
    steps.step()
    volume = mesh.volume()
    return ExportedPart(
        name, target / name, entry.element.id, mesh.triangles, volume, box, _mass(layout, entry, volume)
    )


def _header(name: str, box: Array) -> str:
    """Header: file name, unit, and where the low corner stands in the design."""
    x, y, z = np.round(box[0] / LENGTHS["mm"], 2) + 0.0
    return f"{name[: LONGEST_NAME - 10]} unit mm, from {x:.2f} {y:.2f} {z:.2f}"


def _mass(layout: Layout, entry: Placed, volume: float) -> float | None:
    design = layout.design
    run = design.run(entry.run)
    material = design.material_table().get(design.pair_of(run, entry.element).wall_material)
    return None if material is None else material.density * volume


def part_name(entry: Placed) -> str:
    """File name such as "03-bend-mm.stl": place in the design, name of the element in plain letters, unit.

    Only a-z, 0-9 and hyphens are used. It begins with a number, so that it is never a reserved word of a system, and
    the numbers differ, so that names do even where a system does not tell capitals apart.
    """
    plain = unicodedata.normalize("NFKD", entry.element.title).encode("ascii", "ignore").decode("ascii").lower()
    word = re.sub(r"[^a-z0-9]+", "-", plain)[:LONGEST_NAME].strip("-")
    return f"{entry.index + 1:02d}-{word or entry.element.kind.replace('_', '-')}-mm.stl"


# -- putting in place -----------------------------------------------------------------------------
def _settle(parts: Sequence[ExportedPart], beside: Path) -> None:
    """Put the written files in place; when one cannot be, put back what stood there before."""
    kept = beside / "before"
    kept.mkdir()
    settled: list[ExportedPart] = []
    try:
        for part in parts:
            settled.append(part)
            if os.path.lexists(part.path):
                os.replace(part.path, kept / part.name)
            os.replace(beside / part.name, part.path)
    except OSError:
        _put_back(settled, beside, kept)
        raise


def _put_back(settled: Sequence[ExportedPart], beside: Path, kept: Path) -> None:
    """Undo `_settle`: new files out, old files back."""
    for part in settled:
        if not os.path.lexists(beside / part.name):
            part.path.unlink(missing_ok=True)
        if os.path.lexists(kept / part.name):
            os.replace(kept / part.name, part.path)


def mesh_of(layout: Layout, element_id: str, *, coarse: bool = False) -> Mesh:
    """Solid of one element by its id, m; see `build_solid`."""
    return build_solid(layout.find(element_id), layout.design.process, coarse=coarse)
