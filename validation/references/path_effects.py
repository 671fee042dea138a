"""Effects on settled partons: broadening, drag, virtuality diffusion, for the primary of a single source.

What a test can read from a full-history event file:
- the primary, status 2 with its t or status 1, and its exchange rows (status 4 and 5): q_perp gained and energy lost;
- whether the primary branched and both its daughters did not: that share of all events is exact in spite of the joint
  constraint. A daughter's candidates lie below its start t_i,max; the pair fits when r_1 + r_2 <= 1, r_i = t_i/t_i,max,
  and the one with the larger r_i resumes until it does. A candidate is then only ever dropped in favour of another that
  stays, so both end unbranched if and only if neither had any candidate: the share is the mean of the product of their
  no-branching probabilities. This holds with virtuality diffusion too if the pair's own constraint is that of the
  virtuality which the daughters start from, z(1-z)(t + dt) >= (1-z) t1 + z t2.
"""

import math

import mpmath
import numpy as np
from scipy.integrate import quad

import conventions as qcd
from leg import Leg
from quadrature import gauss, integrate_rows, write_reference

TOLERANCE = 1e-7
OF_PARTON = {"quark": qcd.C_F / qcd.C_A, "gluon": 1.0}
# (T at start, start, end temperature, gluon coefficient) of the longitudinal field.
LONGITUDINAL = (0.45, 0.6, 0.15, 4.0)
LONGITUDINAL_PATHS = ((0.0, 5.0), (0.0, 40.0), (1.0, 6.0), (0.0, 0.3))


# ---- along a path of given length ----


def brick_path(parton, qhat_gluon, temperature, inside_fm):
    """Broadening, drag and its fluctuation over a path inside a brick."""
    broadening = OF_PARTON[parton] * qhat_gluon * inside_fm
    return {"mean_kt_squared_GeV2": broadening, "mean_loss_GeV": broadening / (4.0 * temperature), "loss_variance_GeV2": 0.5 * broadening}


def longitudinal_path(parton, birth, length):
    """The same at rapidity 0 from the axis through longitudinal expansion: closed forms, and their largest error."""
    start_temperature, start, end_temperature, coefficient = LONGITUDINAL
    last = min(birth + length, start * (start_temperature / end_temperature) ** 3)
    first = max(birth, start)
    scale = OF_PARTON[parton] * coefficient / qcd.HBAR_C_GEV_FM
    if first >= last:
        return {"mean_kt_squared_GeV2": 0.0, "mean_loss_GeV": 0.0, "loss_variance_GeV2": 0.0}, 0.0
    kt2 = scale * start_temperature**3 * start * math.log(last / first)
    loss = scale / 4.0 * start_temperature**2 * start ** (2.0 / 3.0) * 3.0 * (last ** (1.0 / 3.0) - first ** (1.0 / 3.0))

    def temperature(tau):
        return start_temperature * (start / tau) ** (1.0 / 3.0)

    others = [scale * quad(lambda tau, p=p: temperature(tau) ** p, first, last, epsabs=1e-13, epsrel=1e-12)[0] for p in (3, 2)]
    error = max(abs(kt2 - others[0]), abs(loss - others[1] / 4.0))
    return {"mean_kt_squared_GeV2": kt2, "mean_loss_GeV": loss, "loss_variance_GeV2": 0.5 * kt2}, error


# ---- averages over the shower's first step ----


