"""The kinds of array that the scorer works with, and how one is made a value.

Conventions
-----------
An array that stands in a frozen dataclass is *sealed*: its write flag is off, so that nothing can
change it behind the back of those who share it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, TypeAlias, TypeVar

import numpy as np

if TYPE_CHECKING:
    from typing import Any

    from numpy.typing import NDArray

FloatArray: TypeAlias = "NDArray[np.float64]"
IntArray: TypeAlias = "NDArray[np.int64]"

_Array = TypeVar("_Array", bound="NDArray[Any]")


def sealed(array: _Array) -> _Array:
    """Take the right to write away from an array, in place, and give the array itself.

    >>> sealed(np.zeros(2)).flags.writeable
    False
    """
    array.setflags(write=False)
    return array
