"""Newton's method for the circuit of `evaluators.analytic.network`, compiled, row by row.

A row is one design at one rotor position. The flanges of a slot answer each other but hardly those
of other slots (two parts in a hundred of their own answer, left out), so they are eliminated slot
by slot and what is left is one unknown a slot.
"""

from __future__ import annotations

import numpy as np
from numba import njit

MU_0 = 4e-7 * np.pi
SHORTENED = 4
PLACES = 4  # of a flange, as in `evaluators.analytic.tips`

# Columns of the table of dimensions.
TOOTH_WIDTH, TOOTH_LENGTH, YOKE_THICKNESS, YOKE_LENGTH, ROOT_THICKNESS, ROOT_LENGTH = range(6)
TIP_SLOPE = 6
TIP_THICKNESS = 7  # four of them
TIP_LENGTH = 11  # four of them, weighted
TIP_PROFILE = 15  # four of them
COLUMNS = 19


@njit(cache=True, error_model="numpy")
def _field(b, knots, cubic):  # type: ignore[no-untyped-def]
    """H and dH/dB at flux density b."""
    size = abs(b)
    k = 0
    while k + 1 < knots.shape[0] and knots[k + 1] <= size:
        k += 1
    t = size - knots[k]
    c0, c1, c2, c3 = cubic[k, 0], cubic[k, 1], cubic[k, 2], cubic[k, 3]
    field = c0 + t * (c1 + t * (c2 + t * c3))
    return (field if b >= 0.0 else -field), c1 + t * (2.0 * c2 + 3.0 * c3 * t)


@njit(cache=True, error_model="numpy")
def _flange(mean, uneven, across, size, knots, cubic):  # type: ignore[no-untyped-def]
    """mu0 times the voltage of a flange, and its slope by the mean flux."""
    steep = size[TIP_SLOPE]
    stretch = 1.0 + steep * steep / 3.0
    voltage, slope = 0.0, 0.0
    for i in range(PLACES):
        length = size[TIP_LENGTH + i]
        if length == 0.0:
            continue
        profile = size[TIP_PROFILE + i]
        thick = size[TIP_THICKNESS + i]
        along = (profile * mean + uneven[i]) / thick
        cross = steep * across if across * along > 0.0 else 0.0
        b = np.sqrt(along * along * stretch + (across * across + cross * along) / 3.0 + 1e-12)
        field, rise = _field(b, knots, cubic)
        nu = field / b
        turn = (along * stretch + cross / 6.0) / b
        voltage += length * nu * along
        slope += length * profile / thick * (nu + (rise - nu) * along * turn / b)
    return MU_0 * voltage, MU_0 * slope


@njit(cache=True, error_model="numpy")
def _state(  # type: ignore[no-untyped-def]
    a,
    tips,
    late,
    uneven,
    across,
    sign,
    size,
    knots,
    cubic,
    tooth_flux,
    tooth,
    tooth_slope,
    lost,
    yoke_slope,
    tips_lost,
    tips_slope,
):
    """Fluxes, voltages and slopes of one row at potentials `a` (q,) and flanges `tips` (q, 2)."""
    q = a.shape[0]
    for j in range(q):
        before = a[j - 1] if j > 0 else sign * a[q - 1]
        tooth_flux[j] = a[j] - before - late[j]
        field, slope = _field(tooth_flux[j] / size[TOOTH_WIDTH], knots, cubic)
        tooth[j] = MU_0 * size[TOOTH_LENGTH] * field
        tooth_slope[j] = MU_0 * size[TOOTH_LENGTH] / size[TOOTH_WIDTH] * slope
    for j in range(q):
        field, slope = _field(a[j] / size[YOKE_THICKNESS], knots, cubic)
        root, root_slope = _field(a[j] / size[ROOT_THICKNESS], knots, cubic)
        after = tooth[j + 1] if j + 1 < q else sign * tooth[0]
        lost[j] = tooth[j] - after + MU_0 * (size[YOKE_LENGTH] * field + size[ROOT_LENGTH] * root)
        yoke_slope[j] = MU_0 * (
            size[YOKE_LENGTH] / size[YOKE_THICKNESS] * slope
            + size[ROOT_LENGTH] / size[ROOT_THICKNESS] * root_slope
        )
        for s in range(2):
            tips_lost[j, s], tips_slope[j, s] = _flange(
                tips[j, s], uneven[j, s], across[j, s], size, knots, cubic
            )


