"""Multiple soft emission in a medium that thins out, solved directly, against the static spectrum of equal I1.

The k-integrated spectrum of any profile qhat(l) in the harmonic approximation is

    omega dI/domega = (2 alpha_s C_R/pi) ln|c(0)|,   c'' = -Omega^2(l) c,   Omega^2 = -i qhat(l)/(2 omega),

with c = 1, c' = 0 behind the medium (Baier, Dokshitzer, Mueller & Schiff 1998, hep-ph/9803473; in this form Arnold 2009,
arXiv:0808.2767; from memory); l from where the parton is born. For a static brick c(0) = cos(Omega L). The dynamical
scaling law (Salgado & Wiedemann 2002, hep-ph/0204221) takes the static spectrum at omega_c = I1 = int l qhat dl.
"""

import math

import mpmath
import numpy as np
from scipy.integrate import quad, solve_ivp

import conventions as qcd
from quadrature import write_reference

# omega over I1.
OMEGAS = (0.01, 0.03, 0.1, 0.2, 0.3, 0.5, 1.0, 2.0, 3.0, 5.0, 10.0)
# (power a, start l0 fm, last l fm): qhat = qhat0 (l0/l)^a between; longitudinal expansion with qhat ~ T^3 is a = 1.
PROFILES = (
    (0.0, 0.0, 5.0),
    (1.0, 0.6, 2.0),
    (1.0, 0.6, 5.0),
    (1.0, 0.6, 16.2),
    (1.0, 0.2, 10.0),
    (0.5, 0.6, 5.0),
    (1.5, 0.6, 5.0),
    (2.0, 0.6, 5.0),
)


def moment(power, first, last, k):
    """int l^k (l0/l)^a dl over the medium; l0^a is 1 for a static brick."""
    exponent = k + 1.0 - power
    scale = first**power if power else 1.0
    return scale * (math.log(last / first) if exponent == 0.0 else (last**exponent - first**exponent) / exponent)


def by_equation(power, first, last, scaled_omega):
    """ln|c(0)| at omega = scaled_omega I1, by integrating the oscillator inwards."""
    # In units of fm with qhat0 = 1: Omega^2 = -i (l0/l)^a/(2 omega), omega = scaled * int l (l0/l)^a dl.
    omega = scaled_omega * moment(power, first, last, 1)

    def slope(l, c):
        return [c[1], 0.5j / omega * ((first / l) ** power if power else 1.0) * c[0]]

    done = solve_ivp(slope, (last, first), np.array([1.0 + 0j, 0j]), method="DOP853", rtol=1e-12, atol=1e-14)
    value, derivative = done.y[:, -1]
    return math.log(abs(value - first * derivative))


def by_bessel(power, first, last, scaled_omega):
    """The same with the closed solutions sqrt(l) Z_nu(2 nu sqrt(k) l^(1/(2 nu))), nu = 1/(2 - a), k l^(-a) = Omega^2."""
    mpmath.mp.dps = 30
    omega = scaled_omega * mpmath.mpf(moment(power, first, last, 1))
    k = mpmath.mpc(0, -1) * (mpmath.mpf(first) ** power if power else 1) / (2 * omega)
    if power == 2.0:
        root = mpmath.sqrt(mpmath.mpf(1) / 4 - k)
        solutions = [lambda l, p=p: l**p for p in (mpmath.mpf(1) / 2 + root, mpmath.mpf(1) / 2 - root)]
    else:
        nu = 1 / (2 - mpmath.mpf(power))

        def solution(function):
            return lambda l: mpmath.sqrt(l) * function(nu, 2 * nu * mpmath.sqrt(k) * l ** (1 / (2 * nu)))

        solutions = [solution(mpmath.besselj), solution(mpmath.bessely)]
    low = mpmath.mpf(first) if first > 0.0 else mpmath.mpf("1e-18")
    ends = [[f(mpmath.mpf(last)), mpmath.diff(f, mpmath.mpf(last))] for f in solutions]
    determinant = ends[0][0] * ends[1][1] - ends[1][0] * ends[0][1]
    a, b = ends[1][1] / determinant, -ends[0][1] / determinant
    value = a * solutions[0](low) + b * solutions[1](low)
    derivative = a * mpmath.diff(solutions[0], low, h=low * mpmath.mpf("1e-8")) + b * mpmath.diff(solutions[1], low, h=low * mpmath.mpf("1e-8"))
    return float(mpmath.log(abs(value - first * derivative)))


