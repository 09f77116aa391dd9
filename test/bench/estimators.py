"""Processor time of the set-up of every estimator in numpy, one thread, from a block of returns to its covariance matrix.

Started with --serve it answers each line {"name", "n", "T", "repeats"} on standard input with `repeats` timings.
"""

import os

for library in ("OPENBLAS", "OMP", "MKL"):
    os.environ[f"{library}_NUM_THREADS"] = "1"

import json
import sys
import time

import numpy as np

FACTORS = 10
LAGS = 5
blocks = {}


def block(n, T):
    if (n, T) not in blocks:
        generator = np.random.default_rng(1)
        F = generator.standard_normal((T, FACTORS)) * 0.01
        noise = generator.standard_normal((T, n)) * 0.01
        blocks[n, T] = F @ generator.standard_normal((FACTORS, n)) * 0.3 + noise, F
    return blocks[n, T]


def moments(R):
    X = R - R.mean(axis=0)
    return X, X.T @ X / len(X)


def sample(R, _):
    return np.cov(R, rowvar=False)


def exponential(R, _):
    omega = 0.97 ** np.arange(len(R) - 1, -1, -1.0)
    omega /= omega.sum()
    Z = (R - omega @ R) * np.sqrt(omega)[:, None]
    return Z.T @ Z


def identity(R, _):
    X, S = moments(R)
    T, n = X.shape
    F = np.eye(n) * np.trace(S) / n
    d = ((S - F) ** 2).sum()
    b = (((X**2).sum(axis=1) ** 2).sum() / T - (S**2).sum()) / T
    a = min(b, d) / d
    return (1 - a) * S + a * F


def oas(R, _):
    X, S = moments(R)
    T, n = X.shape
    squares, trace = (S**2).sum(), np.trace(S)
    a = min(1, ((1 - 2 / n) * squares + trace**2) / ((T + 1 - 2 / n) * (squares - trace**2 / n)))
    return (1 - a) * S + a * np.eye(n) * trace / n


def correlation(R, _):
    X, S = moments(R)
    T, n = X.shape
    variances = np.diag(S)
    deviations = np.sqrt(variances)
    outer = np.outer(deviations, deviations)
    r = ((S / outer).sum() - n) / (n * (n - 1))
    F = r * outer
    np.fill_diagonal(F, variances)
    Y = X**2
    noise = Y.T @ Y / T - S**2
    theta = (X**3).T @ X / T - variances[:, None] * S
    np.fill_diagonal(theta, 0)
    rho = np.trace(noise) + r * (theta * deviations[None, :] / deviations[:, None]).sum()
    a = max(0, min(1, (noise.sum() - rho) / ((S - F) ** 2).sum() / T))
    return (1 - a) * S + a * F


def lagged(R, _):
    X, C = moments(R)
    for k in range(1, LAGS + 1):
        G = X[k:].T @ X[:-k] / len(X)
        C = C + (1 - k / (LAGS + 1)) * (G + G.T)
    return C


def factors(R, F):
    T, k = F.shape
    design = np.column_stack([np.ones(T), F])
    B, squares, _, _ = np.linalg.lstsq(design, R, rcond=None)
    return B[1:].T @ np.cov(F, rowvar=False) @ B[1:] + np.diag(squares / (T - k - 1))


routes = {f.__name__: f for f in (sample, exponential, identity, oas, correlation, lagged, factors)}


def timed(name, n, T):
    R, F = block(n, T)
    start = time.process_time()
    routes[name](R, F)
    return (time.process_time() - start) * 1e3


if "--serve" in sys.argv:
    print(json.dumps({"numpy": np.__version__}), flush=True)
    for line in sys.stdin:
        asked = json.loads(line)
        ms = [timed(asked["name"], asked["n"], asked["T"]) for _ in range(asked["repeats"])]
        print(json.dumps({"ms": ms}), flush=True)
