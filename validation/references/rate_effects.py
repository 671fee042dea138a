"""First branching of a primary in a uniform brick for every effect on rates, alone and composed."""

import math

import numpy as np
from scipy.integrate import quad

import conventions as qcd
import spectra_model
from effects_model import (
    Brick,
    CollinearExpansion,
    EffectsLeg,
    MultipleSoft,
    ResolvedOnly,
    SingleHard,
    SingularEnhancement,
)
from quadrature import gauss, write_reference

# Smaller than a sample of 10^8 events could see.
CLOSURE_TOLERANCE, CHANGE_TOLERANCE, SPECTRUM_TOLERANCE = 2e-6, 2e-6, 2e-5
# P(t > M^2) is given at these fractions of ln M between cutoff and start.
CUT_FRACTIONS = (0.15, 0.3, 0.45, 0.6, 0.75, 0.9)
SAMPLE_T_FRACTIONS = (1.5, 4.0, 25.0, 90.0, 400.0)
SAMPLE_Z = (0.5, 0.3, 0.8, 0.95)
# Cases that make_all.py --check recomputes: one of each kind that needs no table of a spectrum.
CHECKED_CASES = (0, 3, 6, 19)


def setups():
    """(parton, start, cutoff, coupling, epsilon, (energy, length, qhat, small angles, effects...))."""
    fixed = qcd.FixedCoupling(0.15)
    of_t = qcd.RunningCoupling("virtuality", 1)
    of_kt = qcd.RunningCoupling("transverse-momentum", 1)
    of_kt_two = qcd.RunningCoupling("transverse-momentum", 2)
    enhanced = SingularEnhancement
    yield "quark", 10.0, 1.0, fixed, None, (100.0, 2.0, 1.0, False, enhanced(0.3))
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, enhanced(1.0))
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, False, enhanced(1.0))
    yield "quark", 30.0, 1.5, of_t, None, (50.0, 2.0, 0.5, True, enhanced(4.0))
    yield "quark", 100.0, 2.0, fixed, 0.02, (100.0, 3.0, 1.0, True, enhanced(slope_per_gev2=0.2))
    yield "gluon", 20.0, 2.0, fixed, None, (50.0, 1.0, 0.2, True, enhanced(4.0))
    yield "gluon", 40.0, 2.0, of_kt_two, None, (60.0, 3.0, 1.0, False, enhanced(1.0))
    yield "gluon", 10.0, 1.0, of_kt, None, (100.0, 2.0, 0.5, True, enhanced(slope_per_gev2=0.3))

    yield "quark", 10.0, 1.0, fixed, None, (100.0, 2.0, 1.0, True, MultipleSoft())
    yield "quark", 10.0, 1.0, fixed, None, (100.0, 2.0, 1.0, False, MultipleSoft())
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, MultipleSoft())
    yield "quark", 30.0, 1.5, of_t, None, (60.0, 5.0, 1.0, True, MultipleSoft())
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, MultipleSoft())
    yield "gluon", 10.0, 1.0, fixed, None, (100.0, 2.0, 0.5, True, MultipleSoft())

    yield "quark", 10.0, 1.0, fixed, None, (100.0, 2.0, 1.0, True, SingleHard(1.0, 0.5))
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 5.0, 0.5, True, SingleHard(3.0, 0.7))
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, SingleHard(2.0, 0.7))
    yield "gluon", 20.0, 2.0, fixed, 0.02, (50.0, 3.0, 1.0, True, SingleHard(2.0, 0.5))

    yield "quark", 10.0, 1.0, fixed, None, (100.0, 2.0, 1.0, True, ResolvedOnly())
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, ResolvedOnly())
    yield "quark", 30.0, 1.5, of_t, 0.02, (60.0, 5.0, 2.0, True, ResolvedOnly())
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, ResolvedOnly())

    expanded = CollinearExpansion
    yield "gluon", 10.0, 1.0, fixed, None, (100.0, 2.0, 0.5, False, expanded("interference", pair_production=True))
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, expanded("interference", pair_production=True))
    yield "gluon", 20.0, 2.0, fixed, None, (50.0, 2.0, 0.4, True, expanded("soft-gradient", pair_production=True))

    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, expanded("interference"), MultipleSoft())
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, enhanced(1.0), ResolvedOnly())
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, enhanced(0.3), ResolvedOnly())
    yield "quark", 40.0, 1.0, of_kt, None, (100.0, 4.0, 0.5, True, expanded("soft-gradient"), MultipleSoft())
    yield "gluon", 40.0, 2.0, of_kt, None, (60.0, 3.0, 1.0, True, expanded("interference"), MultipleSoft(), ResolvedOnly())


