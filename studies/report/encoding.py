"""Numbers and texts as they travel inside the page: small, exact enough, and harmless."""

from __future__ import annotations

import base64
import gzip
import json
import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

STEPS = 65_534
"""Largest code of a coarse number; 65,535 stands for a missing one."""


def script_json(value: Any) -> str:
    """JSON that can stand inside a script element: no text in it can end the element.

    Numbers that are not finite become null.
    """
    text = json.dumps(_finite(value), ensure_ascii=True, separators=(",", ":"), allow_nan=False)
    return text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


def _finite(value: Any) -> Any:
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, dict):
        return {key: _finite(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(item) for item in value]
    return value


def single(values: FloatArray) -> str:
    """Base64 of little-endian 32-bit numbers: seven digits."""
    return base64.b64encode(np.ascontiguousarray(values, dtype="<f4").tobytes()).decode("ascii")


def coarse(values: FloatArray) -> dict[str, Any]:
    """Numbers in 65,535 steps between their smallest and largest, for curves and background.

    The error is half a step, 8e-6 of the range. Equal numbers are kept as one and their count.
    """
    good = np.isfinite(values)
    if values.size and good.all() and np.ptp(values) == 0.0:
        return {"low": float(values[0]), "count": int(values.size)}
    low = float(values[good].min()) if good.any() else 0.0
    high = float(values[good].max()) if good.any() else 0.0
    span = high - low or 1.0
    scaled = np.where(good, np.rint((np.where(good, values, low) - low) / span * STEPS), STEPS + 1)
    codes = np.ascontiguousarray(scaled, dtype="<u2").tobytes()
    return {"low": low, "step": span / STEPS, "codes": base64.b64encode(codes).decode("ascii")}


def packed(value: Any) -> str:
    """Base64 of gzipped JSON, for what is only looked at on demand."""
    # No time stamp, so that equal reports are equal files.
    data = gzip.compress(script_json(value).encode("ascii"), compresslevel=6, mtime=0)
    return base64.b64encode(data).decode("ascii")
