"""How children are made, on arrays of parents (n, v) scaled to the unit box.

Only uniform numbers are drawn, all of them whether used or not, so that what one child draws
never depends on another.
"""

from __future__ import annotations

import numpy as np

from optimizer.problem import BoolArray, FloatArray, IntArray

ETA_CROSSOVER = 20.0  # spread of children about their parents; larger is nearer
ETA_MUTATION = 2.0  # the middle, on a logarithmic scale, of what is drawn for each child
MUTATION_SPREAD = 2.0  # natural logarithm of the largest over the middle one
DIFFERENCE = 0.5  # factor F of differential evolution
_SAME = 1e-14  # parents nearer than this have no distance to scale


def latin_hypercube(rows: int, variables: int, random: np.random.Generator) -> FloatArray:
    """One random point in each of ``rows`` equal slices of every variable.

    McKay, Beckman and Conover, Technometrics 21 (1979) 239-245.
    """
    order = np.argsort(random.random((rows, variables)), axis=0, kind="stable")
    return np.asarray((order + random.random((rows, variables))) / rows)


def simulated_binary(a: FloatArray, b: FloatArray, random: np.random.Generator) -> FloatArray:
    """One child of each pair by simulated binary crossover within the bounds.

    Deb and Agrawal, Complex Systems 9 (1995) 115-148: the child keeps the parents' centre and
    scatters about either of them; each variable crosses with probability one half. The
    distribution is cut at the bounds as described by Deb (2001), Multi-Objective Optimization
    Using Evolutionary Algorithms, section 4.2.
    """
    u, cross, side = random.random((3, *a.shape))
    low, high = np.minimum(a, b), np.maximum(a, b)
    distance = high - low
    upper = side < 0.5
    room = np.where(upper, 1.0 - high, low)
    safe = np.maximum(distance, _SAME)
    power = ETA_CROSSOVER + 1.0
    alpha = 2.0 - (1.0 + 2.0 * room / safe) ** -power
    inside = u * alpha
    spread = np.where(inside <= 1.0, inside, 1.0 / np.maximum(2.0 - inside, _SAME)) ** (1.0 / power)
    child = 0.5 * (low + high) + np.where(upper, 0.5, -0.5) * spread * distance
    return np.where((cross < 0.5) & (distance > _SAME), child, a)


def differential(
    base: FloatArray, a: FloatArray, b: FloatArray, random: np.random.Generator
) -> FloatArray:
    """``base + F (a - b)``; what leaves the box falls between the base and the bound it passed.

    Storn and Price, J. Global Optim. 11 (1997) 341-359, with crossover rate 1.
    """
    back = random.random(base.shape)
    child = base + DIFFERENCE * (a - b)
    child = np.where(child < 0.0, back * base, child)
    return np.where(child > 1.0, 1.0 - back * (1.0 - base), child)


def polynomial_mutation(
    x: FloatArray, unchanged: BoolArray, random: np.random.Generator
) -> FloatArray:
    """Move each variable with probability 1/v; an ``unchanged`` row (n,) moves one at least.

    Deb and Goyal, Computer Science and Informatics 26 (1996) 30-45, within the bounds, with an
    index drawn for each child. Steps of every length, short ones far more often than long ones,
    are those of the breeder genetic algorithm (Muehlenbein and Schlierkamp-Voosen, Evol. Comput.
    1 (1993) 25-49): a population that has drawn together still leaves a local front. A row that
    is still equal to a parent would pay for the same evaluation twice.
    """
    rows, variables = x.shape
    u, chance = random.random((2, rows, variables))
    size = 2.0 * random.random((rows, 1)) - 1.0
    forced = (random.random(rows) * variables).astype(np.int64)
    mutate = chance * variables < 1.0
    mutate[np.flatnonzero(unchanged), forced[unchanged]] = True
    power = ETA_MUTATION * np.exp(MUTATION_SPREAD * size) + 1.0
    down = u < 0.5
    room = np.where(down, 1.0 - x, x)
    share = np.where(down, 2.0 * u, 2.0 * (1.0 - u))
    step = 1.0 - (share + (1.0 - share) * room**power) ** (1.0 / power)
    moved = np.clip(np.where(down, x - step, x + step), 0.0, 1.0)  # rounding may pass the bound
    return np.where(mutate, moved, x)


def draw_pairs(pools: IntArray, random: np.random.Generator) -> IntArray:
    """Two different members (n, 2) of each pool (n, size)."""
    rows, size = pools.shape
    first = (random.random(rows) * size).astype(np.int64)
    second = (random.random(rows) * (size - 1)).astype(np.int64)
    second += second >= first
    row = np.arange(rows)
    return np.stack([pools[row, first], pools[row, second]], axis=1)