def legs(chosen=None):
    """The set-ups as legs."""
    for number, (parton, start, cutoff, coupling, epsilon, medium) in enumerate(setups()):
        if chosen is None or number in chosen:
            yield EffectsLeg(parton, start, cutoff, coupling, epsilon, opening="pair-threshold", medium=Brick(*medium))


def scaled_ranges(kind, everyone):
    """Ranges of the two scaled variables of a spectrum over all the legs that use it."""
    pairs = []
    for leg in everyone:
        for effect in (one for one in leg.medium.adding if isinstance(one, kind)):
            softest = 0.5 * (1.0 - math.sqrt(1.0 - leg.t0 / leg.t_max)) if leg.epsilon is None else leg.epsilon
            smallest = leg.t0 / 4.0 if leg.epsilon is None else leg.epsilon * (1.0 - leg.epsilon) * leg.t0
            if leg.medium.small_angles:
                softest = max(softest, math.sqrt(smallest) / leg.medium.energy_gev)
            omegas = np.array([softest, 1.0]) * leg.medium.energy_gev
            pairs.append(np.sort(effect.scaled(omegas, np.array([smallest, leg.t_max / 4.0])), axis=1))
    lows, highs = np.min(pairs, axis=0)[:, 0], np.max(pairs, axis=0)[:, 1]
    return [(low * 0.98, high * 1.02) for low, high in zip(lows, highs)]


def tabulate_spectra():
    """Fill the tables of both spectra; the largest error of each at random points."""
    everyone = list(legs())
    MultipleSoft.table = spectra_model.multiple_soft_table(*scaled_ranges(MultipleSoft, everyone))
    SingleHard.table = spectra_model.single_hard_table(*scaled_ranges(SingleHard, everyone))
    return {kind.__name__: float(np.max(np.abs(kind.table.errors()[0]))) for kind in (MultipleSoft, SingleHard)}


def samples(leg):
    """Vacuum, kept vacuum and added densities per d ln t dz at a few points."""
    rows = []
    for t in (f * leg.t0 for f in SAMPLE_T_FRACTIONS if f * leg.t0 < leg.t_max):
        for z in SAMPLE_Z:
            u = np.float64(np.log(z / (1.0 - z)))
            if abs(u) > float(leg.widest_u(leg.y_of(np.array([t])))[0]):
                continue
            for channel in leg.channels():
                vacuum = float(leg.vacuum_density(channel, np.float64(t), u)) / (z * (1.0 - z))
                added = [float(leg.added(effect, channel, np.float64(t), u)) / (z * (1.0 - z)) for effect in leg.medium.adding]
                kept = float(np.prod([effect.keeps(np.float64(t), u) for effect in leg.medium.vetoing]))
                rows.append({"t_GeV2": t, "z": z, "channel": channel, "vacuum_density": vacuum, "vacuum_kept": kept, "added_densities": added})
    return rows


def smallest_ratio(leg):
    """Smallest total density over the vacuum's on a grid of (t, z): negative where the total changes sign."""
    t = np.exp(np.linspace(np.log(leg.t0 * 1.0001), np.log(leg.t_max), 1500))[:, None]
    u = np.linspace(-1.0, 1.0, 161)[None, :] * leg.widest_u(leg.y_of(t)) * (1.0 - 1e-9)
    return float(min(np.min(leg.density(c, t, u) / leg.vacuum_density(c, t, u)) for c in leg.channels()))


def case_of(leg):
    """One entry of the table, with its checks."""
    coarse = leg.evolve(panels=48).exponent
    leg.evolve(rule=gauss(48))
    change = abs(coarse - leg.exponent)
    ln_t, below = leg.first_t()
    z_tables, total, induced_total = {}, 0.0, 0.0
    for channel in leg.channels():
        u, cumulative = leg.first_z(channel)
        induced = leg.first_z(channel, "induced")[1][-1] if leg.medium.adding else 0.0
        total, induced_total = total + cumulative[-1], induced_total + induced
        z_tables[channel] = {"total": cumulative[-1], "induced": induced, "logit_z": u, "cumulative": cumulative}
    smallest = smallest_ratio(leg)
    cuts = [leg.cutoff_gev * (leg.start_gev / leg.cutoff_gev) ** f for f in CUT_FRACTIONS]
    entry = {
        **leg.description(),
        "smallest_total_over_vacuum": smallest,
        "density_changes_sign": smallest < 0.0,
        "exponent": leg.exponent,
        "no_branching_probability": leg.no_branching(),
        "induced_first_branchings": induced_total,
        "above": [{"M_GeV": m, "probability": 1.0 - float(np.exp(-leg.survival_spline(leg.y_of(m * m))))} for m in cuts],
        "samples": samples(leg),
        "t": {"ln_t": ln_t, "cumulative": below},
        "z": z_tables,
    }
    return entry, (change, abs(total - (1.0 - leg.no_branching())), leg.interpolation_error)


