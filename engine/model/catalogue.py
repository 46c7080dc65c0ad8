"""Built-in materials, contact pairs, balls and tubes: literal values, each with its source.

Marks in the sources: "common practice" is what the trade uses, not measured here; "from memory" was not checked
against a text. A design's own entries come before these. Measure friction and rolling loss on a prototype before
trusting a margin.
"""

from collections.abc import Iterable
from typing import NamedTuple

from engine.model.ball import Ball, Layer, Material, Pair

ISO_10456 = "density: ISO 10456 table; elastic constants from memory"
ASHRAE = "density: ASHRAE Handbook table of building materials; elastic constants along the grain, from memory"

_MATERIALS = (
    # id, name, density kg/m3, Young's modulus Pa, Poisson's ratio, source
    (
        "steel",
        "Bearing steel 52100",
        7830.0,
        2.07e11,
        0.30,
        "density: makers' counts of balls per kilogram; rest from memory",
    ),
    ("mild_steel", "Mild steel", 7800.0, 2.05e11, 0.29, ISO_10456),
    ("stainless", "Stainless steel", 7900.0, 1.95e11, 0.29, ISO_10456),
    ("aluminium", "Aluminium alloy", 2800.0, 7.0e10, 0.33, ISO_10456),
    ("brass", "Brass", 8400.0, 1.05e11, 0.34, ISO_10456),
    ("copper", "Copper", 8900.0, 1.2e11, 0.34, ISO_10456),
    ("tungsten", "Tungsten", 19300.0, 4.1e11, 0.28, "density: table of the elements; rest from memory"),
    ("silicon_nitride", "Silicon nitride", 3200.0, 3.1e11, 0.27, "from memory"),
    ("glass", "Soda-lime glass", 2500.0, 7.0e10, 0.22, ISO_10456),
    ("pmma", "Acrylic (PMMA)", 1180.0, 3.2e9, 0.37, ISO_10456),
    ("polycarbonate", "Polycarbonate", 1200.0, 2.3e9, 0.37, ISO_10456),
    ("pvc", "PVC, hard", 1390.0, 3.0e9, 0.38, ISO_10456),
    ("vinyl", "PVC, flexible hose", 1200.0, 1.0e7, 0.48, ISO_10456),
    ("nylon", "Nylon", 1150.0, 2.5e9, 0.39, ISO_10456),
    ("ptfe", "PTFE", 2200.0, 5.0e8, 0.46, ISO_10456),
    ("acetal", "Acetal", 1410.0, 2.9e9, 0.35, "density: engineering table; rest from memory"),
    ("abs", "ABS, printed solid", 1040.0, 2.0e9, 0.37, "density: engineering table 1030 to 1050; rest from memory"),
    ("pla", "PLA, printed solid", 1240.0, 3.0e9, 0.36, "from memory; a part with sparse infill is lighter"),
    ("petg", "PETG, printed solid", 1270.0, 2.0e9, 0.38, "density: engineering table 1260 to 1280; rest from memory"),
    ("oak", "Oak", 705.0, 1.1e10, None, ASHRAE),
    ("maple", "Maple", 667.0, 1.25e10, None, ASHRAE),
    ("plywood", "Plywood", 460.0, 8.0e9, None, ASHRAE),
    ("natural_rubber", "Natural rubber", 910.0, 2.0e6, 0.49, ISO_10456),
    ("ball_rubber", "Filled rubber of a squash ball", 1150.0, 3.0e6, 0.49, "from memory"),
    ("silicone", "Silicone", 1200.0, 3.0e6, 0.49, ISO_10456),
    ("phenolic", "Phenolic of game balls", 1700.0, 5.8e9, 0.34, "from memory"),
    ("celluloid", "Table-tennis ball plastic", 1400.0, 2.0e9, 0.38, "from memory"),
    (
        "ionomer",
        "Golf ball, mean of core and cover",
        1129.0,
        1.0e8,
        0.45,
        "density from limits 45.93 g and 42.67 mm; rest from memory",
    ),
)

