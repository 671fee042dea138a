"""Probability that a quark or gluon reaches the cutoff without branching."""

import itertools

import mpmath
import numpy as np

import conventions as qcd
from leg import Leg
from quadrature import gauss, write_reference

SCALES_GEV = ((10.0, 1.0), (45.6, 1.0), (100.0, 1.0), (100.0, 2.0), (30.0, 1.5), (200.0, 1.0), (7.0, 0.8))
EPSILON_SCALES_GEV = ((100.0, 2.0), (100.0, 1.0), (20.0, 1.0))
EPSILONS = (0.01, 0.05)


def couplings():
    """Every law of the coupling that the table holds."""
    yield qcd.FixedCoupling(0.15)
    for argument, loops in itertools.product(("virtuality", "transverse-momentum"), (1, 2)):
        yield qcd.RunningCoupling(argument, loops)


def legs():
    """Every set-up of the table."""
    for coupling in couplings():
        for start, cutoff in SCALES_GEV:
            yield Leg("quark", start, cutoff, coupling)
            for opening in ("always", "pair-threshold"):
                yield Leg("gluon", start, cutoff, coupling, opening=opening)
    for coupling in (qcd.FixedCoupling(0.15), qcd.RunningCoupling("transverse-momentum", 1)):
        for (start, cutoff), epsilon in itertools.product(EPSILON_SCALES_GEV, EPSILONS):
            yield Leg("quark", start, cutoff, coupling, epsilon=epsilon)
            for opening in ("always", "pair-threshold"):
                yield Leg("gluon", start, cutoff, coupling, epsilon=epsilon, opening=opening)


def by_arbitrary_precision(leg):
    """The exponent of a fixed-coupling, always-open, kinematic leg by mpmath from the closed z integrals."""
    mpmath.mp.dps = 25
    alpha, t0 = leg.coupling.alpha_s, mpmath.mpf(leg.t0)

    def per_log_t(log_t):
        s = mpmath.sqrt(max(mpmath.mpf(0), 1 - t0 * mpmath.exp(-log_t)))
        l = mpmath.log((1 + s) / (1 - s))
        if leg.parton == "quark":
            return mpmath.mpf(4) / 3 * (2 * l - 3 * s / 2)
        return 3 * (2 * l - 7 * s / 4 - s**3 / 12) + leg.flavours * mpmath.mpf(1) / 2 * (s / 2 + s**3 / 6)

    return float(alpha / (2 * mpmath.pi) * mpmath.quad(per_log_t, [mpmath.log(t0), mpmath.log(leg.t_max)]))


def by_nested_quad(leg):
    """The exponent of any vacuum leg by scipy's adaptive double quadrature in (ln t, z)."""
    from scipy.integrate import quad

    def inner(log_t):
        t = np.exp(log_t)
        if leg.epsilon is None:
            s = np.sqrt(max(0.0, 1.0 - leg.t0 / t))
            low, high = 0.5 * (1.0 - s), 0.5 * (1.0 + s)
        else:
            low, high = leg.epsilon, 1.0 - leg.epsilon

        def per_z(z):
            u = np.log(z / (1.0 - z))
            return sum(float(leg.density(c, np.float64(t), np.float64(u))) for c in leg.channels()) / (z * (1.0 - z))

        marks = [0.5 * (1 + sign * np.sqrt(1 - 4 * k**2 / t)) for k in leg.coupling.kinks_gev if t > 4 * k**2 for sign in (-1, 1)]
        marks = [z for z in marks if low < z < high] or None
        return quad(per_z, low, high, points=marks, epsabs=1e-11, epsrel=1e-10, limit=200)[0]

    marks = [np.log(t) for t in leg.kinks_in_t()] or None
    return quad(inner, np.log(leg.t0), np.log(leg.t_max), points=marks, epsabs=1e-9, epsrel=1e-9, limit=200)[0]


def main():
    """Compute, check, write."""
    cases, worst = [], 0.0
    for leg in legs():
        coarse = leg.evolve(panels=48).exponent
        leg.evolve(rule=gauss(48))
        worst = max(worst, abs(coarse - leg.exponent))
        cases.append({**leg.description(), "exponent": leg.exponent, "no_branching_probability": leg.no_branching()})
    closed = max(
        abs(by_arbitrary_precision(leg) - leg.evolve().exponent)
        for leg in (Leg(p, q, c, qcd.FixedCoupling(0.15)) for p in ("quark", "gluon") for q, c in SCALES_GEV)
    )
    running = [
        Leg("quark", 100.0, 1.0, qcd.RunningCoupling("transverse-momentum", 2)),
        Leg("gluon", 45.6, 1.0, qcd.RunningCoupling("transverse-momentum", 1), opening="pair-threshold"),
        Leg("gluon", 100.0, 2.0, qcd.RunningCoupling("virtuality", 2), epsilon=0.01, opening="pair-threshold"),
    ]
    nested = max(abs(by_nested_quad(leg) - leg.evolve().exponent) for leg in running)
    assert worst < 1e-9 and closed < 1e-10 and nested < 1e-8, (worst, closed, nested)
    write_reference(
        "no_branching",
        "No-branching probability of one parton between its start virtuality and the cutoff, in vacuum",
        [
            "Ellis, Stirling & Webber, QCD and Collider Physics, ch. 5 (Sudakov form factor)",
            "Review of Particle Physics, Quantum chromodynamics (coupling; two loops solved exactly)",
        ],
        "Delta = exp(-exponent), exponent = int_{t0}^{Q^2} dt/t int dz alpha_s/(2 pi) sum P; kinematic: z(1-z) t >= t0/4; "
        "constant: epsilon <= z <= 1 - epsilon; t0 = cutoff^2; thresholds 1.5 and 4.75 GeV; frozen below freeze_GeV",
        {
            "largest_change_of_exponent_with_twice_the_nodes": worst,
            "largest_difference_to_mpmath_closed_z_integrals": closed,
            "largest_difference_to_scipy_nested_quad": nested,
        },
        cases=cases,
    )


if __name__ == "__main__":
    main()