@njit(cache=True, error_model="numpy")
def _residual(  # type: ignore[no-untyped-def]
    a, tips, alone, tips_alone, lost, tips_lost, slots, to_tips, own, wrong, tips_wrong
):
    """Residual of one row; returns its largest size."""
    q = a.shape[0]
    for i in range(q):
        wrong[i] = a[i] - alone[i]
        for s in range(2):
            tips_wrong[i, s] = (
                tips[i, s]
                - tips_alone[i, s]
                + own[s, 0] * tips_lost[i, 0]
                + own[s, 1] * tips_lost[i, 1]
            )
    for j in range(q):
        for i in range(q):
            wrong[i] += slots[i, j] * lost[j]
            for s in range(2):
                tips_wrong[i, s] += to_tips[2 * i + s, j] * lost[j]
                wrong[j] += to_tips[2 * i + s, j] * tips_lost[i, s]
    return max(np.abs(wrong).max(), np.abs(tips_wrong).max())


@njit(cache=True, error_model="numpy")
def _matrix(  # type: ignore[no-untyped-def]
    tooth_slope, yoke_slope, tips_slope, sign, slots, to_tips, own, matrix, left, stiff, inverse
):
    """1 + (G - G_t K G_t') S: the tangent of one row with the flanges eliminated.

    Fills stiff K = D (1 + B D)^-1 and inverse (1 + B D)^-1, (q, 2, 2); `left` is room for G - ...
    """
    q = tooth_slope.shape[0]
    for i in range(q):
        first, second = tips_slope[i, 0], tips_slope[i, 1]
        m00, m01 = 1.0 + own[0, 0] * first, own[0, 1] * second
        m10, m11 = own[1, 0] * first, 1.0 + own[1, 1] * second
        det = m00 * m11 - m01 * m10
        inverse[i, 0, 0], inverse[i, 0, 1] = m11 / det, -m01 / det
        inverse[i, 1, 0], inverse[i, 1, 1] = -m10 / det, m00 / det
        for t in range(2):
            stiff[i, 0, t] = first * inverse[i, 0, t]
            stiff[i, 1, t] = second * inverse[i, 1, t]
    left[:, :] = slots
    for k in range(q):
        if tips_slope[k, 0] == 0.0 and tips_slope[k, 1] == 0.0:
            continue
        for i in range(q):
            x, y = to_tips[2 * k, i], to_tips[2 * k + 1, i]
            u = x * stiff[k, 0, 0] + y * stiff[k, 1, 0]
            v = x * stiff[k, 0, 1] + y * stiff[k, 1, 1]
            for j in range(q):
                left[i, j] -= u * to_tips[2 * k, j] + v * to_tips[2 * k + 1, j]
    # V_j = U_j (a_j - a_(j-1)) - U_(j+1) (a_(j+1) - a_j) + Y_j a_j, column by column.
    for i in range(q):
        for j in range(q):
            here = left[i, j]
            before = left[i, j - 1] if j > 0 else sign * left[i, q - 1]
            after = left[i, j + 1] if j + 1 < q else sign * left[i, 0]
            following = tooth_slope[j + 1] if j + 1 < q else tooth_slope[0]
            matrix[i, j] = (
                here * yoke_slope[j] + (here - before) * tooth_slope[j] + (here - after) * following
            )
        matrix[i, i] += 1.0


