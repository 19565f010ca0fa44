"""Small systems of normal equations in plain lists, written out for the sizes of a traverse.

A traverse has one strength, a centre and a core radius, and NumPy takes longer to be called than such a system takes
to be solved. What is written out for it does the operations of the loops in their order and gives the same numbers.
"""

from __future__ import annotations

import math
from typing import TypeAlias

_SINGULAR = 1e-14  # of a diagonal element: what is left of it is rounding

Reduced: TypeAlias = tuple[float, list[float], list[list[float]], list[list[float]], float]


def reduced(products: list[list[float]], eliminated: int, strength: float | None) -> Reduced:
    """Eliminate the first unknowns of the normal equations, whose right side is the last row and column.

    Returns
    -------
    strength : float
        As given, else the first unknown.
    level : list of float
        The first unknowns, the others being zero.
    upper : list of list of float
        Rows that give the first unknowns once the others are known.
    rest : list of list of float
        Normal equations of the others as relative steps, right side last in each row.
    chi_square : float
        What is left of the lower right element.
    """
    if strength is None and eliminated == 1 and len(products) == 4 and products[0][0] > 0.0:
        return _reduced_by_hand(products)
    rows = _eliminate(products, eliminated)
    upper, rest = rows[:eliminated], [row[eliminated:] for row in rows[eliminated:-1]]
    level = back(upper, [0.0] * len(rest))
    if strength is None:
        strength = level[0]
    square = strength * strength
    for i, row in enumerate(rest):
        row[-1] *= strength
        for k in range(len(rest)):
            row[k] = rest[k][i] if k < i else square * row[k]
    return strength, level, upper, rest, rows[-1][-1]


def _reduced_by_hand(products: list[list[float]]) -> Reduced:
    """The same for one unknown and two others, which is a traverse; ten times faster than the loops."""
    first, (_, d, e, u), (_, _, f, v), (_, _, _, chi_square) = products
    a, b, c, t = first
    by_b, by_c, strength = b / a, c / a, t / a
    square = strength * strength
    e = square * (e - by_b * c)
    rest = [
        [square * (d - by_b * b), e, strength * (u - by_b * t)],
        [e, square * (f - by_c * c), strength * (v - by_c * t)],
    ]
    return strength, [strength], [first], rest, chi_square - strength * t


def solved(equations: list[list[float]], bend: list[list[float]] | None = None) -> tuple[list[float], float]:
    """Step to the minimum of a quadratic, and the decrease of chi-square that it promises."""
    if len(equations) == 2 and (pair := _solved_by_hand(equations, bend)):
        return pair
    if bend:
        equations = [
            [*[a + b for a, b in zip(row, more, strict=False)], row[-1]]
            for row, more in zip(equations, bend, strict=True)
        ]
    rows = _eliminate(equations, len(equations))
    return back(rows, []), sum([row[-1] / row[i] * row[-1] for i, row in enumerate(rows)])


def _solved_by_hand(equations: list[list[float]], bend: list[list[float]] | None) -> tuple[list[float], float] | None:
    """The same for two unknowns; nothing where one depends on the other."""
    (d, e, u), (_, f, v) = equations
    if bend:
        (more_d, more_e), (_, more_f) = bend
        d, e, f = d + more_d, e + more_e, f + more_f
    if not d > 0.0:
        return None
    least = _SINGULAR * f
    by_e = e / d
    f -= by_e * e
    v -= by_e * u
    if not f > least:
        return None
    second = v / f
    return [(u - e * second) / d, second], u / d * u + second * v


def _eliminate(matrix: list[list[float]], count: int) -> list[list[float]]:
    """Gaussian elimination of the first `count` unknowns, without pivoting, as fits a positive matrix.

    Only the upper triangle is right afterwards. A row that depends on those above is left out, its unknown 0.
    """
    rows: list[list[float]] = []
    for i, source in enumerate(matrix):
        row = source[:]
        for j in range(min(i, count)):
            above = rows[j]
            factor = above[i] / above[j]
            for k in range(i, len(row)):
                row[k] -= factor * above[k]
        if i < count and not row[i] > _SINGULAR * source[i]:
            row[i] = math.inf
        rows.append(row)
    return rows


def back(rows: list[list[float]], known: list[float]) -> list[float]:
    """Unknowns of an upper triangle, those after them being known; the right side is last in each row."""
    count = len(rows)
    solution = [0.0] * count + known
    for i in range(count - 1, -1, -1):
        row = rows[i]
        value = row[-1]
        for k in range(i + 1, len(solution)):
            value -= row[k] * solution[k]
        solution[i] = value / row[i]
    return solution[:count]


