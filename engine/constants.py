"""Numerical limits and physical constants: purpose, unit, usual size, effect of changing each."""

STANDARD_GRAVITY = 9.80665
"""m/s2, the conventional value (CGPM 1901)."""

AIR_DENSITY = 1.2041
AIR_VISCOSITY = 1.825e-5
"""kg/m3 and Pa s at 20 C and 1 atm (from memory; libraries agree to 0.2 %)."""

# -- curves ---------------------------------------------------------------------------------------
NEWTON_TURNS = 12
"""Steps a closest-point search may take; two or three are usual with a warm start."""
NEWTON_SETTLED = 1e-7
"""A Newton step below this share of a piece ends the search: the next would be its square."""
AXIS_SHARE = 1e-7
"""Nearer to the axis than this share of the ball radius, a surface of revolution is taken as a sphere
(both curvatures equal): the azimuth has no meaning there."""

# -- slip -----------------------------------------------------------------------------------------
YOUNG_SLIP = 1e-4
"""m/s. Below it, just after onset, friction points along the needed rolling force: the direction that
the slip relaxes to. Measured on helical tubes: 5e-9 m of error after seconds of slip; 1e-2 m/s gives 5e-6 m."""
STOPPED_SLIP = 1e-8
"""m/s. Slip slower than this has ended. Larger values move the time of grip."""
NOISE_SHARE = 30.0
"""Slip and rolling speed count as stopped below this many times the local error of a step: what is left is error, not
motion, and a step that resolved it would crawl (a trough run took 2 000 000 steps at a slip of 1.25e-8 m/s)."""
STOPPED_SPIN = 1e-7
"""rad/s. Spin about the normal slower than this counts as none when spin friction acts."""

# -- impact ---------------------------------------------------------------------------------------
REST_IMPACT = 1e-2
"""m/s. A ball that would leave an impact slower than this stays on the wall: no endless bouncing.
10 mm/s is a hop of 5 micrometres, less than the roughness of any wall. The energy is booked as lost in impact."""
IMPACT_ROUNDS = 20
"""Alternating impulses between two walls met at once before both are taken as inelastic."""
CHATTER_COUNT = 400
CHATTER_TIME = 0.25
"""More than this many events within this time (s) is chatter: one contact cannot follow the ball."""

# -- stepping -------------------------------------------------------------------------------------
STEP_SAFETY = 0.9
STEP_SHRINK = 0.2
STEP_GROW = 5.0
"""Usual limits of step-size control (Hairer, Norsett, Wanner, Solving ODE I, II.4)."""
FIRST_STEP = 1e-3
"""s. First trial step after a release or an event; shrinks or grows as the error says."""
LONGEST_STEP = 0.02
"""s. Longest step; keeps the sampled path smooth on the drawing."""
SHORTEST_STEP = 1e-13
"""s. Steps do not shrink below this; what is left is accepted."""
REACH_SHARE = 0.25
"""A step may carry the ball past its known clearance by at most this share of its radius: a wall met
and left within one step would be missed."""
ROOT_TURNS = 60
ROOT_SETTLED = 1e-14
"""Bracketed root search on the dense output: turns at most, and the share of a step that is close enough."""
STEP_LIMIT = 2_000_000
TIME_LIMIT = 120.0
"""s. A run longer than this is cut; a design may ask for more."""
POLL_STEPS = 64
"""Steps between two looks at the cancel flag."""
TOLERANCE = 1e-8
"""Local error a step may make, as a share of ball radius, of speed and of spin. The path of a cylinder run of three
seconds is then right to 5e-9 m; smaller values only matter where a design is on a knife edge."""
VERIFY_TOLERANCE = 1e-11
