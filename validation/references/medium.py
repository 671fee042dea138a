"""First branching of a primary in a uniform brick, for every phase factor of the collinear expansion."""

import itertools

import numpy as np
from scipy.integrate import quad

import conventions as qcd
from leg import Leg
from medium_model import Brick
from quadrature import gauss, write_reference

CLOSURE_TOLERANCE = 1e-7
SAMPLE_T_FRACTIONS = (1.5, 4.0, 25.0, 90.0, 400.0)
SAMPLE_Z = (0.5, 0.3, 0.8, 0.95)


def setups():
    """(parton, start, cutoff, coupling, z-range epsilon, energy, length, qhat, small angles) without the phase."""
    fixed = qcd.FixedCoupling(0.15)
    of_kt = qcd.RunningCoupling("transverse-momentum", 1)
    yield "quark", 10.0, 1.0, fixed, None, 100.0, 2.0, 1.0, False
    yield "quark", 10.0, 1.0, fixed, None, 100.0, 5.0, 1.0, False
    yield "quark", 10.0, 1.0, fixed, None, 100.0, 2.0, 1.0, True
    yield "quark", 40.0, 1.0, of_kt, None, 100.0, 4.0, 0.5, True
    yield "quark", 100.0, 2.0, fixed, 0.02, 100.0, 3.0, 1.0, True
    yield "quark", 20.0, 2.0, fixed, None, 50.0, 1.0, 0.2, True
    yield "quark", 20.0, 2.0, fixed, None, 50.0, 2.0, 0.4, True
    yield "gluon", 10.0, 1.0, fixed, None, 100.0, 2.0, 0.5, False
    yield "gluon", 40.0, 2.0, of_kt, None, 60.0, 3.0, 1.0, True
    yield "gluon", 20.0, 2.0, fixed, None, 50.0, 1.0, 0.2, True


PHASES = (("interference", None), ("rescattering", 1.0), ("rescattering", 0.6), ("soft-gradient", None))


def legs():
    """Every set-up with every phase factor."""
    for phase, window in PHASES:
        chosen = setups() if window != 0.6 else itertools.islice(setups(), 2, 4)
        for parton, start, cutoff, coupling, epsilon, energy, length, qhat, small_angles in chosen:
            brick = Brick(phase, energy, length, qhat, small_angles, window)
            yield Leg(parton, start, cutoff, coupling, epsilon, opening="pair-threshold", medium=brick)


def samples(leg):
    """R and the densities per d ln t dz at a few points, each checked against a path integral in arbitrary precision."""
    rows, worst = [], 0.0
    channel = leg.channels()[0]
    for t in (f * leg.t0 for f in SAMPLE_T_FRACTIONS if f * leg.t0 < leg.t_max):
        for z in SAMPLE_Z:
            u = np.log(z / (1.0 - z))
            if abs(u) > float(leg.widest_u(leg.y_of(np.array([t])))[0]):
                continue
            ratio = float(leg.medium.ratio(np.float64(t), np.float64(u)))
            direct = leg.medium.ratio_by_path(t, z)
            inside = ratio != 0.0
            worst = max(worst, abs(ratio - direct) if inside else 0.0)
            vacuum = float(leg.vacuum_density(channel, np.float64(t), np.float64(u))) / (z * (1.0 - z))
            rows.append({"t_GeV2": t, "z": z, "ratio_without_limit": direct, "ratio": ratio, "vacuum_density": vacuum})
    return rows, worst


def smallest_density(leg):
    """Smallest 1 + R over the leg's (t, z): negative where the total density changes sign."""
    t = np.exp(np.linspace(np.log(leg.t0 * 1.0001), np.log(leg.t_max), 4000))
    widest = leg.widest_u(leg.y_of(t))
    if leg.medium.small_angles:
        widest = np.minimum(widest, np.log(leg.medium.energy_gev**2 / t))
    u = np.linspace(0.0, 1.0, 60)[None, :] * np.maximum(widest, 0.0)[:, None]
    return float(np.min(1.0 + leg.induced_ratio(leg.channels()[0], t[:, None], u * (1.0 - 1e-12))))