class Primary:
    """A vacuum primary in a brick: density of its first branching, and what follows from an exponential lifetime."""

    def __init__(self, parton, start, cutoff, coupling, energy, length, epsilon=None, largest_gain=0.0):
        self.leg = Leg(parton, start, cutoff, coupling, epsilon, opening="pair-threshold").evolve()
        self.energy, self.length = energy, length
        top = math.sqrt(start**2 + largest_gain)
        self.below = {p: Leg(p, top, cutoff, coupling, epsilon, opening="pair-threshold").evolve() for p in ("quark", "gluon")}

    def formation_fm(self, t):
        return 2.0 * self.energy * qcd.HBAR_C_GEV_FM / t

    def over_first_t(self, function):
        """Sum over branchings at t of density times function(t)."""
        leg = self.leg
        edges = leg.panel_edges(96)[None, :]

        def integrand(y):
            t = leg.t_of(y)
            return leg.rate(t.ravel(), gauss(32)).sum(axis=1).reshape(t.shape) * np.exp(-leg.survival_spline(y)) * leg.dlnt_dy(y) * function(t)

        return float(integrate_rows(integrand, edges, gauss(8))[0])

    def path_moments(self):
        """E[s], E[s^2] of s, the time inside (lifetime cut at the end of the brick), over all events: branched and not."""
        length, unbranched = self.length, self.leg.no_branching()

        def first(t):
            tau = self.formation_fm(t)
            return tau * -np.expm1(-length / tau)

        def second(t):
            tau = self.formation_fm(t)
            return 2.0 * tau * tau * (1.0 - np.exp(-length / tau) * (1.0 + length / tau))

        total = self.over_first_t(lambda t: np.ones_like(t))
        assert abs(total - (1.0 - unbranched)) < TOLERANCE, (total, unbranched)
        return {
            "unbranched_share": unbranched,
            "branched_mean_inside_fm": self.over_first_t(first) / total,
            "branched_mean_inside_squared_fm2": self.over_first_t(second) / total,
        }

    def exponent_below(self, parton, t):
        """Exponent of no branching from t to the cutoff."""
        leg = self.below[parton]
        return np.where(t > leg.t0, leg.exponent - leg.survival_spline(leg.y_of(np.maximum(t, leg.t0))), 0.0)

    def pair_survival(self, channel, start_t, z, rest):
        """Both daughters of a parton with this virtuality unbranched."""
        first, second = {"q-qg": ("quark", "gluon"), "g-gg": ("gluon", "gluon"), "g-qq": ("quark", "quark")}[channel]
        return np.exp(-self.exponent_below(first, z * start_t) - self.exponent_below(second, rest * start_t))

    def after_gain(self, channel, t, z, rest, qhat, order):
        """The same averaged over an exponential lifetime with dt = qhat * time inside."""
        tau = self.formation_fm(t)
        ends = np.exp(-self.length / tau)
        value = ends * self.pair_survival(channel, t + qhat * self.length, z, rest)
        nodes, weights = gauss(order)
        # In v = exp(-l/tau), uniform under the lifetime's law; panels halve towards 1 where short times matter.
        for low, high in zip((0.0, 0.25, 0.5, 0.75), (0.25, 0.5, 0.75, 1.0)):
            for node, weight in zip(nodes, weights):
                v = ends + (1.0 - ends) * (low + 0.5 * (high - low) * (1.0 + node))
                share = 0.5 * (high - low) * weight * (1.0 - ends)
                value = value + share * self.pair_survival(channel, t - qhat * tau * np.log(v), z, rest)
        return value

    def both_unbranched(self, qhat, orders=(6, 8, 16)):
        """Share of all events whose primary branches and whose two daughters do not, per channel; Gauss in ln t, ln z, lifetime."""
        leg = self.leg
        edges = leg.panel_edges(48)
        nodes, weights = gauss(orders[0])
        half = 0.5 * np.diff(edges)[:, None]
        y = (edges[:-1, None] + half * (1.0 + nodes)).ravel()
        outer = (half * weights).ravel() * np.exp(-leg.survival_spline(y)) * leg.dlnt_dy(y)
        shares = {}
        for channel in leg.channels():
            total = 0.0
            for t_part, y_part, w_part in zip(*(np.array_split(v, 40) for v in (leg.t_of(y), y, outer))):
                total += float(w_part @ self._over_z(channel, t_part, y_part, qhat, orders))
            shares[channel] = total
        return shares

    def _over_z(self, channel, t, y, qhat, orders):
        leg = self.leg
        limit = leg.widest_u(y)[:, None]
        # A daughter can only branch from the cutoff up: kinks where z t or z (t + gain) passes it.
        opening = [np.log(np.maximum(s / leg.t0 - 1.0, 1e-9))[:, None] for s in (t, t + qhat * self.length)]
        inner = [np.clip(k, -limit, limit) for k in opening]
        kinks = [np.clip(k[:, None], 0.0, limit) for k in leg.kinks_in_u(t).T]
        marks = [*inner, *(-k for k in inner), *kinks, *(-k for k in kinks), limit, -limit]
        edges = np.sort(np.hstack(marks + [limit * f for f in (-0.5, 0.0, 0.5)]), axis=1)

        def integrand(u):
            z, rest = 1.0 / (1.0 + np.exp(-u)), 1.0 / (1.0 + np.exp(u))
            column = t[:, None, None]
            return leg.density(channel, column, u) * self.after_gain(channel, column, z, rest, qhat, orders[2])

        return integrate_rows(integrand, edges, gauss(orders[1]))


def primaries():
    """(parton, start, cutoff, coupling, epsilon, energy, length, gluon qhat, temperature, diffusing qhats)."""
    fixed = qcd.FixedCoupling(0.15)
    of_kt = qcd.RunningCoupling("transverse-momentum", 1)
    yield "quark", 10.0, 1.0, fixed, None, 100.0, 3.0, 2.0, 0.3, (0.0, 2.0, 10.0)
    yield "gluon", 10.0, 2.0, fixed, None, 100.0, 3.0, 2.0, 0.3, (0.0, 2.0, 10.0)
    yield "quark", 20.0, 1.5, of_kt, None, 60.0, 5.0, 1.0, 0.25, (0.0, 5.0)
    yield "gluon", 6.0, 1.5, fixed, None, 200.0, 10.0, 1.0, 0.25, (0.0, 3.0)
    yield "quark", 12.0, 2.0, fixed, 0.02, 100.0, 4.0, 1.0, 0.3, (0.0, 4.0)


