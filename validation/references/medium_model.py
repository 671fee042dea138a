"""The collinear-expansion rate of a uniform brick, written apart from the Rust engine.

D = f R, R = int_0^L dl qhat/(z(1-z) t) K(l/tau_f), tau_f = 2 E hbar c/t, with the gluon's qhat (Guo & Wang 2000,
hep-ph/0005044; Majumder 2009, arXiv:0901.4516; cross terms: Aurenche, Zakharov & Zaraket 2008, arXiv:0804.4282).
For constant qhat the integral of K closes: R = qhat tau_f/(z(1-z) t) S(L/tau_f).
"""

import mpmath
import numpy as np
from scipy.optimize import brentq

import conventions as qcd


def phase_factor(phase, phi, functions=np):
    """K(phi)."""
    plain = 2.0 - 2.0 * functions.cos(phi)
    if phase == "interference":
        return plain
    if phase == "soft-gradient":
        return plain - 2.0 * phi * functions.sin(phi)
    assert phase == "rescattering"
    return plain - 2.0 * phi * functions.sin(phi) + 2.0 * phi**2 * functions.cos(phi)


def phase_integral(phase, x):
    """S(X) = int_0^X K(phi) d phi."""
    sine, cosine = np.sin(x), np.cos(x)
    if phase == "interference":
        return 2.0 * (x - sine)
    if phase == "soft-gradient":
        return 2.0 * x - 4.0 * sine + 2.0 * x * cosine
    assert phase == "rescattering"
    return 2.0 * x - 8.0 * sine + 6.0 * x * cosine + 2.0 * x * x * sine


class Brick:
    """A uniform brick crossed along length_fm by a parton of fixed energy born at its start."""

    def __init__(self, phase, energy_gev, length_fm, qhat_gev2_per_fm, small_angles, window=None):
        assert (window is not None) == (phase == "rescattering")
        self.phase, self.energy_gev, self.length_fm = phase, energy_gev, length_fm
        self.qhat, self.small_angles, self.window = qhat_gev2_per_fm, small_angles, window
        effect = {"kind": "collinear-expansion", "phase": phase}
        if window is not None:
            effect["window"] = window
        self.description = {
            "energy_GeV": energy_gev,
            "length_fm": length_fm,
            "gluon_qhat_GeV2_per_fm": qhat_gev2_per_fm,
            "effect": effect,
            "limit_to_small_angles": small_angles,
        }

    def formation_fm(self, t):
        return 2.0 * self.energy_gev * qcd.HBAR_C_GEV_FM / t

    def reach(self, t):
        """X, the largest phase."""
        x = self.length_fm / self.formation_fm(t)
        return x if self.window is None else np.minimum(x, self.window)

    def ratio(self, t, u):
        """R(t, z) at u = ln(z/(1-z)), zero where the small-angle limit forbids it."""
        z_one_minus_z = 1.0 / (4.0 * np.cosh(0.5 * u) ** 2)
        value = self.qhat * self.formation_fm(t) / (z_one_minus_z * t) * phase_integral(self.phase, self.reach(t))
        if not self.small_angles:
            return value
        # z(1-z) t <= min(z, 1-z)^2 E^2 is |u| <= ln(E^2/t).
        return np.where(np.abs(u) <= np.log(self.energy_gev**2 / t), value, 0.0)

    def ratio_by_path(self, t, z):
        """R without the limit by integrating over the path in arbitrary precision."""
        formation = self.formation_fm(t)
        length = self.length_fm if self.window is None else min(self.length_fm, self.window * formation)
        marks = mpmath.linspace(0, length, 2 + int(length / formation / 3.0))
        integral = mpmath.quad(lambda l: phase_factor(self.phase, l / formation, mpmath), marks)
        return float(self.qhat / (z * (1.0 - z) * t) * integral)

    def kinks_in_u(self, t):
        return [np.maximum(np.log(self.energy_gev**2 / t), 0.0)] if self.small_angles else []

    def kinks_in_t(self, leg):
        kinks = []
        if self.window is not None:
            kinks.append(2.0 * self.energy_gev * qcd.HBAR_C_GEV_FM * self.window / self.length_fm)
        if self.small_angles:

            def gap(t):
                return float(leg.widest_u(leg.y_of(np.array([t])))[0]) - np.log(self.energy_gev**2 / t)

            if gap(leg.t0 * (1.0 + 1e-12)) * gap(leg.t_max) < 0.0:
                kinks.append(brentq(gap, leg.t0 * (1.0 + 1e-12), leg.t_max, xtol=1e-13, rtol=1e-14))
        return kinks

    def kinks_in_t_at(self, u):
        return [self.energy_gev**2 * np.exp(-np.abs(u))] if self.small_angles else []

    def phase_panels(self, t0, t_max):
        """Values of t that cut the oscillation into half periods."""
        if self.window is not None:
            return np.array([t0])
        per_t = self.length_fm / (2.0 * self.energy_gev * qcd.HBAR_C_GEV_FM)
        return np.arange(np.ceil(t0 * per_t / np.pi), np.floor(t_max * per_t / np.pi) + 1.0) * np.pi / per_t