_GUESS = "rolling loss: common practice, measure before use; friction: {}; restitution: {}"
_PAIRS = (
    # ball, wall, static, kinetic, rolling loss (energy form), restitution, source of friction, of restitution
    ("steel", "pmma", 0.45, 0.40, 0.004, 0.80, "0.4 to 0.5, from memory", "0.75 to 0.85, from memory"),
    (
        "steel",
        "glass",
        0.50,
        0.40,
        0.001,
        0.92,
        "glass on metal 0.5 to 0.7 dry, textbook, low end",
        "0.90 to 0.95, from memory",
    ),
    ("steel", "mild_steel", 0.60, 0.30, 0.002, 0.90, "0.6/0.3 dry, textbook", "0.90 to 0.97, from memory"),
    (
        "steel",
        "stainless",
        0.60,
        0.30,
        0.002,
        0.90,
        "steel on steel 0.6/0.3 dry, textbook",
        "as steel on steel, from memory",
    ),
    ("steel", "aluminium", 0.61, 0.47, 0.003, 0.75, "0.61/0.47, textbook chart", "from memory"),
    ("steel", "copper", 0.53, 0.36, 0.003, 0.70, "0.53/0.36, textbook chart", "from memory"),
    ("steel", "brass", 0.51, 0.44, 0.003, 0.75, "0.51, textbook chart; kinetic from memory", "from memory"),
    ("steel", "polycarbonate", 0.40, 0.35, 0.005, 0.75, "0.3 to 0.5, from memory", "from memory"),
    ("steel", "pvc", 0.40, 0.35, 0.006, 0.65, "from memory", "from memory"),
    ("steel", "vinyl", 0.70, 0.60, 0.035, 0.40, "from memory", "from memory"),
    ("steel", "pla", 0.35, 0.30, 0.012, 0.60, "from memory", "from memory"),
    ("steel", "petg", 0.35, 0.30, 0.012, 0.55, "from memory", "from memory"),
    ("steel", "abs", 0.35, 0.30, 0.012, 0.55, "from memory", "from memory"),
    ("steel", "oak", 0.50, 0.30, 0.010, 0.55, "metal on wood 0.5/0.3, textbook", "hardwood 0.45 to 0.65, from memory"),
    (
        "steel",
        "maple",
        0.50,
        0.30,
        0.008,
        0.55,
        "metal on wood 0.5/0.3, textbook",
        "hardwood 0.45 to 0.65, from memory",
    ),
    ("steel", "plywood", 0.50, 0.30, 0.012, 0.50, "metal on wood 0.5/0.3, textbook", "from memory"),
    ("steel", "natural_rubber", 0.90, 0.70, 0.050, 0.45, "from memory", "rubber sheet 0.3 to 0.6, from memory"),
    ("steel", "ptfe", 0.04, 0.04, 0.006, 0.60, "0.04/0.04, textbook", "from memory"),
    ("stainless", "pmma", 0.45, 0.40, 0.004, 0.80, "as steel, from memory", "as steel, from memory"),
    ("glass", "pmma", 0.45, 0.40, 0.005, 0.75, "from memory", "from memory"),
    ("glass", "glass", 0.90, 0.40, 0.002, 0.95, "0.9/0.4, from memory", "0.94 to 0.97, from memory"),
    ("glass", "oak", 0.40, 0.30, 0.010, 0.55, "from memory", "from memory"),
    ("glass", "pla", 0.35, 0.30, 0.014, 0.60, "from memory", "from memory"),
    ("maple", "pmma", 0.40, 0.30, 0.010, 0.60, "from memory", "from memory"),
    ("maple", "oak", 0.50, 0.30, 0.012, 0.50, "wood on wood 0.5/0.3, textbook", "from memory"),
    ("nylon", "pmma", 0.35, 0.30, 0.010, 0.65, "from memory", "from memory"),
    ("phenolic", "pmma", 0.35, 0.30, 0.008, 0.75, "from memory", "from memory"),
    (
        "celluloid",
        "pmma",
        0.35,
        0.30,
        0.010,
        0.85,
        "from memory",
        "table 0.876, steel block 0.887 to 0.923, rule text; here from memory",
    ),
    (
        "ionomer",
        "pmma",
        0.40,
        0.35,
        0.012,
        0.75,
        "from memory",
        "0.86 on an unnamed floor, class figures; here from memory",
    ),
    ("ball_rubber", "pmma", 0.90, 0.75, 0.050, 0.40, "from memory", "at least 0.35, from memory"),
)

