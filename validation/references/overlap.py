"""The overlap of two Woods-Saxon nuclei: thickness, number of collisions, moments and marginal distributions."""

import functools

import mpmath
import numpy as np
from scipy.integrate import quad

from quadrature import gauss, write_reference

# Radius and diffuseness in fm: a heavy one, a light one, one that is all surface.
NUCLEI = {"heavy": (6.62, 0.546), "light": (2.61, 0.51), "surface": (0.8, 0.6)}
IMPACT_PARAMETERS_FM = {"heavy": (0.0, 4.0, 7.5, 11.0, 16.0), "light": (0.0, 3.0, 6.0), "surface": (0.0, 2.0)}
THICKNESS_AT_FM = (0.0, 0.05, 0.7, 2.0, 4.3, 6.62, 8.0, 12.0)
TAIL = 40.0
TOLERANCE = 1e-6
MARGINAL_POINTS = 121


@functools.cache
def volume(radius, diffuseness):
    """int d^3r/(1 + exp((r - R)/a)) = -8 pi a^3 Li_3(-exp(R/a))."""
    return float(-8 * mpmath.pi * mpmath.mpf(diffuseness) ** 3 * mpmath.polylog(3, -mpmath.exp(mpmath.mpf(radius) / diffuseness)))


def thickness_by_quad(radius, diffuseness, s):
    """T(s) per nucleon by scipy's adaptive quadrature over z."""

    def density(z):
        return 1.0 / (1.0 + np.exp((np.hypot(s, z) - radius) / diffuseness))

    last = max(s, radius) + TAIL * diffuseness
    total = sum(quad(density, a, b, epsabs=0, epsrel=1e-13, limit=400)[0] for a, b in ((0, 0.5), (0.5, radius + 1.0), (radius + 1.0, last)))
    return 2.0 * total / volume(radius, diffuseness)


def thickness_by_mpmath(radius, diffuseness, s):
    """T(s) per nucleon in arbitrary precision, over r instead of z: 2 int_s^inf rho r dr/sqrt(r^2 - s^2), r = s + w^2."""
    radius, diffuseness, s = mpmath.mpf(radius), mpmath.mpf(diffuseness), mpmath.mpf(s)

    def integrand(w):
        r = s + w * w
        return 2 * r / mpmath.sqrt(r + s) / (1 + mpmath.exp((r - radius) / diffuseness)) if r > 0 else mpmath.mpf(0)

    last = mpmath.sqrt(max(s, radius) + TAIL * diffuseness)
    edges = [0, mpmath.mpf("0.25"), 1, 1.5, 2, 2.5, 3, 4, last]
    return float(2 * mpmath.quad(integrand, sorted(edges)) / volume(radius, diffuseness))


@functools.cache
def rule():
    """Gauss and Legendre of order 20 on [-1, 1]."""
    return gauss(20)


def thickness(radius, diffuseness):
    """T as a vectorised function: Gauss quadrature over z on panels of a diffuseness, graded towards z = 0."""
    nodes, weights = rule()
    norm = volume(radius, diffuseness)

    def at(s):
        s = np.asarray(s, dtype=float)
        last = np.max(np.maximum(s, radius)) + TAIL * diffuseness
        edges = np.concatenate([[0.0], diffuseness * np.geomspace(1e-3, 1.0, 8), np.arange(2.0 * diffuseness, last, diffuseness)])
        total = np.zeros_like(s)
        for low, high in zip(edges[:-1], edges[1:]):
            half = 0.5 * (high - low)
            for node, weight in zip(nodes, weights):
                z = low + half * (1.0 + node)
                total += half * weight / (1.0 + np.exp(np.minimum((np.hypot(s, z) - radius) / diffuseness, 700.0)))
        return 2.0 * total / norm

    return at


