"""Field orders of one frequency that drive currents in the same magnets."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.losses.eddy import segment_share

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]


def mixed_to_separate(
    loss: FloatArray,
    phase: ComplexArray,
    orders: IntArray,
    frequencies: IntArray,
    pole_pairs: int,
    segments: int,
    segment_angle: FloatArray,
) -> FloatArray:
    """Loss of n designs with orders mixed over that of each order by itself, (n,).

    In a magnet segment of angle b, with as much current flowing on as back, the currents of the
    orders s and t have the mean product sinc((s - t) b/2) - sinc(s b/2) sinc(t b/2), which for
    s = t is `segment_share`. Over all poles products of orders a multiple of 2 p apart remain.
    So orders of one frequency are no more independent than the magnets are a ring; the mean
    product follows from the currents' zero sum alone. Their profiles over the radius are taken as
    alike and each reaction as that of its order alone.

    Parameters
    ----------
    loss : array (n, h)
        Of each order by itself.
    phase : array (n, h)
        Of its wave seen by the rotor at a north pole's axis, of modulus one, or less where only
        that part of the loss mixes.
    orders : array (h,) of int
        Signed such that all `frequencies` (h,), per turn, are above zero.
    pole_pairs, segments : int
        p, and segments side by side in one magnet.
    segment_angle : array (n,)
    """
    apart = orders[:, None] - orders[None, :]
    together = (frequencies[:, None] == frequencies[None, :]) & (apart % (2 * pole_pairs) == 0)
    first, second = np.nonzero(np.triu(together, 1))
    half = 0.5 * segment_angle[:, None]

    def mean(order: IntArray) -> FloatArray:
        return np.sinc(order * half / np.pi)

    difference = orders[first] - orders[second]
    each = mean(orders)
    alone = np.sqrt(np.maximum(segment_share(orders, segment_angle[:, None]), 1e-12))
    product = mean(difference) - each[:, first] * each[:, second]
    if segments > 1:
        place = np.arange(segments) - 0.5 * (segments - 1)
        product = product * np.mean(
            np.cos(2.0 * half[:, :, None] * place * difference[None, :, None]), axis=2
        )
    amplitude = np.sqrt(loss) * phase / alone
    crossed = (amplitude[:, first] * np.conj(amplitude[:, second])).real * product
    total = loss.sum(axis=1)
    mixed = total + 2.0 * crossed.sum(axis=1)
    return np.asarray(np.maximum(mixed, 0.0) / np.where(total > 0.0, total, 1.0))
