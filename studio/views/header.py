"""Head of the window: place, name of the design, verdict, run and unit."""

from typing import Any, get_args

from PySide6.QtCore import QSignalBlocker, Qt, QTimer, Slot
from PySide6.QtWidgets import QComboBox, QGridLayout, QHBoxLayout, QLabel, QSizePolicy, QWidget

from engine.model.design import LengthUnit
from engine.model.edits import set_field
from studio.theme import Theme
from studio.words import Verdict, verdict_of
from studio.workspace import Workspace

HEIGHT = 44
LONG_MS = 3000
"""ms of rolling after which the line says why: the first start compiles the kernels for this machine."""
LONG_WORDS = "Rolling … a first start takes a minute or two, to prepare for this machine"


class VerdictLine(QLabel):
    """One line, cut short with dots where it does not fit; whole in its tip."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("verdict")
        self.setAlignment(Qt.AlignmentFlag.AlignCenter)
        self.setSizePolicy(QSizePolicy.Policy.Maximum, QSizePolicy.Policy.Fixed)
        self._whole = ""

    def show_verdict(self, verdict: Verdict, mark: str, room: int) -> None:
        """Show a verdict within some px."""
        self._whole = f"{mark}  {verdict.text}"
        self.setAccessibleName(f"Verdict: {verdict.text}")
        self.setToolTip(verdict.text)
        if self.property("state") != verdict.state:
            self.setProperty("state", verdict.state)
            self.style().unpolish(self)
            self.style().polish(self)
        self.ensurePolished()
        self.setText(self.fontMetrics().elidedText(self._whole, Qt.TextElideMode.ElideRight, max(80, room - 28)))


class Header(QWidget):
    """Row on top of the window."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("header")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.setFixedHeight(HEIGHT)
        self._workspace = workspace
        self.place = QLabel("Layout")
        self.place.setProperty("role", "place")
        self.place.setFixedHeight(HEIGHT - 1)
        self.name, self.edited = QLabel(), QLabel()
        self.name.setProperty("role", "design")
        self.edited.setProperty("role", "soft")
        self.verdict = VerdictLine()
        self.run = QComboBox()
        self.run.setAccessibleName("Run")
        self.run.activated.connect(lambda place: workspace.choose_run(self.run.itemData(place)))
        self.units = QComboBox()
        self.units.setAccessibleName("Unit of length")
        self.units.setToolTip("Unit of length; angles are in degrees, grades in per cent")
        for unit in get_args(LengthUnit):
            self.units.addItem(unit, unit)
        self.units.activated.connect(self._choose_units)
        self._long = QTimer(self)
        self._long.setSingleShot(True)
        self._long.setInterval(LONG_MS)
        self._long.timeout.connect(self._explain)
        self._lay_out()
        for signal in (workspace.designChanged, workspace.rolled, workspace.fileChanged, workspace.opened):
            signal.connect(self.refresh)
        self.refresh()

    def _lay_out(self) -> None:
        """Three columns, so that the verdict stands in the middle of the window."""
        left, right = QHBoxLayout(), QHBoxLayout()
        left.setSpacing(10)
        for widget in (self.place, self.name, self.edited):
            left.addWidget(widget)
        left.insertSpacing(1, 14)
        left.addStretch(1)
        grade = QLabel("° · % grade")
        grade.setProperty("role", "soft")
        right.addStretch(1)
        right.setSpacing(8)
        for widget in (self.run, self.units, grade):
            right.addWidget(widget)
        row = QGridLayout(self)
        row.setContentsMargins(16, 0, 16, 0)
        row.setHorizontalSpacing(12)
        row.addLayout(left, 0, 0)
        row.addWidget(self.verdict, 0, 1, Qt.AlignmentFlag.AlignCenter)
        row.addLayout(right, 0, 2)
        row.setColumnStretch(0, 1)
        row.setColumnStretch(2, 1)

    def resizeEvent(self, event: Any) -> None:
        """Fit the texts anew."""
        super().resizeEvent(event)
        self.refresh()

    @Slot()
    def refresh(self, *_: Any) -> None:
        """Show the present state."""
        workspace = self._workspace
        name = workspace.title
        self.name.setText(self.name.fontMetrics().elidedText(name, Qt.TextElideMode.ElideRight, self.width() // 6))
        self.name.setToolTip(str(workspace.path) if workspace.path is not None else "Not saved yet")
        self.edited.setText("edited" if workspace.dirty else "")
        verdict = verdict_of(workspace)
        waiting = workspace.roll is None and not workspace.problem
        if not waiting:
            self._long.stop()
        elif not self._long.isActive():
            self._long.start()
        mark = {"clears": "●", "thin": "◆", "fails": "▲"}.get(verdict.state, "○")
        self.verdict.show_verdict(verdict, mark, int(self.width() * 0.46))
        self._show_runs()
        with QSignalBlocker(self.units):
            self.units.setCurrentIndex(self.units.findData(workspace.design.units))

    @Slot()
    def _explain(self) -> None:
        """Say why the first roll takes long."""
        self.verdict.show_verdict(Verdict(LONG_WORDS, "none"), "○", int(self.width() * 0.46))

    def _show_runs(self) -> None:
        """Offer the runs where there are several."""
        runs = [(run.id, run.name or run.id) for run in self._workspace.design.runs]
        self.run.setVisible(len(runs) > 1)
        with QSignalBlocker(self.run):
            if [self.run.itemData(place) for place in range(self.run.count())] != [key for key, _ in runs]:
                self.run.clear()
                for key, name in runs:
                    self.run.addItem(name, key)
            self.run.setCurrentIndex(self.run.findData(self._workspace.run_id))

    @Slot(int)
    def _choose_units(self, place: int) -> None:
        """Show lengths in another unit: a step of the design."""
        unit = self.units.itemData(place)
        self._workspace.edit(f"unit {unit}", set_field(self._workspace.design, "units", unit))
