"""A fillet of next to no radius once overflowed the curvature of the meridian (1 / radius)."""

import numpy as np
import pytest

from engine import shapes
from engine.model.elements import Well


@pytest.mark.parametrize("field", ["rim_fillet", "floor_fillet"])
def test_fillet_of_next_to_no_radius_is_a_sharp_edge(field):
    tiny = shapes.meridian(Well(id="w", **{field: 2.225073858507e-311}))
    sharp = shapes.meridian(Well(id="w", **{field: 0.0}))
    assert np.array_equal(tiny, sharp)