def inverted(matrix: list[list[float]], size: int) -> list[list[float]]:
    """Inverse of the upper left of a positive matrix; infinite on the diagonal of a row that depends on those above."""
    if size == 3 and (short := _inverted_by_hand(matrix)):
        return short
    inverse = [row[:size] for row in matrix[:size]]
    left_out = []
    for i in range(size):
        row = inverse[i]
        pivot = row[i]
        if not pivot > _SINGULAR * matrix[i][i]:
            left_out.append(i)
            continue
        row[i] = 1.0
        for k in range(size):
            row[k] /= pivot
        for other in inverse:
            if other is not row:
                factor = other[i]
                other[i] = 0.0
                for k in range(size):
                    other[k] -= factor * row[k]
    for i in left_out:
        for k in range(size):
            inverse[i][k] = inverse[k][i] = 0.0
        inverse[i][i] = math.inf
    return inverse


def _inverted_by_hand(matrix: list[list[float]]) -> list[list[float]] | None:
    """The same for three; nothing where one depends on the others."""
    (a, b, c, *_), (_, d, e, *_), (_, _, f, *_) = matrix[:3]
    if not a > 0.0:
        return None
    least_d, least_f = _SINGULAR * d, _SINGULAR * f
    by_b, by_c = b / a, c / a
    d -= by_b * b
    if not d > least_d:
        return None
    e -= by_b * c
    by_e = e / d
    f -= by_c * c + by_e * e
    if not f > least_f:
        return None
    turn = by_b * by_e - by_c
    h, g = -by_e / f, turn / f
    i = 1.0 / d - by_e * h
    j = -by_b / d - by_e * g
    return [[1.0 / a + by_b * by_b / d + turn * g, j, g], [j, i, h], [g, h, 1.0 / f]]


def bent(
    bend: list[list[float]] | None,
    before: list[list[float]],
    now: list[list[float]],
    units: list[float],
    step: list[float],
) -> list[list[float]]:
    """What a step showed of the curvature that products of first derivatives leave out.

    The right side changed by more than the mean of the matrices before and after the step accounts for. The least
    symmetric matrix that makes up for it is added, least in the metric of that mean: [1]_ with a trapezoid.

    Parameters
    ----------
    bend : list of list of float, optional
        What earlier steps showed.
    before, now : list of list of float
        Equations as `reduced` gives them.
    units : list of float
        New unit of each unknown over that of `before`.
    step : list of float
        In the new units.

    References
    ----------
    .. [1] J. E. Dennis, D. M. Gay and R. E. Welsch, ACM Trans. Math. Softw. 7 (1981) 348-368.
    """
    bend = bend or [[0.0] * len(step) for _ in step]
    if len(step) == 2:
        return _bent_by_hand(bend, before, now, units, step)
    missing, pull = [], []
    for old, new, known, unit in zip(before, now, bend, units, strict=True):
        mean = expected = 0.0
        for k, change in enumerate(step):
            mean += 0.5 * (unit * units[k] * old[k] + new[k]) * change
            expected += known[k] * change
        missing.append(unit * old[-1] - new[-1] - mean - expected)
        pull.append(mean)
    size = along = 0.0
    for change, mean, miss in zip(step, pull, missing, strict=True):
        size += mean * change
        along += miss * change
    if not size > 0.0:
        return bend
    half = 0.5 * along / size
    toward = [(miss - half * mean) / size for miss, mean in zip(missing, pull, strict=True)]
    return [
        [known + (a * mean + pull[i] * b) for known, b, mean in zip(row, toward, pull, strict=True)]
        for i, (row, a) in enumerate(zip(bend, toward, strict=True))
    ]


def _bent_by_hand(
    bend: list[list[float]],
    before: list[list[float]],
    now: list[list[float]],
    units: list[float],
    step: list[float],
) -> list[list[float]]:
    """The same for two unknowns, whose matrices are read above the diagonal only."""
    (old_d, old_e, old_u), (_, old_f, old_v) = before
    (d, e, u), (_, f, v) = now
    (bend_d, bend_e), (_, bend_f) = bend
    (first, second), (p, q) = units, step
    mean = 0.5 * (first * second * old_e + e)
    pull_p = 0.5 * (first * first * old_d + d) * p + mean * q
    pull_q = mean * p + 0.5 * (second * second * old_f + f) * q
    size = pull_p * p + pull_q * q
    if not size > 0.0:
        return bend
    miss_p = first * old_u - u - pull_p - (bend_d * p + bend_e * q)
    miss_q = second * old_v - v - pull_q - (bend_e * p + bend_f * q)
    half = 0.5 * (miss_p * p + miss_q * q) / size
    toward_p, toward_q = (miss_p - half * pull_p) / size, (miss_q - half * pull_q) / size
    bend_e += toward_p * pull_q + pull_p * toward_q
    return [
        [bend_d + (toward_p * pull_p + pull_p * toward_p), bend_e],
        [bend_e, bend_f + (toward_q * pull_q + pull_q * toward_q)],
    ]
