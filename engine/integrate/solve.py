"""The loop: step, detect, locate, change the mode, record. One ball from its start to its end."""

import math
from typing import NamedTuple

import numpy as np

from engine.constants import (
    CHATTER_COUNT,
    CHATTER_TIME,
    FIRST_STEP,
    LONGEST_STEP,
    POLL_STEPS,
    REACH_SHARE,
    SHORTEST_STEP,
    STEP_LIMIT,
)
from engine.contact.query import ANYWHERE, foot_on, nearest_wall
from engine.dynamics.phases import mode_on, put_back
from engine.dynamics.rates import rates
from engine.dynamics.state import FLIGHT, ROLLING, SLIPPING, STATE, Mode
from engine.integrate.events import fill_guards, first_guard, heading_of, locate_touch, still_speed
from engine.integrate.log import MARK, SAMPLE, room, write_mark, write_sample
from engine.integrate.outcome import GOES_ON, QUIET, SLIP_ONSET, after_guard, after_touch
from engine.integrate.step import dense_at, fill_dense, new_work, next_size, try_step, warm_start
from engine.kernel import allocating, kernel

RELEASED = 0
TIME_UP, CHATTERING, STEPS_UP, CANCELLED, NO_FIT, NOT_FINITE = 3, 4, 5, 6, 7, 9
"""Values of `result.Status`."""
TOUCHING = 1e-9
"""m. A wall this far inside the ball in the same step is also met."""


class Options(NamedTuple):
    """`end` s; `tolerance` (see constants.TOLERANCE); `spacing` s between samples at most (0: steps and asked times only)."""

    end: float
    tolerance: float
    spacing: float


class Log(NamedTuple):
    """Samples and events so far and how many of each."""

    samples: np.ndarray
    marks: np.ndarray
    n_samples: int
    n_marks: int


@allocating
def add_sample(log, y, mode, contact, stamp):
    """Return the log with one more sample."""
    samples = room(log.samples, log.n_samples)
    write_sample(samples[log.n_samples], y, mode, contact, stamp)
    return Log(samples, log.marks, log.n_samples + 1, log.n_marks)


@allocating
def add_mark(log, y, mode, event, stamp):
    """Return the log with one more event."""
    marks = room(log.marks, log.n_marks)
    write_mark(marks[log.n_marks], y, mode, event, stamp)
    return Log(log.samples, marks, log.n_samples, log.n_marks + 1)


@kernel
def first_mode(walls, ball, start, y, out):
    """Return the mode at the start. `start` = (t, patch, regime asked, young, spin); regime -1: by the state."""
    patch, regime = int(start[1]), int(start[2])
    if patch < 0:
        return Mode(-1, FLIGHT, 0, 0)
    if start[3] >= 0.0:
        return Mode(patch, regime, int(start[3]), int(start[4]))
    return mode_on(walls, ball, patch, y, out)


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
def meet_wall(walls, ball, mode, work, free):
    """Return (theta, patch, free way) of the first wall met in the step just made; theta 2 when none is."""
    y1, r = work.y1, ball.radius
    gap, patch, way = nearest_wall(walls, (y1[0], y1[1], y1[2]), r, mode.patch)
    theta, met = 2.0, -1
    for _ in range(4):
        if patch < 0 or gap >= (0.0 if met < 0 else -TOUCHING) or patch == met:
            break
        share = locate_touch(walls, ball, patch, work, min(theta, 1.0))
        dense_at(work.dense, share, work.trial)
        y = work.trial
        foot = foot_on(walls, patch, (y[0], y[1], y[2]), r, ANYWHERE)
        if y[3] * foot.nx + y[4] * foot.ny + y[5] * foot.nz >= 0.0:
            break
        theta, met = share, patch
        gap, patch, way = nearest_wall(walls, (y[0], y[1], y[2]), r, mode.patch)
    return theta, met, (way if met < 0 else 0.0)


@allocating
def sample_step(walls, ball, mode, work, log, span):
    """Add the samples that fall within a step (or the part of it up to an event).

    `span` = (t, h, share, impact loss, guess, asked times, next asked, spacing). Returns (log, next asked).
    """
    t, h, share, impact, guess, asked, upcoming, spacing = span
    while upcoming < asked.shape[0] and asked[upcoming] < t + share * h:
        dense_at(work.dense, (asked[upcoming] - t) / h, work.trial)
        contact = rates(walls, ball, mode, work.trial, guess, work.spare)
        log = add_sample(log, work.trial, mode, contact, (asked[upcoming], impact, upcoming))
        upcoming += 1
    if spacing > 0.0:
        pieces = int(math.ceil(share * h / spacing))
        for i in range(1, pieces):
            theta = share * i / pieces
            dense_at(work.dense, theta, work.trial)
            contact = rates(walls, ball, mode, work.trial, guess, work.spare)
            log = add_sample(log, work.trial, mode, contact, (t + theta * h, impact, -1))
    return log, upcoming


@kernel
def longest(walls, mode, y, free, reach):
    """Return the longest step that cannot carry the ball past a wall it has not looked at, s."""
    way = max(free, reach)
    speed = speed_of(y)
    g = 10.0 if mode.regime == FLIGHT else 30.0
    return min(LONGEST_STEP, (math.sqrt(speed * speed + 2.0 * g * way) - speed) / g)


@kernel
def stand_at(walls, ball, mode, work, place):
    """Put `work.y0` at the share theta of the step. `place` = (theta, guess); returns (Contact there, correction)."""
    theta, guess = place
    y = work.y0
    dense_at(work.dense, theta, work.trial)
    for j in range(STATE):
        y[j] = work.trial[j]
    correction = put_back(walls, ball, mode, y, guess)
    return rates(walls, ball, mode, y, guess, work.spare), correction


