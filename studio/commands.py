"""Undo commands: each holds the whole design before and after, so undo cannot drift."""

import zlib
from collections.abc import Callable

from PySide6.QtGui import QUndoCommand

from engine.model.design import Design

MERGE_IDS = 0x7FFFFFFF
"""Command ids must fit a C int; -1 means: never merge."""


class EditCommand(QUndoCommand):
    """One step from a design to the next; steps in a row with the same merge key become one."""

    def __init__(
        self, put: Callable[[Design], None], before: Design, after: Design, label: str, merge_key: str = ""
    ) -> None:
        super().__init__(label)
        self._put = put
        self.before = before
        self.after = after
        self.merge_key = merge_key

    def id(self) -> int:
        """Number that commands which may merge share."""
        return zlib.crc32(self.merge_key.encode()) & MERGE_IDS if self.merge_key else -1

    def mergeWith(self, other: QUndoCommand) -> bool:
        """Take in a later step with the same key."""
        if not isinstance(other, EditCommand) or other.merge_key != self.merge_key or not self.merge_key:
            return False
        self.after = other.after
        self.setObsolete(self.after == self.before)
        return True

    def redo(self) -> None:
        """Put the later design in place."""
        self._put(self.after)

    def undo(self) -> None:
        """Put the earlier design back."""
        self._put(self.before)
