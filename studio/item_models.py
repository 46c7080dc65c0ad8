"""Qt item models: the findings of the present roll, the elements of the run."""

from typing import TYPE_CHECKING, Any, NamedTuple

from PySide6.QtCore import QAbstractListModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Slot

from studio.words import element_words
from studio.workspace import Workspace

if TYPE_CHECKING:
    from engine.findings.finding import Finding

Index = QModelIndex | QPersistentModelIndex

SHAPES = {"fails": "triangle", "fail": "triangle", "failure": "triangle", "warning": "diamond", "thin": "diamond"}
"""Shape by severity: what is not listed is a note, a circle."""
TOKENS = {"triangle": "fails", "diamond": "warning", "circle": "soft"}
"""Colour token by shape."""
SPOKEN = {"triangle": "Fails", "diamond": "Thin margin", "circle": "Note"}
"""Word by shape, for screen readers and tips."""


class FindingRow(NamedTuple):
    """One finding as shown: shape, filled when the run fails by it, texts, and where it leads."""

    shape: str
    title: str
    sentence: str
    cure: str
    element: str
    time: float | None


def finding_row(finding: "Finding", workspace: Workspace) -> FindingRow:
    """Row of one finding."""
    entry = finding.as_json()
    element = workspace.element(entry["segment"] or "")
    where = element_words(workspace, element) if element is not None else (entry["where"] or "")
    kind = str(entry.get("kind", "")).replace("_", " ")
    title = str(entry.get("title") or f"{kind} {('in ' + where) if where else ''}").strip()
    return FindingRow(
        shape=SHAPES.get(str(entry["severity"]).lower(), "circle"),
        title=title[:1].upper() + title[1:],
        sentence=entry["sentence"],
        cure=entry["cure"] or "",
        element=element.id if element is not None else "",
        time=entry.get("t_s", entry.get("time_s")),
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

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: N802, B008 (signature given by Qt)
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