@functools.cache
def interpolant(radius, diffuseness):
    """ln T as a Chebyshev series in s on pieces, checked."""
    exact = thickness(radius, diffuseness)
    last = 2.0 * radius + 60.0 * diffuseness
    # Light nuclei have a cusp at the centre, a share exp(-R/a) of their density: pieces are graded towards it.
    edges = np.concatenate([[0.0], diffuseness * np.geomspace(1e-3, 0.5, 10), np.linspace(diffuseness, last, 60)])
    pieces = [np.polynomial.chebyshev.Chebyshev.interpolate(lambda s: np.log(exact(s)), 20, [a, b]) for a, b in zip(edges[:-1], edges[1:])]

    def at(s):
        place = np.minimum(np.searchsorted(edges, s, side="right") - 1, len(pieces) - 1)
        value = np.empty_like(s)
        for number, piece in enumerate(pieces):
            inside = place == number
            value[inside] = piece(s[inside])
        return np.exp(value)

    probe = np.linspace(0.0, edges[-2], 200)
    worst = np.max(np.abs(at(probe) / exact(probe) - 1.0))
    assert worst < 1e-8, worst
    return at


def density(nucleus, b, x, y):
    """T T at a place, fm^-4."""
    at = interpolant(*nucleus)
    return at(np.hypot(x - 0.5 * b, y)) * at(np.hypot(x + 0.5 * b, y))


def cartesian(nucleus, b):
    """[int, <x^2>, <y^2>] by the rectangle rule, exponentially convergent, and marginals in x and y."""
    radius, diffuseness = nucleus
    half = max(radius + 25.0 * diffuseness, 0.5 * b)
    points = 801
    axis = np.linspace(-half, half, points)
    step = axis[1] - axis[0]
    x, y = np.meshgrid(axis, axis, indexing="ij")
    values = density(nucleus, b, x, y)
    total = values.sum() * step * step
    moments = [(values * q).sum() * step * step / total for q in (x * x, y * y)]
    marginals = [values.sum(axis=other) * step / total for other in (1, 0)]
    return [total, *moments], (axis, *marginals)


def polar(nucleus, b):
    """The same moments in polar coordinates about the midpoint: Gauss panels in r, equal angles."""
    radius, diffuseness = nucleus
    last = max(radius + 25.0 * diffuseness, 0.5 * b)
    # Round nuclei at |x| = b/2 may have a cusp at their centre: a panel ends there.
    edges = np.unique(np.concatenate([np.linspace(0.0, last, 120), [0.5 * b]]))
    nodes, weights = rule()
    angles = (np.arange(720) + 0.5) * np.pi / 1440.0
    sums = np.zeros(3)
    for low, high in zip(edges[:-1], edges[1:]):
        half = 0.5 * (high - low)
        r = (low + half * (1.0 + nodes))[:, None]
        x, y = r * np.cos(angles), r * np.sin(angles)
        values = density(nucleus, b, x, y) * r * (half * weights)[:, None]
        sums += [(values * q).sum() for q in (1.0, x * x, y * y)]
    sums *= 4.0 * np.pi / 1440.0
    return [sums[0], sums[1] / sums[0], sums[2] / sums[0]]


@functools.cache
def integral_by_form_factor(nucleus, b):
    """int T T d^2s = int k dk/(2 pi) J_0(k b) F(k)^2, F the form factor of the profile (three-dimensional transform)."""
    radius, diffuseness = nucleus
    norm = volume(radius, diffuseness)
    r, weight = np.polynomial.legendre.leggauss(2000)
    last = radius + 45.0 * diffuseness
    r, weight = 0.5 * last * (1.0 + r), 0.5 * last * weight
    profile = 4.0 * np.pi * r * r * weight / (1.0 + np.exp((r - radius) / diffuseness)) / norm
    k, k_weight = np.polynomial.legendre.leggauss(1500)
    largest = 16.0 / diffuseness
    k, k_weight = 0.5 * largest * (1.0 + k), 0.5 * largest * k_weight
    form = np.array([(profile * np.sinc(one * r / np.pi)).sum() for one in k])
    bessel = np.vectorize(lambda x: float(mpmath.besselj(0, x)))(k * b)
    return float((k * k_weight * bessel * form**2).sum() / (2.0 * np.pi))


