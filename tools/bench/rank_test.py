"""Is B slower than A? Two samples of times, one value a launch of a program: rank test, ratio with its interval, correction.

The test is that of Mann and Whitney, two-sided: it asks for no distribution and one wild launch weighs no more than a rank.
The ratio is the median of all b_j / a_i (Hodges and Lehmann's estimate, on logarithms); its interval is the one that turns
the test around: the ratios by which B could be divided without the test at 1 - confidence objecting.
Several benchmarks at once: p-values by Holm's step-down, so that the chance of even one false alarm stays below alpha.

Sources: H.B. Mann, D.R. Whitney, Ann. Math. Stat. 18, 1947; M. Hollander, D.A. Wolfe, "Nonparametric Statistical Methods",
2nd ed., 1999, ch. 4; S. Holm, Scand. J. Stat. 6, 1979.
"""
import math
from dataclasses import dataclass

import numpy
from scipy import stats


def p_value(a, b):
    """Two-sided; exact without ties up to 64 values together, else the normal approximation with its corrections."""
    exact = len(a) + len(b) <= 64 and len(set(a) | set(b)) == len(a) + len(b)
    return float(stats.mannwhitneyu(a, b, alternative="two-sided", method="exact" if exact else "asymptotic").pvalue)


def smallest_p(m, n):
    """What the test can say at most: all of one side below all of the other."""
    return 2.0 / math.comb(m + n, m)


def share_of_u(m, n):
    """P(U = 0), P(U = 1), ... of the null distribution, from its generating function: the Gaussian binomial."""
    counts = numpy.zeros(m * n + 1, dtype=object)  # whole numbers of any size
    counts[0] = 1
    for i in range(1, m + 1):  # times (1 - q^(n + i)) / (1 - q^i)
        for k in range(m * n, n + i - 1, -1):
            counts[k] -= counts[k - n - i]
        for k in range(i, m * n + 1):
            counts[k] += counts[k - i]
    return [float(c / math.comb(m + n, m)) for c in counts]


def critical_u(m, n, alpha):
    """Largest u with P(U <= u) <= alpha / 2; -1 if there is none."""
    total, u = 0.0, -1
    for k, share in enumerate(share_of_u(m, n)):
        total += share
        if total > 0.5 * alpha:
            break
        u = k
    return u


def ratio_interval(a, b, confidence=0.95):
    """Ratio b over a, and the ends of its interval; infinite where there are too few values for that confidence."""
    ratios = sorted(y / x for x in a for y in b)
    u = critical_u(len(a), len(b), 1.0 - confidence)
    ratio = math.exp(float(numpy.median(numpy.log(ratios))))
    return (ratio, ratios[u], ratios[-1 - u]) if u >= 0 else (ratio, 0.0, math.inf)


def holm(p_values):
    """Adjusted p-values, in the order given."""
    order = sorted(range(len(p_values)), key=lambda i: p_values[i])
    adjusted, least = [0.0] * len(p_values), 0.0
    for rank, i in enumerate(order):
        least = max(least, min(1.0, (len(p_values) - rank) * p_values[i]))
        adjusted[i] = least
    return adjusted


@dataclass
class Verdict:
    name: str
    base_ns: float  # medians
    new_ns: float
    ratio: float  # new over base, with the ends of its interval
    low: float
    high: float
    p: float  # adjusted
    verdict: str  # "slower", "faster", "same": past the threshold and significant, or not


def judge(base, new, threshold=0.05, alpha=0.01, confidence=0.95):
    """A Verdict for each benchmark that both sides have; base, new: name -> times in ns, one a launch."""
    names = [name for name in base if name in new]
    adjusted = holm([p_value(base[name], new[name]) for name in names])
    verdicts = []
    for name, p in zip(names, adjusted):
        ratio, low, high = ratio_interval(base[name], new[name], confidence)
        word = "same"
        if p < alpha and ratio > 1.0 + threshold:
            word = "slower"
        elif p < alpha and ratio < 1.0 / (1.0 + threshold):
            word = "faster"
        verdicts.append(Verdict(name, float(numpy.median(base[name])), float(numpy.median(new[name])), ratio, low, high, p, word))
    return verdicts
