"""How likely something is by chance alone: tails of the usual distributions, and of runs of equal sign.

Written out from their series, since numpy has none of them; tests hold each to scipy's.
"""

from __future__ import annotations

from math import erfc, exp, lgamma, log, log1p, pi, sqrt

LARGE = 400  # degrees of freedom from which on the cube-root form of Wilson and Hilferty is used
TINY = 1e-300
STEPS = 300


def beyond_normal(z: float) -> float:
    """Chance that a standard normal value lies above z."""
    return 0.5 * erfc(z / sqrt(2.0))


def above_chi_square(value: float, freedom: int) -> float:
    """Chance that chi-square with so many degrees of freedom lies above a value; finite sums, else Wilson-Hilferty."""
    if value <= 0.0:
        return 1.0
    if freedom > LARGE:
        spread = 2.0 / (9.0 * freedom)
        return beyond_normal(((value / freedom) ** (1.0 / 3.0) - 1.0 + spread) / sqrt(spread))
    half = 0.5 * value
    if freedom % 2 == 0:
        return _terms(half, 0.0, -half, freedom // 2)
    return erfc(sqrt(half)) + _terms(half, 0.5, -half + 0.5 * log(half) - 0.5 * log(pi) + log(2.0), freedom // 2)


def _terms(half: float, shift: float, first: float, number: int) -> float:
    """The sum of `number` terms that each stand to the last as half / (index + shift); `first` is a logarithm."""
    term, total = first, 0.0
    for index in range(number):
        total += exp(term)
        term += log(half) - log(index + 1.0 + shift)
    return min(1.0, total)


def below_f(value: float, freedom: int, other: int) -> float:
    """Chance that a ratio of variances lies below a value: `freedom` above the line, `other` below it."""
    if value <= 0.0:
        return 0.0
    return beta_share(freedom * value / (freedom * value + other), 0.5 * freedom, 0.5 * other)


def beyond_t(value: float, freedom: int) -> float:
    """Chance that Student's t lies farther from 0 than a value, on either side."""
    return beta_share(freedom / (freedom + value * value), 0.5 * freedom, 0.5)


def beta_share(x: float, a: float, b: float) -> float:
    """Regularised incomplete beta function, by its continued fraction."""
    if x <= 0.0 or x >= 1.0:
        return 0.0 if x <= 0.0 else 1.0
    if x > (a + 1.0) / (a + b + 2.0):
        return 1.0 - beta_share(1.0 - x, b, a)
    front = lgamma(a + b) - lgamma(a) - lgamma(b) + a * log(x) + b * log1p(-x)
    return exp(front) / a / _fraction(x, a, b)


def _fraction(x: float, a: float, b: float) -> float:
    """The continued fraction 1 + d1/(1 + d2/(1 + ...)) by the modified method of Lentz."""
    value, up, down = 1.0, 1.0, 0.0
    for step in range(1, STEPS):
        half = step // 2
        if step % 2:
            part = -(a + half) * (a + b + half) * x / ((a + 2 * half) * (a + 2 * half + 1.0))
        else:
            part = half * (b - half) * x / ((a + 2 * half - 1.0) * (a + 2 * half))
        down = 1.0 / (1.0 + part * down or TINY)
        up = 1.0 + part / up or TINY
        value *= up * down
        if abs(up * down - 1.0) < 1e-14:
            break
    return value


def longest_run(length: int, number: int) -> float:
    """Chance that `number` values, each equally likely on either side, show so many running on one side."""
    if length <= 1:
        return 1.0
    # ends[k]: chance that no such run has come up and that the last k+1 values lie on one side
    ends = [1.0] + [0.0] * (length - 2)
    for _ in range(number - 1):
        ends = [0.5 * sum(ends), *(0.5 * one for one in ends[:-1])]
    return 1.0 - sum(ends)


def farthest_of(statistic: float, number: int) -> float:
    """Chance (upper bound) that the value farthest from the mean of `number` lies so many deviations off (Grubbs)."""
    square = statistic * statistic
    room = (number - 1) ** 2 - number * square
    if number < 3 or room <= 0.0:
        return 0.0 if number >= 3 else 1.0
    t = sqrt(square * number * (number - 2) / room)
    return min(1.0, number * beyond_t(t, number - 2))
