"""Times the decomposition in numpy, one thread, on a block centred beforehand.

two-pass:    y = X w, then C w = X'y / (T-1): no matrix
covariance:  C = np.cov(X), then C w

Run alone it prints JSON lines {name, n, T, median_ms}. With --serve it answers each line {"name", "n", "T", "repeats"} on
standard input with `repeats` timings, so that a caller can take turns with it on a noisy machine.
"""

import os

for library in ("OPENBLAS", "OMP", "MKL"):
    os.environ[f"{library}_NUM_THREADS"] = "1"

import json
import statistics
import sys
import time

import numpy as np

blocks = {}


def block(n, T):
    if (n, T) not in blocks:
        generator = np.random.default_rng(1)
        X = generator.standard_normal((T, n)) * 0.01
        blocks[n, T] = X - X.mean(axis=0), generator.standard_normal(n)
    return blocks[n, T]


def finish(Cw, w):
    s = np.sqrt(w @ Cw)
    contribution = w * Cw / s
    return contribution, contribution / s


def two_pass(X, w):
    return finish(X.T @ (X @ w) / (len(X) - 1), w)


def covariance(X, w):
    return finish(np.cov(X, rowvar=False) @ w, w)


routes = {"numpy two-pass": two_pass, "numpy covariance": covariance}


def timed(name, n, T):
    X, w = block(n, T)
    start = time.perf_counter()
    routes[name](X, w)
    return (time.perf_counter() - start) * 1e3


if "--serve" in sys.argv:
    print(json.dumps({"numpy": np.__version__}), flush=True)
    for line in sys.stdin:
        asked = json.loads(line)
        ms = [timed(asked["name"], asked["n"], asked["T"]) for _ in range(asked["repeats"])]
        print(json.dumps({"ms": ms}), flush=True)
else:
    for n in (100, 500, 1000, 5000):
        for name, repeats in (("numpy two-pass", 30), ("numpy covariance", 5)):
            timed(name, n, 1260)
            median = statistics.median(timed(name, n, 1260) for _ in range(repeats))
            print(json.dumps({"name": name, "n": n, "T": 1260, "median_ms": round(median, 4)}))