@kernel
def respond(walls, ball, mode, work, event):
    """Act on an event at `work.y0`. `event` = (wall met or -1, guard, slip speed)."""
    met, slot, slip = event
    if met >= 0:
        return after_touch(walls, ball, mode, work.y0, met, work.spare)
    return after_guard(walls, ball, mode, work.y0, (slot, slip), work.spare)


@allocating
def begin(walls, ball, start, work):
    """Put `work.y0` at the start; return (log with the release, mode, correction m)."""
    y = work.y0
    y[:] = start[5 : 5 + STATE]
    log = Log(np.zeros((1024, SAMPLE)), np.zeros((64, MARK)), 0, 0)
    mode = first_mode(walls, ball, start, y, work.spare)
    correction = put_back(walls, ball, mode, y, ANYWHERE)
    stamp = (start[0], start[5 + STATE])
    log = add_mark(log, y, mode, (RELEASED, mode.patch, 0.0, (0.0, 0.0, 0.0)), stamp)
    if start[2] == ROLLING and mode.regime == SLIPPING and mode.young == 1:
        log = add_mark(log, y, mode, (SLIP_ONSET, mode.patch, 0.0, (0.0, 0.0, 0.0)), stamp)
    return log, mode, correction


@allocating
def solve(walls, ball, start, options, asked, cancel):
    """Roll one ball from its start to its end.

    Parameters
    ----------
    walls : Walls
    ball : BallParams
    start : (5 + 13 + 1,) float
        t, patch, regime, young, spin, the state y, impact loss so far. young < 0: the mode follows from the state.
    options : Options
    asked : (n,) float
        Rising times at which a sample is wanted, s.
    cancel : (1,) uint8
        Set to 1 by another thread to stop.

    Returns
    -------
    Log, status, steps, largest correction m
    """
    work = new_work()
    y = work.y0
    t, impact = start[0], start[5 + STATE]
    log, mode, correction = begin(walls, ball, start, work)
    status, steps, upcoming = GOES_ON, 0, 0
    h, free, window, count = FIRST_STEP, 0.0, t, 0
    fresh, guess = True, ANYWHERE
    contact = rates(walls, ball, mode, y, guess, work.k[0])
    while status == GOES_ON:
        if fresh:
            contact = rates(walls, ball, mode, y, ANYWHERE, work.k[0])
            log = add_sample(log, y, mode, contact, (t, impact, -1))
            fresh = False
        steps += 1
        status = limits(t, options, steps, cancel, y)
        if status != GOES_ON:
            break
        guess = warm_start(walls, mode, contact.foot)
        heading = heading_of(contact, ball, still_speed(options.tolerance, speed_of(y), ball.radius))
        fill_guards(walls, ball, mode, contact, heading, work.before)
        h = min(h, options.end - t, longest(walls, mode, y, free, REACH_SHARE * ball.radius))
        h, h_next, contact = fit_step(walls, ball, mode, work, (h, options.tolerance, guess[0], guess[1]))
        fill_dense(work, h)
        theta, slot = first_guard(walls, ball, mode, work, (contact, heading, guess[0], guess[1]))
        met = -1
        free -= 1.01 * h * max(speed_of(y), speed_of(work.y1)) + 1e-9
        if free < 0.0:
            share, met, free = meet_wall(walls, ball, mode, work, free)
            theta, met = (share, met) if share < theta else (theta, -1)
        span = (t, h, min(theta, 1.0), impact, guess, asked, upcoming, options.spacing)
        log, upcoming = sample_step(walls, ball, mode, work, log, span)
        if theta > 1.0:
            t += h
            y[:] = work.y1
            work.k[0] = work.k[6]
            correction = max(correction, put_back(walls, ball, mode, y, warm_start(walls, mode, contact.foot)))
            log = add_sample(log, y, mode, contact, (t, impact, -1))
            h = h_next
            continue
        contact, off = stand_at(walls, ball, mode, work, (theta, guess))
        t, correction = t + theta * h, max(correction, off)
        log = add_sample(log, y, mode, contact, (t, impact, -1))
        outcome = respond(walls, ball, mode, work, (met, slot, contact.slip))
        impact += outcome.lost
        mode, status, fresh = outcome.mode, outcome.status, True
        if outcome.kind != QUIET:
            # from here a run may be resumed: nothing of the step before may be carried on
            h, free = FIRST_STEP, 0.0
            event = (outcome.kind, outcome.patch, outcome.value, outcome.normal)
            log = add_mark(log, y, mode, event, (t, impact))
        count = count + 1 if t - window < CHATTER_TIME else 0
        window = window if count > 0 else t
        status = CHATTERING if count > CHATTER_COUNT and status == GOES_ON else status
    contact = rates(walls, ball, mode, y, ANYWHERE, work.k[0])
    log = add_sample(log, y, mode, contact, (t, impact, -1))
    return log, status, steps, correction


@kernel
def limits(t, options, steps, cancel, y):
    """Return the status of a run that must end here for its own sake, else GOES_ON."""
    if t >= options.end - 1e-12:
        return TIME_UP
    if steps > STEP_LIMIT:
        return STEPS_UP
    if steps % POLL_STEPS == 0 and cancel[0] != 0:
        return CANCELLED
    if not math.isfinite(y[0] + y[3] + y[6]):
        return NOT_FINITE
    return GOES_ON
