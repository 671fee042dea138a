"""Energy spectra and mean losses of multiple soft emission and of first order in opacity, and their h at points.

Both k_T-integrated spectra are integrals of the double-differential ones of spectra_model over ln k_T^2, to infinity
(closed forms exist) or to k_T = omega, which in scaled variables needs one number more: R = omega_c L for multiple soft,
R = mu^2 L^2/2 at first order in opacity (k_T^2 < omega^2 is s < R/(2 gamma^2), omega = (R/gamma)/L).
"""

import math

import numpy as np
from scipy.integrate import quad
from scipy.special import sici

from quadrature import gauss, write_reference
from spectra_model import frequency, multiple_soft, single_hard

OMEGAS = (0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 4.0)
LIMITS = (100.0, 1000.0, 10000.0, None)
INVERSE_GAMMAS = (0.02, 0.1, 0.3, 1.0, 2.0, 5.0)
HARD_LIMITS = (50.0, 1000.0, None)
LOSS_LIMITS = (100.0, 1000.0, 10000.0)
H_MULTIPLE_SOFT = ((0.01, 0.03, 0.1, 0.3, 1.0, 3.0, 10.0), (0.02, 0.1, 0.3, 1.0, 3.0, 10.0, 40.0, 150.0))
H_SINGLE_HARD = ((0.01, 0.1, 0.5, 1.0, 3.0, 10.0), (0.02, 0.1, 0.3, 1.0, 3.0, 10.0, 40.0, 150.0))
# Beyond these the integrands are power tails: h ~ x for small x, h ~ (a + b ln x)/x for large.
SMALLEST, LARGEST = 1e-7, 1e5
# Mean loss: range of omega/omega_c, and where the bounded spectrum has a closed form.
LOSS_FROM, FAR, LOSS_TO = 1e-4, 1.5, 1e3
CLOSED_TOLERANCE = 1e-7
# As quoted in the project's list of check values.
QUOTED_BOUNDED = {0.1: 1.287061, 0.5: 0.2492515, 1.0: 0.0752414, 2.0: 0.0199227}
QUOTED_OPACITY = {0.1: 2.027061, 1.0: 0.5265624, 2.0: 0.3046076}


def over_ln_x(function, top, edges=(), per_unit=2, order=10):
    """int function(x) d ln x from 0 to top, None for infinity."""
    low, high = math.log(SMALLEST), math.log(LARGEST if top is None else top)
    marks = np.unique(np.concatenate([np.linspace(low, high, int(per_unit * (high - low)) + 2), [e for e in edges if low < e < high]]))
    nodes, weights = gauss(order)
    half = 0.5 * np.diff(marks)[:, None]
    points = np.exp(marks[:-1, None] + half * (1.0 + nodes)).ravel()
    values = np.array([function(x) for x in points]).reshape(half.size, -1)
    whole = float(np.sum(values * weights * half)) + function(SMALLEST)
    if top is not None:
        return whole
    last, before = LARGEST * function(LARGEST), 0.1 * LARGEST * function(0.1 * LARGEST)
    return whole + (last + (last - before) / math.log(10.0)) / LARGEST


def oscillating_edges(phase_scale, phases, top):
    """Ends in ln x of panels no longer than three radians of x/phase_scale, for so many radians."""
    last = min(top or LARGEST, phases * phase_scale)
    return np.log(np.arange(1.0, last / (3.0 * phase_scale)) * 3.0 * phase_scale) if last > 6.0 * phase_scale else ()


def soft_spectrum(e, limit):
    """omega dI/domega in 2 alpha_s C_R/pi at omega = e omega_c with k_T < omega; limit is omega_c L, None for none."""
    top = None if limit is None else 0.5 * e * e * limit
    # The oscillation in x/e is damped like exp(-x/(3 e^2)).
    return over_ln_x(lambda x: multiple_soft(e, x), top, oscillating_edges(e, min(400.0, 100.0 * e), top))


def soft_spectrum_closed(e):
    """Without limit."""
    w = frequency(e)
    return math.log(abs(np.cos(w)))


def hard_spectrum(gamma, limit):
    """The same over n0 L at first order in opacity; limit is mu^2 L^2/2."""
    top = None if limit is None else limit / (2.0 * gamma * gamma)
    return over_ln_x(lambda s: single_hard(gamma, s), top, oscillating_edges(1.0 / gamma, 200.0, top))


def hard_spectrum_closed(gamma):
    """Without limit."""
    sine, cosine = sici(gamma)
    inner = 0.5 * math.pi - math.cos(gamma) * (0.5 * math.pi - sine) - math.sin(gamma) * cosine
    return math.log(gamma) + np.euler_gamma - 1.0 + inner / gamma


def soft_spectrum_far(e, limit):
    """The bounded one for omega above omega_c: the closed form less the tail h = 1/x + 2/x^2 + 6/x^3 + ... of a hard vertex.

    The oscillation has died out at the bound, exp(-x/(3 e^2)) = exp(-R/6).
    """
    top = 0.5 * e * e * limit
    return soft_spectrum_closed(e) - (1.0 / top + 1.0 / top**2 + 2.0 / top**3 + 6.0 / top**4)


def soft_loss(limit, points=24):
    """int d e of the spectrum with k_T < omega, times 4/pi: 1 without limit."""
    nodes, weights = gauss(points)
    total = 0.0
    for low, high, spectrum in ((LOSS_FROM, FAR, soft_spectrum), (FAR, LOSS_TO, soft_spectrum_far)):
        half = 0.5 * math.log(high / low)
        energies = low * np.exp(half * (1.0 + nodes))
        total += half * float(np.dot(weights, [e * spectrum(e, limit) for e in energies]))
    # Above, the spectrum falls as 1/omega^2; below, the bounded one is small enough to neglect.
    return 4.0 / math.pi * (total + LOSS_TO * soft_spectrum_far(LOSS_TO, limit))