def case_of(leg):
    """One entry of the table, with its two checks."""
    coarse = leg.evolve(panels=48).exponent
    leg.evolve(rule=gauss(48))
    change = abs(coarse - leg.exponent)
    rows, path_error = samples(leg)
    branched = 1.0 - leg.no_branching()
    ln_t, below = leg.first_t()
    z_tables, total, induced_total = {}, 0.0, 0.0
    for channel in leg.channels():
        u, cumulative = leg.first_z(channel)
        induced = leg.first_z(channel, "induced")[1][-1] if channel != "g-qq" else 0.0
        total, induced_total = total + cumulative[-1], induced_total + induced
        z_tables[channel] = {"total": cumulative[-1], "induced": induced, "logit_z": u, "cumulative": cumulative}
    smallest = smallest_density(leg)
    entry = {
        **leg.description(),
        "smallest_one_plus_ratio": smallest,
        "density_changes_sign": smallest < 0.0,
        "exponent": leg.exponent,
        "no_branching_probability": leg.no_branching(),
        "induced_first_branchings": induced_total,
        "samples": rows,
        "t": {"ln_t": ln_t, "cumulative": below},
        "z": z_tables,
    }
    return entry, (change, path_error, abs(total - branched), leg.interpolation_error)


def exponent_by_nested_quad(leg):
    """The exponent by scipy's adaptive double quadrature in (ln t, u), for one leg without kinks."""

    def inner(log_t):
        t = np.exp(log_t)
        widest = float(leg.widest_u(leg.y_of(np.array([t])))[0])
        return quad(lambda u: float(leg.density("q-qg", np.float64(t), np.float64(u))), -widest, widest, epsabs=1e-12, epsrel=1e-11)[0]

    return quad(inner, np.log(leg.t0), np.log(leg.t_max), epsabs=1e-9, epsrel=1e-9, limit=400)[0]


def main():
    """Compute, check, write."""
    entries, checks = [], []
    for leg in legs():
        entry, check = case_of(leg)
        entries.append(entry)
        checks.append(check)
        words = f"{leg.medium.phase} {leg.parton} Q={leg.start_gev} L={leg.medium.length_fm}"
        print(words, f"{entry['no_branching_probability']:.7g} min {entry['smallest_one_plus_ratio']:.4f}", [f"{c:.1e}" for c in check])
    change, path_error, closure, interpolation = (max(column) for column in zip(*checks))
    plain = Leg("quark", 10.0, 1.0, qcd.FixedCoupling(0.15), medium=Brick("interference", 100.0, 5.0, 1.0, False))
    nested = abs(exponent_by_nested_quad(plain) - plain.evolve().exponent)
    assert max(change, path_error, closure, nested) < CLOSURE_TOLERANCE, (change, path_error, closure, nested)
    write_reference(
        "medium",
        "First branching of a single primary in a uniform brick (collinear expansion)",
        [
            "Guo & Wang 2000, hep-ph/0005044; Majumder 2009, arXiv:0901.4516 (the rate)",
            "Aurenche, Zakharov & Zaraket 2008, arXiv:0804.4282 (the cross terms in the phase factor)",
        ],
        "total density f (1 + R) on q-qg and g-gg, f on g-qq; R = int_0^L dl qhat/(z(1-z) t) K(l/tau_f), tau_f = 2 E hbar c/t, E the exact "
        "energy of the primary, born at the brick's start; with limit_to_small_angles R = 0 where z(1-z) t > min(z,1-z)^2 E^2; "
        "no_branching_probability = exp(-int f (1 + R)); cumulative: int of f (1 + R) exp(-int) below that ln_t or logit_z, so the last value of t "
        "is 1 - no_branching_probability; where density_changes_sign these are expectations of event weights and cumulative need not be monotonic; "
        "induced: the part of max(R, 0); samples: densities per d ln t dz of the first channel",
        {
            "largest_change_of_exponent_with_twice_the_panels": change,
            "largest_difference_of_R_to_a_path_integral_by_mpmath": path_error,
            "largest_difference_of_the_two_ways_to_integrate_over_all": closure,
            "difference_to_scipy_nested_quad_of_one_exponent": nested,
            "largest_error_of_linear_interpolation": interpolation,
        },
        cases=entries,
    )


if __name__ == "__main__":
    main()
