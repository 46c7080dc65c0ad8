"""Samples of a rolled run as a file: one row per sample (CSV) or one array per column (NPZ)."""

import io

import numpy as np
from numpy.typing import NDArray

from engine.integrate.result import LOSSES, Regime, Trajectory

AXES = ("x", "y", "z")


def columns(trajectory: Trajectory) -> dict[str, NDArray[np.generic]]:
    """Columns by name with the unit in it, each (n,); `element` counts placed elements from 0, `regime` is a word."""
    names = np.array([Regime(value).name.lower() for value in range(len(Regime))])
    made: dict[str, NDArray[np.generic]] = {"t_s": trajectory.t}
    for stem, unit, values in (("", "m", trajectory.x), ("v", "m_s", trajectory.v), ("w", "rad_s", trajectory.w)):
        made.update({f"{stem}{axis}_{unit}": values[:, place] for place, axis in enumerate(AXES)})
    made.update(
        element=trajectory.element,
        s_m=trajectory.s,
        wall_angle_rad=trajectory.angle,
        regime=names[trajectory.regime],
        normal_force_n=trajectory.normal_force,
        slip_speed_m_s=trajectory.slip_speed,
        friction_ratio=trajectory.friction_ratio,
        margin=trajectory.margin,
        kinetic_j=trajectory.kinetic,
        potential_j=trajectory.potential,
    )
    made.update({f"loss_{cause}_j": trajectory.loss[:, place] for place, cause in enumerate(LOSSES)})
    return made


def csv_bytes(trajectory: Trajectory) -> bytes:
    """CSV (RFC 4180, UTF-8), a header row first; numbers read back as the same floats, what is not known is empty."""
    made = columns(trajectory)
    texts = [_texts(values) for values in made.values()]
    rows = [",".join(made), *(",".join(row) for row in zip(*texts, strict=True))]
    return ("\r\n".join(rows) + "\r\n").encode("utf-8")


def _texts(values: NDArray[np.generic]) -> list[str]:
    """Text of each value; nan is empty."""
    if values.dtype.kind == "f":
        return ["" if value != value else repr(value) for value in values.tolist()]
    return [str(value) for value in values.tolist()]


def npz_bytes(trajectory: Trajectory) -> bytes:
    """NumPy archive with one array per column, without pickled objects."""
    file = io.BytesIO()
    np.savez_compressed(file, allow_pickle=False, **columns(trajectory))
    return file.getvalue()