MAKERS_LIST = "diameter: makers' stock lists"
_SOLID_BALLS = (
    # material, diameters in m
    ("steel", (0.006, 0.00635, 0.008, 0.009525, 0.010, 0.0127, 0.015875, 0.016, 0.01905, 0.020, 0.025, 0.0254)),
    ("stainless", (0.010, 0.0127, 0.016, 0.020, 0.0254)),
    ("glass", (0.016, 0.025)),
    ("maple", (0.020, 0.025, 0.040)),
    ("nylon", (0.0127, 0.020, 0.0254)),
)
_BALL_TOLERANCE = {"steel": 5e-5, "stainless": 5e-5, "glass": 5e-4, "maple": 3e-4, "nylon": 5e-5}
"""Plus or minus, m: bearing grades are far inside 0.05 mm; glass marbles 0.3 to 0.5 mm is common practice; wood and
nylon from memory."""

_GAME_BALLS = (
    Ball(
        id="golf",
        name="Golf ball, 42.67 mm",
        layers=(Layer(material="ionomer", radius=0.021335),),
        diameter_tolerance=1e-4,
    ),
    Ball(
        id="table-tennis",
        name="Table-tennis ball, 40 mm, 2.7 g",
        layers=(Layer(material="void", radius=0.019608), Layer(material="celluloid", radius=0.020)),
        diameter_tolerance=5e-4,
    ),
    Ball(
        id="squash",
        name="Squash ball, 40 mm, 24 g",
        layers=(Layer(material="void", radius=0.01443), Layer(material="ball_rubber", radius=0.020)),
        diameter_tolerance=5e-4,
    ),
    Ball(
        id="snooker",
        name="Snooker ball, 52.5 mm",
        layers=(Layer(material="phenolic", radius=0.02625),),
        diameter_tolerance=5e-5,
    ),
    Ball(
        id="pool",
        name="Pool ball, 57.15 mm",
        layers=(Layer(material="phenolic", radius=0.028575),),
        diameter_tolerance=1.27e-4,
    ),
)


class TubeStock(NamedTuple):
    """Tube one can buy: name, outer and inner diameter (m), material id, source."""

    name: str
    outer: float
    bore: float
    material: str
    source: str

    @property
    def wall(self) -> float:
        """Wall thickness, m."""
        return 0.5 * (self.outer - self.bore)


PIPE_SOURCE = "ASTM D1785; its wall is a minimum, so the true bore is this or smaller"
COPPER_SOURCE = "ASTM B88M type B, outside diameter and wall"
ACRYLIC_SOURCE = "common practice: usual stock sizes; extruded tube varies about 1 % in diameter and 10 % in wall"
_PIPES = (
    # nominal size, outside, Schedule 40 bore, Schedule 80 bore, all but the first in mm
    ("1/2", 21.34, 15.80, 13.87),
    ("3/4", 26.67, 20.93, 18.85),
    ("1", 33.40, 26.64, 24.31),
    ("1 1/4", 42.16, 35.05, 32.46),
    ("1 1/2", 48.26, 40.89, 38.10),
    ("2", 60.33, 52.50, 49.25),
    ("2 1/2", 73.03, 62.71, 59.00),
    ("3", 88.90, 77.93, 73.66),
    ("4", 114.30, 102.26, 97.18),
    ("6", 168.28, 154.05, 146.33),
)
_COPPER = ((12, 0.9), (15, 1.0), (18, 1.0), (22, 1.1), (28, 1.2), (35, 1.4), (42, 1.5), (54, 1.7))
_ACRYLIC = (
    *((20, 16), (25, 21), (30, 26), (30, 24), (35, 29), (40, 36), (40, 34), (50, 46), (50, 44), (60, 54), (70, 64)),
    *((80, 74), (90, 84), (100, 94), (120, 114), (150, 144), (200, 194)),
)
_MM = 1e-3


