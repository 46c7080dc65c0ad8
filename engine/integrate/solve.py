"""The loop: step, detect, locate, change the mode, record. One ball from its start to its end."""

import math
from typing import NamedTuple

import numpy as np

from engine.constants import CHATTER_COUNT, CHATTER_TIME, FIRST_STEP, POLL_STEPS, STEP_LIMIT
from engine.contact.query import ANYWHERE
from engine.dynamics.phases import mode_on, put_back
from engine.dynamics.rates import rates
from engine.dynamics.state import FLIGHT, ROLLING, SLIPPING, STATE, Mode
from engine.integrate.advance import accept, advance, stand_at
from engine.integrate.log import MARK, SAMPLE, room, write_mark, write_sample
from engine.integrate.outcome import GOES_ON, QUIET, SLIP_ONSET, after_guard, after_touch
from engine.integrate.step import dense_at, fill_dense, new_work
from engine.kernel import allocating, kernel

RELEASED = 0
TIME_UP, CHATTERING, STEPS_UP, CANCELLED, NO_FIT, NOT_FINITE = 3, 4, 5, 6, 7, 9
"""Values of `result.Status`."""

class Options(NamedTuple):
    """`end` s; `tolerance` (see constants.TOLERANCE).

    `spacing` s between samples at most (0: steps and asked times only).
    """

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


@allocating
def sample_step(walls, ball, mode, work, log, span):
    """Add the samples that fall within a step (or the part of it up to an event).

    `span` = (t, impact loss, Step, asked times, next asked, spacing, tolerance). Returns (log, next asked).
    """
    t, impact, step, asked, upcoming, spacing, tolerance = span
    h, share, guess = step.h, min(step.theta, 1.0), (step.piece, step.q)
    pieces = int(math.ceil(share * h / spacing)) if spacing > 0.0 else 0
    wanted = upcoming < asked.shape[0] and asked[upcoming] < t + share * h
    if (pieces > 1 or wanted) and not step.extended:
        fill_dense(walls, ball, mode, work, (h, tolerance, step.piece, step.q))
    while upcoming < asked.shape[0] and asked[upcoming] < t + share * h:
        dense_at(work, (asked[upcoming] - t) / h, work.trial)
        contact = rates(walls, ball, mode, work.trial, guess, work.spare)
        log = add_sample(log, work.trial, mode, contact, (asked[upcoming], impact, upcoming))
        upcoming += 1
    for i in range(1, pieces):
        theta = share * i / pieces
        dense_at(work, theta, work.trial)
        contact = rates(walls, ball, mode, work.trial, guess, work.spare)
        log = add_sample(log, work.trial, mode, contact, (t + theta * h, impact, -1))
    return log, upcoming


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
    start : (5 + 13 + 2,) float
        t, patch, regime, young, spin, the state y, impact loss so far, wall the ball was on last (-1: none).
        young < 0: the mode follows from the state.
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
    left = int(start[6 + STATE])
    status, steps, upcoming = GOES_ON, 0, 0
    h, free, window, count = FIRST_STEP, 0.0, t, 0
    fresh = True
    contact = rates(walls, ball, mode, y, ANYWHERE, work.k[0])
    while status == GOES_ON:
        if fresh:
            contact = rates(walls, ball, mode, y, ANYWHERE, work.k[0])
            log = add_sample(log, y, mode, contact, (t, impact, -1))
            fresh = False
        steps += 1
        status = limits(t, options, steps, cancel, y)
        if status != GOES_ON:
            break
        step = advance(walls, ball, mode, work, (h, options.end - t, free, contact, options.tolerance, left))
        span = (t, impact, step, asked, upcoming, options.spacing, options.tolerance)
        log, upcoming = sample_step(walls, ball, mode, work, log, span)
        free = step.free
        if step.theta > 1.0:
            t += step.h
            h, contact = step.h_next, step.contact
            correction = max(correction, accept(walls, ball, mode, work, contact))
            log = add_sample(log, y, mode, contact, (t, impact, -1))
            continue
        contact, off = stand_at(walls, ball, mode, work, step)
        t, h, correction = t + step.theta * step.h, step.h, max(correction, off)
        log = add_sample(log, y, mode, contact, (t, impact, -1))
        outcome = respond(walls, ball, mode, work, (step.met, step.slot, contact.slip))
        impact += outcome.lost
        left = outcome.mode.patch if outcome.mode.patch >= 0 else outcome.patch
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
