"""Vector operations over the lanes, written out for the compiler.

`LANES` designs lie side by side in memory. The compiler packs eight like statements into one vector
instruction, but only with the switch set below, only if all values are read before any is written
(it cannot know that arrays do not overlap), and only for unsigned indices; together three times the
speed of a loop over the lanes, measured.
"""

from __future__ import annotations

import numba
from numba import njit

LANES = 8
"""Designs in one batch: eight doubles fill a vector register of the widest common kind."""

numba.config.SLP_VECTORIZE = 1  # type: ignore[attr-defined]


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def subtract_product(w, a, b):  # type: ignore[no-untyped-def]
    """w -= a * b."""
    w0, w1, w2, w3, w4, w5, w6, w7 = (
        w[0] - a[0] * b[0],
        w[1] - a[1] * b[1],
        w[2] - a[2] * b[2],
        w[3] - a[3] * b[3],
        w[4] - a[4] * b[4],
        w[5] - a[5] * b[5],
        w[6] - a[6] * b[6],
        w[7] - a[7] * b[7],
    )
    w[0] = w0
    w[1] = w1
    w[2] = w2
    w[3] = w3
    w[4] = w4
    w[5] = w5
    w[6] = w6
    w[7] = w7


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def product(w, a, b):  # type: ignore[no-untyped-def]
    """w = a * b."""
    w0, w1, w2, w3, w4, w5, w6, w7 = (
        a[0] * b[0],
        a[1] * b[1],
        a[2] * b[2],
        a[3] * b[3],
        a[4] * b[4],
        a[5] * b[5],
        a[6] * b[6],
        a[7] * b[7],
    )
    w[0] = w0
    w[1] = w1
    w[2] = w2
    w[3] = w3
    w[4] = w4
    w[5] = w5
    w[6] = w6
    w[7] = w7


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def add_product(w, a, b):  # type: ignore[no-untyped-def]
    """w += a * b."""
    w0, w1, w2, w3, w4, w5, w6, w7 = (
        w[0] + a[0] * b[0],
        w[1] + a[1] * b[1],
        w[2] + a[2] * b[2],
        w[3] + a[3] * b[3],
        w[4] + a[4] * b[4],
        w[5] + a[5] * b[5],
        w[6] + a[6] * b[6],
        w[7] + a[7] * b[7],
    )
    w[0] = w0
    w[1] = w1
    w[2] = w2
    w[3] = w3
    w[4] = w4
    w[5] = w5
    w[6] = w6
    w[7] = w7


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def add_products(w, a, b, c, d):  # type: ignore[no-untyped-def]
    """w += a * b + c * d."""
    w0, w1, w2, w3, w4, w5, w6, w7 = (
        w[0] + a[0] * b[0] + c[0] * d[0],
        w[1] + a[1] * b[1] + c[1] * d[1],
        w[2] + a[2] * b[2] + c[2] * d[2],
        w[3] + a[3] * b[3] + c[3] * d[3],
        w[4] + a[4] * b[4] + c[4] * d[4],
        w[5] + a[5] * b[5] + c[5] * d[5],
        w[6] + a[6] * b[6] + c[6] * d[6],
        w[7] + a[7] * b[7] + c[7] * d[7],
    )
    w[0] = w0
    w[1] = w1
    w[2] = w2
    w[3] = w3
    w[4] = w4
    w[5] = w5
    w[6] = w6
    w[7] = w7


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def products(w, a, b, c, d):  # type: ignore[no-untyped-def]
    """w = a * b + c * d."""
    w0, w1, w2, w3, w4, w5, w6, w7 = (
        a[0] * b[0] + c[0] * d[0],
        a[1] * b[1] + c[1] * d[1],
        a[2] * b[2] + c[2] * d[2],
        a[3] * b[3] + c[3] * d[3],
        a[4] * b[4] + c[4] * d[4],
        a[5] * b[5] + c[5] * d[5],
        a[6] * b[6] + c[6] * d[6],
        a[7] * b[7] + c[7] * d[7],
    )
    w[0] = w0
    w[1] = w1
    w[2] = w2
    w[3] = w3
    w[4] = w4
    w[5] = w5
    w[6] = w6
    w[7] = w7


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def subtract_panel(work, index, lower, first, last, s):  # type: ignore[no-untyped-def]
    """work[index[p], c] -= s[c] * lower[p] for p in first..last-1 and four columns c.

    The factors s stay in registers.
    """
    a0, a1, a2, a3, a4, a5, a6, a7 = (
        s[0, 0],
        s[0, 1],
        s[0, 2],
        s[0, 3],
        s[0, 4],
        s[0, 5],
        s[0, 6],
        s[0, 7],
    )
    b0, b1, b2, b3, b4, b5, b6, b7 = (
        s[1, 0],
        s[1, 1],
        s[1, 2],
        s[1, 3],
        s[1, 4],
        s[1, 5],
        s[1, 6],
        s[1, 7],
    )
    c0, c1, c2, c3, c4, c5, c6, c7 = (
        s[2, 0],
        s[2, 1],
        s[2, 2],
        s[2, 3],
        s[2, 4],
        s[2, 5],
        s[2, 6],
        s[2, 7],
    )
    d0, d1, d2, d3, d4, d5, d6, d7 = (
        s[3, 0],
        s[3, 1],
        s[3, 2],
        s[3, 3],
        s[3, 4],
        s[3, 5],
        s[3, 6],
        s[3, 7],
    )
    for p in range(first, last):
        v = lower[p]
        v0, v1, v2, v3, v4, v5, v6, v7 = (v[0], v[1], v[2], v[3], v[4], v[5], v[6], v[7])
        w = work[index[p]]
        w0, w1, w2, w3, w4, w5, w6, w7 = (
            w[0, 0] - a0 * v0,
            w[0, 1] - a1 * v1,
            w[0, 2] - a2 * v2,
            w[0, 3] - a3 * v3,
            w[0, 4] - a4 * v4,
            w[0, 5] - a5 * v5,
            w[0, 6] - a6 * v6,
            w[0, 7] - a7 * v7,
        )
        w[0, 0] = w0
        w[0, 1] = w1
        w[0, 2] = w2
        w[0, 3] = w3
        w[0, 4] = w4
        w[0, 5] = w5
        w[0, 6] = w6
        w[0, 7] = w7
        w0, w1, w2, w3, w4, w5, w6, w7 = (
            w[1, 0] - b0 * v0,
            w[1, 1] - b1 * v1,
            w[1, 2] - b2 * v2,
            w[1, 3] - b3 * v3,
            w[1, 4] - b4 * v4,
            w[1, 5] - b5 * v5,
            w[1, 6] - b6 * v6,
            w[1, 7] - b7 * v7,
        )
        w[1, 0] = w0
        w[1, 1] = w1
        w[1, 2] = w2
        w[1, 3] = w3
        w[1, 4] = w4
        w[1, 5] = w5
        w[1, 6] = w6
        w[1, 7] = w7
        w0, w1, w2, w3, w4, w5, w6, w7 = (
            w[2, 0] - c0 * v0,
            w[2, 1] - c1 * v1,
            w[2, 2] - c2 * v2,
            w[2, 3] - c3 * v3,
            w[2, 4] - c4 * v4,
            w[2, 5] - c5 * v5,
            w[2, 6] - c6 * v6,
            w[2, 7] - c7 * v7,
        )
        w[2, 0] = w0
        w[2, 1] = w1
        w[2, 2] = w2
        w[2, 3] = w3
        w[2, 4] = w4
        w[2, 5] = w5
        w[2, 6] = w6
        w[2, 7] = w7
        w0, w1, w2, w3, w4, w5, w6, w7 = (
            w[3, 0] - d0 * v0,
            w[3, 1] - d1 * v1,
            w[3, 2] - d2 * v2,
            w[3, 3] - d3 * v3,
            w[3, 4] - d4 * v4,
            w[3, 5] - d5 * v5,
            w[3, 6] - d6 * v6,
            w[3, 7] - d7 * v7,
        )
        w[3, 0] = w0
        w[3, 1] = w1
        w[3, 2] = w2
        w[3, 3] = w3
        w[3, 4] = w4
        w[3, 5] = w5
        w[3, 6] = w6
        w[3, 7] = w7
