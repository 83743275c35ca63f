"""The regression a user would otherwise write with dense arrays: effects swept out by hand, clustered errors.

Reads the same columns as estimate.ts (raw doubles), demeans by alternating projections with numpy.bincount,
solves least squares and clusters by the first effect. Prints seconds, peak memory and the coefficients as JSON.
"""

import json
import resource
import sys
import time

import numpy as np

folder, n, k = sys.argv[1], int(sys.argv[2]), int(sys.argv[3])
y = np.fromfile(f"{folder}/y.f64")
X = np.column_stack([np.fromfile(f"{folder}/x{j}.f64") for j in range(k)])
g = [np.fromfile(f"{folder}/g{e}.i32", dtype=np.int32) for e in range(2)]
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss

start = time.perf_counter()
D = np.column_stack([y, X])
counts = [np.bincount(codes) for codes in g]
for sweep in range(10_000):
    last = D.copy()
    for codes, count in zip(g, counts):
        for j in range(D.shape[1]):
            D[:, j] -= (np.bincount(codes, weights=D[:, j]) / count)[codes]
    if (np.linalg.norm(D - last, axis=0) <= 1e-10 * np.linalg.norm(D, axis=0)).all():
        break
yd, Xd = D[:, 0], D[:, 1:]
b, *_ = np.linalg.lstsq(Xd, yd, rcond=None)
e = yd - Xd @ b
scores = np.column_stack([np.bincount(g[0], weights=Xd[:, j] * e) for j in range(k)])
bread = np.linalg.inv(Xd.T @ Xd)
G = len(counts[0])
factor = G / (G - 1) * (n - 1) / (n - k - len(counts[1]))
se = np.sqrt(np.diag(bread @ scores.T @ scores @ bread) * factor)
seconds = time.perf_counter() - start
peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
print(json.dumps({"seconds": seconds, "bytes": (peak - before) * 1024, "b": b.tolist(), "se": se.tolist()}))
