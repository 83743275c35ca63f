"""The same generations as a user would script them with numpy and scipy: whole-array steps, no tables.

Run by engine.ts: engine.py INPUT GENERATIONS CASE. Draws its own shocks, so it agrees with the engine in distribution.
"""

import json
import sys
import time

import numpy as np
from scipy import optimize, sparse

path, generations, case = sys.argv[1], int(sys.argv[2]), sys.argv[3]
with open(path, "rb") as file:
    h = np.fromfile(file, np.float64, 32)
    n, ends = int(h[0]), int(h[1])
    np.fromfile(file, np.float64, 516 + 256 + 2047 + 6 * int(h[8]))
    start = np.fromfile(file, np.uint32, n + 1).astype(np.int64)
    target = np.fromfile(file, np.uint32, ends).astype(np.int32)
    wealth = np.fromfile(file, np.float64, n)
s, R, delta, own, other = h[4], h[5], h[9], h[10], h[11]
A, alpha, sigma = h[13], h[14], h[15]
weights, scales = h[16:18], h[18:20]
ties = sparse.csr_matrix((np.ones(ends), target, start), shape=(n, n))
degree = np.diff(start)
rows = np.repeat(np.arange(n), degree)
rng = np.random.default_rng(1)


def newton(value_and_slope, low, high):
    """Roots of rising functions in (low, high), element by element, Newton kept in its bracket."""
    low, high = low.copy(), high.copy()
    x = 0.5 * (low + high)
    for _ in range(100):
        value, slope = value_and_slope(x)
        below = value < 0
        low[below], high[~below] = x[below], x[~below]
        step = x - value / slope
        outside = ~((step > low) & (step < high))
        step[outside] = 0.5 * (low + high)[outside]
        done = np.max(np.abs(step - x) / x) < 1e-10
        x = step
        if done:
            break
    return x


def growth(q):
    """Growth factor of those who strive for q = aspiration / wealth: their first-order condition."""
    pi = weights[0]

    def f(g):
        m = g**-sigma + pi * (g - q) ** -sigma
        p = (delta * R * m) ** (-1 / sigma)
        dm = -sigma * (g ** (-sigma - 1) + pi * (g - q) ** (-sigma - 1))
        return p - (1 - g / R), -p / sigma * dm / m + 1 / R

    return newton(f, q + 0.0, np.full_like(q, R))


def linear(wealth):
    aspiration = own * wealth + other * (ties @ wealth) / degree
    q = aspiration / wealth
    strive = q <= threshold
    z = low_growth * wealth
    z[strive] = growth(q[strive]) * wealth[strive]
    return z, strive


def concave(wealth):
    seen = wealth[target]
    richer = seen > np.repeat(wealth, degree)
    count = np.bincount(rows[richer], minlength=n)
    total = np.bincount(rows[richer], weights=seen[richer], minlength=n)
    up = np.where(count > 0, total / np.maximum(count, 1), wealth)
    base = own * wealth + other * up
    aims = [scale * base for scale in scales]
    best = np.full(n, -np.inf)
    plan = np.zeros(n)
    met = np.zeros(n, int)
    top = A * wealth**alpha
    for j in range(3):
        lower = np.zeros(n) if j == 0 else aims[j - 1]
        upper = np.minimum(aims[j], top) if j < 2 else top
        who = np.flatnonzero(lower < upper)
        y, a = wealth[who], [aim[who] for aim in aims[:j]]

        def f(k):
            z = A * k**alpha
            m = z**-sigma
            dm = -sigma * z ** (-sigma - 1)
            for pi, aim in zip(weights, a):
                m = m + pi * (z - aim) ** -sigma
                dm = dm - sigma * pi * (z - aim) ** (-sigma - 1)
            f1 = alpha * z / k
            p = (delta * f1 * m) ** (-1 / sigma)
            return p - (y - k), 1 - p / sigma * ((alpha - 1) / k + f1 * dm / m)

        low = (lower[who] / A) ** (1 / alpha)
        high = (upper[who] / A) ** (1 / alpha)
        at_end = f(high * (1 - 1e-12))[0]
        inside = (at_end >= 0) | (upper[who] >= top[who])
        who, y, low, high = who[inside], y[inside], low[inside], high[inside]
        a = [aim[inside] for aim in a]
        k = newton(f, low, high)
        z = A * k**alpha
        u = z ** (1 - sigma)
        for pi, aim in zip(weights, a):
            u = u + pi * np.maximum(z - aim, 0) ** (1 - sigma)
        u = ((y - k) ** (1 - sigma) + delta * u) / (1 - sigma)
        better = u >= best[who]
        best[who[better]], plan[who[better]], met[who[better]] = u[better], z[better], j
    return plan, met > 0


kappa = (delta * R) ** (1 / sigma)
low_growth = kappa / (1 + kappa / R)
if case != "concave":

    def gap(q):
        g = growth(np.array([q]))[0]
        up = (1 - g / R) ** (1 - sigma) + delta * (g ** (1 - sigma) + weights[0] * (g - q) ** (1 - sigma))
        return up - (1 - low_growth / R) ** (1 - sigma) - delta * low_growth ** (1 - sigma)

    threshold = optimize.brentq(gap, low_growth, R * (1 - 1e-9), xtol=1e-12)

np.seterr(all="ignore")
began = time.process_time()
for _ in range(generations):
    plan, met = (concave if case == "concave" else linear)(wealth)
    wealth = plan * np.exp(s * rng.standard_normal(n) - 0.5 * s * s)
seconds = time.process_time() - began
print(json.dumps({"seconds": seconds, "mean": wealth.mean(), "unmet": int((~met).sum())}))
