"""The three triode laws, written from their formulas and from nothing else in this repository.

Voltages are against the cathode: `vg` grid, `vp` plate, in volts. Currents flow into grid and plate, in amperes.

Sources: `koren`, N. Koren, "Improved Vacuum-Tube Models for SPICE Simulations", Glass Audio 8 (5), 1996;
`dempwolf-zoelzer`, K. Dempwolf and U. Zoelzer, "A Physically-Motivated Triode Model for Circuit Simulations",
DAFx-11, 2011; `two-section`, this project's own: two elementary triodes of unlike mu in parallel, with a knee.
"""

import cmath
import math

STEP = 1e-25  # V, imaginary: small enough that the derivative it gives is exact to the last bit


def softplus(z):
    """ln(1 + e^z), without overflow, for real and complex z."""
    if isinstance(z, complex):
        return z + cmath.log(1 + cmath.exp(-z)) if z.real > 0 else cmath.log(1 + cmath.exp(z))
    return z + math.log1p(math.exp(-z)) if z > 0 else math.log1p(math.exp(z))


def smooth(x, sharpness):
    """A corner at 0 rounded: about x above it, about 0 below."""
    return softplus(sharpness * x) / sharpness


def _grid(p, vg):
    return p["Gg"] * smooth(vg, p["Cg"]) ** p["xi"] + p.get("Ig0", 0.0)


def dempwolf_zoelzer(p, vg, vp):
    """Grid and plate current, A."""
    cathode = p["G"] * smooth(vp / p["mu"] + vg, p["C"]) ** p["gamma"]
    grid = _grid(p, vg)
    return grid, cathode - grid


def two_section(p, vg, vp):
    """Grid and plate current, A."""
    if vp.real <= 0:
        return _grid(p, vg), 0.0 * vp
    effective = vg + p["offset"]
    plain = smooth(vp / p["mu"] + effective, p["C"]) ** p["gamma"]
    low_mu = smooth(vp / (p["mu"] * p["mu_ratio"]) + effective, p["C"]) ** p["gamma"]
    knee = vp**3 / (vp**3 + p["knee"] ** 3)
    return _grid(p, vg), knee * p["G"] * ((1 - p["share"]) * plain + p["share"] * low_mu)


def koren(p, vg, vp):
    """Grid and plate current, A."""
    if vp.real <= 0:
        return _grid(p, vg), 0.0 * vp
    root = (p["Kvb"] + vp * vp) ** 0.5
    e1 = vp / p["Kp"] * softplus(p["Kp"] * (1 / p["mu"] + vg / root))
    return _grid(p, vg), 2 * e1 ** p["Ex"] / p["Kg1"]


LAWS = {"dempwolf-zoelzer": dempwolf_zoelzer, "two-section": two_section, "koren": koren}


class Triode:
    """A law with its parameters."""

    def __init__(self, model, parameters):
        self.law = LAWS[model]
        self.parameters = parameters

    def currents(self, vg, vp):
        """Grid and plate current, A."""
        return self.law(self.parameters, float(vg), float(vp))

    def slopes(self, vg, vp):
        """[[dIg/dvg, dIg/dvp], [dIp/dvg, dIp/dvp]], S, by complex step (Squire and Trapp 1998)."""
        by_vg = self.law(self.parameters, complex(vg, STEP), complex(vp))
        by_vp = self.law(self.parameters, complex(vg), complex(vp, STEP))
        return [[complex(by_vg[i]).imag / STEP, complex(by_vp[i]).imag / STEP] for i in range(2)]
