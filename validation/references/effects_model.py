"""Every effect on rates as a density in a uniform brick, and a leg that branches with their sum.

The total density (per d ln t dz) is f_vac Theta + sum_i D_i: Theta from `resolved-only`, one D_i an effect. Induced
emissions end where the angle would not be small, z(1-z) t <= min(z, 1-z)^2 E^2, if the case says so. All with the
gluon's qhat; the parton is born at the start of the brick, so its remaining path is the length.
"""

import numpy as np
from scipy.optimize import brentq

import conventions as qcd
import medium_model
from leg import Leg

TINY = 1e-10


def fractions(u):
    """z and 1-z at u = ln(z/(1-z))."""
    return 1.0 / (1.0 + np.exp(-u)), 1.0 / (1.0 + np.exp(u))


class CollinearExpansion:
    """D = f_vac R; see medium_model."""

    def __init__(self, phase, window=None, pair_production=False):
        self.phase, self.window, self.pair_production = phase, window, pair_production
        self.description = {"kind": "collinear-expansion", "phase": phase}
        if window is not None:
            self.description["window"] = window
        if pair_production:
            self.description["pair_production"] = True

    def set_up(self, brick):
        self.brick = medium_model.Brick(self.phase, brick.energy_gev, brick.length_fm, brick.qhat, False, self.window)

    def added(self, leg, channel, t, u):
        if channel == "g-qq" and not self.pair_production:
            return 0.0
        return leg.vacuum_density(channel, t, u) * self.brick.ratio(t, u)

    def kinks_in_t(self, leg):
        return self.brick.kinks_in_t(leg)

    def phase_panels(self, t0, t_max):
        return self.brick.phase_panels(t0, t_max)


class Emission:
    """An effect that adds gluon emission alone and has no kinks of its own."""

    def kinks_in_t(self, leg):
        return []

    def phase_panels(self, t0, t_max):
        return np.zeros(0)

    def set_up(self, brick):
        self.brick = brick

    def added(self, leg, channel, t, u):
        if channel == "g-qq":
            return 0.0
        z, rest = fractions(u)
        return leg.coupling(z * rest, t) / (2.0 * np.pi) * z * rest * self.kernel(channel, t, z, rest)


class SingularEnhancement(Emission):
    """The soft-singular part of the kernel times f (Borghini & Wiedemann 2005, hep-ph/0506218)."""

    def __init__(self, enhancement=None, slope_per_gev2=None):
        self.constant, self.slope = enhancement, slope_per_gev2
        size = {"enhancement": enhancement} if slope_per_gev2 is None else {"slope_per_GeV2": slope_per_gev2}
        self.description = {"kind": "singular-enhancement", **size}

    def kernel(self, channel, t, z, rest):
        f = self.constant if self.slope is None else self.slope * self.brick.qhat * self.brick.length_fm
        # With the 1/2 of identical gluons: C_A (1/z + 1/(1-z)).
        return f * (2.0 * qcd.C_F / rest if channel == "q-qg" else qcd.C_A * (1.0 / z + 1.0 / rest))


class Spectrum(Emission):
    """Delta P from h: 4 C_F/(1-z) h for a quark, half of 4 C_A [h/(1-z) + h/z] for a gluon, each h at its own omega."""

    def kernel(self, channel, t, z, rest):
        kappa2 = z * rest * t
        last = 4.0 / rest * self.h(rest * self.brick.energy_gev, kappa2)
        if channel == "q-qg":
            return qcd.C_F * last
        return 0.5 * qcd.C_A * (last + 4.0 / z * self.h(z * self.brick.energy_gev, kappa2))


class MultipleSoft(Spectrum):
    """Baier, Dokshitzer, Mueller, Peigne & Schiff; Zakharov; see spectra_model."""

    description = {"kind": "multiple-soft"}
    table = None

    def scaled(self, omega, kappa2):
        """omega/omega_c and kappa^2/(qhat L)."""
        critical = 0.5 * self.brick.qhat * self.brick.length_fm**2 / qcd.HBAR_C_GEV_FM
        return omega / critical, kappa2 / (self.brick.qhat * self.brick.length_fm)

    def h(self, omega, kappa2):
        return type(self).table(*self.scaled(omega, kappa2))


class SingleHard(Spectrum):
    """First order in opacity; see spectra_model."""

    table = None

    def __init__(self, opacity, mu_gev):
        self.opacity, self.mu_gev = opacity, mu_gev
        self.description = {"kind": "single-hard", "gluon_opacity": opacity, "mu_GeV": mu_gev}

    def scaled(self, omega, kappa2):
        """gamma = mu^2 L/(2 omega) and kappa^2/mu^2."""
        return self.mu_gev**2 * self.brick.length_fm / (2.0 * omega * qcd.HBAR_C_GEV_FM), kappa2 / self.mu_gev**2

    def h(self, omega, kappa2):
        return self.opacity * type(self).table(*self.scaled(omega, kappa2))