@njit(cache=True, error_model="numpy")
def _voltage(small, tooth_slope, yoke_slope, sign, lost):  # type: ignore[no-untyped-def]
    """Small voltage around every slot from small potentials."""
    q = small.shape[0]
    for j in range(q):
        before = small[j - 1] if j > 0 else sign * small[q - 1]
        after = small[j + 1] if j + 1 < q else sign * small[0]
        following = tooth_slope[j + 1] if j + 1 < q else tooth_slope[0]
        lost[j] = (
            tooth_slope[j] * (small[j] - before)
            + following * (small[j] - after)
            + yoke_slope[j] * small[j]
        )


@njit(cache=True, error_model="numpy")
def _solve(matrix, load):  # type: ignore[no-untyped-def]
    """Gauss' elimination with pivoting, in place; the solution replaces `load` (q, r)."""
    q, r = load.shape
    for k in range(q):
        pivot = k
        for i in range(k + 1, q):
            if abs(matrix[i, k]) > abs(matrix[pivot, k]):
                pivot = i
        if pivot != k:
            for j in range(k, q):
                matrix[k, j], matrix[pivot, j] = matrix[pivot, j], matrix[k, j]
            for j in range(r):
                load[k, j], load[pivot, j] = load[pivot, j], load[k, j]
        for i in range(k + 1, q):
            factor = matrix[i, k] / matrix[k, k]
            if factor != 0.0:
                for j in range(k + 1, q):
                    matrix[i, j] -= factor * matrix[k, j]
                for j in range(r):
                    load[i, j] -= factor * load[k, j]
    for k in range(q - 1, -1, -1):
        for j in range(r):
            total = load[k, j]
            for i in range(k + 1, q):
                total -= matrix[k, i] * load[i, j]
            load[k, j] = total / matrix[k, k]


@njit(cache=True, error_model="numpy")
def solve(  # type: ignore[no-untyped-def]
    alone,
    tips_alone,
    uneven,
    across,
    late,
    start,
    allowed,
    sign,
    sizes,
    knots,
    cubic,
    slots,
    to_tips,
    own,
    iterations,
):
    """All rows: alone (n, k, q), tips (n, k, q, 2), uneven (n, k, q, 2, 4), allowed (n,)."""
    n, positions, q = alone.shape
    a = start.copy()
    tips = tips_alone.copy()
    tooth_flux, tooth = np.empty((n, positions, q)), np.empty((n, positions, q))
    lost, tips_lost = np.empty((n, positions, q)), np.empty((n, positions, q, 2))
    tooth_slope, yoke_slope = np.empty((n, positions, q)), np.empty((n, positions, q))
    tips_slope = np.empty((n, positions, q, 2))
    wrong, tips_wrong = np.empty(q), np.empty((q, 2))
    old, tips_old = np.empty(q), np.empty((q, 2))
    matrix, left, load = np.empty((q, q)), np.empty((q, q)), np.empty((q, 1))
    stiff, inverse = np.empty((q, 2, 2)), np.empty((q, 2, 2))
    step, tips_step = np.empty(q), np.empty((q, 2))
    for d in range(n):
        for k in range(positions):
            x, y = a[d, k], tips[d, k]
            state = (
                tooth_flux[d, k],
                tooth[d, k],
                tooth_slope[d, k],
                lost[d, k],
                yoke_slope[d, k],
                tips_lost[d, k],
                tips_slope[d, k],
            )
            given = (late[d, k], uneven[d, k], across[d, k], sign, sizes[d], knots, cubic)
            answer = (slots[d], to_tips[d], own[d], wrong, tips_wrong)
            _state(x, y, *given, *state)
            size = _residual(x, y, alone[d, k], tips_alone[d, k], state[3], state[5], *answer)
            for _ in range(iterations):
                if size <= allowed[d]:
                    break
                _matrix(
                    state[2],
                    state[4],
                    state[6],
                    sign,
                    slots[d],
                    to_tips[d],
                    own[d],
                    matrix,
                    left,
                    stiff,
                    inverse,
                )
                for i in range(q):
                    load[i, 0] = wrong[i]
                for i in range(q):
                    for s in range(2):
                        part = stiff[i, s, 0] * tips_wrong[i, 0] + stiff[i, s, 1] * tips_wrong[i, 1]
                        for j in range(q):
                            load[j, 0] -= to_tips[d, 2 * i + s, j] * part
                _solve(matrix, load)
                _voltage(load[:, 0], state[2], state[4], sign, step)
                for i in range(q):
                    first, second = tips_wrong[i, 0], tips_wrong[i, 1]
                    for j in range(q):
                        first -= to_tips[d, 2 * i, j] * step[j]
                        second -= to_tips[d, 2 * i + 1, j] * step[j]
                    for s in range(2):
                        tips_step[i, s] = inverse[i, s, 0] * first + inverse[i, s, 1] * second
                old[:], tips_old[:] = x, y
                length = 1.0
                before = size
                for attempt in range(SHORTENED):
                    for i in range(q):
                        x[i] = old[i] - length * load[i, 0]
                        for s in range(2):
                            y[i, s] = tips_old[i, s] - length * tips_step[i, s]
                    _state(x, y, *given, *state)
                    size = _residual(
                        x, y, alone[d, k], tips_alone[d, k], state[3], state[5], *answer
                    )
                    if size <= before or attempt == SHORTENED - 1:
                        break
                    length *= 0.4
    return a, tooth_flux, tooth, lost, tooth_slope, yoke_slope, tips_lost, tips_slope


