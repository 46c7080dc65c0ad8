"""One step with everything that may happen in it: guards, walls met, where the first of them lies."""

import math
from typing import NamedTuple

from engine.constants import LONGEST_STEP, REACH_SHARE, SHORTEST_STEP
from engine.contact.query import ANYWHERE, foot_on, nearest_wall, side_beyond
from engine.dynamics.phases import put_back
from engine.dynamics.rates import Contact, rates
from engine.dynamics.state import FLIGHT, STATE
from engine.integrate.events import any_falls, fill_guards, first_guard, gap_at, heading_of, locate_touch, still_speed
from engine.integrate.step import dense_at, fill_dense, next_size, try_step, warm_start
from engine.integrate.tableau import STAGES
from engine.kernel import kernel

NOTHING = 2.0
"""Share of a step at which nothing happens in it."""
TOUCHING = 1e-9
"""m. A wall this far inside the ball in the same step is also met."""


class Step(NamedTuple):
    """A step made.

    Its size and the size proposed for the next; `Contact` at its end; share `theta` of the first event in it (NOTHING:
    none), its guard `slot` (-1) or the wall `met` (-1); way `free` of other walls left, m; warm start at its beginning;
    whether the continuous extension is filled.
    """

    h: float
    h_next: float
    contact: Contact
    theta: float
    slot: int
    met: int
    free: float
    piece: int
    q: float
    extended: bool


@kernel
def speed_of(y):
    """Return |v|, m/s."""
    return math.sqrt(y[3] * y[3] + y[4] * y[4] + y[5] * y[5])


@kernel
def fit_step(walls, ball, mode, work, plan):
    """Make one step that meets the tolerance. `plan` = (h, tolerance, piece, q); returns (h used, h next, Contact)."""
    h, tolerance, piece, q = plan
    while True:
        error, contact = try_step(walls, ball, mode, work, (h, tolerance, piece, q))
        if error <= 1.0 or h <= SHORTEST_STEP:
            return h, next_size(h, error), contact
        h = max(SHORTEST_STEP, min(0.9 * h, next_size(h, error)))


@kernel
def touch_of(walls, ball, mode, work, place):
    """Return (share, patch) of the touch of a wall that the ball is within at a share; `work.trial` gets its state.

    `place` = (patch, share). Where only the continuation of the wall beyond a boundary is met, what is linked there, a
    rim say, is met instead.
    """
    patch, high = place
    share = locate_touch(walls, ball, patch, work, high)
    if share < 0.0:
        return NOTHING, -1
    dense_at(work, share, work.trial)
    y = work.trial
    side = side_beyond(walls, patch, foot_on(walls, patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE))
    beyond = walls.link[patch, side] if side >= 0 else -1
    if beyond >= 0 and beyond != mode.patch and gap_at(walls, ball, beyond, work, high) < 0.0:
        patch = beyond
        share = max(0.0, locate_touch(walls, ball, patch, work, high))
        dense_at(work, share, work.trial)
    return share, patch


@kernel
def meet_wall(walls, ball, mode, work, plan):
    """Return (theta, patch, free way, extended) of the first wall met in the step just made.

    `plan` = (h, tolerance, piece, q, extended, wall left last): the continuous extension is filled when a wall lies
    within the ball.
    """
    y1, r = work.y1, ball.radius
    h, tolerance, piece, q, extended, left = plan
    before = (left, (work.y0[0], work.y0[1], work.y0[2]))
    gap, patch, way = nearest_wall(walls, y1, r, mode.patch, before)
    if patch < 0 or gap >= 0.0:
        return NOTHING, -1, way, extended
    if not extended:
        fill_dense(walls, ball, mode, work, (h, tolerance, piece, q))
    theta, met = NOTHING, -1
    for _ in range(4):
        if patch < 0 or gap >= (0.0 if met < 0 else -TOUCHING) or patch == met:
            break
        share, wall = touch_of(walls, ball, mode, work, (patch, min(theta, 1.0)))
        if wall < 0:
            break
        theta, met = share, wall
        gap, patch, way = nearest_wall(walls, work.trial, r, mode.patch, before)
    return theta, met, (way if met < 0 else 0.0), True


@kernel
def longest(mode, y, free, reach):
    """Return the longest step that cannot carry the ball past a wall it has not looked at, s."""
    way = max(free, reach)
    speed = speed_of(y)
    g = 10.0 if mode.regime == FLIGHT else 30.0
    return min(LONGEST_STEP, (math.sqrt(speed * speed + 2.0 * g * way) - speed) / g)


@kernel
def advance(walls, ball, mode, work, plan):
    """Make one step from `work.y0` to `work.y1` and find the first event in it.

    `plan` = (h wished, time to the end, way free of other walls, Contact at the start, tolerance, wall the ball was on
    last).
    """
    h, span, free, contact, tolerance, left = plan
    y = work.y0
    piece, q = warm_start(walls, mode, contact.foot)
    heading = heading_of(contact, ball, still_speed(tolerance, speed_of(y), ball.radius))
    fill_guards(walls, ball, mode, contact, heading, work.before)
    h = min(h, span, longest(mode, y, free, REACH_SHARE * ball.radius))
    h, h_next, contact = fit_step(walls, ball, mode, work, (h, tolerance, piece, q))
    fill_guards(walls, ball, mode, contact, heading, work.after)
    theta, slot, met, extended = NOTHING, -1, -1, False
    if any_falls(work):
        fill_dense(walls, ball, mode, work, (h, tolerance, piece, q))
        extended = True
        theta, slot = first_guard(walls, ball, mode, work, (heading, piece, q))
    free -= 1.01 * h * max(speed_of(y), speed_of(work.y1)) + TOUCHING
    if free < 0.0:
        share, wall, free, extended = meet_wall(walls, ball, mode, work, (h, tolerance, piece, q, extended, left))
        if share < theta:
            theta, met = share, wall
    return Step(h, h_next, contact, theta, slot, met, free, piece, q, extended)


@kernel
def accept(walls, ball, mode, work, contact):
    """Go on from the end of the step; return the correction that put the state back on its wall, m."""
    for j in range(STATE):
        work.y0[j] = work.y1[j]
        work.k[0, j] = work.k[STAGES, j]
    return put_back(walls, ball, mode, work.y0, warm_start(walls, mode, contact.foot))


@kernel
def stand_at(walls, ball, mode, work, step):
    """Put `work.y0` at the event of a step; return (Contact there, correction m)."""
    guess = (step.piece, step.q)
    dense_at(work, step.theta, work.trial)
    for j in range(STATE):
        work.y0[j] = work.trial[j]
    correction = put_back(walls, ball, mode, work.y0, guess)
    return rates(walls, ball, mode, work.y0, guess, work.spare), correction
