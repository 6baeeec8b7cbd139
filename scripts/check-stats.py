#!/usr/bin/env python3
"""Compares the statistics with SciPy and statsmodels over thousands of random inputs per function.

    pip install -r scripts/requirements.txt
    cargo build --release --example stats_probe
    scripts/check-stats.py [--inputs 2000] [--seed 1] [--probe target/release/examples/stats_probe]

Prints, per function, the worst relative error and the input that gave it. Exit 1 if one is above 1e-9 (interval ends:
1e-8). Extremes are among the inputs: 0 of 10^12, 10^9 of 10^12, a single run, confidence 0.5 to 1 - 1e-9.
Where the two differ by more than a hundredth of the limit, high-precision arithmetic (mpmath) says who is right; the
column "overruled" counts how often SciPy was beyond the limit and the project's answer was not.
"""

import argparse
import gc
import json
import math
import random
import subprocess
import sys
import warnings
from fractions import Fraction

import mpmath as mp
import numpy as np
import statsmodels.api as sm
from scipy import linalg, optimize, special, stats
from statsmodels.stats.multitest import multipletests

warnings.filterwarnings("ignore")
mp.mp.dps = 50
NODES = [(mp.mpf(float(x)), float(w)) for x, w in zip(*np.polynomial.legendre.leggauss(16))]
TINY = 1e-290  # p-values below this are compared as zero
rng = random.Random()


# --- inputs -------------------------------------------------------------------------------------------------------


def confidence():
    return rng.choice([0.5, 0.9, 0.95, 0.99, 1 - 1e-9, 1 - 10 ** rng.uniform(-9, -0.302), rng.uniform(0.5, 0.9999)])


def big(limit):
    """A count from 0 to limit, every order of magnitude equally often."""
    return min(limit, int(10 ** rng.uniform(0, math.log10(limit + 1))) - rng.choice([0, 1]))


