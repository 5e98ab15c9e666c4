"""Openings of rows that were set aside: each one recorded, none can be taken back."""

import hashlib
import json
from collections.abc import Iterable
from dataclasses import asdict, dataclass

__all__ = ["FIRST", "Opening"]

FIRST = "0" * 64
"""What the first opening holds in place of the one before it."""


@dataclass(frozen=True, slots=True)
class Opening:
    """One opening of the rows that were set aside.

    There is no clock in it: equal openings of equal rows after equal ones are equal.

    Attributes
    ----------
    number : int
        1 for the first.
    reason : str
        Why the rows were opened, in the user's words.
    samples : int
        How many rows were opened.
    ids_sha256 : str
        Hash of their sorted ids: which rows, without naming people.
    previous_sha256 : str
        `sha256` of the opening before, zeros for the first: an entry that is changed,
        removed or put in between breaks the chain.
    """

    number: int
    reason: str
    samples: int
    ids_sha256: str
    previous_sha256: str

    @property
    def sha256(self) -> str:
        """Hash of this opening, and by the chain of all before it."""
        text = json.dumps(asdict(self), sort_keys=True, ensure_ascii=False)
        return hashlib.sha256(text.encode()).hexdigest()

    @staticmethod
    def of(
        ids: Iterable[str], reason: str, previous: "Opening | None" = None
    ) -> "Opening":
        """Return the opening of the given rows that follows another one."""
        names = sorted(ids)
        digest = hashlib.sha256(json.dumps(names, ensure_ascii=False).encode())
        return Opening(
            number=1 if previous is None else previous.number + 1,
            reason=reason,
            samples=len(names),
            ids_sha256=digest.hexdigest(),
            previous_sha256=FIRST if previous is None else previous.sha256,
        )
