"""Balls, materials and contact pairs."""

import math
from collections.abc import Mapping
from typing import Literal

from pydantic import model_validator

from engine.model.base import Frozen, Identifier, Note, Text, labelled, metres, named, quantity, several

VOID = "void"
"""Material of a hollow: no mass."""
LAYER_LIMIT = 16
SMALLEST_RADIUS = 1e-4
LARGEST_RADIUS = 5.0
"""m. Radius of a ball or of one of its layers."""

Confidence = Literal["measured", "published", "common practice", "from memory"]
"""How far a value can be trusted: measured on this installation, read in a source, or neither."""


class Material(Frozen):
    """Stuff of a ball or a wall: density kg/m3; Young's modulus Pa and Poisson's ratio where known."""

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    density: float = quantity(7800.0, "kg/m3", "Density", 1.0, 30_000.0)
    young: float | None = quantity(None, "Pa", "Young's modulus", 1e4, 2e12)
    poisson: float | None = quantity(None, "ratio", "Poisson's ratio", -0.99, 0.5)
    source: Note = labelled("", "Source")


class Layer(Frozen):
    """Shell of a ball: its material ("void" for a hollow) and its outer radius, m."""

    material: Identifier = labelled("steel", "Material", reference="material")
    radius: float = metres(0.008, "Outer radius", SMALLEST_RADIUS, LARGEST_RADIUS)


class Ball(Frozen):
    """Ball made of layers from inside out; the last one is the surface that rolls.

    `diameter_tolerance` is plus or minus, m, on the diameter.
    """

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    layers: tuple[Layer, ...] = several("Layers from inside out", LAYER_LIMIT, (Layer(),), 1)
    diameter_tolerance: float = metres(0.0, "Tolerance of diameter", 0.0, 0.1)

    @model_validator(mode="after")
    def _check_layers(self) -> "Ball":
        """Refuse layers that overlap and a surface made of nothing: neither has a mass."""
        radii = [layer.radius for layer in self.layers]
        if any(outer <= inner for inner, outer in zip(radii, radii[1:], strict=False)):
            raise ValueError("layers must grow from inside out: each radius larger than the one before")
        if self.layers[-1].material == VOID:
            raise ValueError('layers must not end with "void"; give the surface a material')
        return self

    @property
    def radius(self) -> float:
        """Radius of the ball, m."""
        return self.layers[-1].radius

    def mass(self, materials: Mapping[str, Material]) -> float:
        """Mass, kg: (4/3) pi sum rho_i (q_i^3 - q_(i-1)^3) over the layers of outer radius q_i."""
        shells = self._shells(materials)
        return 4.0 / 3.0 * math.pi * sum(rho * (outer**3 - inner**3) for rho, inner, outer in shells)

    def inertia_factor(self, materials: Mapping[str, Material]) -> float:
        """Inertia factor k = I/(m r^2): 2/5 when solid, up to 2/3 for a thin shell.

        A shell of density rho between radii p and q has m = (4/3) pi rho (q^3 - p^3), I = (8/15) pi rho (q^5 - p^5), so
        k = (2/5) sum rho_i (q_i^5 - q_(i-1)^5) / sum rho_i (q_i^3 - q_(i-1)^3), with q in units of r.
        """
        r = self.radius
        shells = [(rho, inner / r, outer / r) for rho, inner, outer in self._shells(materials)]
        fifth = sum(rho * (outer**5 - inner**5) for rho, inner, outer in shells)
        third = sum(rho * (outer**3 - inner**3) for rho, inner, outer in shells)
        return 0.4 * fifth / third

    def _shells(self, materials: Mapping[str, Material]) -> list[tuple[float, float, float]]:
        """Density, inner and outer radius of each layer."""
        inner = 0.0
        shells = []
        for layer in self.layers:
            density = 0.0 if layer.material == VOID else materials[layer.material].density
            shells.append((density, inner, layer.radius))
            inner = layer.radius
        return shells


class Pair(Frozen):
    """How one ball material and one wall material touch.

    `rolling_loss` is the energy form: energy lost per metre over the normal load. `loss_speed` (m/s), when given, makes
    it grow with speed: rolling_loss (1 + v / loss_speed). `spin_arm` (m) is the arm of friction against spin about the
    normal; left out, it follows from `contact_modulus` (Pa) by Hertz, and without both there is no such friction.
    """

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    ball_material: Identifier = labelled("steel", "Ball material", reference="material")
    wall_material: Identifier = labelled("pmma", "Wall material", reference="material")
    static_friction: float = quantity(0.3, "ratio", "Static friction", 0.0, 10.0)
    kinetic_friction: float = quantity(0.2, "ratio", "Kinetic friction", 0.0, 10.0)
    rolling_loss: float = quantity(0.003, "ratio", "Rolling loss", 0.0, 1.0)
    loss_speed: float | None = quantity(None, "m/s", "Speed that doubles rolling loss", 1e-3, 1e4)
    restitution: float = quantity(0.6, "ratio", "Restitution", 0.0, 1.0)
    spin_arm: float | None = metres(None, "Arm of spin friction", 0.0, 1.0)
    contact_modulus: float | None = quantity(None, "Pa", "Contact modulus", 1e3, 2e12)
    source: Note = labelled("", "Source")
    confidence: Confidence = labelled("from memory", "How sure")

    @model_validator(mode="after")
    def _check_friction(self) -> "Pair":
        """Refuse kinetic friction above static: a ball that has just gripped would slip again at once."""
        if self.kinetic_friction > self.static_friction:
            raise ValueError(
                f"kinetic_friction {self.kinetic_friction:g} must not be larger than "
                f"static_friction {self.static_friction:g}"
            )
        return self
