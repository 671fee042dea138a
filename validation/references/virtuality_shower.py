"""Multiplicity and moments of virtuality-ordered showers with the joint constraint, by a second, bare Monte Carlo.

It shares nothing with the Rust engine: plain veto with one global overestimate, species, t and fractions only. What it
checks is what no quadrature gives: the daughters' starting scales and the rule by which a pair that does not fit resumes
(a published family of prescriptions: Bengtsson & Sjostrand 1987, Nucl. Phys. B 289:810):

    daughters start from z t and (1-z) t; while z(1-z) t - (1-z) t1 - z t2 < 0 the daughter with the larger
    t_i/t_i,max resumes its evolution below its present t_i.

With angles ordered as well, a daughter of fraction x branches at t, z only if t/(z(1-z) x^2) lies below the same of the
branching that made it (the squared angle, up to the jet's energy squared); vetoed inside its evolution.
"""

import math

import numpy as np
from numba import njit

import conventions as qcd
from quadrature import write_reference

C_F, C_A, T_R = qcd.C_F, qcd.C_A, qcd.T_R
CHARM2, BOTTOM2 = qcd.CHARM_GEV**2, qcd.BOTTOM_GEV**2
QUARK, GLUON = 0, 1
AT_T, AT_FRACTION, AT_FRACTION_JOINT, ANGULAR = 0, 1, 2, 3
ANGLES = "fractions of t, joint constraint, angles ordered"
RULES = {"t": AT_T, "fractions of t": AT_FRACTION, "fractions of t, joint constraint": AT_FRACTION_JOINT, ANGLES: ANGULAR}
DEEPEST = 4096
EVENTS = 1_000_000
SEED = 7


@njit(cache=False)
def alpha_s(mu2, fixed, at_nodes):
    """Fixed, or one loop from the values at the Z mass and the thresholds; frozen below 1 GeV."""
    if fixed > 0.0:
        return fixed
    mu2 = max(mu2, 1.0)
    if mu2 >= BOTTOM2:
        return at_nodes[0] / (1.0 + 23.0 / (12.0 * math.pi) * at_nodes[0] * math.log(mu2 / 91.1876**2))
    if mu2 >= CHARM2:
        return at_nodes[1] / (1.0 + 25.0 / (12.0 * math.pi) * at_nodes[1] * math.log(mu2 / BOTTOM2))
    return at_nodes[2] / (1.0 + 27.0 / (12.0 * math.pi) * at_nodes[2] * math.log(mu2 / CHARM2))


@njit(cache=False)
def evolve(species, t, t0, fixed, at_nodes, always_open, widest=np.inf):
    """Next (t, z, kind) below t with t/(z(1-z)) below `widest`: kind 0 q-qg, 1 g-gg, 2 g-qq; t = 0 if it ends at the cutoff."""
    largest = fixed if fixed > 0.0 else alpha_s(1.0, fixed, at_nodes)
    while t > t0:
        s = math.sqrt(1.0 - t0 / t)
        l = math.log((1.0 + s) / (1.0 - s))
        singular = 2.0 * C_F * l if species == QUARK else 2.0 * C_A * l
        regular = 0.0 if species == QUARK else 5.0 * T_R
        total = largest / (2.0 * math.pi) * (singular + regular)
        t *= np.random.random() ** (1.0 / total)
        if t <= t0:
            break
        low, high = 0.5 * (1.0 - s), 0.5 * (1.0 + s)
        if np.random.random() * (singular + regular) < singular:
            if species == QUARK:
                # density 1/(1-z)
                z = 1.0 - (1.0 - low) * ((1.0 - high) / (1.0 - low)) ** np.random.random()
                ratio, kind = 0.5 * (1.0 + z * z), 0
            else:
                # density 1/(z(1-z)) is flat in ln(z/(1-z))
                z = 1.0 / (1.0 + math.exp(-l * (2.0 * np.random.random() - 1.0)))
                ratio, kind = (1.0 - z * (1.0 - z)) ** 2, 1
        else:
            z = np.random.random()
            open_count = 5.0
            if not always_open:
                open_count = 3.0 + (1.0 if t > 4.0 * CHARM2 else 0.0) + (1.0 if t > 4.0 * BOTTOM2 else 0.0)
            ratio, kind = (z * z + (1.0 - z) ** 2) * open_count / 5.0, 2
        if z * (1.0 - z) * t < 0.25 * t0 or t >= widest * z * (1.0 - z):
            continue
        if np.random.random() < ratio * alpha_s(z * (1.0 - z) * t, fixed, at_nodes) / largest:
            return t, z, kind
    return 0.0, 0.0, -1