def case_of(parton, start, cutoff, coupling, epsilon, energy, length, qhat_gluon, temperature, diffusing):
    """One entry of the primaries' table."""
    primary = Primary(parton, start, cutoff, coupling, energy, length, epsilon, max(diffusing) * length)
    moments = primary.path_moments()
    qhat = OF_PARTON[parton] * qhat_gluon
    mean, square = moments["branched_mean_inside_fm"], moments["branched_mean_inside_squared_fm2"]
    return {
        **primary.leg.description(),
        "energy_GeV": energy,
        "length_fm": length,
        "gluon_qhat_GeV2_per_fm": qhat_gluon,
        "temperature_GeV": temperature,
        **moments,
        "unbranched": brick_path(parton, qhat_gluon, temperature, length),
        "branched": {
            "mean_kt_squared_GeV2": qhat * mean,
            "mean_kt_fourth_GeV4": 2.0 * qhat**2 * square,
            "mean_loss_GeV": qhat * mean / (4.0 * temperature),
            "mean_loss_squared_without_fluctuation_GeV2": (qhat / (4.0 * temperature)) ** 2 * square,
            "mean_loss_squared_with_fluctuation_GeV2": (qhat / (4.0 * temperature)) ** 2 * square + 0.5 * qhat * mean,
        },
        "both_daughters_unbranched": [{"diffusing_qhat_GeV2_per_fm": one, "shares": primary.both_unbranched(one)} for one in diffusing],
    }


def finer_change(parton, start, cutoff, coupling, epsilon, energy, length, qhat_gluon, temperature, diffusing):
    """How far a finer quadrature moves the share at the strongest diffusion."""
    primary = Primary(parton, start, cutoff, coupling, energy, length, epsilon, max(diffusing) * length)
    coarse, fine = (primary.both_unbranched(max(diffusing), orders) for orders in ((6, 8, 16), (10, 14, 24)))
    return max(abs(coarse[channel] - fine[channel]) for channel in coarse)


CHECKED_CASES = (3,)


def cases(chosen):
    """Some entries of the table, for make_all.py --check."""
    everyone = list(primaries())
    return [case_of(*everyone[number]) for number in chosen]


def by_sampling(setup, qhat, events=400_000, seed=3):
    """Mean and standard error of the share with both daughters unbranched, by sampling t, z, the lifetime and the daughters.

    Only for a fixed coupling and a kinematic range; quark primaries. Candidates by veto under P <= 2 C_F/(1-z).
    """
    parton, start, cutoff, coupling, epsilon, energy, length = setup[:7]
    assert parton == "quark" and epsilon is None
    draws = np.random.default_rng(seed)
    primary = Primary(parton, start, cutoff, coupling, energy, length, None, qhat * length)
    t0, t = cutoff**2, np.full(events, start**2)
    largest = 0.5 * (1.0 + math.sqrt(1.0 - t0 / start**2))
    log_range = math.log((1.0 - (1.0 - largest)) / (1.0 - largest))
    power = coupling.alpha_s / (2.0 * math.pi) * 2.0 * qcd.C_F * log_range
    z, alive, done = np.zeros(events), np.ones(events, bool), np.zeros(events, bool)
    while np.any(alive & ~done):
        now = np.flatnonzero(alive & ~done)
        t[now] *= draws.random(now.size) ** (1.0 / power)
        alive[now] = t[now] > t0
        rest = (1.0 - largest) * np.exp(log_range * draws.random(now.size))
        z[now] = 1.0 - rest
        inside = z[now] * rest * t[now] >= t0 / 4.0
        done[now] = alive[now] & inside & (draws.random(now.size) < (1.0 + z[now] ** 2) / 2.0)
    life = draws.exponential(size=events) * primary.formation_fm(t)
    start_t = t + qhat * np.minimum(life, length)
    share = np.where(done, primary.pair_survival("q-qg", np.where(done, start_t, t0), np.where(done, z, 0.5), np.where(done, 1.0 - z, 0.5)), 0.0)
    return share.mean(), share.std() / math.sqrt(events)


