"""The transport coefficient of a perturbative plasma: the form used, and how far it is from the full rates."""

import math

import mpmath
import numpy as np
from scipy.integrate import quad

from conventions import C_A, C_F, HBAR_C_GEV_FM
from quadrature import gauss, write_reference

POINTS = [(alpha, n_f, t, e) for alpha, n_f in ((0.3, 3), (0.2, 2), (0.15, 0)) for t in (0.2, 0.3, 0.45) for e in (5.0, 20.0, 100.0)]
TOLERANCE = 1e-3


def debye_mass2(alpha, n_f, t):
    """m_D^2 = 4 pi alpha T^2 (1 + n_f/6)."""
    return 4.0 * math.pi * alpha * t * t * (1.0 + n_f / 6.0)


def form(alpha, n_f, t, e, casimir):
    """C_R (2 zeta(3)/pi)(12 + 3 n_f) alpha^2 T^3 max(0, ln(2 E T/m_D^2)), GeV^2/fm."""
    log = max(0.0, math.log(2.0 * e * t / debye_mass2(alpha, n_f, t)))
    return casimir * 2.0 * float(mpmath.zeta(3)) / math.pi * (12 + 3 * n_f) * alpha**2 * t**3 * log / HBAR_C_GEV_FM


def slope_by_scattering(n_f):
    """d qhat/d ln q_max^2 over C_R alpha^2 T^3 from elastic scattering at small angles.

    sum over plasma particles of density * 4 pi alpha^2 (T_s/d_s), densities integrated numerically.
    """
    boson = quad(lambda p: p * p / math.expm1(p), 0.0, 60.0)[0] / (2.0 * math.pi**2)
    fermion = quad(lambda p: p * p / (math.exp(p) + 1.0), 0.0, 60.0)[0] / (2.0 * math.pi**2)
    gluons, quarks = 16.0 * boson, 12.0 * n_f * fermion
    return 4.0 * math.pi * (gluons * 3.0 / 8.0 + quarks * 0.5 / 3.0)


def occupation(q, n_f):
    """int d^3p/(2 pi)^3 (1 - cos) [2 C_A f_b (1 + f_b') + 2 n_f f_f (1 - f_f')] at T = 1, p' = p + q^2/(2 p (1 - cos)).

    Arnold & Xiao 2008, arXiv:0810.1026 (the statement is from memory; its two limits are checked below).
    """
    nodes, weights = gauss(80)
    # p = e^v, 1 - cos = 2 u^2.
    v, v_weights = 0.5 * (nodes + 1.0) * 13.0 - 9.0, 6.5 * weights
    u, u_weights = 0.5 * (nodes + 1.0), 0.5 * weights
    p, u = np.exp(v)[:, None], u[None, :]
    one_minus = 2.0 * u * u
    recoil = p + np.minimum(q * q / (2.0 * p * one_minus), 600.0)
    boson, fermion = lambda x: 1.0 / np.expm1(x), lambda x: 1.0 / (np.exp(x) + 1.0)
    rate = 2.0 * C_A * boson(p) * (1.0 + boson(recoil)) + 2.0 * n_f * fermion(p) * (1.0 - fermion(recoil))
    return float((p**3 * one_minus * 4.0 * u * rate * v_weights[:, None] * u_weights[None, :]).sum() / (4.0 * math.pi**2))


def full(alpha, n_f, t, e, casimir):
    """int^{q^2 = 2 E T} d^2q/(2 pi)^2 q^2 g^4 C_R N(q)/(q^2 (q^2 + m_D^2)), N the occupation integral, GeV^2/fm."""
    mass2, largest2 = debye_mass2(alpha, n_f, t) / t**2, 2.0 * e / t
    x, weights = gauss(60)
    low, high = math.log(1e-4 * mass2), math.log(largest2)
    log_q2 = low + 0.5 * (high - low) * (1.0 + x)
    values = [occupation(math.exp(0.5 * one), n_f) * math.exp(one) / (math.exp(one) + mass2) for one in log_q2]
    # d^2q q^2/(q^2 (q^2 + m^2)) = pi dln(q^2) q^2/(q^2 + m^2).
    integral = math.pi * 0.5 * (high - low) * float(np.dot(values, weights)) / (4.0 * math.pi**2)
    return (4.0 * math.pi * alpha) ** 2 * casimir * integral * t**3 / HBAR_C_GEV_FM


def main():
    """Compute, check, write."""
    prefactor = limits = 0.0
    for n_f in (0, 2, 3):
        closed = 2.0 * float(mpmath.zeta(3)) / math.pi * (12 + 3 * n_f)
        prefactor = max(prefactor, abs(slope_by_scattering(n_f) / closed - 1.0))
        soft, hard = 1.0 + n_f / 6.0, closed / (16.0 * math.pi) * 4.0
        limits = max(limits, abs(occupation(1e-4, n_f) / soft - 1.0), abs(occupation(60.0, n_f) / hard - 1.0))
    rows = []
    for alpha, n_f, t, e in POINTS:
        quark = form(alpha, n_f, t, e, C_F)
        rows.append(
            {
                "alpha_s": alpha,
                "flavours": n_f,
                "temperature_GeV": t,
                "energy_GeV": e,
                "debye_mass_GeV": math.sqrt(debye_mass2(alpha, n_f, t)),
                "quark_qhat_GeV2_per_fm": quark,
                "gluon_qhat_GeV2_per_fm": form(alpha, n_f, t, e, C_A),
                "full_over_form": full(alpha, n_f, t, e, C_F) / quark,
            }
        )
        print(alpha, n_f, t, e, quark, rows[-1]["full_over_form"])
    print(prefactor, limits)
    assert prefactor < 1e-8 and limits < TOLERANCE, "two ways disagree"
    write_reference(
        "thermal",
        "Transport coefficient and Debye mass of a perturbative plasma",
        [
            "Arnold & Xiao 2008, arXiv:0810.1026 (scattering rate at q_T of the temperature and above; from memory, limits checked)",
            "Aurenche, Gelis & Zaraket 2002, hep-ph/0204146 (rate at q_T below the temperature)",
        ],
        "qhat_R = C_R (2 zeta(3)/pi)(12 + 3 n_f) alpha_s^2 T^3 max(0, ln(2 E T/m_D^2)), m_D^2 = 4 pi alpha_s T^2 (1 + n_f/6), fixed coupling; "
        "full_over_form: the integral up to q_T^2 = 2 E T of both published rates joined as g^4 C_R N(q_T)/(q_T^2 (q_T^2 + m_D^2)), over the form",
        {
            "largest_relative_difference_of_the_prefactor_to_small_angle_scattering": prefactor,
            "largest_relative_difference_of_N_to_its_soft_and_hard_limits": limits,
        },
        cases=rows,
    )


if __name__ == "__main__":
    main()