def density_from_scratch(leg, effect, t, z):
    """alpha_s/(2 pi) Delta P of a spectrum with h by direct quadrature, no table."""
    direct = {MultipleSoft: spectra_model.multiple_soft, SingleHard: spectra_model.single_hard}[type(effect)]
    scale = effect.opacity if isinstance(effect, SingleHard) else 1.0
    kappa2, energy = z * (1.0 - z) * t, leg.medium.energy_gev

    def term(share):
        return 4.0 / share * scale * direct(*effect.scaled(share * energy, kappa2))

    colour = qcd.C_F * term(1.0 - z) if leg.parton == "quark" else 0.5 * qcd.C_A * (term(z) + term(1.0 - z))
    return float(leg.coupling(np.float64(z * (1.0 - z)), np.float64(t))) / (2.0 * math.pi) * colour


def exponent_by_nested_quad(leg):
    """The exponent by scipy's adaptive double quadrature in (ln t, u), in pieces between the kinks."""

    def inner(log_t):
        t = np.exp(log_t)
        widest = float(leg.widest_u(leg.y_of(np.array([t])))[0])
        kinks = [float(k) for k in leg.kinks_in_u(np.array([t])).ravel()]
        marks = sorted({-widest, widest, *(s * k for k in kinks if k < widest for s in (-1.0, 1.0))})

        def whole(u):
            return sum(float(leg.density(c, np.float64(t), np.float64(u))) for c in leg.channels())

        return sum(quad(whole, low, high, epsabs=1e-9, epsrel=1e-8)[0] for low, high in zip(marks[:-1], marks[1:]))

    marks = sorted({np.log(leg.t0), np.log(leg.t_max), *np.log(leg.kinks_in_t())})
    return sum(quad(inner, low, high, epsabs=1e-7, epsrel=1e-7, limit=100)[0] for low, high in zip(marks[:-1], marks[1:]))


def spectrum_checks():
    """h against quadratures that close nothing but Gaussian integrals, and along another way in tau."""
    two_times = max(abs(spectra_model.multiple_soft(e, x) - spectra_model.multiple_soft_by_two_times(e, x)) for e, x in ((0.5, 1.0), (1.0, 10.0)))
    real_axis = max(
        abs(spectra_model.multiple_soft(e, x) - spectra_model.multiple_soft_on_real_axis(e, x))
        for e in (0.003, 0.02, 0.1, 0.5, 1.0, 3.0, 10.0, 40.0)
        for x in (0.02, 0.3, 1.0, 3.0, 10.0, 30.0, 100.0, 300.0)
        if x / e < 4e4
    )
    by_angle = max(abs(spectra_model.single_hard(g, s) - spectra_model.single_hard_by_angle(g, s)) for g, s in ((1.0, 1.0), (5.0, 0.1), (0.3, 20.0)))
    return two_times, real_axis, by_angle


def cases(chosen):
    """Some entries of the table, for make_all.py --check; only of those that need no spectrum."""
    return [case_of(leg)[0] for leg in legs(chosen)]


