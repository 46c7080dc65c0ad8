"""The ball rolled anew after every change: the latest design wins, the window never waits for a long roll."""

import logging
import time
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QObject, QRunnable, QThreadPool, Signal, Slot

from engine.errors import TrundleError
from engine.model.design import Design
from studio.workspace import Workspace

if TYPE_CHECKING:
    from engine.simulate import Roll

Roller = Callable[..., "Roll"]

QUICK = 0.03
"""s. A design that last rolled in less is rolled at once: the drawings are then painted once for an edit, not twice."""
PATIENCE = 0.25
"""s. A roll that is out of date but younger is let finish, so that a drag shows something; an older one is stopped."""
CANCELLED = "cancelled"
NOTHING_TO_ROLL = "There is nothing to roll yet: add a straight from the strip on the left."
BROKE_OFF = "The roll broke off by a fault of the program; the log has the report. Undo the last step to go on."

log = logging.getLogger(__name__)


class _Answer(QObject):
    """Carries the result of a job to the window's thread: job, Roll or None, sentence, seconds."""

    ready = Signal(object, object, str, float)


class _Job(QRunnable):
    """One roll in a worker thread."""

    def __init__(self, roller: Roller, design: Design, run_id: str, previous: "Roll | None") -> None:
        super().__init__()
        self.setAutoDelete(False)
        self.roller, self.design, self.run_id, self.previous = roller, design, run_id, previous
        self.cancel: NDArray[np.uint8] = np.zeros(1, dtype=np.uint8)
        self.answer = _Answer()
        self.started = time.perf_counter()

    def run(self) -> None:
        """Roll and answer, whatever happens."""
        begun = time.thread_time()  # of this thread alone: waiting for the window's thread does not count
        roll: Roll | None = None
        sentence = BROKE_OFF
        try:
            roll, sentence = attempt(self.roller, self.design, self.run_id, self.previous, self.cancel)
        finally:
            self.answer.ready.emit(self, roll, sentence, time.thread_time() - begun)


def attempt(
    roller: Roller, design: Design, run_id: str, previous: "Roll | None", cancel: NDArray[np.uint8]
) -> "tuple[Roll | None, str]":
    """Roll, or give the sentence that says why not."""
    try:
        return roller(design, run_id, previous, cancel=cancel), ""
    except TrundleError as error:
        return None, str(error)
    except (ArithmeticError, LookupError, ValueError, TypeError, AttributeError):
        log.exception("A roll broke off")
        return None, BROKE_OFF


class Preview(QObject):
    """Keeps the roll of a workspace up to date.

    Parameters
    ----------
    workspace : Workspace
    roller : `engine.simulate.roll`, or what stands for it in a test
    """

    busyChanged = Signal(bool)

    def __init__(self, workspace: Workspace, roller: Roller, parent: QObject | None = None) -> None:
        super().__init__(parent if parent is not None else workspace)
        self._workspace = workspace
        self._roller = roller
        self._pool = QThreadPool(self)
        self._pool.setMaxThreadCount(1)
        self._job: _Job | None = None
        self._waiting = False
        self._seconds = float("inf")
        workspace.designChanged.connect(self.request)
        workspace.opened.connect(self._forget_speed)

    @property
    def busy(self) -> bool:
        """Whether a roll is under way."""
        return self._job is not None

    @property
    def seconds(self) -> float:
        """Time the last roll took, s."""
        return self._seconds

    @Slot()
    def _forget_speed(self) -> None:
        self._seconds = float("inf")

    @Slot()
    def request(self, *_: Any) -> None:
        """Roll the present design as soon as possible."""
        run = self._workspace.run
        if run is None or not run.elements:
            self._stop_job()
            self._workspace.take_failure(NOTHING_TO_ROLL)
        elif self._job is not None:
            self._waiting = True
            if time.perf_counter() - self._job.started > PATIENCE:
                self._job.cancel[0] = 1
        elif self._seconds < QUICK and self._workspace.roll is not None:
            self._roll_now(run.id)
        else:
            self._start(run.id)

    def _roll_now(self, run_id: str) -> None:
        """Roll in this thread: quicker than a frame."""
        begun = time.perf_counter()
        design, previous = self._workspace.design, self._workspace.roll
        roll, sentence = attempt(self._roller, design, run_id, previous, np.zeros(1, dtype=np.uint8))
        self._seconds = time.perf_counter() - begun
        self._deliver(roll, sentence)

    def _start(self, run_id: str) -> None:
        """Roll in the worker thread."""
        self._waiting = False
        job = _Job(self._roller, self._workspace.design, run_id, self._workspace.roll)
        job.answer.ready.connect(self._arrived)
        self._job = job
        self.busyChanged.emit(True)
        self._pool.start(job)

    @Slot(object, object, str, float)
    def _arrived(self, job: _Job, roll: "Roll | None", sentence: str, seconds: float) -> None:
        """Take the answer of a job, and start again when the design has changed meanwhile."""
        if job is not self._job:
            return
        self._job = None
        self._seconds = seconds
        stopped = job.cancel[0] == 1 or (roll is not None and roll.outcome == CANCELLED)
        if not stopped and (roll is not None or not self._waiting):
            self._deliver(roll, sentence)
        if self._waiting:
            self._waiting = False
            self.request()
        if self._job is None:
            self.busyChanged.emit(False)

    def _deliver(self, roll: "Roll | None", sentence: str) -> None:
        """Hand a result to the workspace."""
        if roll is None:
            self._workspace.take_failure(sentence)
        else:
            self._workspace.take_roll(roll)

    def _stop_job(self) -> None:
        """Drop the roll under way."""
        if self._job is not None:
            self._job.cancel[0] = 1
            self._job = None
            self.busyChanged.emit(False)
        self._waiting = False

    def finish(self) -> None:
        """Stop and wait for the worker; call before quitting."""
        self._stop_job()
        self._pool.waitForDone()