@njit(cache=True, error_model="numpy")
def small(  # type: ignore[no-untyped-def]
    alone, tips_alone, late, tooth_slope, yoke_slope, tips_slope, sign, slots, to_tips, own
):
    """Voltages lost to small sources, r of them: alone and late (n, k, q, r), tips (n, k, q, 2, r).

    The slopes are (n, k, q) and (n, k, q, 2).
    """
    n, positions, q, r = alone.shape
    lost, tips_lost = np.empty((n, positions, q, r)), np.empty((n, positions, q, 2, r))
    matrix, left, load = np.empty((q, q)), np.empty((q, q)), np.empty((q, r))
    stiff, inverse = np.empty((q, 2, 2)), np.empty((q, 2, 2))
    missing, seen = np.empty((q, r)), np.empty((q, 2, r))
    for d in range(n):
        for k in range(positions):
            tooth = tooth_slope[d, k]
            _matrix(
                tooth,
                yoke_slope[d, k],
                tips_slope[d, k],
                sign,
                slots[d],
                to_tips[d],
                own[d],
                matrix,
                left,
                stiff,
                inverse,
            )
            for j in range(q):
                for c in range(r):
                    after = late[d, k, j + 1, c] if j + 1 < q else sign * late[d, k, 0, c]
                    following = tooth[j + 1] if j + 1 < q else tooth[0]
                    missing[j, c] = following * after - tooth[j] * late[d, k, j, c]
            load[:, :] = alone[d, k]
            seen[:, :, :] = tips_alone[d, k]
            for j in range(q):
                for i in range(q):
                    for c in range(r):
                        load[i, c] -= slots[d, i, j] * missing[j, c]
                        for s in range(2):
                            seen[i, s, c] -= to_tips[d, 2 * i + s, j] * missing[j, c]
            for i in range(q):
                for s in range(2):
                    for c in range(r):
                        part = stiff[i, s, 0] * seen[i, 0, c] + stiff[i, s, 1] * seen[i, 1, c]
                        for j in range(q):
                            load[j, c] -= to_tips[d, 2 * i + s, j] * part
            _solve(matrix, load)
            for c in range(r):
                _voltage(load[:, c], tooth, yoke_slope[d, k], sign, lost[d, k, :, c])
            for i in range(q):
                for c in range(r):
                    first, second = seen[i, 0, c], seen[i, 1, c]
                    for j in range(q):
                        first -= to_tips[d, 2 * i, j] * lost[d, k, j, c]
                        second -= to_tips[d, 2 * i + 1, j] * lost[d, k, j, c]
                    for s in range(2):
                        tips_lost[d, k, i, s, c] = stiff[i, s, 0] * first + stiff[i, s, 1] * second
            for j in range(q):
                for c in range(r):
                    lost[d, k, j, c] += missing[j, c]
    return lost, tips_lost