def hits():
    n = rng.choice([1, 2, 10, 100, 10**12, max(1, big(10**12)), max(1, big(10**12)), max(1, big(10**4))])
    x = rng.choice([0, min(1, n), n // 1000, big(n), big(n), n - big(n), n, rng.randint(0, n)])
    return x, n


def exposure():
    return rng.choice([1.0, 10 ** rng.uniform(-6, 9)])


def near(x, n):
    """A null probability at which x of n is neither certain nor hopeless."""
    p = (x + 0.5) / (n + 1)
    p *= math.exp(rng.gauss(0, 2) / math.sqrt(min(x, n - x) + 1))
    return min(max(p, 1e-13), 1 - 1e-13)


def pair():
    x, t, u = big(10**rng.choice([1, 3, 6])), exposure(), exposure()
    ratio = math.exp(rng.gauss(0, 2) / math.sqrt(x + 1))
    y = int(np.random.default_rng(rng.getrandbits(32)).poisson(min(x / t * u * ratio, 1e6)))
    return x, t, y, u


def table():
    size = rng.choice([3, 10, 100, 1000])
    return tuple(rng.randint(0, rng.choice([size, 3])) for _ in range(4))


def p_values():
    return tuple(10 ** rng.uniform(-12, 0) if rng.random() < 0.5 else round(rng.random(), 2) for _ in range(rng.randint(1, 60)))


# --- independent answers ------------------------------------------------------------------------------------------


def clopper_pearson(x, n, conf, sides=2):
    a = (1 - conf) / sides
    return (stats.beta.ppf(a, x, n - x + 1) if x else 0.0, stats.beta.isf(a, x + 1, n - x) if x < n else 1.0)


def garwood(x, t, conf, sides=2):
    a = (1 - conf) / sides
    return (special.gammaincinv(x, a) / t if x else 0.0, special.gammainccinv(x + 1, a) / t)


def bisected(f, lo, hi):
    return optimize.brentq(f, lo, hi, xtol=1e-15, rtol=1e-15, maxiter=500)


def mid_p(x, n, conf):
    a = (1 - conf) / 2
    if x in (0, n):
        edge = 1 - mp.mpf(1 - conf) ** (mp.mpf(1) / n)
        return (0.0, float(edge)) if x == 0 else (float(1 - edge), 1.0)
    # the mean of the tails at x and beyond x
    below = lambda v: (special.betaincc(x, n - x + 1, special.expit(v)) + special.betaincc(x + 1, n - x, special.expit(v))) / 2
    above = lambda v: (special.betainc(x, n - x + 1, special.expit(v)) + special.betainc(x + 1, n - x, special.expit(v))) / 2
    mid, step = math.log((x + 0.5) / (n - x + 0.5)), 60 * (1 / (x + 0.5) + 1 / (n - x + 0.5)) ** 0.5
    return (
        special.expit(bisected(lambda v: above(v) - a, mid - step, mid)),
        special.expit(bisected(lambda v: below(v) - a, mid, mid + step)),
    )


def mid_p_rate(x, t, conf):
    a = (1 - conf) / 2
    if x == 0:
        return 0.0, -math.log(1 - conf) / t
    below = lambda v: (special.gammaincc(x, math.exp(v)) + special.gammaincc(x + 1, math.exp(v))) / 2
    above = lambda v: (special.gammainc(x, math.exp(v)) + special.gammainc(x + 1, math.exp(v))) / 2
    mid, step = math.log(x), 40 / x**0.5
    return math.exp(bisected(lambda v: above(v) - a, mid - step, mid)) / t, math.exp(bisected(lambda v: below(v) - a, mid - 1 / x, mid + step)) / t


def wilson(x, n, conf):
    z, p = mp.sqrt(2) * mp.erfinv(mp.mpf(conf)), mp.mpf(x) / n
    centre, half = p + z**2 / (2 * n), z * mp.sqrt(p * (1 - p) / n + z**2 / (4 * mp.mpf(n) ** 2))
    low, high = (centre - half) / (1 + z**2 / n), (centre + half) / (1 + z**2 / n)
    return (float(low) if x else 0.0), float(high)


def exact_test(x, n, p):
    return (stats.binomtest(x, n, p).pvalue,)


def compare_rates(x, t, y, u, ratio):
    n, p = x + y, t * ratio / (t * ratio + u)
    if n == 0:
        return 1.0, 0.5, 1.0, 0.5, 1.0
    law, point = stats.binom(n, p), stats.binom.pmf(x, n, p)
    up, down = law.sf(x - 1), law.cdf(x)
    return up, law.sf(x) + point / 2, down, law.cdf(x - 1) + point / 2, stats.binomtest(x, n, p).pvalue


def rate_ratio(x, t, y, u, conf):
    a, n = (1 - conf) / 2, x + y
    # through F quantiles, not through the beta law
    low = x / (y + 1) * stats.f.ppf(a, 2 * x, 2 * y + 2) if x else 0.0
    high = (x + 1) / y * stats.f.isf(a, 2 * x + 2, 2 * y) if y else math.inf
    return low * u / t, high * u / t


def fisher_exact(a, b, c, d):
    cells = [[a, b], [c, d]]
    return tuple(stats.fisher_exact(cells, alternative=side).pvalue for side in ("greater", "less", "two-sided"))


def odds_ratio(a, b, c, d, conf):
    rows, col = (a + b, c + d), a + c
    k = np.arange(max(0, col - rows[1]), min(rows[0], col) + 1)
    base = special.gammaln([rows[0] + 1]) - special.gammaln(k + 1) - special.gammaln(rows[0] - k + 1)
    base = base + special.gammaln(rows[1] + 1) - special.gammaln(col - k + 1) - special.gammaln(rows[1] - col + k + 1)

    def weights(v):
        w = base + k * v
        w = np.exp(w - w.max())
        return w / w.sum()

    alpha = (1 - conf) / 2
    solve = lambda f: math.exp(bisected(f, -400, 400))
    least, most = a == k[0], a == k[-1]
    estimate = 0.0 if least else math.inf if most else solve(lambda v: (k * weights(v)).sum() - a)
    low = 0.0 if least else solve(lambda v: weights(v)[k >= a].sum() - alpha)
    high = math.inf if most else solve(lambda v: weights(v)[k <= a].sum() - alpha)
    return estimate, low, high


def dispersion(counts, exposures):
    x, t = np.array(counts, float), np.array(exposures)
    e = x.sum() * t / t.sum()
    chi = ((x - e) ** 2 / e).sum()
    return chi, stats.chi2.sf(chi, len(x) - 1)


def gamma_fit(counts, exposures):
    """The two score equations, by Newton in high precision from the program's own answer."""
    x, t = [mp.mpf(v) for v in counts], [mp.mpf(v) for v in exposures]

    def scores(a, b):
        by_shape = mp.fsum(mp.digamma(a + v) - mp.digamma(a) + mp.log(b / (b + s)) for v, s in zip(x, t))
        return by_shape, mp.fsum(a / b - (a + v) / (b + s) for v, s in zip(x, t))

    with mp.workdps(25):
        return tuple(float(v) for v in mp.findroot(scores, OURS, tol=1e-30))


def gamma_posterior(a, b, x, t, conf):
    side = (1 - conf) / 2
    return special.gammaincinv(a + x, side) / (b + t), special.gammainccinv(a + x, side) / (b + t)


def clustered_rate(counts, exposures, conf):
    x, t, side = np.array(counts, float), np.array(exposures), (1 - conf) / 2
    rate, m = x.sum() / t.sum(), len(x)
    d = m / (m - 1) * ((x - rate * t) ** 2).sum() / x.sum()
    d = 1.0 if d <= 1 else d * (stats.t.isf(side, m - 1) / stats.norm.isf(side)) ** 2
    k = x.sum() / d
    return special.gammaincinv(k, side) * d / t.sum(), special.gammainccinv(k + 1, side) * d / t.sum()


def chance_of_scatter(counts, exposures):
    """Fisher's test from one event a cluster on, else the Poisson tail of pairs in one cluster."""
    x, t = [int(v) for v in counts], [mp.mpf(v) for v in exposures]
    n, total = sum(x), mp.fsum(t)
    if n < 2:
        return (1.0,)
    if n >= len(x):
        chi = mp.fsum((v - n * s / total) ** 2 / (n * s / total) for v, s in zip(x, t))
        return (float(mp.gammainc(mp.mpf(len(x) - 1) / 2, chi / 2, regularized=True)),)
    pairs = sum(v * (v - 1) // 2 for v in x)
    mean = mp.mpf(n * (n - 1)) / 2 * mp.fsum(s * s for s in t) / total**2
    return (float(mp.gammainc(pairs, 0, mean, regularized=True)) if pairs else 1.0,)


def sequential(good, bad, alpha, beta, most, rate):
    """The same plan as a chain in continuous time: exponential of its generator over each stretch."""
    slope = math.log(bad / good) / (bad - good)
    up, down = math.log((1 - alpha) / beta) / (bad - good), math.log((1 - beta) / alpha) / (bad - good)
    end = max(slope * most + (up - down) / 2, up)
    accept = [min(slope * k + up, end) for k in range(most)]
    reject = {k: min(slope * k - down, end) for k in range(1, most) if slope * k - down > 0} | {most: end}
    # states: counts 0 … most - 1, rejected, and a clock that integrates the time in the open states
    state, now, accepted = np.zeros(most + 2), 0.0, 0.0
    state[0] = 1
    for cut in sorted({*accept, *reject.values()}):
        limit = min(k for k, until in reject.items() if until >= cut)
        flow = np.zeros((most + 2, most + 2))
        for k in range(most):
            flow[k, k], flow[k, most + 1] = -rate, 1.0
            flow[k, k + 1 if k + 1 < limit else most] += rate
        state[most] += state[limit:most].sum()
        state[limit:most] = 0
        state = state @ linalg.expm(flow * (cut - now))
        for k in range(most):
            if accept[k] <= cut:
                accepted, state[k] = accepted + state[k], 0.0
        now = cut
    return accepted, state[most], state[most + 1]


def comparison_power(m1, t1, m2, t2, level):
    total, p0, p1 = stats.poisson(m1 + m2), t1 / (t1 + t2), m1 / (m1 + m2)
    reach = 12 * (m1 + m2) ** 0.5 + 80
    low, high = int(max(m1 + m2 - reach, 0)), int(m1 + m2 + reach)
    n = np.arange(low, high + 1)
    critical = stats.binom.isf(level, n, p0) + 1
    critical = np.where(stats.binom.sf(critical - 2, n, p0) <= level, critical - 1, critical)
    power = (total.pmf(n) * stats.binom.sf(critical - 1, n, p1)).sum()
    return OURS if max(power, *OURS) < 1e-15 else (power,)  # smaller ones are not resolved, and of no use


def jackknife_ratio(tops, bottoms, conf):
    """Leaving one out in exact fractions."""
    pairs = [(Fraction(n), Fraction(d)) for n, d in zip(tops, bottoms)]
    m, top, bottom = len(pairs), sum(n for n, _ in pairs), sum(d for _, d in pairs)
    ratio, without = top / bottom, [(top - n) / (bottom - d) for n, d in pairs]
    mean = sum(without) / m
    error = mp.sqrt(exact((m - 1) * sum((v - mean) ** 2 for v in without) / m))
    reach = error * mp.mpf(stats.t.isf((1 - conf) / 2, m - 1))
    middle = exact(ratio)
    return tuple(float(v) for v in (middle, exact((m - 1) * (mean - ratio)), error, middle - reach, middle + reach))


def exact(fraction):
    return mp.mpf(fraction.numerator) / fraction.denominator


def line_limits(slope, level, at_mean, conf, away, chi, cov, readings):
    """Everything that the program prints, from the fit and the covariance of level and slope at at_mean."""
    degrees, side = readings - 2, (1 - conf) / 2
    wide = chi > degrees and stats.chi2.sf(float(chi), degrees) <= 0.05
    reach = float(stats.t.isf(side, degrees)) * mp.sqrt(chi / degrees) if wide else float(stats.norm.isf(side))
    around = lambda middle, variance: [middle + sign * reach * mp.sqrt(variance) for sign in (0, -1, 1)]
    far = away - at_mean
    lines = [
        around(slope, cov[1][1]),
        [mp.exp(10 * v) for v in around(slope, cov[1][1])],
        [mp.exp(v) for v in around(level, cov[0][0])],
        [mp.exp(v) for v in around(level + far * slope, cov[0][0] + 2 * far * cov[0][1] + far * far * cov[1][1])],
    ]
    scatter = float(chi / degrees)
    if max(scatter, OURS[12]) < 1e-9:
        scatter = OURS[12]  # a line through all readings: what is left is rounding
    return tuple(float(v) for line in lines for v in line) + (scatter, float(wide))


def log_linear(counts, exposures, at, conf, away):
    x, t, y = np.array(at), np.array(exposures), np.array(counts, float)
    middle = (x * y).sum() / y.sum()
    design = np.column_stack([np.ones(len(x)), x - middle])
    fit = sm.GLM(y, design, family=sm.families.Poisson(), offset=np.log(t)).fit(tol=1e-15, maxiter=200)
    return line_limits(fit.params[1], fit.params[0], middle, conf, away, fit.pearson_chi2, fit.cov_params(), len(y))


def nb_tables(counts, exposures):
    x, t = np.array(counts, float), np.array(exposures)

    def likelihood(rate, k):
        m = rate * t
        parts = special.gammaln(x + k) - special.gammaln(k) - special.gammaln(x + 1) - (x + k) * np.log1p(m / k)
        return (parts + x * np.log(m / k)).sum()

    def by_shape(rate, k):
        m = rate * t
        return (special.digamma(x + k) - special.digamma(k) - np.log1p(m / k) + (m - x) / (k + m)).sum()

    by_rate = lambda rate, k: ((x - rate * t) / (1 + rate * t / k)).sum()
    return x, t, likelihood, by_shape, by_rate


def best_shape(score, value):
    """The shape of greatest likelihood: every change of sign of the score on a grid, and the Poisson end."""
    grid = np.linspace(-60, 12, 145)
    scores = [score(math.exp(v)) for v in grid]
    found = [math.exp(bisected(lambda v: score(math.exp(v)), a, b)) for a, b, f, g in zip(grid, grid[1:], scores, scores[1:]) if f > 0 >= g]
    return max(found + [1e12], key=value)


def negative_binomial_rate(counts, exposures, conf):
    x, t, likelihood, by_shape, by_rate = nb_tables(counts, exposures)
    poisson = lambda rate: (x * np.log(rate * t) - rate * t - special.gammaln(x + 1)).sum()
    value = lambda rate, k: poisson(rate) if k == 1e12 else likelihood(rate, k)
    fall, pooled = stats.chi2.isf(1 - conf, 1) / 2, x.sum() / t.sum()
    if not x.sum():
        return 0.0, 0.0, fall / t.sum(), math.inf
    rate_for = lambda k: pooled * math.exp(bisected(lambda v: by_rate(pooled * math.exp(v), k), -60, 60))
    shape = best_shape(lambda k: by_shape(rate_for(k), k), lambda k: value(pooled if k == 1e12 else rate_for(k), k))
    if shape == 1e12:
        rate, profile = pooled, poisson
    else:
        rate = rate_for(shape)
        profile = lambda r: (lambda k: value(r, k))(best_shape(lambda k: by_shape(r, k), lambda k: value(r, k)))
    goal = value(rate, shape) - fall
    limit = lambda far: rate * math.exp(bisected(lambda v: profile(rate * math.exp(v)) - goal, *sorted((0, far))))
    step = fall**0.5 * 0.1
    while step < 600 and profile(rate * math.exp(step)) > goal:
        step = min(2 * step, 600)
    down = fall**0.5 * 0.1
    while down < 600 and profile(rate * math.exp(-down)) > goal:
        down = min(2 * down, 600)
    return rate, limit(-down), limit(step) if step < 600 else math.inf, math.inf if shape == 1e12 else shape


def walk(accept, reject, rate):
    """A plan as convolutions with Poisson laws: probabilities of acceptance and rejection, mean exposure."""
    most, now, accepted, rejected, spent = len(accept), 0.0, 0.0, 0.0, 0.0
    state, first = np.array([1.0]), 0
    ends = np.maximum.accumulate(reject)  # the first event number that rejects at a time: ends holds 0 for "never"
    for cut in np.unique(np.concatenate([accept, reject[reject > 0]])):
        limit = int(np.searchsorted(ends, cut))
        mean, keep = rate * (cut - now), max(limit - first, 0)
        rejected += state[keep:].sum()
        state = state[:keep]
        j = np.arange(keep + 1)
        above = stats.poisson.sf(j, mean)  # P(X > j)
        for k, share in enumerate(state):
            rejected += share * (above[keep - k - 1] if keep > k else 1.0)
            spent += share * above[: keep - k].sum() / rate
        state = np.convolve(state, stats.poisson.pmf(j[:-1], mean))[:keep] if keep else state
        done = int(np.searchsorted(accept, cut, side="right"))
        gone = min(max(done - first, 0), len(state))
        accepted += state[:gone].sum()
        state, first, now = state[gone:], max(first, done), cut
    return accepted, rejected, spent


def fixed_plan(good, bad, alpha, beta):
    number = next(r for r in range(1, 10**6) if special.gammainccinv(r, beta) / bad <= special.gammaincinv(r, alpha) / good)
    end = special.gammainccinv(number, beta) / bad
    hit, spent = stats.poisson.sf(number - 1, good * end), lambda rate: stats.poisson.sf(np.arange(number), rate * end).sum() / rate
    return (hit, beta, spent(good), spent(bad), end) + (end,) * number + (0.0,) * number + (end,)


def wald_plan(good, bad, alpha, beta, most, end):
    """Lines at likelihood ratios of 1 / risk for four fifths of the risks, cut off at an event number and an exposure."""
    k, slope = np.arange(most + 1), math.log(bad / good) / (bad - good)
    reject = np.clip(slope * k + math.log(0.8 * alpha) / (bad - good), 0, end)
    reject[0], reject[most] = 0, end
    return np.minimum(slope * k[:-1] - math.log(0.8 * beta) / (bad - good), end), reject


def plan_risks(good, bad, alpha, beta):
    most, end = (len(OURS) - 6) // 2, OURS[4]
    keeps = lambda at, to: walk(*wald_plan(good, bad, alpha, beta, at, to), bad)[0] - beta
    # one event less: wherever the end is put, a risk is broken
    if most > 1:
        last = (math.log(bad / good) * (most - 2) - math.log(0.8 * beta)) / (bad - good)
        if keeps(most - 1, last) <= 0:
            to = optimize.brentq(lambda to: keeps(most - 1, to), last * 1e-3, last, xtol=1e-12 * last)
            if walk(*wald_plan(good, bad, alpha, beta, most - 1, to), good)[1] <= alpha * (1 - 1e-9):
                return ("one event less would do",)
    accept, reject = wald_plan(good, bad, alpha, beta, most, end)
    at_good, at_bad = walk(accept, reject, good), walk(accept, reject, bad)
    kept = at_good[1] <= alpha * (1 + 1e-12) and abs(at_bad[0] - beta) <= 1e-9 * beta
    # the end is right if it uses up the risk of accepting the bad rate
    return (at_good[1], beta, at_good[2], at_bad[2], end) + tuple(accept) + tuple(reject) if kept else ("risk broken", at_good, at_bad)


def exposure_to_compare(first, second, ratio, level, power):
    mean_of = lambda exposure: exposure * (first + ratio * second)
    p0, p1, mean = 1 / (1 + ratio), first / (first + ratio * second), mean_of(OURS[0])
    far = mean + 6 * mean**0.5 + 4 / p0 + 10
    n = np.arange(int(max(0, mean - 15 * mean**0.5 - 100)), int(far + 12 * far**0.5 + 100))
    critical = stats.binom.isf(level, n, p0) + 1
    critical = np.where(stats.binom.sf(critical - 2, n, p0) <= level, critical - 1, critical)
    given = stats.binom.sf(critical - 1, n, p1)
    lack = lambda m: (stats.poisson.pmf(n, m) * given).sum() - power
    step = mean**0.5 / 50
    if any(lack(m) < -1e-11 for m in np.arange(mean * (1 + 1e-9), far, max(step, (far - mean) / 400))):
        return ("falls below again",)
    if not lack(mean - step / 2) < 0 < lack(mean + step / 2):
        return ("no crossing here",)
    return (bisected(lack, mean - step / 2, mean + step / 2) / (first + ratio * second),)


def exposure_to_show_below(bound, true, conf, probability):
    for allowed in range(10**7):
        exposure = special.gammainccinv(allowed + 1, 1 - conf) / bound
        passed = special.pdtr(allowed, true * exposure)
        if passed >= probability:
            return exposure, allowed, passed


def adjusted(kind):
    return lambda p: tuple(multipletests(p, method=kind)[1])


def episodes(times, gap):
    found = []
    for t in sorted(times):
        if found and t - found[-1][1] < gap:
            found[-1][1:] = [t, found[-1][2] + 1]
        else:
            found.append([t, t, 1])
    return tuple(float(v) for e in found for v in e)


def enough_runs(p, x, conf, answer, tail=lambda x, n, p: stats.binom.cdf(x, n, p)):
    """The answer itself if it proves the bound and one run less does not; else a neighbour."""
    a = 1 - conf
    if tail(x, answer, p) > a * (1 + 1e-9):
        return (answer + 1,)
    if answer - 1 > x and tail(x, answer - 1, p) <= a * (1 - 1e-9):
        return (answer - 1,)
    return (answer,)


# --- the last word ------------------------------------------------------------------------------------------------


def mp_ln_point(x, n, p):
    p = mp.mpf(p)
    choose = mp.loggamma(n + 1) - mp.loggamma(x + 1) - mp.loggamma(n - x + 1)
    return choose + x * mp.log(p) + (n - x) * mp.log1p(-p)


def mp_sum(point, ratio):
    """point (1 + r(0) + r(0) r(1) + …) for falling terms."""
    total, term, j = mp.mpf(1), mp.mpf(1), 0
    with mp.workdps(30):
        while term > total * mp.mpf(10) ** -22:
            term *= ratio(j)
            total, j = total + term, j + 1
    return point * total


def mp_tail_integral(ln_density, edge, direction, spread, distance):
    """Integral of a density from edge outwards; spread is its standard deviation, distance that of the edge from the
    mean in such units. The logarithm of the density is taken as it stands: high precision affords the cancellation."""
    reach = (mp.sqrt(distance**2 + 110) - distance) * spread * mp.mpf("1.5")
    panels = int(reach * (1 + distance) / spread) + 1
    half, peak, total = direction * reach / panels / 2, ln_density(edge), mp.mpf(0)
    for panel in range(panels):
        middle = edge + (2 * panel + 1) * half
        total += sum(w * mp.exp(ln_density(middle + half * x) - peak) for x, w in NODES)
    return abs(half * total) * mp.exp(peak)


def mp_binomial(x, n, p, side):
    """P(X <= x) or P(X >= x), from x away from the mean: by adding, or as the integral of the beta density."""
    p = mp.mpf(p)
    if x < 0 or x > n:
        return mp.mpf(0)  # asked only as the complement of everything
    if (side == "below") != (x <= n * p):
        return 1 - (mp_binomial(x + 1, n, p, "above") if side == "below" else mp_binomial(x - 1, n, p, "below"))
    odds, variance = p / (1 - p), n * p * (1 - p)
    if variance < 10**5 or min(x, n - x) < 10**4:
        point = mp.exp(mp_ln_point(x, n, p))
        return mp_sum(point, (lambda j: (x - j) / (n - x + 1 + j) / odds) if side == "below" else (lambda j: (n - x - j) * odds / (x + 1 + j)))
    k = x if side == "above" else x + 1  # P(X >= k) = I_p(k, n - k + 1)
    ln_beta = mp.loggamma(k) + mp.loggamma(n - k + 1) - mp.loggamma(n + 1)
    ln_density = lambda s: (k - 1) * mp.log(s) + (n - k) * mp.log1p(-s) - ln_beta
    spread = mp.sqrt(mp.mpf(k) * (n - k) / n) / n
    return mp_tail_integral(ln_density, p, -1 if side == "above" else 1, spread, abs(mp.mpf(k) / n - p) / spread)


def mp_poisson(x, mean, side):
    mean = mp.mpf(mean)
    if x < 0:
        return mp.mpf(0)
    if (side == "below") != (x <= mean):
        return 1 - (mp_poisson(x + 1, mean, "above") if side == "below" else mp_poisson(x - 1, mean, "below"))
    if x < 10**5:
        point = mp.exp(x * mp.log(mean) - mean - mp.loggamma(x + 1))
        return mp_sum(point, (lambda j: (x - j) / mean) if side == "below" else (lambda j: mean / (x + 1 + j)))
    k = x if side == "above" else x + 1
    ln_gamma = mp.loggamma(k)
    ln_density = lambda s: (k - 1) * mp.log(s) - s - ln_gamma
    return mp_tail_integral(ln_density, mean, -1 if side == "above" else 1, mp.sqrt(k), abs(k - mean) / mp.sqrt(k))


def polished(theta, tail, slope, alpha):
    """One Newton step from theta in high precision: the true limit, if theta was near it."""
    return theta - (tail(theta) - mp.mpf(alpha)) / slope(theta)


def judge_binomial(conf_sides, half=False, raw=False):
    def judge(ours, x, n, conf):
        a, point = mp.mpf(1 - conf) / conf_sides, lambda p: mp.exp(mp_ln_point(x, n, p))
        cut = (lambda p: point(p) / 2) if half else (lambda p: 0)
        tail = lambda side: lambda p: mp_binomial(x, n, mp.mpf(p), side) - cut(p)
        score = lambda p: (x - n * mp.mpf(p)) / (mp.mpf(p) * (1 - mp.mpf(p)))
        shift = (lambda p: point(p) * score(p) / 2) if half else (lambda p: 0)
        low = polished(ours[0], tail("above"), lambda p: x / mp.mpf(p) * point(p) - shift(p), a) if x else 0.0
        high = polished(ours[1], tail("below"), lambda p: -(n - x) / (1 - mp.mpf(p)) * point(p) - shift(p), a) if x < n else 1.0
        return (low, high) if raw else (float(low), float(high))

    return judge


def judge_poisson(conf_sides, half=False):
    def judge(ours, x, t, conf):
        a, point = mp.mpf(1 - conf) / conf_sides, lambda m: mp.exp(x * mp.log(m) - m - mp.loggamma(x + 1))
        cut = (lambda m: point(m) / 2) if half else (lambda m: 0)
        tail = lambda side: lambda m: mp_poisson(x, m, side) - cut(m)
        shift = (lambda m: point(m) * (x / m - 1) / 2) if half else (lambda m: 0)
        low = polished(mp.mpf(ours[0]) * t, tail("above"), lambda m: x / m * point(m) - shift(m), a) if x else 0.0
        high = polished(mp.mpf(ours[1]) * t, tail("below"), lambda m: -point(m) - shift(m), a)
        return float(low / t), float(high / t)

    return judge


def mp_as_unlikely(x, n, p):
    limit, mean = mp_ln_point(x, n, p) + mp.log(1 + mp.mpf(10) ** -7), n * mp.mpf(p)
    if x == mean:
        return 1.0
    up = x < mean
    inner, outer = (int(mp.ceil(mean)), n) if up else (int(mp.floor(mean)), 0)
    total = mp_binomial(x, n, p, "below" if up else "above")
    if mp_ln_point(inner, n, p) <= limit:
        outer = inner
    if mp_ln_point(outer, n, p) <= limit:
        while abs(outer - inner) > 1:
            middle = (inner + outer) // 2
            inner, outer = (inner, middle) if mp_ln_point(middle, n, p) <= limit else (middle, outer)
        total += mp_binomial(outer, n, p, "above" if up else "below")
    return float(min(total, 1))


def judge_compare(ours, x, t, y, u, ratio):
    n, p = x + y, mp.mpf(t) * mp.mpf(ratio) / (mp.mpf(t) * mp.mpf(ratio) + mp.mpf(u))
    point, up, down = mp.exp(mp_ln_point(x, n, p)), mp_binomial(x, n, p, "above"), mp_binomial(x, n, p, "below")
    return tuple(float(v) for v in (up, up - point / 2, down, down - point / 2, mp_as_unlikely(x, n, p)))


def judge_ratio(ours, x, t, y, u, conf):
    share = lambda r: mp.mpf(r) * t / (mp.mpf(r) * t + u) if math.isfinite(r) else mp.mpf(1)
    with mp.workdps(60):
        limits = judge_binomial(2, raw=True)(tuple(map(share, ours)), x, x + y, conf)
        return tuple(math.inf if v == 1 else float(v / (1 - v) * u / t) for v in limits)


def judge_odds(ours, a, b, c, d, conf):
    rows, col = (a + b, c + d), a + c
    ks = range(max(0, col - rows[1]), min(rows[0], col) + 1)
    base = [math.comb(rows[0], k) * math.comb(rows[1], col - k) for k in ks]

    def parts(odds):
        w = [m * mp.mpf(odds) ** k for m, k in zip(base, ks)]
        total = mp.fsum(w)
        mean = mp.fsum(k * v for k, v in zip(ks, w)) / total
        up, down = (mp.fsum(v for k, v in zip(ks, w) if keep(k)) / total for keep in (lambda k: k >= a, lambda k: k <= a))
        return mean, up, down

    alpha = mp.mpf(1 - conf) / 2
    goals = [lambda o: parts(o)[0] - a, lambda o: parts(o)[1] - alpha, lambda o: parts(o)[2] - alpha]
    fixed = [v in (0.0, math.inf) for v in ours]
    return tuple(v if f else float(mp.findroot(g, mp.mpf(v))) for v, f, g in zip(ours, fixed, goals))


def judge_fisher(ours, a, b, c, d):
    rows, col = (a + b, c + d), a + c
    weight = {k: math.comb(rows[0], k) * math.comb(rows[1], col - k) for k in range(max(0, col - rows[1]), min(rows[0], col) + 1)}
    whole = sum(weight.values())
    part = lambda keep: float(mp.mpf(sum(w for k, w in weight.items() if keep(k, w))) / whole)
    return part(lambda k, w: k >= a), part(lambda k, w: k <= a), part(lambda k, w: w * 10**7 <= weight[a] * (10**7 + 1))


def judge_runs(ours, p, x, conf):
    return enough_runs(p, x, conf, ours[0], lambda x, n, p: mp_binomial(x, int(n), p, "below"))


def judge_dispersion(ours, counts, exposures):
    total = mp.fsum(mp.mpf(t) for t in exposures)
    e = [sum(counts) * mp.mpf(t) / total for t in exposures]
    chi = mp.fsum((x - v) ** 2 / v for x, v in zip(counts, e))
    # the tail of the chi-square that the program itself printed: its own rounding is judged by the first number
    return float(chi), float(mp.gammainc(mp.mpf(len(counts) - 1) / 2, mp.mpf(ours[0]) / 2, regularized=True))


def judge_log_linear(ours, counts, exposures, at, conf, away):
    """Newton in high precision from the program's own fit."""
    y, t, x = [[mp.mpf(v) for v in values] for values in (counts, exposures, at)]
    middle = mp.fsum(a * b for a, b in zip(x, y)) / mp.fsum(y)
    level, slope = mp.log(mp.mpf(ours[6])), mp.mpf(ours[0])
    for _ in range(4):
        fit = [s * mp.exp(level + slope * (v - middle)) for s, v in zip(t, x)]
        a, b, c = (mp.fsum(f * (v - middle) ** p for f, v in zip(fit, x)) for p in (0, 1, 2))
        g, h = mp.fsum(n - f for n, f in zip(y, fit)), mp.fsum((n - f) * (v - middle) for n, f, v in zip(y, fit, x))
        whole = a * c - b * b
        level, slope = level + (c * g - b * h) / whole, slope + (a * h - b * g) / whole
    chi = mp.fsum((n - f) ** 2 / f for n, f in zip(y, fit))
    cov = [[c / whole, -b / whole], [-b / whole, a / whole]]
    return line_limits(slope, level, middle, conf, away, chi, cov, len(y))


def judge_negative_binomial(ours, counts, exposures, conf):
    """The likelihood equations in high precision, from the program's own answer."""
    x, t = [mp.mpf(v) for v in counts], [mp.mpf(v) for v in exposures]
    fall = mp.findroot(lambda v: mp.erfc(mp.sqrt(v)) - mp.mpf(1 - conf), stats.chi2.isf(1 - conf, 1) / 2)
    if not math.isfinite(ours[3]):
        if not sum(counts):
            return 0.0, 0.0, float(fall / mp.fsum(t)), math.inf
        all_x, all_t = mp.fsum(x), mp.fsum(t)
        lost = lambda rate: all_x * mp.log(all_x / (rate * all_t)) - all_x + rate * all_t - fall
        return (float(all_x / all_t),) + tuple(float(mp.findroot(lost, v)) for v in ours[1:3]) + (math.inf,)

    def likelihood(r, k):
        part = lambda v, s: mp.loggamma(v + k) - mp.loggamma(k) - v * mp.log(k) + v * mp.log(r * s) - (v + k) * mp.log1p(r * s / k)
        return mp.fsum(part(v, s) for v, s in zip(x, t))

    by_shape = lambda r, k: mp.fsum(mp.digamma(v + k) - mp.digamma(k) - mp.log1p(r * s / k) + (r * s - v) / (k + r * s) for v, s in zip(x, t))
    by_rate = lambda r, k: mp.fsum((v - r * s) / (k + r * s) for v, s in zip(x, t))
    solve = lambda f, u, v: mp.findroot(lambda a, b: f(mp.exp(a), mp.exp(b)), (mp.log(u), mp.log(v)), tol=1e-24)
    with mp.workdps(30):
        rate, shape = map(mp.exp, solve(lambda r, k: (by_shape(r, k), by_rate(r, k)), ours[0], ours[3]))
        goal, limits = likelihood(rate, shape) - fall, []
        score = nb_tables(counts, exposures)
        for end in ours[1:3]:
            if math.isfinite(end):
                k = best_shape(lambda k: score[3](end, k), lambda k: score[2](end, k))
                if k == 1e12:
                    return (math.nan,) * 4
                limits.append(mp.exp(solve(lambda r, k: (likelihood(r, k) - goal, by_shape(r, k) * k), end, k)[0]))
            else:
                limits.append(mp.inf)
        return float(rate), float(limits[0]), float(limits[1]), float(shape)


def judge_show_below(ours, bound, true, conf, probability):
    def plan(allowed):
        side = mp.mpf(1 - conf)
        mean = mp.mpf(test_length(allowed, conf))
        slope = -mp.exp(allowed * mp.log(mean) - mean - mp.loggamma(allowed + 1))
        for _ in range(2):
            mean -= (mp_poisson(allowed, mean, "below") - side) / slope
        return mean / mp.mpf(bound), mp_poisson(allowed, mean * mp.mpf(true) / mp.mpf(bound), "below") if true else mp.mpf(1)

    test_length = lambda allowed, conf: special.gammainccinv(allowed + 1, 1 - conf)
    allowed = int(ours[1])
    exposure, passed = plan(allowed)
    enough, less = passed >= probability * (1 - 1e-12), allowed and plan(allowed - 1)[1] >= probability * (1 + 1e-12)
    return (float(exposure), float(allowed), float(passed)) if enough and not less else (math.nan,) * 3


# --- the comparison -----------------------------------------------------------------------------------------------

END, VALUE = 1e-8, 1e-9


def spread(cells):
    counts = tuple(int(v) for v in np.random.default_rng(rng.getrandbits(32)).negative_binomial(2, 1 / (1 + 10 ** rng.uniform(-1, 3)), cells))
    return counts if sum(counts) else (1,) + counts[1:]


def dispersion_input():
    cells = rng.choice([2, 3, rng.randint(2, 50), rng.randint(2, 400)])
    t = tuple(1.0 if rng.random() < 0.5 else rng.uniform(0.5, 2) for _ in range(cells))
    return spread(cells), t


def sparse_input():
    """A few events in many clusters, some of them together."""
    cells = rng.randint(5, 400)
    counts = [0] * cells
    for _ in range(rng.randint(1, 6)):
        counts[rng.randrange(cells)] += rng.choice([1, 1, 2, 5])
    return tuple(counts), tuple(1.0 if rng.random() < 0.5 else rng.uniform(0.5, 2) for _ in range(cells))


def gamma_input():
    """Counts that scatter clearly more than chance, so that there is a law to fit."""
    cells = rng.randint(5, 60)
    t = tuple(10 ** rng.uniform(-1, 2) for _ in range(cells))
    shape, mean = 10 ** rng.uniform(-0.7, 0.5), 10 ** rng.uniform(-0.5, 1)
    counts = tuple(int(np.random.default_rng(rng.getrandbits(32)).poisson(min(rng.gammavariate(shape, mean / shape) * s, 1e6))) for s in t)
    e = np.array(t) * sum(counts) / sum(t)
    # the likelihood has a maximum where its score against one common rate says so: sum of (x - e)^2 - x
    return (counts, t) if sum(counts) and ((np.array(counts) - e) ** 2 - counts).sum() > sum(counts) else gamma_input()


def plan_input():
    good = 10 ** rng.uniform(-4, 1)
    bad = good * rng.uniform(1.3, 10)
    return good, bad, rng.uniform(0.01, 0.4), rng.uniform(0.01, 0.4), rng.randint(1, 20), math.exp(rng.uniform(math.log(good / 2), math.log(bad * 2)))


def jackknife_input():
    units = rng.choice([2, 3, rng.randint(2, 12), rng.randint(2, 300)])
    if rng.random() < 0.3:
        return tuple(rng.uniform(-100, 100) for _ in range(units)), tuple(rng.uniform(1, 100) for _ in range(units)), confidence()
    t = tuple(10 ** rng.uniform(-1, 3) for _ in range(units))
    return tuple(float(v) for v in spread(units)), t, confidence()


def line_input():
    readings, scale, origin = rng.choice([3, 4, rng.randint(3, 60)]), 10 ** rng.uniform(-3, 3), rng.choice([0, 20, -1e3])
    scale = max(scale, abs(origin) / 100)  # at_mean is a double: a range far narrower than its value has lost the rest
    at = [origin + scale * rng.choice([rng.random(), rng.randint(0, 10) / 10]) for _ in range(readings)]
    t = [10 ** rng.uniform(-2, 4) for _ in range(readings)]
    slope, clump = rng.gauss(0, 3) / scale, rng.choice([1, 1, rng.randint(2, 20)])
    means = [s * math.exp(slope * (v - at[0])) for s, v in zip(t, at)]
    wanted = 10 ** rng.uniform(0.5, 5)
    draw = np.random.default_rng(rng.getrandbits(32))
    counts = [clump * int(draw.poisson(wanted * m / sum(means) / clump)) for m in means]
    hit = [v for v, n in zip(at, counts) if n]
    apart = sum(counts) >= 2 and min(hit) < max(at) and max(hit) > min(at)
    return (tuple(counts), tuple(t), tuple(at), confidence(), rng.uniform(min(at) - scale, max(at) + scale)) if apart else line_input()


def clumped_input():
    cells = rng.choice([2, 3, rng.randint(2, 25), rng.randint(2, 25)])
    t = tuple(1.0 if rng.random() < 0.3 else 10 ** rng.uniform(-1, 2) for _ in range(cells))
    shape, mean = 10 ** rng.uniform(-1, 2.5), 10 ** rng.uniform(-2, 1.5)
    draw = np.random.default_rng(rng.getrandbits(32))
    return tuple(int(draw.poisson(mean * s * (rng.gammavariate(shape, 1 / shape) if shape < 100 else 1))) for s in t), t, confidence()


def risks_input():
    good = 10 ** rng.uniform(-4, 1)
    ratio = rng.uniform(1.1, 1.4) if rng.random() < 0.01 else 10 ** rng.uniform(math.log10(1.5), 1.5)
    risk = lambda: rng.choice([0.1, 0.2, 0.05, 10 ** rng.uniform(-3, -0.4)])
    return good, good * ratio, risk(), risk()


def compare_input():
    second = 10 ** rng.uniform(-4, 2)
    first = second * rng.choice([10 ** rng.uniform(0.2, 2), 2.0])
    ratio = rng.choice([1.0, 2.0, 10 ** rng.uniform(-1, 1.5)])
    return first, rng.choice([second, second, second, 0.0]), ratio, rng.choice([0.05, 0.01, 1e-6, rng.uniform(0.001, 0.2)]), rng.choice([0.8, 0.9, rng.uniform(0.3, 0.999)])


def below_input():
    bound = exposure()
    return bound, bound * rng.choice([0.0, rng.random() * 0.95, 10 ** rng.uniform(-9, 0) * 0.9]), confidence(), rng.choice([0.5, 0.8, 0.9, 0.95, 1 - 10 ** rng.uniform(-9, -0.3)])


def runs_input():
    return 10 ** rng.uniform(-12, -0.05), rng.choice([0, 1, big(100)]), confidence()


FUNCTIONS = {
    "clopper_pearson": (lambda: (*hits(), confidence()), clopper_pearson, END, judge_binomial(2)),
    "clopper_pearson_one": (lambda: (*hits(), confidence()), lambda *a: clopper_pearson(*a, 1), END, judge_binomial(1)),
    "mid_p": (lambda: (*hits(), confidence()), mid_p, END, judge_binomial(2, True)),
    "wilson": (lambda: (*hits(), confidence()), wilson, END, None),
    "exact_test": (lambda: (lambda x, n: (x, n, near(x, n)))(*hits()), exact_test, VALUE, lambda ours, *a: (mp_as_unlikely(*a),)),
    "garwood": (lambda: (big(10**9), exposure(), confidence()), garwood, END, judge_poisson(2)),
    "garwood_one": (lambda: (big(10**9), exposure(), confidence()), lambda *a: garwood(*a, 1), END, judge_poisson(1)),
    "mid_p_rate": (lambda: (big(10**9), exposure(), confidence()), mid_p_rate, END, judge_poisson(2, True)),
    "test_length_factor": (lambda: (big(10**6), confidence()), lambda x, c: garwood(x, 1.0, c, 1)[1:], VALUE, None),
    "exposure_needed": (lambda: (exposure(), big(10**6), confidence()), lambda r, x, c: garwood(x, r, c, 1)[1:], VALUE, None),
    "success_runs": (lambda: (lambda p, _, c: (p, c))(*runs_input()), lambda p, c: enough_runs(p, 0, c, OURS[0]), VALUE, None),
    "demonstration_runs": (runs_input, lambda p, x, c: enough_runs(p, x, c, OURS[0]), VALUE, judge_runs),
    "mtbf": (lambda: (exposure(), 1 + big(10**6), confidence()), lambda t, x, c: tuple(1 / v for v in garwood(x, t, c)[::-1]), END, None),
    "fit_rate": (
        lambda: (big(10**6), float(1 + big(10**6)), exposure(), rng.uniform(1, 100), confidence()),
        lambda x, d, h, a, c: (garwood(x, d * h * a, c, 1)[1] * 1e9,), VALUE, None,
    ),
    "compare_rates": (lambda: (*pair(), rng.choice([1.0, rng.uniform(0.2, 5)])), compare_rates, VALUE, judge_compare),
    "rate_ratio": (lambda: (lambda x, t, y, u: (x, t, y or int(x == 0), u, confidence()))(*pair()), rate_ratio, END, judge_ratio),
    "fisher_exact": (lambda: (lambda t: t if sum(t) else (1, 0, 0, 1))(table()), fisher_exact, VALUE, judge_fisher),
    "odds_ratio": (lambda: (*tuple(v + (i in (0, 3)) for i, v in enumerate(table())), confidence()), odds_ratio, END, judge_odds),
    "dispersion": (dispersion_input, dispersion, VALUE, judge_dispersion),
    "gamma_fit": (gamma_input, gamma_fit, VALUE, None),
    "gamma_posterior": (
        lambda: (10 ** rng.uniform(-0.7, 3), 10 ** rng.uniform(-3, 3), big(10**4), rng.choice([0.0, exposure()]), confidence()),
        gamma_posterior, END, None,
    ),
    "clustered_rate": (lambda: (*dispersion_input(), confidence()), clustered_rate, END, None),
    "jackknife_ratio": (jackknife_input, jackknife_ratio, VALUE, None),
    "log_linear": (line_input, log_linear, VALUE, judge_log_linear),
    "negative_binomial_rate": (clumped_input, negative_binomial_rate, VALUE, judge_negative_binomial),
    "plan_risks": (risks_input, plan_risks, VALUE, None),
    "fixed_plan": (risks_input, fixed_plan, VALUE, None),
    "exposure_to_compare": (compare_input, exposure_to_compare, VALUE, None),
    "exposure_to_show_below": (below_input, exposure_to_show_below, VALUE, judge_show_below),
    "chance_of_scatter": (
        lambda: dispersion_input() if rng.random() < 0.5 else sparse_input(), chance_of_scatter, VALUE, None,
    ),
    "poisson_at_least": (
        lambda: (big(10**6), 10 ** rng.uniform(-9, 6)), lambda k, m: (float(special.gammainc(k, m)) if k else 1.0,), VALUE,
        lambda ours, k, m: (float(mp.gammainc(k, 0, mp.mpf(m), regularized=True)) if k else 1.0,),
    ),
    "sequential": (plan_input, sequential, VALUE, None),
    "comparison_power": (
        lambda: (10 ** rng.uniform(-1, 3), rng.uniform(0.1, 10), 10 ** rng.uniform(-1, 3), rng.uniform(0.1, 10), rng.choice([0.05, 0.01, 1e-6])),
        comparison_power, VALUE, None,
    ),
    "holm": (lambda: (p_values(),), adjusted("holm"), VALUE, None),
    "hochberg": (lambda: (p_values(),), adjusted("simes-hochberg"), VALUE, None),
    "benjamini_hochberg": (lambda: (p_values(),), adjusted("fdr_bh"), VALUE, None),
    "episodes": (
        lambda: (tuple(rng.choice([rng.uniform(0, 1e4), float(rng.randint(0, 600))]) for _ in range(rng.randint(1, 60))), rng.choice([60.0, 1.0, rng.uniform(1, 500)])),
        episodes, VALUE, None,
    ),
}
EXTREMES = {
    "hits": [(0, 10**12), (10**9, 10**12), (10**12, 10**12), (10**12 - 1, 10**12), (1, 10**12), (0, 1), (1, 1), (1, 2)],
    "confidences": [0.5, 0.9, 0.95, 0.99, 0.999999, 1 - 1e-9],
}
OURS = ()


def word(value):
    return " ".join(map(repr, value)) if isinstance(value, tuple) else repr(value)


def relative(ours, theirs):
    if len(ours) != len(theirs):
        return math.inf
    worst = 0.0
    for a, b in zip(ours, theirs):
        if a == b or max(abs(a), abs(b)) < TINY:
            continue
        if not (math.isfinite(a) and math.isfinite(b)):
            return math.inf
        worst = max(worst, abs(a - b) / max(abs(b), TINY))
    return worst


def inputs_for(name, draw, number):
    drawn = [draw() for _ in range(number)]
    if name in ("clopper_pearson", "clopper_pearson_one", "mid_p", "wilson"):
        drawn += [(*h, c) for h in EXTREMES["hits"] for c in EXTREMES["confidences"]]
    if name in ("garwood", "garwood_one", "mid_p_rate"):
        drawn += [(x, 1.0, c) for x in (0, 1, 10**9) for c in EXTREMES["confidences"]]
    return drawn


def main():
    global OURS
    options = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    options.add_argument("--inputs", type=int, default=2000)
    options.add_argument("--seed", type=int, default=1)
    options.add_argument("--probe", default="target/release/examples/stats_probe")
    options.add_argument("--only", nargs="*", choices=FUNCTIONS, help="these functions only")
    options = options.parse_args()
    failed = []
    print(f"{'function':<22}{'inputs':>7}  {'worst':>9}  {'limit':>7}  {'overruled':>9}  at")
    for name in options.only or FUNCTIONS:
        draw, reference, limit, judge = FUNCTIONS[name]
        rng.seed(f"{options.seed} {name}")
        drawn = inputs_for(name, draw, options.inputs)
        asked = "".join(json.dumps([name, *map(word, args)]) + "\n" for args in drawn)
        told = subprocess.run([options.probe], input=asked, capture_output=True, text=True, check=True).stdout.splitlines()
        assert len(told) == len(drawn)
        gc.freeze()  # statsmodels collects garbage on every call; leave it nothing old to look at
        worst, at, overruled = 0.0, None, 0
        for args, line in zip(drawn, told):
            answer = json.loads(line)
            if isinstance(answer, dict):
                error, theirs, OURS = math.inf, answer["error"], answer
            else:
                OURS = tuple(math.inf if v is None else v for v in answer)
                theirs = reference(*args)
                error = relative(OURS, theirs)
            if not error <= limit / 100 and judge and isinstance(OURS, tuple):
                truth = judge(OURS, *args)
                if relative(OURS, truth) < error:
                    overruled += relative(theirs, truth) > limit
                    error, theirs = relative(OURS, truth), truth
            if at is None or not error <= worst:
                worst, at = error, (args, OURS, theirs)
        shown = str(at)[:600] if worst > limit else str(at[0])[:160]
        print(f"{name:<22}{len(drawn):>7}  {worst:9.2e}  {limit:7.0e}  {overruled:>9}  {shown}", flush=True)
        if not worst <= limit:
            failed.append(name)
    print(f"{len(FUNCTIONS if not options.only else options.only) - len(failed)} passed, {len(failed)} failed", *failed)
    sys.exit(1 if failed else 0)


if __name__ == "__main__":
    main()
