"""Moments of the parton densities made by collinear-ordered evolution at fixed coupling."""

import math

import numpy as np
from scipy.integrate import quad
from scipy.linalg import expm

import conventions as qcd
from quadrature import write_reference

ALPHA_S = 0.15
START_GEV, CUTOFF_GEV = 100.0, 2.0
FLAVOURS = 5
EPSILONS = (0.01, 0.003, 0.001)
MOMENTS = (2, 3, 4, 6)


def harmonic(n):
    """S1(n)."""
    return math.fsum(1.0 / k for k in range(1, n + 1))


def textbook(n, n_f):
    """The matrix without a cut, rows (Sigma, g): Ellis, Stirling & Webber ch. 4 (timelike: transposed)."""
    qq = qcd.C_F * (1.5 + 1.0 / (n * (n + 1)) - 2.0 * harmonic(n))
    gq = qcd.C_F * (n * n + n + 2) / ((n - 1) * n * (n + 1))
    qg = n_f * (n * n + n + 2) / (n * (n + 1) * (n + 2))
    gg = 2.0 * qcd.C_A * (1.0 / (n * (n - 1)) + 1.0 / ((n + 1) * (n + 2)) - harmonic(n) + 11.0 / 12.0) - n_f / 3.0
    return np.array([[qq, qg], [gq, gg]])


def with_cut(n, n_f, epsilon):
    """The same by quadrature of the kernels over epsilon <= z <= 1 - epsilon, in u = ln(z/(1-z))."""
    widest = math.log((1.0 - epsilon) / epsilon)

    def over_z(function):
        def per_u(u):
            z, rest = 1.0 / (1.0 + math.exp(-u)), 1.0 / (1.0 + math.exp(u))
            return function(z, rest) * z * rest

        return sum(quad(per_u, *ends, epsabs=1e-13, epsrel=1e-13)[0] for ends in ((-widest, 0.0), (0.0, widest)))

    quark, gluons, pair = qcd.quark_to_quark_gluon, qcd.gluon_to_gluons, qcd.gluon_to_one_flavour
    qq = over_z(lambda z, r: quark(z, r) * (z ** (n - 1) - 1.0))
    gq = over_z(lambda z, r: quark(z, r) * r ** (n - 1))
    qg = over_z(lambda z, r: 2.0 * n_f * pair(z, r) * z ** (n - 1))
    gg = over_z(lambda z, r: gluons(z, r) * (z ** (n - 1) + r ** (n - 1) - 1.0) - n_f * pair(z, r))
    return np.array([[qq, qg], [gq, gg]])


def moments(n, n_f, epsilon, start_gev, cutoff_gev):
    """Moments sum x^(n-1) at the cutoff: Sigma = all quarks and antiquarks, valence = quark minus antiquark of one flavour."""
    matrix = with_cut(n, n_f, epsilon)
    span = ALPHA_S / (2.0 * math.pi) * math.log(start_gev**2 / cutoff_gev**2)
    evolved = expm(matrix * span)
    return {
        "N": n,
        "matrix": matrix,
        "quark": {"Sigma": evolved[0, 0], "g": evolved[1, 0], "valence": math.exp(matrix[0, 0] * span)},
        "gluon": {"Sigma": evolved[0, 1], "g": evolved[1, 1], "valence": 0.0},
    }


def main():
    """Compute, check, write."""
    cases = []
    for epsilon in EPSILONS:
        # N = 1 counts partons: finite with the cut, but with a wide distribution.
        rows = [moments(n, FLAVOURS, epsilon, START_GEV, CUTOFF_GEV) for n in (1, *MOMENTS)]
        second = next(row for row in rows if row["N"] == 2)
        for parton in ("quark", "gluon"):
            assert abs(second[parton]["Sigma"] + second[parton]["g"] - 1.0) < 1e-12, "momentum is not conserved"
        cases.append({"epsilon": epsilon, "moments": rows})
    limits = []
    for n in MOMENTS:
        matrix = textbook(n, FLAVOURS)
        span = ALPHA_S / (2.0 * math.pi) * math.log(START_GEV**2 / CUTOFF_GEV**2)
        evolved = expm(matrix * span)
        small = [np.max(np.abs(with_cut(n, FLAVOURS, e) - matrix)) for e in (1e-3, 1e-5)]
        # What the cut removes is of first order in epsilon.
        assert small[1] < 0.02 * small[0], (n, small)
        limits.append(
            {
                "N": n,
                "matrix": matrix,
                "quark": {"Sigma": evolved[0, 0], "g": evolved[1, 0], "valence": math.exp(matrix[0, 0] * span)},
                "gluon": {"Sigma": evolved[0, 1], "g": evolved[1, 1], "valence": 0.0},
            }
        )
    write_reference(
        "collinear_moments",
        "Moments of the densities of final partons in collinear-ordered evolution at fixed coupling",
        [
            "Ellis, Stirling & Webber, QCD and Collider Physics, ch. 4 (anomalous dimensions; timelike: transposed)",
            "Altarelli & Parisi 1977, Nucl. Phys. B 126:298",
        ],
        "d(Sigma, g)/dtau = A (Sigma, g), dtau = alpha_s/(2 pi) dt/t from start to t0 = cutoff^2; A by quadrature over "
        "epsilon <= z <= 1 - epsilon; matrix exponential by scipy.linalg.expm; moment = mean over events of the sum of x^(N-1); "
        "matrix rows and columns in the order (Sigma, g), column = parent; all five flavours always open",
        "quadrature 1e-13 relative; matrix exponential to rounding; N = 2 conserves momentum to 1e-12",
        setup={
            "coupling": {"argument": "fixed", "alpha_s": ALPHA_S},
            "start_virtuality_GeV": START_GEV,
            "virtuality_cutoff_GeV": CUTOFF_GEV,
            "flavours": FLAVOURS,
            "flavour_opening": "always",
            "ordering": "collinear",
        },
        cases=cases,
        without_cut=limits,
    )


if __name__ == "__main__":
    main()