@njit(cache=False)
def one_event(species, start, t0, fixed, at_nodes, always_open, rule, partner_mass_sum, stack, out):
    """Adds one event: out = (n, quarks, sum x^2, sum x^3, branchings, constrained branchings). A pair if partner_mass_sum > 0."""
    top = 0
    t, z, kind = evolve(species, start, t0, fixed, at_nodes, always_open)
    if partner_mass_sum > 0.0:
        t2, z2, kind2 = evolve(species, start, t0, fixed, at_nodes, always_open)
        while math.sqrt(t) + math.sqrt(t2) > partner_mass_sum:
            if t >= t2:
                t, z, kind = evolve(species, t, t0, fixed, at_nodes, always_open)
            else:
                t2, z2, kind2 = evolve(species, t2, t0, fixed, at_nodes, always_open)
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3], stack[top, 4] = t2, z2, kind2, 1.0, species
        top += 1
    stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3], stack[top, 4] = t, z, kind, 1.0, species
    top += 1
    out[:] = 0.0
    while top > 0:
        top -= 1
        t, z, kind, x, kind_of = stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3], stack[top, 4]
        if kind < 0:
            out[0] += 1.0
            out[1] += 1.0 if kind_of == QUARK else 0.0
            out[2] += x * x
            out[3] += x * x * x
            continue
        first = QUARK if kind != 1 else GLUON
        second = GLUON if kind != 2 else QUARK
        max1, max2 = z * t, (1.0 - z) * t
        if rule == AT_T:
            max1, max2 = t, t
        widest1 = widest2 = np.inf
        if rule == ANGULAR:
            widest1, widest2 = t / (z * (1.0 - z)) * z * z, t / (z * (1.0 - z)) * (1.0 - z) ** 2
        t1, z1, k1 = evolve(first, max1, t0, fixed, at_nodes, always_open, widest1)
        t2, z2, k2 = evolve(second, max2, t0, fixed, at_nodes, always_open, widest2)
        out[4] += 1.0
        if rule == AT_FRACTION_JOINT or rule == ANGULAR:
            if z * (1.0 - z) * t - (1.0 - z) * t1 - z * t2 < 0.0:
                out[5] += 1.0
            while z * (1.0 - z) * t - (1.0 - z) * t1 - z * t2 < 0.0:
                if t1 / max1 >= t2 / max2:
                    t1, z1, k1 = evolve(first, t1, t0, fixed, at_nodes, always_open, widest1)
                else:
                    t2, z2, k2 = evolve(second, t2, t0, fixed, at_nodes, always_open, widest2)
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3], stack[top, 4] = t2, z2, k2, x * (1.0 - z), second
        top += 1
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3], stack[top, 4] = t1, z1, k1, x * z, first
        top += 1


@njit(cache=False)
def sample(events, seed, species, start, t0, fixed, at_nodes, always_open, rule, partner_mass_sum):
    """Sums of the observables, of their squares, and the histogram of n up to 200."""
    np.random.seed(seed)
    stack = np.zeros((DEEPEST, 5))
    out = np.zeros(6)
    sums, squares = np.zeros(6), np.zeros(6)
    histogram = np.zeros(201, np.int64)
    for _ in range(events):
        one_event(species, start, t0, fixed, at_nodes, always_open, rule, partner_mass_sum, stack, out)
        sums += out
        squares += out * out
        histogram[min(200, int(out[0]))] += 1
    return sums, squares, histogram


def threshold_values():
    """One-loop alpha_s at the Z mass and at both thresholds."""
    return np.array([qcd.ALPHA_S_MZ, qcd.exact_alpha_s(qcd.BOTTOM_GEV, 1), qcd.exact_alpha_s(qcd.CHARM_GEV, 1)])


