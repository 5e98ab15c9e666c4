"""What all records share: frozen, slotted, arrays that cannot be written to."""

from collections.abc import Mapping
from dataclasses import fields
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Record", "frame", "read_only"]


class Record:
    """Base of every record; makes the record's arrays read-only.

    Subclasses are ``@dataclass(frozen=True, slots=True, eq=False)``: identity
    equality, since the truth of comparing arrays is an array.
    """

    __slots__ = ()

    def __post_init__(self) -> None:
        """Replace each array by a read-only view of itself."""
        for field in fields(self):  # type: ignore[arg-type]  # subclasses are dataclasses
            value = getattr(self, field.name)
            if isinstance(value, np.ndarray):
                object.__setattr__(self, field.name, read_only(value))
            elif isinstance(value, Mapping) and value:
                sealed = {
                    key: read_only(item) if isinstance(item, np.ndarray) else item
                    for key, item in value.items()
                }
                object.__setattr__(self, field.name, sealed)
            elif (
                isinstance(value, tuple)
                and value
                and all(isinstance(item, np.ndarray) for item in value)
            ):
                object.__setattr__(
                    self, field.name, tuple(read_only(item) for item in value)
                )

    def to_frame(self) -> "pd.DataFrame":
        """Return the record as a data frame with one row."""
        return frame({f.name: [getattr(self, f.name)] for f in fields(self)})  # type: ignore[arg-type]


def read_only(array: Any) -> Any:
    """Return a view of `array` that refuses writing.

    Parameters
    ----------
    array : ndarray
        Any array; its own flags are left as they are.

    Returns
    -------
    ndarray
        The same memory, not writeable through this view.
    """
    view = array.view()
    view.flags.writeable = False
    return view


def frame(columns: dict[str, Any]) -> "pd.DataFrame":
    """Return a data frame of the columns; pandas is imported only here.

    Parameters
    ----------
    columns : dict of str to sequence
        Column name to values, all of one length.

    Returns
    -------
    pandas.DataFrame
        In the order of the dict.
    """
    import pandas as pd  # pandas is slow to import; records must stay light

    return pd.DataFrame(columns)
