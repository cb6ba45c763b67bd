"""What the reference answers are made of: a gated tone burst as a function of time, and the output it gives."""

import json
import os
from pathlib import Path

# One thread: small matrices gain nothing from more, and sums keep one order.
os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import numpy as np
from scipy.integrate import Radau

from equations import Equations
from network import read

ROOT = Path(__file__).resolve().parents[2]
STAGES = ROOT / "tests" / "known-answers"
ANSWERS = ROOT / "tests" / "reference"
SAMPLE_RATE = 48_000  # Hz
# Where Newton may stop, as a part of the error allowed in a step. Hairer and Wanner, "Solving Ordinary Differential
# Equations II", section IV.8, advise 0.1 to 0.01 (from memory); scipy's own choice, the root of rtol, lies below the
# rounding of a 200 V potential here and never converges.
NEWTON_TOLERANCE = 1e-2

# name: stage, and a burst of `frequency` Hz whose carrier has `rms` volts at `in`, `burst` s long; the answer covers
# `duration` s from the start of the burst.
BURSTS = {
    "grid-current-burst": {"stage": "known5.toml", "frequency": 1000.0, "rms": 4.0, "burst": 0.010, "duration": 0.020},
    "capacitor-follower-burst": {"stage": "known2.toml", "frequency": 1000.0, "rms": 6.0, "burst": 0.010,
                                 "duration": 0.015},
    "direct-follower-burst": {"stage": "known4.toml", "frequency": 2000.0, "rms": 3.0, "burst": 0.005,
                              "duration": 0.010},
}
QUICK = ["grid-current-burst", "direct-follower-burst"]  # a few seconds each
TOLERANCE = {"rtol": 1e-10, "atol": 1e-11}
LOOSER_TOLERANCE = {"rtol": 1e-9, "atol": 1e-10}


def signal(burst, t):
    """Volts at `in`: sqrt(2) rms sin(2 pi f t) under a raised-cosine gate, 0 from the end of the burst on.

    Value, first and second derivative are continuous everywhere, and the input is 0 V at t = 0.
    """
    if not 0 < t < burst["burst"]:
        return 0.0
    gate = np.sin(np.pi * t / burst["burst"]) ** 2
    return np.sqrt(2) * burst["rms"] * gate * np.sin(2 * np.pi * burst["frequency"] * t)


def solve(burst, rtol, atol):
    """Potential of node `o` at the instants n / SAMPLE_RATE, V, by scipy's Radau IIA of order five.

    Every instant ends a step: between steps Radau offers a cubic alone, far coarser than the steps themselves.
    """
    equations = Equations(read(STAGES / burst["stage"]))
    x = equations.state_at(equations.operating_point())
    count = round(burst["duration"] * SAMPLE_RATE)
    output = [equations.node("o", x, 0.0)]
    step = 1e-6
    for n in range(1, count):
        begin, end = (n - 1) / SAMPLE_RATE, n / SAMPLE_RATE
        solver = Radau(lambda t, y: equations.rate(y, signal(burst, t)), begin, x, end, first_step=min(step, end - begin),
                       rtol=rtol, atol=atol, jac=lambda t, y: equations.jacobian(y))
        solver.newton_tol = NEWTON_TOLERANCE
        while solver.status == "running":
            message = solver.step()
            if solver.status == "failed":
                raise ArithmeticError(f"at {solver.t} s: {message}")
            # The last step of an interval may be cut short by its end: keep the longest.
            step = max(step if solver.status == "finished" else 0.0, solver.step_size)
        x = solver.y
        output.append(equations.node("o", x, signal(burst, end)))
    return np.array(output)


def peak(output):
    """Largest excursion from rest, V."""
    return float(np.abs(output).max())


def committed(name):
    """The committed answer `name`."""
    with open(ANSWERS / f"{name}.json", encoding="utf-8") as file:
        return json.load(file)