def by_joint_constraint(setup, qhat, events=200_000, seed=4):
    """The same counted from whole first steps: both daughters drawn candidate by candidate with the resume rule.

    A daughter's candidates form a Poisson process in its own exponent, so they are drawn there.
    """
    parton, start, cutoff, coupling, epsilon, energy, length = setup[:7]
    draws = np.random.default_rng(seed)
    primary = Primary(parton, start, cutoff, coupling, energy, length, None, qhat * length)
    leg, hits = primary.leg, 0
    t_grid = np.exp(np.linspace(math.log(cutoff**2), math.log(start**2 + qhat * length), 4000))
    below = {p: primary.exponent_below(p, t_grid) for p in ("quark", "gluon")}
    ln_t, cumulative = leg.first_t()
    branched = draws.random(events) * 1.0 < cumulative[-1]
    for t in np.exp(np.interp(draws.random(int(branched.sum())) * cumulative[-1], cumulative, ln_t)):
        # z by veto at this t.
        edge = 0.5 * (1.0 + math.sqrt(1.0 - cutoff**2 / t))
        while True:
            rest = (1.0 - edge) * (edge / (1.0 - edge)) ** draws.random()
            if draws.random() < (1.0 + (1.0 - rest) ** 2) / 2.0:
                break
        z = 1.0 - rest
        whole = t + qhat * min(draws.exponential() * primary.formation_fm(t), length)
        tops = (z * whole, rest * whole)

        def following(which, here):
            table = below[("quark", "gluon")[which]]
            left = np.interp(here, t_grid, table) - draws.exponential()
            return float(np.interp(left, table, t_grid)) if left > 0.0 else 0.0

        pair = [following(0, tops[0]), following(1, tops[1])]
        while pair[0] / tops[0] + pair[1] / tops[1] > 1.0:
            larger = int(pair[1] / tops[1] > pair[0] / tops[0])
            pair[larger] = following(larger, pair[larger])
        hits += pair == [0.0, 0.0]
    share = hits / events
    return share, math.sqrt(share * (1.0 - share) / events)


def main():
    """Compute, check, write."""
    entries = cases(range(len(list(primaries()))))
    setup = next(primaries())
    pulls = []
    for qhat, row in zip(setup[9], entries[0]["both_daughters_unbranched"]):
        share = row["shares"]["q-qg"]
        sampled, error = by_sampling(setup, qhat)
        counted, count_error = by_joint_constraint(setup, qhat)
        pulls += [(sampled - share) / error, (counted - share) / count_error]
        print(f"qhat {qhat}: {share:.7f} sampled {sampled:.6f}({error:.6f}) with the joint constraint {counted:.5f}({count_error:.5f})", flush=True)
    assert max(abs(p) for p in pulls) < 4.0, pulls
    changes = [finer_change(*setup) for setup in primaries()]
    assert max(changes) < 1e-6, changes
    paths, errors = [], []
    for parton in ("quark", "gluon"):
        for birth, length in LONGITUDINAL_PATHS:
            values, error = longitudinal_path(parton, birth, length)
            errors.append(error)
            paths.append({"parton": parton, "birth_t_fm": birth, "time_fm": length, **values})
    assert max(errors) < 1e-11, errors
    write_reference(
        "path_effects",
        "Effects on settled partons: broadening, drag, virtuality diffusion",
        [
            "broadening: <k_T^2> = int qhat dl, common practice",
            "drag: ehat = qhat/(4T) (common practice); its fluctuation from the stationarity of exp(-E/T), derived",
            "Renk 2008, arXiv:0806.0305 (virtuality diffusion)",
        ],
        "qhat of the parton = C_R/C_A times the gluon's; <k_T^2> = int qhat dl, Gaussian, half a component; mean loss int qhat/(4T) dl; variance of the "
        "loss int 2 T ehat dl = int qhat/2 dl (drift -ehat and diffusion leave exp(-E/T) unchanged); time inside s = min(lifetime, length), lifetime "
        "exponential with mean 2E hbar c/t, E the exact energy of the primary; unbranched: s = length; branched: averages over primaries that branch, "
        "vacuum rates alone; floors of the energy do not act. both_daughters_unbranched: share of all events in which the primary branches (in this "
        "channel) and both daughters do not, daughters starting from z(t + dt), (1-z)(t + dt), dt = diffusing qhat * s, with the pair's constraint at "
        "t + dt; the joint constraint does not change it (see the script)",
        {
            "largest_difference_of_longitudinal_closed_forms_to_scipy": max(errors),
            "pulls_of_the_shares_to_two_ways_of_sampling_case_0": pulls,
            "largest_change_of_a_share_with_finer_quadrature": max(changes),
        },
        longitudinal={
            "setup": dict(zip(("temperature_GeV", "start_fm", "end_temperature_GeV", "gluon_cubic_coefficient"), LONGITUDINAL)),
            "note": "at rapidity 0 from the axis, born at birth_t, for so much time",
            "paths": paths,
        },
        cases=entries,
    )


if __name__ == "__main__":
    main()
