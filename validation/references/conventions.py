"""Constants, the running coupling and the leading-order kernels, written apart from the Rust engine.

Coupling: Review of Particle Physics, chapter "Quantum chromodynamics" (beta function to two loops).
Kernels: Altarelli & Parisi 1977, Nucl. Phys. B 126:298; Ellis, Stirling & Webber, QCD and Collider Physics, ch. 4-5.
"""

import math

import numpy as np
from scipy.optimize import brentq

HBAR_C_GEV_FM = 0.1973269804  # CODATA 2018
C_F, C_A, T_R = 4.0 / 3.0, 3.0, 0.5
Z_MASS_GEV = 91.1876
ALPHA_S_MZ = 0.118
CHARM_GEV, BOTTOM_GEV = 1.5, 4.75
FREEZE_GEV = 1.0

LARGEST_SCALE_GEV = 1.0e4
CHEBYSHEV_DEGREE = 60


def flavours_at(mu2):
    """Number of flavours in the running at the squared scale."""
    return 3 + (mu2 >= CHARM_GEV**2) + (mu2 >= BOTTOM_GEV**2)


def beta_coefficients(n_f):
    """b0 and b1 of d alpha/d ln mu^2 = -b0 alpha^2 - b1 alpha^3."""
    return (33.0 - 2.0 * n_f) / (12.0 * math.pi), (153.0 - 19.0 * n_f) / (24.0 * math.pi**2)


def run(alpha, mu2_from, mu2_to, n_f, loops):
    """alpha_s carried between two squared scales at constant n_f, exactly in the truncated beta function."""
    b0, b1 = beta_coefficients(n_f)
    distance = math.log(mu2_to / mu2_from)
    if loops == 1:
        return alpha / (1.0 + b0 * alpha * distance)

    def primitive(a):
        # d primitive / d ln mu^2 = 1 along the exact two-loop solution.
        return 1.0 / (b0 * a) + b1 / b0**2 * math.log(a / (b0 + b1 * a))

    target = primitive(alpha) + distance
    return brentq(lambda a: primitive(a) - target, 1e-4, 50.0, xtol=1e-16, rtol=1e-15)


def exact_alpha_s(mu_gev, loops, alpha_s_mz=ALPHA_S_MZ, freeze_gev=FREEZE_GEV):
    """alpha_s at one scale, thresholds crossed one by one from the Z mass (which has five flavours)."""
    mu2 = max(mu_gev, freeze_gev) ** 2
    alpha, here, n_f = alpha_s_mz, Z_MASS_GEV**2, 5
    for threshold in (BOTTOM_GEV**2, CHARM_GEV**2):
        if mu2 >= threshold:
            break
        alpha, here, n_f = run(alpha, here, threshold, n_f, loops), threshold, n_f - 1
    return run(alpha, here, mu2, n_f, loops)


class FixedCoupling:
    """The same value everywhere."""

    kinks_gev = ()

    def __init__(self, alpha_s):
        self.alpha_s = alpha_s
        self.description = {"argument": "fixed", "alpha_s": alpha_s}

    def __call__(self, z_one_minus_z, t):
        return np.full(np.broadcast(z_one_minus_z, t).shape, self.alpha_s)


class RunningCoupling:
    """alpha_s of t or of z(1-z) t; piecewise Chebyshev interpolants of the exact solution, checked on construction."""

    def __init__(self, argument, loops=1, alpha_s_mz=ALPHA_S_MZ, freeze_gev=FREEZE_GEV):
        assert argument in ("virtuality", "transverse-momentum")
        self.argument = argument
        self.freeze2 = freeze_gev**2
        self.description = {"argument": argument, "loops": loops, "alpha_s_mz": alpha_s_mz, "freeze_GeV": freeze_gev}
        self.kinks_gev = tuple(sorted({freeze_gev, CHARM_GEV, BOTTOM_GEV}))
        self.edges = np.log([max(self.freeze2, 1e-12), CHARM_GEV**2, BOTTOM_GEV**2, LARGEST_SCALE_GEV**2])
        self.pieces = []
        for low, high in zip(self.edges[:-1], self.edges[1:]):
            # The upper end of a piece is taken from below; the coupling is continuous there.
            value = np.vectorize(lambda x: exact_alpha_s(math.exp(0.5 * x), loops, alpha_s_mz, freeze_gev))
            piece = np.polynomial.chebyshev.Chebyshev.interpolate(value, CHEBYSHEV_DEGREE, [low, high])
            probe = np.linspace(low, high, 37)
            worst = np.max(np.abs(piece(probe) / value(probe) - 1.0))
            assert worst < 2e-13, f"coupling table off by {worst}"
            self.pieces.append(piece)

    def at(self, mu2):
        """alpha_s at an array of squared scales."""
        x = np.log(np.maximum(mu2, self.freeze2))
        charm, bottom = self.edges[1], self.edges[2]
        return np.where(
            x < charm,
            self.pieces[0](np.minimum(x, charm)),
            np.where(x < bottom, self.pieces[1](np.clip(x, charm, bottom)), self.pieces[2](np.maximum(x, bottom))),
        )

    def __call__(self, z_one_minus_z, t):
        if self.argument == "virtuality":
            return np.broadcast_to(self.at(t), np.broadcast(z_one_minus_z, t).shape)
        return self.at(z_one_minus_z * t)


def quark_to_quark_gluon(z, one_minus_z):
    """C_F (1 + z^2)/(1 - z); z is the quark's."""
    return C_F * (1.0 + z * z) / one_minus_z


def gluon_to_gluons(z, one_minus_z):
    """2 C_A (1 - z(1-z))^2/(z(1-z)), with 1/2 for identical gluons over the full range."""
    both = z * one_minus_z
    return C_A * (1.0 - both) ** 2 / both


def gluon_to_one_flavour(z, one_minus_z):
    """T_R (z^2 + (1-z)^2) for one flavour."""
    return T_R * (z * z + one_minus_z * one_minus_z)


def open_flavours(t, flavours, opening):
    """How many flavours g -> q qbar may make at t."""
    if opening == "always":
        return np.full(np.shape(t), float(flavours))
    count = np.full(np.shape(t), 3.0)
    if flavours >= 4:
        count = count + (t > 4.0 * CHARM_GEV**2)
    if flavours >= 5:
        count = count + (t > 4.0 * BOTTOM_GEV**2)
    return count
