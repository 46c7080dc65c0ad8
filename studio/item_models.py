"""Qt item models: the findings of the present roll, the elements of the run."""

import math
from typing import Any, NamedTuple

from PySide6.QtCore import QAbstractListModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from engine.findings.finding import Finding, Severity
from studio.cures import offers
from studio.words import finding_title
from studio.workspace import Workspace

Index = QModelIndex | QPersistentModelIndex

SHAPES = {Severity.FAILS: "triangle", Severity.THIN: "diamond", Severity.NOTE: "circle"}
TOKENS = {"triangle": "fails", "diamond": "warning", "circle": "soft"}
"""Colour token by shape."""
SPOKEN = {"triangle": "Fails", "diamond": "Thin", "circle": "Note"}
"""Word by shape, for screen readers and tips."""


class FindingRow(NamedTuple):
    """One finding as shown: shape, filled when the run fails by it, texts, and where it leads."""

    shape: str
    title: str
    sentence: str
    cure: str
    element: str
    time: float | None
    pressable: bool


def finding_row(finding: Finding, workspace: Workspace) -> FindingRow:
    """Row of one finding."""
    return FindingRow(
        shape=SHAPES[finding.severity],
        title=finding_title(workspace, finding),
        sentence=finding.sentence,
        cure=finding.cure,
        element=finding.segment if workspace.element(finding.segment) is not None else "",
        time=finding.t if math.isfinite(finding.t) else None,
        pressable=offers(workspace, finding),
    )


class FindingsModel(QAbstractListModel):
    """Findings of the roll, worst first; empty while nothing is rolled."""

    ROW = Qt.ItemDataRole.UserRole + 1

    def __init__(self, workspace: Workspace, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._workspace = workspace
        self.rows: list[FindingRow] = []
        workspace.rolled.connect(self._take)
        self._take(workspace.roll)

    @Slot(object)
    def _take(self, roll: Any) -> None:
        """Show the findings of a roll."""
        rows = [finding_row(finding, self._workspace) for finding in roll.findings] if roll is not None else []
        if rows != self.rows:
            self.beginResetModel()
            self.rows = rows
            self.endResetModel()

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008 (default given by Qt)
        """Return the number of findings."""
        return 0 if parent.isValid() else len(self.rows)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Return what a role shows of a finding."""
        if not index.isValid() or index.row() >= len(self.rows):
            return None
        row = self.rows[index.row()]
        if role == Qt.ItemDataRole.DisplayRole:
            return row.title
        if role in (Qt.ItemDataRole.AccessibleTextRole, Qt.ItemDataRole.ToolTipRole):
            return ". ".join(part for part in (f"{SPOKEN[row.shape]}: {row.title}", row.sentence, row.cure) if part)
        return row if role == self.ROW else None