def main():
    """Compute, check, write."""
    two_times, real_axis, by_angle = spectrum_checks()
    table_errors = tabulate_spectra()
    print("spectra", f"{two_times:.1e} {real_axis:.1e} {by_angle:.1e}", table_errors, flush=True)
    entries, checks, direct = [], [], 0.0
    for leg in legs():
        entry, check = case_of(leg)
        entries.append(entry)
        checks.append(check)
        for row in entry["samples"]:
            for effect, added in zip(leg.medium.adding, row["added_densities"]):
                if isinstance(effect, (MultipleSoft, SingleHard)) and row["channel"] != "g-qq" and added != 0.0:
                    difference = density_from_scratch(leg, effect, row["t_GeV2"], row["z"]) - added
                    direct = max(direct, abs(difference) / row["vacuum_density"])
        words = "+".join(effect["kind"] for effect in leg.medium.description["effects"])
        numbers = f"{entry['no_branching_probability']:.7g} min {entry['smallest_total_over_vacuum']:.4f}"
        print(len(entries) - 1, words, leg.parton, leg.start_gev, numbers, [f"{c:.1e}" for c in check], flush=True)
    nested = max(abs(exponent_by_nested_quad(leg) - leg.evolve().exponent) for leg in legs((3, 8, 19, 26)))
    change, closure, interpolation = (max(column) for column in zip(*checks))
    print("nested", nested, "direct", direct, "change", change, "closure", closure)
    assert change < CHANGE_TOLERANCE and closure < CLOSURE_TOLERANCE and nested < CHANGE_TOLERANCE, (change, closure, nested)
    assert max(two_times, real_axis, by_angle) < 1e-8 and max(*table_errors.values(), direct) < SPECTRUM_TOLERANCE, (table_errors, direct)
    write_reference(
        "rate_effects",
        "First branching of a single primary in a uniform brick, every effect on rates alone and composed",
        [
            "Borghini & Wiedemann 2005, hep-ph/0506218 (singular-enhancement)",
            "Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9607355; Zakharov 1997; Salgado & Wiedemann 2003, hep-ph/0302184; "
            "Armesto, Cunqueiro, Salgado & Xiang 2008, arXiv:0710.3073 (multiple-soft; from memory)",
            "Gyulassy, Levai & Vitev 2000-1, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129 (single-hard; from memory)",
            "Mehtar-Tani, Salgado & Tywoniuk 2010-12, arXiv:1009.2965, 1205.5739; Caucal, Iancu, Mueller & Soyez 2018, arXiv:1801.09703 "
            "(resolved-only)",
            "Guo & Wang 2000, hep-ph/0005044; Majumder 2009, arXiv:0901.4516; Aurenche, Zakharov & Zaraket 2008, arXiv:0804.4282 "
            "(collinear-expansion)",
        ],
        "total density (per d ln t dz) f_vac Theta + sum D_i. singular-enhancement: D = alpha_s/(2 pi) f [2 C_F/(1-z) or C_A (1/z + 1/(1-z))], "
        "f = enhancement or slope * I0, I0 = qhat L. multiple-soft and single-hard: D = alpha_s/(2 pi) [4 C_F/(1-z) h((1-z)E) or "
        "(1/2) 4 C_A (h((1-z)E)/(1-z) + h(zE)/z)], h(omega, kappa^2 = z(1-z)t) as in spectra_model.py (the vacuum's is 1/2), omega_c = qhat L^2/2, "
        "single-hard with the gluon's opacity n0 L and mu as given. collinear-expansion: D = f_vac R as in medium.json, on g-qq too with "
        "pair_production. All D = 0 where limit_to_small_angles and z(1-z)t > min(z,1-z)^2 E^2. resolved-only: Theta = 0 where sqrt(2 omega hbar c/"
        "qhat) < tau_f < L, omega = min(z,1-z)E, tau_f = 2E hbar c/t, on every vacuum channel. E the exact energy of the primary, born at the "
        "brick's start. no_branching_probability = exp(-exponent); above: P(t1 > M^2), of all events; cumulative: P(first branching below ln_t), "
        "P(first branching in this channel below logit_z), of all events; where density_changes_sign these are expectations of event weights and "
        "need not be monotonic; induced: the part of sum max(D_i, 0). samples: per d ln t dz, vacuum_kept is Theta, added_densities one an "
        "effect that adds, in order",
        {
            "largest_change_of_exponent_with_twice_the_panels": change,
            "largest_difference_of_the_two_ways_to_integrate_over_all": closure,
            "largest_difference_of_four_exponents_to_scipy_nested_quad": nested,
            "largest_error_of_linear_interpolation": interpolation,
            "largest_error_of_h_by_its_table": table_errors,
            "largest_error_of_a_sample_by_the_table_over_the_vacuum_density": direct,
            "largest_difference_of_multiple_soft_h_to_quadrature_over_both_times": two_times,
            "largest_difference_of_multiple_soft_h_to_quadrature_over_real_times": real_axis,
            "largest_difference_of_single_hard_h_to_quadrature_over_the_angle": by_angle,
        },
        cases=entries,
    )


if __name__ == "__main__":
    main()
