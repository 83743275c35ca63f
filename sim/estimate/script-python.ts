/**
 * `panel.py`: a script that reruns a plan's regressions from the folder in Python, on its own code, so that a reader can
 * check ours or go on from there.
 */

import type { Estimate } from './plan.js';
import { scriptPlan } from './script-plan.js';

/** The script for these estimates. Needs numpy, pandas and scipy, and pyarrow where the panel is Parquet. */
export function pythonScript(estimates: readonly Estimate[]): string {
  return BODY.replace('@PLAN@', () => scriptPlan(estimates).replaceAll('\\', '\\\\').replaceAll("'''", "\\'\\'\\'"));
}

const BODY = String.raw`"""Reruns the regressions of this folder's plan: python3 panel.py [FOLDER]

Needs numpy, pandas and scipy, and pyarrow where the panel is a Parquet file. Conventions: HC1 n/(n-k); clustered
G/(G-1) (n-1)/(n-k), k counting absorbed effects unless nested in a cluster, t with G-1 degrees of freedom; two-way by
inclusion and exclusion with the smallest G. Prints each coefficient and standard error and, where estimates.csv is
there, how far it is from them.
"""

import json
import sys
from pathlib import Path

import numpy as np
import pandas as pd
from scipy import sparse, stats
from scipy.sparse.csgraph import connected_components

ESTIMATES = json.loads('''@PLAN@''')
FOLDER = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent
CONSTANT = "(const)"


def table(name):
    if (FOLDER / f"{name}.parquet").exists():
        return pd.read_parquet(FOLDER / f"{name}.parquet")
    if (FOLDER / f"{name}.csv").exists():
        return pd.read_csv(FOLDER / f"{name}.csv")
    return None


def load():
    panel, households = table("panel"), table("households")
    if panel is None:
        sys.exit(f"{FOLDER}: there is no panel.parquet or panel.csv")
    keys = ["arm", "replicate", "household"]
    if households is not None:
        new = [c for c in households.columns if c not in panel.columns]
        panel = panel.merge(households[keys + new], on=keys, how="left")
    return panel


def moved(frame, step):
    """Position of the same household's row a generation on or back, -1 when there is none."""
    keys = [k for k in ("arm", "replicate", "household") if k in frame.columns]
    here = pd.MultiIndex.from_frame(frame[keys + ["generation"]])
    there = pd.MultiIndex.from_frame(frame[keys + ["generation"]].assign(generation=frame["generation"] + step))
    return here.get_indexer(there)


def values(term, frame, rows):
    """Columns of a term by name, at some rows (-1: missing)."""

    def at(x):
        x = np.asarray(x, dtype=float)
        return np.where(rows >= 0, x[np.maximum(rows, 0)], np.nan)

    def log(x):
        return np.log(np.where(x > 0, x, np.nan))

    if isinstance(term, str):
        if term in frame.columns:
            return {term: at(frame[term])}
        return {term: log(at(frame[term[4:]]))}
    kind = next(k for k in ("log", "square", "power", "product", "lag", "lead", "dummy") if k in term)
    inner = term[kind]
    if kind == "dummy":
        x = frame[inner].to_numpy(dtype=object)
        x = np.array([x[r] if r >= 0 else None for r in rows], dtype=object)
        present = [v for v in pd.unique(x) if not pd.isna(v)]
        if inner != "arm":
            present.sort()
        base = term.get("base", present[0])
        missing = pd.isna(x)
        return {
            f"{inner}={label(v)}": np.where(missing, np.nan, (x == v).astype(float)) for v in present if v != base
        }
    if kind == "log":
        return {f"log_{n}": log(x) for n, x in values(inner, frame, rows).items()}
    if kind == "square":
        return {f"square({n})": x * x for n, x in values(inner, frame, rows).items()}
    if kind == "power":
        return {f"power({n}, {inner[1]})": x ** inner[1] for n, x in values(inner[0], frame, rows).items()}
    if kind == "product":
        left, right = values(inner[0], frame, rows), values(inner[1], frame, rows)
        return {f"product({a}, {b})": x * y for a, x in left.items() for b, y in right.items()}
    to = moved(frame, -1 if kind == "lag" else 1)
    there = np.where(rows >= 0, to[np.maximum(rows, 0)], -1)
    return {f"{kind}({n})": x for n, x in values(inner, frame, there).items()}


def label(v):
    return str(int(v)) if isinstance(v, (float, np.floating)) and v == int(v) else str(v)


def passes(column, rule):
    text = not pd.api.types.is_numeric_dtype(column)
    if isinstance(rule, dict):
        if "in" in rule:
            return column.isin(rule["in"])
        return (column >= rule.get("from", -np.inf)) & (column <= rule.get("to", np.inf))
    if isinstance(rule, list):
        if len(rule) == 2 and not text:
            return (column >= rule[0]) & (column <= rule[1])
        return column.isin(rule)
    return column == rule


def codes(frame, grouping, rows):
    columns = [grouping] if isinstance(grouping, str) else grouping["product"]
    part = frame.iloc[rows][columns]
    number = part.groupby(columns, sort=False).ngroup().to_numpy()
    return np.where(part.isna().any(axis=1), -1, number)


def recode(g):
    return np.unique(g, return_inverse=True)[1]


def demean(columns, effects, weights=None):
    w = np.ones(len(columns[0])) if weights is None else weights
    out = []
    for x in columns:
        x = x.copy()
        for _ in range(10_000):
            last = x.copy()
            for g in effects:
                x -= (np.bincount(g, w * x) / np.bincount(g, w))[g]
            if len(effects) < 2 and _ > 0:
                break
            if np.linalg.norm(x - last) <= 1e-12 * max(np.linalg.norm(x), 1e-14 * np.linalg.norm(last)):
                break
        out.append(x)
    return out


def rank(effects):
    """Rank of the effects' dummies; for three or more an upper bound (see the codebook)."""
    total = 0
    for e, g in enumerate(effects):
        redundant = 0
        for h in effects[:e]:
            edges = sparse.coo_matrix((np.ones(len(g)), (g, g.max() + 1 + h)), shape=(g.max() + h.max() + 2,) * 2)
            redundant = max(redundant, connected_components(edges, directed=False)[0])
        total += g.max() + 1 - redundant
    return total


def independent(columns, lengths):
    """Columns that are not collinear with those before them, at 1e-9 of their length."""
    kept, basis = [], []
    for j, x in enumerate(columns):
        r = x.copy()
        for _ in range(2):
            for q in basis:
                r -= q * (q @ r)
        if np.linalg.norm(r) > 1e-9 * lengths[j] and np.linalg.norm(r) > 0:
            kept.append(j)
            basis.append(r / np.linalg.norm(r))
    return kept


def meat(scores, spec, clusters, n, k, effects):
    def sums(g):
        s = np.column_stack([np.bincount(g, column) for column in scores.T])
        return s.T @ s

    if spec["errors"] != "clustered":
        return scores.T @ scores * (n / (n - k - rank(effects)) if spec["errors"] == "robust" else 1)
    free = [g for g in effects if not any((pd.Series(c).groupby(g).nunique() == 1).all() for c in clusters)]
    M = sums(clusters[0])
    if len(clusters) == 2:
        M = M + sums(clusters[1]) - sums(recode(clusters[0].astype(np.int64) * (clusters[1].max() + 1) + clusters[1]))
    G = min(c.max() + 1 for c in clusters)
    return M * G / (G - 1) * (n - 1) / (n - k - rank(free))


def mended(V, clusters):
    """Two-way clustering can give negative eigenvalues: set to zero."""
    if len(clusters) == 2:
        values, vectors = np.linalg.eigh(V)
        if (values < (0 if (np.diag(V) < 0).any() else -1e-12 * values.max())).any():
            V = vectors * np.maximum(values, 0) @ vectors.T
    return V


def fit(spec, frame, drawn):
    alive = np.ones(len(frame), bool)
    for name, rule in spec["where"].items():
        alive &= passes(frame[name], rule).to_numpy()
    if drawn is not None:
        alive &= frame["household"].isin(drawn).to_numpy()
    rows = np.flatnonzero(alive)
    outcome = next(iter(values(spec["outcome"], frame, rows).values()))
    many = {
        kind: {n: x for term in spec.get(kind) or [] for n, x in values(term, frame, rows).items()}
        for kind in ("covariates", "endogenous", "instruments")
    }
    effects = [codes(frame, g, rows) for g in spec["effects"]]
    clusters = [codes(frame, g, rows) for g in spec["cluster"]]
    keep = np.isfinite(outcome)
    for group in many.values():
        for x in group.values():
            keep &= np.isfinite(x)
    for g in effects + clusters:
        keep &= g >= 0
    while effects:
        before = keep.sum()
        for g in effects:
            size = np.bincount(g[keep], minlength=g.max() + 1)
            drop = size == 1
            if spec["method"] == "logit":
                ones = np.bincount(g[keep], outcome[keep], minlength=g.max() + 1)
                drop |= (ones == 0) | (ones == size)
            keep &= ~drop[g]
        if keep.sum() == before:
            break
    y = outcome[keep]
    n = len(y)
    effects, clusters = [recode(g[keep]) for g in effects], [recode(g[keep]) for g in clusters]
    constant = {CONSTANT: np.ones(n)} if spec["constant"] and not effects else {}
    W = {n: x[keep] for n, x in many["covariates"].items()}
    E = {n: x[keep] for n, x in many["endogenous"].items()}
    Z = {n: x[keep] for n, x in many["instruments"].items()}
    if spec["method"] == "logit":
        return logit(spec, y, constant | W, effects, clusters)
    names = list(constant) + list(E) + list(W)
    columns = [*constant.values(), *E.values(), *W.values()]
    lengths = [np.linalg.norm(x) for x in columns]
    z = [*constant.values(), *W.values(), *Z.values()]
    zlengths = [np.linalg.norm(x) for x in z]
    if effects:
        y, *columns = demean([y, *columns], effects)
        z = demean(z, effects)
    kept = independent(columns, lengths)
    X, names = np.column_stack([columns[j] for j in kept]), [names[j] for j in kept]
    P = X
    if spec["method"] == "iv":
        Q, _ = np.linalg.qr(np.column_stack([z[j] for j in independent(z, zlengths)]))
        P = Q @ (Q.T @ X)
    k = X.shape[1]
    # scaled columns: the normal equations of raw ones can lose every digit
    s = np.linalg.norm(P, axis=0)
    Q, R = np.linalg.qr(P / s)
    b = np.linalg.solve(R, Q.T @ y) / s
    e = y - X @ b
    half = np.linalg.inv(R) / s[:, None]
    df = n - k - rank(effects)
    if spec["errors"] == "classical":
        V = half @ half.T * (e @ e / df)
    else:
        w = e
        if spec["errors"] == "robust-hc3":
            h = (Q**2).sum(axis=1) + sum((1 / np.bincount(g))[g] for g in effects)
            w = e / (1 - h)
        V = mended(half @ meat(Q * w[:, None], spec, clusters, n, k, effects) @ half.T, clusters)
    if spec["errors"] == "clustered":
        df = min(c.max() for c in clusters)
    return names, b, np.sqrt(np.diag(V)), df


def logit(spec, y, columns, effects, clusters):
    n, names = len(y), list(columns)
    dummies = [(g == c).astype(float) for e, g in enumerate(effects) for c in range(1 if e else 0, g.max() + 1)]
    demeaned = demean(list(columns.values()), effects) if effects else list(columns.values())
    kept = independent(demeaned, [np.linalg.norm(x) for x in columns.values()])
    names = [names[j] for j in kept]
    X = np.column_stack([list(columns.values())[j] for j in kept])
    k = X.shape[1]
    full = np.column_stack([X, *dummies]) if dummies else X
    full = full[:, independent(list(full.T), list(np.linalg.norm(full, axis=0)))]
    s = np.linalg.norm(full, axis=0)
    A = full / s
    b = np.zeros(A.shape[1])
    for _ in range(100):
        p = 1 / (1 + np.exp(-A @ b))
        H = (A * (p * (1 - p))[:, None]).T @ A
        step = np.linalg.solve(H, A.T @ (y - p))
        b = b + step
        if abs(step).max() < 1e-12 * max(1, abs(b).max()):
            break
    p = 1 / (1 + np.exp(-A @ b))
    bread = np.linalg.inv((A * (p * (1 - p))[:, None]).T @ A)
    V = bread
    df = np.inf
    if spec["errors"] != "classical":
        w = y - p
        if spec["errors"] == "robust-hc3":
            w = w / (1 - p * (1 - p) * ((A @ bread) * A).sum(axis=1))
        V = bread @ meat(A * w[:, None], spec, clusters, n, k, effects) @ bread
        if spec["errors"] == "clustered":
            df = min(c.max() for c in clusters)
    V = mended((V / np.outer(s, s))[:k, :k], clusters)
    return names, (b / s)[:k], np.sqrt(np.diag(V)), df


def main():
    panel = load()
    ours = pd.read_csv(FOLDER / "estimates.csv") if (FOLDER / "estimates.csv").exists() else None
    draws = pd.read_csv(FOLDER / "estimates_draws.csv") if (FOLDER / "estimates_draws.csv").exists() else None
    arms = list(pd.unique(panel["arm"]))
    furthest = 0.0
    for spec in ESTIMATES:
        wanted = spec["where"].get("arm", arms)
        wanted = wanted["in"] if isinstance(wanted, dict) else [wanted] if isinstance(wanted, str) else wanted
        chosen = [arm for arm in arms if arm in wanted]
        for group in [chosen] if spec["pool_arms"] else [[arm] for arm in chosen]:
            for replicate in sorted(panel["replicate"].unique()):
                frame = panel[panel["arm"].isin(group) & (panel["replicate"] == replicate)].reset_index(drop=True)
                arm = " + ".join(group)
                drawn = None
                if spec["draw"] != "everyone":
                    mine = (draws["name"] == spec["name"]) & (draws["arm"] == arm) & (draws["replicate"] == replicate)
                    drawn = draws.loc[mine, "household"]
                try:
                    names, b, se, df = fit(spec, frame, drawn)
                except Exception as error:
                    print(f"{spec['name']}, {arm}, replicate {replicate}: {error}")
                    continue
                print(f"\n{spec['name']}, {arm}, replicate {replicate}")
                for name, estimate, error in zip(names, b, se):
                    p = 2 * stats.t.sf(abs(estimate / error), df)
                    line = f"  {name:40s} {estimate:14.6g} {error:12.6g}  p {p:.4f}"
                    if ours is not None:
                        same = ours[
                            (ours["name"] == spec["name"])
                            & (ours["arm"] == arm)
                            & (ours["replicate"] == replicate)
                            & (ours["kind"] == "coefficient")
                            & (ours["term"] == name)
                        ]
                        if len(same) == 1:
                            apart = max(
                                abs(estimate - same["estimate"].iloc[0]) / error,
                                abs(error / same["std_error"].iloc[0] - 1),
                            )
                            furthest = max(furthest, apart)
                            line += f"  apart {apart:.0e}"
                        else:
                            furthest = np.inf
                            line += "  not in estimates.csv"
                    print(line)
    if ours is not None:
        print(f"\nfurthest from estimates.csv: {furthest:.1e} (of a standard error)")


if __name__ == "__main__":
    main()
`;