def h_points():
    """h of both spectra on grids."""
    soft = [[multiple_soft(e, x) for x in H_MULTIPLE_SOFT[1]] for e in H_MULTIPLE_SOFT[0]]
    hard = [[single_hard(gamma, s) for s in H_SINGLE_HARD[1]] for gamma in H_SINGLE_HARD[0]]
    return (
        {"omega_over_omega_c": list(H_MULTIPLE_SOFT[0]), "kappa_squared_over_qhat_L": list(H_MULTIPLE_SOFT[1]), "h": soft},
        {"gamma": list(H_SINGLE_HARD[0]), "kappa_squared_over_mu_squared": list(H_SINGLE_HARD[1]), "h_over_opacity": hard},
    )


CHECKED_CASES = (2, 5)


def case_of(e):
    """One entry of the multiple-soft spectrum."""
    return {
        "omega_over_omega_c": e,
        "unbounded_closed_form": soft_spectrum_closed(e),
        "bounded": [{"R": limit, "value": soft_spectrum(e, limit)} for limit in LIMITS if limit is not None],
    }


def cases(chosen):
    """Some entries of the table, for make_all.py --check."""
    return [case_of(OMEGAS[number]) for number in chosen]


def hard_case_of(inverse_gamma):
    """One entry of the first order in opacity."""
    gamma = 1.0 / inverse_gamma
    return {
        "inverse_gamma": inverse_gamma,
        "unbounded_closed_form": hard_spectrum_closed(gamma),
        "bounded": [{"R": limit, "value": hard_spectrum(gamma, limit)} for limit in HARD_LIMITS if limit is not None],
    }


def main():
    """Compute, check, write."""
    soft, hard = cases(range(len(OMEGAS))), [hard_case_of(one) for one in INVERSE_GAMMAS]
    closures = [abs(soft_spectrum(e, None) - soft_spectrum_closed(e)) for e in OMEGAS]
    hard_closures = [abs(hard_spectrum(1.0 / one, None) - hard_spectrum_closed(1.0 / one)) for one in INVERSE_GAMMAS]
    print("closures", [f"{c:.1e}" for c in closures + hard_closures], flush=True)
    assert max(closures + hard_closures) < CLOSED_TOLERANCE, (closures, hard_closures)
    for row in soft:
        known = QUOTED_BOUNDED.get(row["omega_over_omega_c"])
        assert known is None or abs(row["bounded"][1]["value"] - known) < 2e-6, (row, known)
    for row in hard:
        known = QUOTED_OPACITY.get(row["inverse_gamma"])
        assert known is None or abs(row["unbounded_closed_form"] - known) < 2e-6, (row, known)
    soft_end = math.exp(-12.0)
    # Below, ln|cos| = 1/sqrt(2 e) - ln 2.
    unbounded = math.sqrt(2.0 * soft_end) - soft_end * math.log(2.0)
    for low, high in ((-12, -6), (-6, 0), (0, 12)):
        unbounded += quad(lambda y: math.exp(y) * soft_spectrum_closed(math.exp(y)), low, high, epsabs=1e-10)[0]
    unbounded *= 4.0 / math.pi
    assert abs(unbounded - 1.0) < 1e-4, unbounded
    far = [abs(soft_spectrum_far(row["omega_over_omega_c"], b["R"]) - b["value"]) for row in soft if row["omega_over_omega_c"] > FAR for b in row["bounded"]]
    assert max(far) < 1e-7, far
    losses = [{"R": limit, "over_alpha_s_C_R_qhat_L2_over_4": soft_loss(limit)} for limit in LOSS_LIMITS]
    changes = [abs(row["over_alpha_s_C_R_qhat_L2_over_4"] - soft_loss(row["R"], points=18)) for row in losses[1:2]]
    print("losses", losses, changes)
    assert max(changes) < 1e-4, changes
    soft_h, hard_h = h_points()
    write_reference(
        "energy_loss",
        "Energy spectra and mean loss of multiple soft emission and of first order in opacity; their double-differential h at points",
        [
            "Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9607355; Salgado & Wiedemann 2003, hep-ph/0302184",
            "Gyulassy, Levai & Vitev 2000-1, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129",
        ],
        "omega dI/domega in units 2 alpha_s C_R/pi (and n0 L at first order in opacity), static brick. Closed forms: "
        "ln|cos((1+i) sqrt(omega_c/(2 omega)))|; ln gamma + gamma_E - 1 + (pi/2 - cos gamma (pi/2 - Si gamma) - sin gamma Ci gamma)/gamma, gamma = mu^2 L/"
        "(2 omega). Bounded: k_T < omega, the integral of h (spectra_model.py) over ln k_T^2 up to k_T^2/(qhat L) = (omega/omega_c)^2 R/2, "
        "R = omega_c L; k_T^2/mu^2 = R/(2 gamma^2), R = mu^2 L^2/2. mean_loss: int domega of the bounded spectrum over alpha_s C_R qhat L^2/4, its "
        "value without the bound",
        {
            "largest_difference_of_integrated_h_to_closed_forms": max(closures + hard_closures),
            "unbounded_mean_loss_over_its_closed_form": unbounded,
            "largest_change_of_a_bounded_mean_loss_with_fewer_points": max(changes),
            "h": "1e-9 or better, see rate_effects.json",
        },
        cases=soft,
        first_order_in_opacity=hard,
        mean_loss=losses,
        multiple_soft_h=soft_h,
        single_hard_h=hard_h,
    )


if __name__ == "__main__":
    main()