def static(scaled_omega):
    """ln|cos((1+i) sqrt(omega_c/(2 omega)))|."""
    return math.log(abs(np.cos((1.0 + 1.0j) / math.sqrt(2.0 * scaled_omega))))


def mean_loss(power, first, last):
    """int d omega ln|c(0)| over I1: pi/4 whatever the profile, since ln c is analytic and 1/omega's coefficient is I1's."""
    value, error = 0.0, 0.0
    for low, high in ((-12.0, -7.0), (-7.0, -4.0), (-4.0, -1.0), (-1.0, 2.0), (2.0, 6.0), (6.0, 12.0)):
        piece = quad(lambda x: math.exp(x) * by_equation(power, first, last, math.exp(x)), low, high, epsabs=1e-9, epsrel=1e-8)
        value, error = value + piece[0], error + piece[1]
    # Below: ln|c| ~ b/sqrt(omega), so the rest is 2 omega ln|c| up to omega times logarithms; above: ln|c| ~ 1/omega^2, so the rest is omega ln|c|.
    soft, hard = math.exp(-12.0), math.exp(12.0)
    return value + 2.0 * soft * by_equation(power, first, last, soft) + hard * by_equation(power, first, last, hard), error


def case_of(power, first, last):
    """One entry, and the largest difference of the two ways."""
    i0, i1 = moment(power, first, last, 0), moment(power, first, last, 1)
    rows, worst = [], 0.0
    for omega in OMEGAS:
        exact = by_equation(power, first, last, omega)
        worst = max(worst, abs(exact - by_bessel(power, first, last, omega)))
        rows.append({"omega_over_I1": omega, "direct": exact, "scaling_law": static(omega), "law_over_direct": static(omega) / exact})
    return {
        "power": power,
        "start_fm": first,
        "end_fm": last,
        "I0_over_2_I1_per_length": i0 * last / (2.0 * i1),
        "points": rows,
    }, worst


CHECKED_CASES = (2, 6)


def cases(chosen):
    """Some entries of the table, for make_all.py --check."""
    return [case_of(*PROFILES[number])[0] for number in chosen]


def main():
    """Compute, check, write."""
    entries, errors = zip(*(case_of(*profile) for profile in PROFILES))
    assert max(errors) < 1e-9, errors
    assert max(abs(row["law_over_direct"] - 1.0) for row in entries[0]["points"]) < 1e-9
    losses = [mean_loss(*profile)[0] for profile in (PROFILES[0], PROFILES[2], PROFILES[6])]
    assert max(abs(loss / (math.pi / 4.0) - 1.0) for loss in losses) < 5e-5, losses
    for entry in entries:
        words = " ".join(f"{row['omega_over_I1']:g}:{row['law_over_direct']:.3f}" for row in entry["points"])
        print(entry["power"], entry["start_fm"], entry["end_fm"], f"I0 ratio {entry['I0_over_2_I1_per_length']:.3f}", words)
    write_reference(
        "expanding_scaling",
        "Multiple soft emission in a thinning medium: direct solution against the dynamical scaling law",
        [
            "Baier, Dokshitzer, Mueller & Schiff 1998, hep-ph/9803473; Arnold 2009, arXiv:0808.2767 (spectrum of any profile; from memory)",
            "Salgado & Wiedemann 2002, hep-ph/0204221 (scaling law)",
        ],
        "omega dI/domega in units 2 alpha_s C_R/pi, k_T-integrated without limit; qhat = qhat0 (l0/l)^power for start <= l <= end, l from birth; "
        "direct: ln|c(0)|, c'' = i qhat/(2 omega) c, c = 1, c' = 0 at the end; scaling_law: ln|cos((1+i) sqrt(I1/(2 omega)))|, I1 = int l qhat dl; "
        "I0_over_2_I1_per_length: the true int qhat dl over the law's qhat L = 2 I1/L with L = end. The mean loss alpha_s C_R I1/2 is exact for "
        "every profile (checked for three)",
        {
            "largest_difference_of_the_equation_to_closed_solutions": max(errors),
            "mean_loss_of_three_profiles_over_the_law": [loss / (math.pi / 4.0) for loss in losses],
        },
        cases=list(entries),
    )


if __name__ == "__main__":
    main()
