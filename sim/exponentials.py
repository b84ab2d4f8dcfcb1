"""Sums of decaying exponentials, ``c[0] + sum c[k] exp(-rate[k] t)``, in plain floats.

``rates[0]`` is always zero and stands for the constant. Enough linear algebra for three banks.
"""

import math
from collections.abc import Sequence
from itertools import pairwise

BISECTIONS = 80


def symmetric_modes(matrix: Sequence[Sequence[float]]) -> tuple[list[float], list[list[float]]]:
    """Return eigenvalues and eigenvectors (a row each) of a small symmetric matrix (cyclic Jacobi rotations)."""
    n = len(matrix)
    a = [list(row) for row in matrix]
    vectors = [[1.0 if i == j else 0.0 for j in range(n)] for i in range(n)]
    for _ in range(50):
        off = sum(a[i][j] ** 2 for i in range(n) for j in range(i))
        if off <= 1e-36 * sum(a[i][i] ** 2 for i in range(n)):
            break
        for p in range(n):
            for q in range(p + 1, n):
                if a[p][q] != 0.0:
                    _rotate(a, vectors, p, q)
    return [a[i][i] for i in range(n)], vectors


def _rotate(a: list[list[float]], vectors: list[list[float]], p: int, q: int) -> None:
    theta = 0.5 * (a[q][q] - a[p][p]) / a[p][q]
    t = math.copysign(1.0, theta) / (abs(theta) + math.sqrt(theta * theta + 1.0))
    c = 1.0 / math.sqrt(t * t + 1.0)
    s = t * c
    for k in range(len(a)):
        akp, akq = a[k][p], a[k][q]
        a[k][p], a[k][q] = c * akp - s * akq, s * akp + c * akq
    for k in range(len(a)):
        apk, aqk = a[p][k], a[q][k]
        a[p][k], a[q][k] = c * apk - s * aqk, s * apk + c * aqk
        vpk, vqk = vectors[p][k], vectors[q][k]
        vectors[p][k], vectors[q][k] = c * vpk - s * vqk, s * vpk + c * vqk
    a[p][q] = a[q][p] = 0.0


def value(coefficients: Sequence[float], rates: Sequence[float], t: float) -> float:
    """Return the sum at time ``t``, second; precise also for very slow rates."""
    start = sum(coefficients)
    return start + sum(c * math.expm1(-r * t) for c, r in zip(coefficients, rates, strict=True) if c != 0.0)


def integral(coefficients: Sequence[float], rates: Sequence[float], t: float) -> float:
    """Return the integral of the sum from 0 to ``t``."""
    return sum(c * _decay_integral(r, t) for c, r in zip(coefficients, rates, strict=True))


def product_integral(a: Sequence[float], b: Sequence[float], rates: Sequence[float], t: float) -> float:
    """Return the integral from 0 to ``t`` of the product of two sums of the same rates."""
    return sum(ca * cb * _decay_integral(ra + rb, t)
               for ca, ra in zip(a, rates, strict=True) if ca != 0.0
               for cb, rb in zip(b, rates, strict=True) if cb != 0.0)


def _decay_integral(rate: float, t: float) -> float:
    return t if rate == 0.0 else -math.expm1(-rate * t) / rate


def first_upward_crossing(coefficients: Sequence[float], rates: Sequence[float], t_max: float) -> float | None:
    """Return the first time in [0, t_max] at which the sum is above zero, or None.

    Exact: between two neighbouring extremes, which are found first, the sum is monotone.
    """
    if sum(coefficients) > 0.0:
        return 0.0
    terms = [(r, c) for r, c in sorted(zip(rates, coefficients, strict=True)) if c != 0.0]
    merged: list[tuple[float, float]] = []
    for r, c in terms:
        if merged and merged[-1][0] == r:
            merged[-1] = (r, merged[-1][1] + c)
        else:
            merged.append((r, c))
    if sum(max(0.0, c) for _, c in merged) <= 0.0:
        return None
    return next((root for root, upward in _roots(merged, t_max) if upward), None)


def _at(terms: Sequence[tuple[float, float]], t: float) -> float:
    return sum(c * math.exp(-r * t) for r, c in terms)


def _roots(terms: Sequence[tuple[float, float]], t_max: float) -> list[tuple[float, bool]]:
    """Return the roots in (0, t_max] and whether the sum rises through them.

    The derivative, freed of its slowest factor, has one term less: hence the recursion.
    """
    if len(terms) < 2:
        return []
    slowest = terms[0][0]
    terms = [(r - slowest, c) for r, c in terms]
    extremes = [t for t, _ in _roots([(r, -r * c) for r, c in terms[1:]], t_max)]
    bounds = [0.0, *extremes, t_max]
    found: list[tuple[float, bool]] = []
    for low, high in pairwise(bounds):
        at_low, at_high = _at(terms, low), _at(terms, high)
        if at_low == 0.0 or (at_low < 0.0) == (at_high < 0.0):
            continue
        for _ in range(BISECTIONS):
            middle = 0.5 * (low + high)
            if (_at(terms, middle) < 0.0) == (at_low < 0.0):
                low = middle
            else:
                high = middle
        found.append((high, at_low < 0.0))
    return found
