"""Where the first branching of a primary happens: distributions in t and in z, given that it happens."""

import conventions as qcd
from leg import Leg
from quadrature import write_reference

# A thousandth of what a sample of 10^8 events could see.
CLOSURE_TOLERANCE = 1e-7


def legs():
    """Every set-up of the table."""
    fixed = qcd.FixedCoupling(0.15)
    of_t = qcd.RunningCoupling("virtuality", 1)
    of_kt = qcd.RunningCoupling("transverse-momentum", 1)
    of_kt_two = qcd.RunningCoupling("transverse-momentum", 2)
    yield Leg("quark", 100.0, 1.0, fixed)
    yield Leg("quark", 100.0, 1.0, of_t)
    yield Leg("quark", 100.0, 1.0, of_kt)
    yield Leg("quark", 30.0, 1.5, of_kt_two)
    yield Leg("quark", 100.0, 2.0, fixed, epsilon=0.01)
    yield Leg("quark", 100.0, 1.0, of_kt, epsilon=0.01)
    yield Leg("gluon", 100.0, 1.0, fixed, opening="always")
    yield Leg("gluon", 100.0, 1.0, of_t, opening="always")
    yield Leg("gluon", 100.0, 1.0, of_kt, opening="pair-threshold")
    yield Leg("gluon", 20.0, 1.0, of_kt_two, opening="pair-threshold")
    yield Leg("gluon", 10.0, 2.0, fixed, opening="pair-threshold")
    yield Leg("gluon", 20.0, 1.0, of_kt, epsilon=0.02, opening="pair-threshold")


def case_of(leg):
    """One entry of the table, and how far probability is from closing."""
    leg.evolve()
    branched = 1.0 - leg.no_branching()
    ln_t, below = leg.first_t()
    z_tables, total = {}, 0.0
    for channel in leg.channels():
        u, cumulative = leg.first_z(channel)
        total += cumulative[-1]
        z_tables[channel] = {
            "share": cumulative[-1] / branched,
            "logit_z": u,
            "cdf": cumulative / cumulative[-1],
        }
    entry = {
        **leg.description(),
        "no_branching_probability": leg.no_branching(),
        "t": {"ln_t": ln_t, "cdf": below / branched},
        "z": z_tables,
    }
    return entry, abs(total / branched - 1.0), leg.interpolation_error / branched


def main():
    """Compute, check, write."""
    entries, closures, interpolations = zip(*(case_of(leg) for leg in legs()))
    print("closures", [f"{c:.1e}" for c in closures])
    assert max(closures) < CLOSURE_TOLERANCE, closures
    write_reference(
        "first_branching",
        "First branching of a single primary in vacuum: cumulative distributions given a branching",
        [
            "Ellis, Stirling & Webber, QCD and Collider Physics, ch. 5",
            "Review of Particle Physics, Quantum chromodynamics (coupling)",
        ],
        "density of the first branching = f(t, z) exp(-int_t f); t.cdf: P(t1 < t | branches) over ln_t (GeV^2); z.CHANNEL: share of "
        "first branchings and P(z < z1 | this channel) over logit_z = ln(z/(1-z)); z is the quark's in q-qg, one daughter's drawn "
        "over the full symmetric range in g-gg, the quark's in g-qq; interpolate linearly in ln_t and logit_z",
        {
            "largest_relative_difference_of_the_two_ways_to_integrate_over_all": max(closures),
            "largest_error_of_linear_interpolation": max(interpolations),
        },
        cases=list(entries),
    )


if __name__ == "__main__":
    main()
