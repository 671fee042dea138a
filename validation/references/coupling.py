"""The running coupling at many scales."""

import math

import numpy as np
from scipy.integrate import solve_ivp

import conventions as qcd
from quadrature import write_reference

SCALES_GEV = (0.3, 0.9, 1.0, 1.2, 1.4999, 1.5, 1.5001, 2.0, 3.0, 4.7499, 4.75, 4.7501, 5.0, 7.0, 10.0, 20.0, 45.6)
SCALES_GEV += (50.0, 91.1876, 100.0, 200.0, 500.0, 1000.0, 5000.0)
SETUPS = ((0.118, 1.0), (0.118, 0.8), (0.130, 1.5), (0.110, 1.0))


def by_differential_equation(mu_gev, loops, alpha_s_mz, freeze_gev):
    """The same by integrating the beta function numerically, threshold by threshold."""
    target = 2.0 * math.log(max(mu_gev, freeze_gev))
    here, alpha = 2.0 * math.log(qcd.Z_MASS_GEV), alpha_s_mz
    stops = [2.0 * math.log(m) for m in (qcd.BOTTOM_GEV, qcd.CHARM_GEV) if 2.0 * math.log(m) > target]
    for n_f, stop in zip((5, 4, 3), [*stops, target]):
        b0, b1 = qcd.beta_coefficients(n_f)

        def slope(_, a, b0=b0, b1=b1):
            return -b0 * a**2 - (b1 * a**3 if loops == 2 else 0.0)

        if stop != here:
            alpha = solve_ivp(slope, (here, stop), [alpha], method="DOP853", rtol=1e-12, atol=1e-14).y[0, -1]
        here = stop
    return alpha


def main():
    """Compute, check, write."""
    cases, worst = [], 0.0
    for alpha_s_mz, freeze_gev in SETUPS:
        for loops in (1, 2):
            values = [qcd.exact_alpha_s(mu, loops, alpha_s_mz, freeze_gev) for mu in SCALES_GEV]
            other = [by_differential_equation(mu, loops, alpha_s_mz, freeze_gev) for mu in SCALES_GEV]
            worst = max(worst, float(np.max(np.abs(np.array(values) / np.array(other) - 1.0))))
            cases.append({"loops": loops, "alpha_s_mz": alpha_s_mz, "freeze_GeV": freeze_gev, "mu_GeV": SCALES_GEV, "alpha_s": values})
    assert worst < 1e-10, worst
    write_reference(
        "coupling",
        "alpha_s(mu^2), one and two loops, continuous at 1.5 and 4.75 GeV, constant below freeze_GeV",
        ["Review of Particle Physics, Quantum chromodynamics (beta function)"],
        "d alpha/d ln mu^2 = -b0 alpha^2 - b1 alpha^3, b0 = (33 - 2 n_f)/(12 pi), b1 = (153 - 19 n_f)/(24 pi^2); n_f = 3, 4, 5; "
        "reference at 91.1876 GeV; two loops by the implicit exact solution (scipy.optimize.brentq)",
        {"largest_relative_difference_to_numerical_integration_of_the_beta_function": worst},
        cases=cases,
    )


if __name__ == "__main__":
    main()