def setups():
    """(parton, start, cutoff, fixed alpha or 0 for kT running, always open, rule, sqrt_s of a pair or 0)."""
    joint = "fractions of t, joint constraint"
    for parton in ("quark", "gluon"):
        yield parton, 100.0, 1.0, 0.15, True, "fractions of t", 0.0
        yield parton, 100.0, 1.0, 0.15, True, joint, 0.0
        yield parton, 100.0, 1.0, 0.0, True, joint, 0.0
        yield parton, 40.0, 1.0, 0.0, False, joint, 0.0
        yield parton, 100.0, 2.0, 0.15, False, joint, 0.0
        yield parton, 91.1876, 1.0, 0.0, False, joint, 91.1876
        yield parton, 45.5938, 1.0, 0.0, False, joint, 91.1876
    for parton in ("quark", "gluon"):
        yield parton, 100.0, 1.0, 0.15, True, ANGLES, 0.0
        yield parton, 100.0, 1.0, 0.0, True, ANGLES, 0.0
        yield parton, 40.0, 1.0, 0.0, False, ANGLES, 0.0


def case_of(parton, start, cutoff, fixed, always_open, rule, sqrt_s, events=EVENTS):
    """One entry of the table."""
    species = QUARK if parton == "quark" else GLUON
    sums, squares, histogram = sample(
        events, SEED, species, start**2, cutoff**2, fixed, threshold_values(), always_open, RULES[rule], sqrt_s
    )
    mean = sums / events
    error = np.sqrt((squares / events - mean**2) / (events - 1))
    coupling = {"argument": "fixed", "alpha_s": fixed} if fixed > 0.0 else qcd.RunningCoupling("transverse-momentum").description
    return {
        "source": {"kind": "pair", "sqrt_s_GeV": sqrt_s} if sqrt_s > 0.0 else {"kind": "single"},
        "parton": parton,
        "start_virtuality_GeV": start,
        "virtuality_cutoff_GeV": cutoff,
        "coupling": coupling,
        "flavours": 5,
        "flavour_opening": "always" if always_open else "pair-threshold",
        "daughters_start_at": rule,
        "events": events,
        "mean_multiplicity": [mean[0], error[0]],
        "mean_quark_multiplicity": [mean[1], error[1]],
        "mean_sum_of_squared_fractions": [mean[2], error[2]],
        "mean_sum_of_cubed_fractions": [mean[3], error[3]],
        "share_of_branchings_that_resumed": mean[5] / mean[4],
        "multiplicity_histogram": np.trim_zeros(histogram, "b"),
    }


def main():
    """Compute, check the part that quadrature gives, write."""
    cases = [case_of(*setup) for setup in setups()]
    # Where there is no joint constraint on the primary, the share of events with one parton is the no-branching probability.
    known = {"quark": 0.0469308, "gluon": 8.96420e-4}
    for case in cases:
        print(case["source"], case["parton"], case["coupling"]["argument"], case["daughters_start_at"], case["mean_multiplicity"])
        plain = case["coupling"]["argument"] == "fixed" and case["virtuality_cutoff_GeV"] == 1.0
        if plain:
            p, n = known[case["parton"]], case["events"]
            pull = (case["multiplicity_histogram"][1] - n * p) / math.sqrt(n * p * (1 - p))
            assert abs(pull) < 4.5, pull
    write_reference(
        "virtuality_shower",
        "Multiplicity and fraction moments of virtuality-ordered showers, from a second, bare Monte Carlo",
        ["Bengtsson & Sjostrand 1987, Nucl. Phys. B 289:810 (the family of prescriptions)", "kernels, coupling: as in no_branching.json"],
        "kinematic z range, massless; daughters from z t and (1-z) t; while z(1-z) t - (1-z) t1 - z t2 < 0 the daughter with the larger "
        "t_i/t_i,max resumes below its t_i; angles ordered: t/(z(1-z) x^2) below that of the branching that made the parton, x its fraction; a pair resumes likewise until sqrt(t1) + sqrt(t2) <= sqrt_s; numbers are [mean per event, "
        "standard error]; multiplicity_histogram[n] = events with n final partons (a pair counts both sides), the last bin of 201 gathers the rest",
        f"statistical, {EVENTS} events a case, seed {SEED}",
        cases=cases,
    )


if __name__ == "__main__":
    main()
