"""The gluon spectrum at first order in opacity of a static brick, screened Coulomb centres, double differential.

With gamma = mu^2 L/(2 omega), v = kappa^2/mu^2, momenta in units of mu and per unit of opacity n0 L:
h = int d^2q V(q) k.q/(k - q)^2 [1 - sin(gamma p^2)/(gamma p^2)], p = k - q, V = 1/(pi (1 + q^2)^2); vacuum h = 1/2.
"""

import numpy as np
from scipy.special import sici

from brick_panels import nodes_of, stepped_edges
from quadrature import write_reference

INVERSE_GAMMAS = (1e-3, 0.01, 0.1, 0.3, 1.0, 2.0, 5.0, 20.0, 100.0)
V_POINTS = (1e-3, 0.03, 0.3, 1.0, 4.0, 30.0, 200.0)
# Beyond this product of gamma and v the direct integral over the angle costs minutes.
DIRECT_LIMIT = 500.0
INTEGRAL_INVERSE_GAMMAS = (0.1, 0.25, 0.5, 1.0, 2.0)
# check-values.md of the design: omega dI/domega in units (2 alpha_s C_R/pi) n0 L.
PUBLISHED_FORM = {0.1: 2.027061, 1.0: 0.5265624, 2.0: 0.3046076}
TOLERANCE = 1e-8
LARGEST_W = 1e9
LEFT_OUT = 1e-12


def w_nodes(gamma, v):
    """Nodes in w = p^2; the sine is left out where what it adds has fallen below LEFT_OUT."""
    silent = max(4.0 * (1.0 + v), (max(v, 1e-3) / (gamma**2 * LEFT_OUT)) ** 0.25)
    edges = stepped_edges(1e-3 * min(1.0, v, 1.0 / gamma), LARGEST_W * (1.0 + v), gamma, silent)
    # Near w = v + 1 the kernel changes over sqrt(v).
    edges = np.unique(np.concatenate([edges, 1.0 + v + 3.0 * np.sqrt(1.0 + v) * np.linspace(-1.0, 1.0, 13)]))
    w, weights = nodes_of(edges[edges >= 0.0])
    return w, weights, silent


def interference(gamma, w, silent):
    """1 - sin(gamma w)/(gamma w)."""
    phase = gamma * w
    small = phase < 1e-3
    safe = np.where(small, 1.0, phase)
    return np.where(small, phase**2 / 6.0, np.where(w < silent, 1.0 - np.sin(safe) / safe, 1.0))


def by_single_integral(gamma, v):
    """h with the angle integrated: v int dw/w [..] (1 + v - w)/((1 + v + w)^2 - 4 v w)^(3/2)."""
    w, weights, silent = w_nodes(gamma, v)
    # (1 + v + w)^2 - 4 v w, without cancellation.
    discriminant = (1.0 + v - w) ** 2 + 4.0 * w
    return float(np.sum(weights * interference(gamma, w, silent) * v / w * (1.0 + v - w) / discriminant**1.5))


def by_double_integral(gamma, v):
    """h by polar coordinates around k: trapezium in the angle, which converges like a geometric series."""
    w, weights, silent = w_nodes(gamma, v)
    count = int(60 * np.sqrt(1.0 + v)) + 60
    cosine = np.cos(np.pi * (np.arange(count) + 0.5) / count)
    total = 0.0
    for start in range(0, len(w), 4000):
        part = w[start : start + 4000, None]
        k_p = np.sqrt(v * part) * cosine
        # k.q V(q) over the circle, d^2p = dw dphi/2.
        circle = np.mean((v - k_p) / (1.0 + v + part - 2.0 * k_p) ** 2, axis=1)
        total += np.sum(weights[start : start + 4000] * interference(gamma, part[:, 0], silent) / part[:, 0] * circle)
    return float(total)


def closed_integral(gamma):
    """int h d ln v over all v."""
    sine, cosine = sici(gamma)
    half_pi = 0.5 * np.pi
    bracket = half_pi - np.cos(gamma) * (half_pi - sine) - np.sin(gamma) * cosine
    return float(np.log(gamma) + np.euler_gamma - 1.0 + bracket / gamma)


def closed_without_phase(gamma, v):
    """h as gamma goes to infinity: v/(1+v)^2 [ln(gamma (1+v)^2) + gamma_E - 3]."""
    return v / (1.0 + v) ** 2 * (np.log(gamma * (1.0 + v) ** 2) + np.euler_gamma - 3.0)


def integral(gamma):
    """int h d ln v by quadrature up to v = 600, where the oscillation is damped away, and by the large-v form above."""
    v_edges = stepped_edges(0.2, 600.0, 1.5 * gamma, (8.0 / gamma) ** 2, ratio=0.4)[1:]
    ln_v, weights = nodes_of(np.log(np.concatenate([np.geomspace(1e-9, 0.2, 20)[:-1], v_edges])), 10)
    values = np.array([by_single_integral(gamma, v) for v in np.exp(ln_v)])
    # int dv/v^2 [ln(gamma v^2) + gamma_E - 3] above the end.
    top = 600.0
    return float(np.sum(weights * values)) + (np.log(gamma * top * top) + np.euler_gamma - 1.0) / top


def main():
    """Compute, check, write."""
    points, worst = [], 0.0
    for inverse in INVERSE_GAMMAS:
        gamma = 1.0 / inverse
        for v in V_POINTS:
            single = by_single_integral(gamma, v)
            if gamma * v < DIRECT_LIMIT:
                worst = max(worst, abs(single - by_double_integral(gamma, v)))
            points.append({"inverse_gamma": inverse, "v": v, "h": single})
    limit = max(abs(closed_without_phase(1e5, v) - by_single_integral(1e5, v)) for v in (0.03, 1.0, 4.0))
    integrals, closure, published = [], 0.0, 0.0
    for inverse in INTEGRAL_INVERSE_GAMMAS:
        closed = closed_integral(1.0 / inverse)
        closure = max(closure, abs(integral(1.0 / inverse) - closed))
        published = max(published, abs(closed - PUBLISHED_FORM.get(inverse, closed)))
        integrals.append({"inverse_gamma": inverse, "integral": closed})
    print(f"single-double {worst:.1e} closure {closure:.1e} check values {published:.1e} limit {limit:.1e}")
    assert worst < TOLERANCE and closure < 2e-4 and published < 1e-6 and limit < 1e-4
    write_reference(
        "single_hard_spectrum",
        "Double-differential gluon spectrum at first order in opacity, static brick of screened Coulomb centres",
        [
            "Gyulassy, Levai & Vitev 2000, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129 (the integral over the momentum transfer; from memory, re-derived)",
        ],
        "gamma = mu^2 L/(2 omega), v = kappa^2/mu^2; h per opacity n0 L: (pi/(2 alpha_s C_R)) kappa^2 omega dI/(domega dkappa^2) = n0 L h; "
        "h = int d^2q V(q) k.q/(k-q)^2 [1 - sin(QL)/(QL)], Q = (k-q)^2/(2 omega), V = mu^2/(pi (q^2+mu^2)^2); integral = int h d ln v",
        {
            "largest_difference_of_double_and_single_integral": worst,
            "largest_difference_of_the_integral_to_its_closed_form": closure,
        },
        points=points,
        integrals=integrals,
    )


if __name__ == "__main__":
    main()
