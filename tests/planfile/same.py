"""Whether two values are the same, bit for bit."""

from __future__ import annotations

import dataclasses
import struct

import numpy as np
import pandas as pd


def same(a: object, b: object) -> bool:
    """Equal in type and content; floats by their bits, frames by cells and dtypes."""
    if isinstance(a, np.ndarray) or isinstance(b, np.ndarray):
        return (
            isinstance(a, np.ndarray)
            and isinstance(b, np.ndarray)
            and a.dtype == b.dtype
            and a.shape == b.shape
            and a.tobytes() == b.tobytes()
        )
    if isinstance(a, pd.DataFrame):
        assert isinstance(b, pd.DataFrame)
        pd.testing.assert_frame_equal(a, b, check_exact=True)
        return True
    if type(a) is not type(b):
        return False
    if isinstance(a, float):
        assert isinstance(b, float)
        return (a != a and b != b) or struct.pack("<d", a) == struct.pack("<d", b)
    if dataclasses.is_dataclass(a):
        return all(same(getattr(a, f.name), getattr(b, f.name)) for f in dataclasses.fields(a))
    if isinstance(a, tuple | list):
        assert isinstance(b, tuple | list)
        return len(a) == len(b) and all(map(same, a, b))
    if isinstance(a, dict):
        assert isinstance(b, dict)
        return list(a) == list(b) and all(same(a[key], b[key]) for key in a)
    # Decimal("1.0") == Decimal("1.00"), but they are not the same.
    return a == b and str(a) == str(b)
