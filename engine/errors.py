"""The error family: each error is one sentence with what was given, what is allowed and what to do."""

import difflib
import errno
from collections.abc import Iterable, Sequence

NEAR_ENOUGH = 0.6
"""Share of equal letters (difflib ratio) from which a known name is offered; 0.6 finds one or two slips."""

OS_REASONS = {
    errno.ENOENT: "there is no such file or folder",
    errno.EACCES: "this account may not open it",
    errno.EPERM: "this account may not change it",
    errno.EISDIR: "it is a folder, not a file",
    errno.ENOTDIR: "a part of the path is a file, not a folder",
    errno.ENOSPC: "the disk is full",
    errno.EDQUOT: "the disk quota is used up",
    errno.EROFS: "the disk can only be read",
    errno.ENAMETOOLONG: "the name is too long",
    errno.ELOOP: "its links lead round in a circle",
}


class TrundleError(Exception):
    """Base of every error that a user can cause; `str(error)` is a sentence to show as it is."""


class DesignError(TrundleError):
    """A design cannot be laid out or rolled."""


class EditError(TrundleError):
    """An edit was refused; the design is unchanged."""


class QuantityError(TrundleError):
    """A typed number or unit cannot be read."""


class SaveError(TrundleError):
    """A file could not be written; what stood there before is whole."""


class CasesFileError(TrundleError):
    """A file of reference cases cannot be used."""


class CancelledError(TrundleError):
    """Work was stopped at the user's wish."""


class PartRefusedError(TrundleError):
    """A part may not be exported because a check on it failed."""


class UnknownNameError(TrundleError):
    """A name that should be one of a known list is not.

    Attributes
    ----------
    given : str
    known : tuple of str
    """

    def __init__(self, what: str, given: str, known: Iterable[str]) -> None:
        self.given = given
        self.known = tuple(known)
        super().__init__(f'There is no {what} "{given}"{suggestion(given, self.known)}.')


class DesignFileError(TrundleError):
    """A design file cannot be used; every problem found is in `problems`.

    Attributes
    ----------
    path : str
        The file.
    problems : tuple of str
        One sentence each.
    """

    def __init__(self, path: str, problems: Sequence[str]) -> None:
        self.path = path
        self.problems = tuple(problems)
        super().__init__(f"{path} cannot be used: " + " ".join(self.problems))


def nearest(given: str, known: Iterable[str]) -> str | None:
    """Known name that is most like the given one, or None when none is near."""
    names = list(known)
    folded = {name.casefold(): name for name in names}
    if given.casefold() in folded:
        return folded[given.casefold()]
    found = difflib.get_close_matches(given, names, n=1, cutoff=NEAR_ENOUGH)
    return found[0] if found else None


def suggestion(given: str, known: Iterable[str], most: int = 12) -> str:
    """Continuation of a sentence about an unknown name: the nearest known one, else all of them when they are few."""
    names = list(known)
    near = nearest(given, names)
    if near is not None:
        return f'; the nearest known name is "{near}"'
    if not names:
        return "; none is known yet"
    if len(names) <= most:
        return "; known are " + ", ".join(f'"{name}"' for name in names)
    return f"; {len(names)} names are known, none of them near"


def os_reason(error: OSError) -> str:
    """Reason of a failed file operation in plain words (without a full stop)."""
    reason = OS_REASONS.get(error.errno or 0)
    return reason if reason is not None else (error.strerror or "the system gave no reason").lower()
