#!/usr/bin/env python3
"""Writes tests/reference/binomial.json: binomial figures by scipy.stats, which listening tests are judged by.

Run with the environment that tools/run-tests makes: .venv/bin/python tools/reference/binomial.py
"""

import json
import pathlib

from scipy.stats import binom, binomtest

ANSWER = pathlib.Path(__file__).parents[2] / "tests" / "reference" / "binomial.json"
COUNTS = [(0, 5), (3, 5), (5, 5), (7, 10), (12, 16), (16, 16), (9, 20), (18, 25), (60, 100), (260, 500)]


def at_least(k, n, p):
    return {"k": k, "n": n, "p": p, "probability": float(binom.sf(k - 1, n, p))}


def clopper_pearson(k, n, confidence):
    interval = binomtest(k, n).proportion_ci(confidence, method="exact")
    return {"k": k, "n": n, "confidence": confidence, "low": float(interval.low), "high": float(interval.high)}


def sign_test(one, other):
    return {"one": one, "other": other, "probability": float(binomtest(one, one + other, 0.5).pvalue)}


def plan(effect, power, alpha):
    """The fewest trials: every number is tried in turn."""
    for n in range(1, 2001):
        needed = next((k for k in range(n + 1) if binom.sf(k - 1, n, 0.5) <= alpha), None)
        if needed is not None and binom.sf(needed - 1, n, effect) >= power:
            return {"effect": effect, "power": power, "alpha": alpha, "trials": n, "needed": needed,
                    "achieved": float(binom.sf(needed - 1, n, effect))}
    raise ValueError("no plan")


def main():
    answer = {
        "method": "scipy.stats.binom.sf, scipy.stats.binomtest; tools/reference/binomial.py",
        "at_least": [at_least(k, n, p) for k, n in COUNTS for p in (0.5, 0.7, 0.9)],
        "clopper_pearson": [clopper_pearson(k, n, c) for k, n in COUNTS for c in (0.95, 0.99)],
        "sign_test": [sign_test(a, b) for a, b in [(0, 1), (1, 1), (5, 0), (8, 2), (2, 8), (15, 15), (30, 12), (300, 240)]],
        "plans": [plan(*asked) for asked in [(0.7, 0.8, 0.05), (0.75, 0.8, 0.05), (0.9, 0.8, 0.05), (0.6, 0.8, 0.05),
                                             (0.7, 0.9, 0.05), (0.8, 0.95, 0.01), (0.55, 0.8, 0.05)]],
    }
    ANSWER.write_text(json.dumps(answer, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