class ResolvedOnly:
    """No vacuum branching of any kind where sqrt(2 omega/qhat) < tau_f < L, omega = min(z, 1-z) E (Mehtar-Tani, Salgado &
    Tywoniuk 2010-12, arXiv:1009.2965, 1205.5739; Caucal, Iancu, Mueller & Soyez 2018, arXiv:1801.09703)."""

    description = {"kind": "resolved-only"}

    def set_up(self, brick):
        self.first_t = 2.0 * brick.energy_gev * qcd.HBAR_C_GEV_FM / brick.length_fm
        # tau_f^2 > 2 omega hbar c/qhat is min(z, 1-z) t^2 < this.
        self.softness = 2.0 * brick.qhat * brick.energy_gev * qcd.HBAR_C_GEV_FM

    def keeps(self, t, u):
        """Theta."""
        softer = 1.0 / (1.0 + np.exp(np.abs(u)))
        return np.where((t > self.first_t) & (softer * t * t < self.softness), 0.0, 1.0)

    def edge(self, t):
        """|u| beyond which the veto acts above first_t."""
        share = np.minimum(self.softness / (t * t), 0.5)
        return np.log((1.0 - share) / share)

    def kinks_in_t(self, leg):
        sharp = self.first_t
        kinks = [sharp * (1.0 - TINY), sharp, sharp * (1.0 + TINY), np.sqrt(2.0 * self.softness)]
        return kinks + crossings(leg, self.edge)


def crossings(leg, edge):
    """Values of t at which the edge |u| = edge(t) meets the end of the z range."""

    def gap(t):
        return float(leg.widest_u(leg.y_of(np.array([t])))[0]) - float(edge(t))

    grid = np.geomspace(leg.t0 * (1.0 + 1e-12), leg.t_max, 200)
    values = [gap(t) for t in grid]
    return [brentq(gap, a, b, xtol=1e-13, rtol=1e-14) for a, b, x, y in zip(grid[:-1], grid[1:], values[:-1], values[1:]) if x * y < 0.0]


class Brick:
    """A uniform brick with effects, in the words that Leg asks for."""

    def __init__(self, energy_gev, length_fm, qhat_gev2_per_fm, small_angles, *effects):
        self.energy_gev, self.length_fm, self.qhat, self.small_angles = energy_gev, length_fm, qhat_gev2_per_fm, small_angles
        self.adding = [effect for effect in effects if not isinstance(effect, ResolvedOnly)]
        self.vetoing = [effect for effect in effects if isinstance(effect, ResolvedOnly)]
        for effect in effects:
            effect.set_up(self)
        self.description = {
            "energy_GeV": energy_gev,
            "length_fm": length_fm,
            "gluon_qhat_GeV2_per_fm": qhat_gev2_per_fm,
            "effects": [effect.description for effect in effects],
            "limit_to_small_angles": small_angles,
        }

    def angle_edge(self, t):
        """z(1-z) t = min(z, 1-z)^2 E^2."""
        return np.log(self.energy_gev**2 / t)

    def kinks_in_u(self, t):
        kinks = [np.maximum(self.angle_edge(t), 0.0)] if self.small_angles and self.adding else []
        return kinks + [np.where(t > effect.first_t, effect.edge(t), 0.0) for effect in self.vetoing]

    def kinks_in_t(self, leg):
        kinks = [t for effect in self.adding + self.vetoing for t in effect.kinks_in_t(leg)]
        return kinks + (crossings(leg, self.angle_edge) if self.small_angles and self.adding else [])

    def kinks_in_t_at(self, u):
        kinks = [self.energy_gev**2 * np.exp(-np.abs(u))] if self.small_angles and self.adding else []
        return kinks + [np.sqrt(effect.softness * (1.0 + np.exp(np.abs(u)))) for effect in self.vetoing]

    def phase_panels(self, t0, t_max):
        return np.concatenate([np.array([t0]), *(effect.phase_panels(t0, t_max) for effect in self.adding)])


class EffectsLeg(Leg):
    """A leg in such a brick."""

    def added(self, effect, channel, t, u):
        """D_i, evaluated only inside the small-angle limit."""
        t, u = np.broadcast_arrays(t, u)
        inside = np.abs(u) <= self.medium.angle_edge(t) if self.medium.small_angles else np.ones(u.shape, bool)
        value = np.zeros(u.shape)
        if np.any(inside):
            value[inside] = effect.added(self, channel, t[inside], u[inside])
        return value

    def part_density(self, channel, t, u, part):
        added = [self.added(effect, channel, t, u) for effect in self.medium.adding]
        if part == "induced":
            return sum(np.maximum(one, 0.0) for one in added)
        vacuum = self.vacuum_density(channel, t, u)
        for effect in self.medium.vetoing:
            vacuum = vacuum * effect.keeps(t, u)
        if part == "vacuum":
            return vacuum + sum(np.minimum(one, 0.0) for one in added)
        return vacuum + sum(added)

    def density(self, channel, t, u):
        return self.part_density(channel, t, u, "all")