def _pair(row: tuple[str, str, float, float, float, float, str, str]) -> Pair:
    """Contact pair of one row of the table."""
    ball, wall, static, kinetic, loss, restitution, friction_source, restitution_source = row
    return Pair(
        id=f"{ball}-{wall}",
        name=f"{MATERIALS[ball].name} on {MATERIALS[wall].name}",
        ball_material=ball,
        wall_material=wall,
        static_friction=static,
        kinetic_friction=kinetic,
        rolling_loss=loss,
        restitution=restitution,
        contact_modulus=contact_modulus(MATERIALS[ball], MATERIALS[wall]),
        source=_GUESS.format(friction_source, restitution_source),
        confidence="common practice",
    )


def contact_modulus(one: Material, other: Material) -> float | None:
    """Hertz modulus E*, Pa: 1/E* = (1 - nu1^2)/E1 + (1 - nu2^2)/E2; None when a constant is not known."""
    compliance = 0.0
    for material in (one, other):
        if material.young is None or material.poisson is None:
            return None
        compliance += (1.0 - material.poisson**2) / material.young
    return 1.0 / compliance


def _solid(material: str, diameter: float) -> Ball:
    """Solid stock ball; its id is the material and the diameter in mm."""
    size = f"{diameter / _MM:.6g}"
    return Ball(
        id=f"{material}-{size}",
        name=f"{MATERIALS[material].name}, {size} mm",
        layers=(Layer(material=material, radius=0.5 * diameter),),
        diameter_tolerance=_BALL_TOLERANCE[material],
    )


def _tubes() -> tuple[TubeStock, ...]:
    """Every stock tube."""
    pipes = [
        TubeStock(f"PVC pipe {size} in, Schedule {schedule}", outer * _MM, bore * _MM, "pvc", PIPE_SOURCE)
        for size, outer, *bores in _PIPES
        for schedule, bore in zip((40, 80), bores, strict=True)
    ]
    copper = [
        TubeStock(f"Copper tube {outer} x {wall} mm", outer * _MM, (outer - 2 * wall) * _MM, "copper", COPPER_SOURCE)
        for outer, wall in _COPPER
    ]
    acrylic = [
        TubeStock(f"Acrylic tube {outer}/{bore} mm", outer * _MM, bore * _MM, "pmma", ACRYLIC_SOURCE)
        for outer, bore in _ACRYLIC
    ]
    return (*acrylic, *copper, *pipes)


MATERIALS: dict[str, Material] = {
    key: Material(id=key, name=name, density=density, young=young, poisson=poisson, source=source)
    for key, name, density, young, poisson, source in _MATERIALS
}
PAIRS: dict[str, Pair] = {pair.id: pair for pair in map(_pair, _PAIRS)}
BALLS: dict[str, Ball] = {
    ball.id: ball
    for ball in (*(_solid(material, size) for material, sizes in _SOLID_BALLS for size in sizes), *_GAME_BALLS)
}
TUBES: tuple[TubeStock, ...] = _tubes()


def material_table(own: Iterable[Material] = ()) -> dict[str, Material]:
    """Materials by id: the built-in ones, then a design's own over them."""
    return {**MATERIALS, **{material.id: material for material in own}}


def pair_table(own: Iterable[Pair] = ()) -> dict[str, Pair]:
    """Contact pairs by id: the built-in ones, then a design's own over them."""
    return {**PAIRS, **{pair.id: pair for pair in own}}


def ball_table(own: Iterable[Ball] = ()) -> dict[str, Ball]:
    """Balls by id: the built-in ones, then a design's own over them."""
    return {**BALLS, **{ball.id: ball for ball in own}}
