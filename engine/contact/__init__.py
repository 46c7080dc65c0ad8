"""Walls as bounded patches: gap, normal, curvature, contact laws."""