def cumulative(axis, marginal):
    """The distribution function on the points: the trapezoidal sum with two end corrections (Euler and Maclaurin)."""
    step = axis[1] - axis[0]
    slope = np.gradient(marginal, step, edge_order=2)
    third = np.gradient(np.gradient(slope, step, edge_order=2), step, edge_order=2)
    below = np.cumsum(marginal) * step - 0.5 * step * marginal
    return below - step**2 / 12.0 * slope + step**4 / 720.0 * third


def main():
    """Compute, check, write."""
    mpmath.mp.dps = 25
    profiles, cases = [], []
    thickness_error = integral_error = polar_error = norm_error = 0.0
    for name, nucleus in NUCLEI.items():
        rows = []
        for s in THICKNESS_AT_FM:
            exact, second = thickness_by_mpmath(*nucleus, s), thickness_by_quad(*nucleus, s)
            thickness_error = max(thickness_error, abs(second / exact - 1.0), abs(float(interpolant(*nucleus)(np.array([s]))[0]) / exact - 1.0))
            rows.append({"s_fm": s, "thickness_per_fm2": exact})
        at = interpolant(*nucleus)
        s = np.linspace(0.0, nucleus[0] + 40.0 * nucleus[1], 4001)
        simpson = np.ones_like(s)
        simpson[1:-1:2], simpson[2:-1:2] = 4.0, 2.0
        norm_error = max(norm_error, abs((2.0 * np.pi * s * at(s) * simpson).sum() * (s[1] - s[0]) / 3.0 - 1.0))
        profiles.append({"name": name, "radius_fm": nucleus[0], "diffuseness_fm": nucleus[1], "thickness": rows})
        for b in IMPACT_PARAMETERS_FM[name]:
            first, (axis, along_x, along_y) = cartesian(nucleus, b)
            second = polar(nucleus, b)
            polar_error = max(polar_error, max(abs(p / q - 1.0) for p, q in zip(second, first)))
            by_form = integral_by_form_factor(nucleus, b)
            # The transform oscillates, so its error is relative to the central overlap.
            integral_error = max(integral_error, abs(by_form - first[0]) / integral_by_form_factor(nucleus, 0.0))
            total, x2, y2 = first
            chosen = np.unique(np.linspace(0, len(axis) - 1, MARGINAL_POINTS * 2 - 1).astype(int))
            cases.append(
                {
                    "nucleus": name,
                    "radius_fm": nucleus[0],
                    "diffuseness_fm": nucleus[1],
                    "impact_parameter_fm": b,
                    "integral_per_fm2": total,
                    "mean_x2_fm2": x2,
                    "mean_y2_fm2": y2,
                    "mean_r2_fm2": x2 + y2,
                    "ellipticity": abs(x2 - y2) / (x2 + y2),
                    "marginals": {
                        "place_fm": axis[chosen],
                        "below_x": cumulative(axis, along_x)[chosen],
                        "below_y": cumulative(axis, along_y)[chosen],
                    },
                }
            )
            print(name, b, first, f"{abs(by_form / total - 1.0):.1e}")
    print(thickness_error, norm_error, integral_error, polar_error)
    assert max(thickness_error, norm_error, integral_error, polar_error) < TOLERANCE, "two ways disagree"
    write_reference(
        "overlap",
        "Overlap of two equal Woods-Saxon nuclei",
        ["Miller, Reygers, Sanders & Steinberg 2007, nucl-ex/0701025 (thickness, overlap, binary collisions)"],
        "rho ~ 1/(1 + exp((r - R)/a)) with unit integral; thickness T(s) = int rho dz; density of collisions T(|s - b/2|) T(|s + b/2|) with b along x; "
        "moments with that density about the midpoint; ellipticity = |<x^2> - <y^2>|/<r^2>; marginals: share of the density below a coordinate",
        {
            "largest_relative_difference_of_T_between_mpmath_scipy_and_gauss": thickness_error,
            "largest_difference_of_int_T_d2s_to_1": norm_error,
            "largest_difference_of_the_overlap_to_the_form_factor_integral_over_the_central_one": integral_error,
            "largest_relative_difference_of_moments_in_polar_coordinates": polar_error,
        },
        nuclei=profiles,
        cases=cases,
    )


if __name__ == "__main__":
    main()
