"""Path integrals of qhat through a longitudinally expanding medium."""

import math

import mpmath
from scipy.integrate import quad

import conventions as qcd
from medium_model import phase_factor
from quadrature import write_reference

START_TEMPERATURE_GEV, START_FM, END_TEMPERATURE_GEV = 0.45, 0.6, 0.15
COEFFICIENT = 4.0
FORMATION_FM = (0.2, 0.7, 2.0, 6.0, 40.0)
WINDOW = 1.0
# (birth t, birth z, rapidity of the direction); None is along the beam.
PATHS = (
    (0.0, 0.0, 0.0),
    (0.35, 0.0, 0.0),
    (0.6, 0.0, 0.0),
    (2.0, 0.0, 0.0),
    (9.5, 0.0, 0.0),
    (17.0, 0.0, 0.0),
    (0.0, 0.0, 1.0),
    (0.0, 0.0, -0.6),
    (1.5, 0.9, 0.0),
    (3.0, 1.2, -0.7),
    (2.0, -1.6, 1.1),
    (0.0, 0.0, None),
    (2.0, 0.5, None),
)


class Path:
    """A light-like ray: lab time t + l, beam coordinate z + l cos(theta), l from birth."""

    def __init__(self, birth_t, birth_z, rapidity, flow):
        self.birth_t, self.birth_z, self.flow = birth_t, birth_z, flow
        self.cosine = 1.0 if rapidity is None else math.tanh(rapidity)
        self.sine2 = 0.0 if rapidity is None else 1.0 / math.cosh(rapidity) ** 2

    def proper_time(self, l):
        # Expanded so that nothing cancels along the beam.
        square = self.birth_t**2 - self.birth_z**2 + 2 * l * (self.birth_t - self.cosine * self.birth_z) + self.sine2 * l * l
        return mpmath.sqrt(square) if square > 0 else mpmath.mpf(0)

    def where(self, tau):
        """The l >= 0 at which the ray reaches a proper time, 0 if it was born later, None if never."""
        linear, constant = self.birth_t - self.cosine * self.birth_z, self.birth_t**2 - self.birth_z**2 - tau**2
        if constant >= 0.0:
            return 0.0
        if self.sine2 == 0.0:
            return -constant / (2.0 * linear) if linear > 0.0 else None
        return -constant / (linear + math.sqrt(linear**2 - self.sine2 * constant))

    def qhat(self, l):
        """GeV^2 per lab fm."""
        tau = self.proper_time(l)
        temperature = START_TEMPERATURE_GEV * (START_FM / tau) ** (mpmath.mpf(1) / 3)
        rest = COEFFICIENT * temperature**3 / qcd.HBAR_C_GEV_FM
        if not self.flow:
            return rest
        # p.u/E with u = (t, 0, 0, z)/tau.
        return rest * ((self.birth_t + l) - self.cosine * (self.birth_z + self.cosine * l)) / tau

    def inside(self):
        """First and last l in the medium, None if there is none."""
        end = START_FM * (START_TEMPERATURE_GEV / END_TEMPERATURE_GEV) ** 3
        first, last = self.where(START_FM), self.where(end)
        return None if first is None or last is None or first >= last else (first, last)


def integral(function, low, high, wavelength):
    """By mpmath over pieces that grow geometrically and are shorter than half a wavelength."""
    if high <= low:
        return 0.0
    marks, here = [mpmath.mpf(low)], mpmath.mpf(low)
    while here < high:
        here = min(mpmath.mpf(high), here + min(wavelength / 2, 0.3 + here))
        marks.append(here)
    return float(mpmath.quad(function, marks))


def case_of(birth_t, birth_z, rapidity, flow):
    """One entry of the table, and its largest difference to scipy's quadrature."""
    path = Path(birth_t, birth_z, rapidity, flow)
    bounds = path.inside()
    entry = {
        "birth_t_fm": birth_t,
        "birth_z_fm": birth_z,
        "direction_cosine_to_beam": path.cosine,
        "flow": flow,
        "inside_fm": list(bounds) if bounds else [],
    }
    low, high = bounds or (0.0, 0.0)
    moments = [integral(lambda l, k=k: path.qhat(l) * l**k, low, high, 10.0) for k in range(3)]
    others = [quad(lambda l, k=k: float(path.qhat(l)) * l**k, low, high, epsabs=1e-12, epsrel=1e-12)[0] for k in range(3)]
    worst = max(abs(a - b) / max(abs(b), 1.0) for a, b in zip(moments, others))
    phases = []
    for formation in FORMATION_FM:
        row = {"formation_fm": formation}
        for phase in ("interference", "rescattering", "soft-gradient"):
            stop = min(high, WINDOW * formation) if phase == "rescattering" else high
            key = phase.replace("-", "_")
            row[key] = integral(
                lambda l, p=phase, f=formation: path.qhat(l) * phase_factor(p, l / f, mpmath), low, stop, 2 * math.pi * formation
            )
        # An independent route for the interference: 2 I0 minus scipy's rule for cosine weights.
        cosine = quad(lambda l: float(path.qhat(l)), low, high, weight="cos", wvar=1.0 / formation, limit=400, epsabs=1e-11)[0]
        worst = max(worst, abs(row["interference"] - (2.0 * moments[0] - 2.0 * cosine)))
        phases.append(row)
    return {**entry, "I0_GeV2": moments[0], "I1_GeV2_fm": moments[1], "I2_GeV2_fm2": moments[2], "phase_integrals_GeV2": phases}, worst


def main():
    """Compute, check, write."""
    mpmath.mp.dps = 20
    entries, errors = zip(*(case_of(*path, flow) for path in PATHS for flow in (True, False)))
    closed = COEFFICIENT * START_TEMPERATURE_GEV**3 * START_FM / qcd.HBAR_C_GEV_FM * 3.0 * math.log(START_TEMPERATURE_GEV / END_TEMPERATURE_GEV)
    assert abs(entries[0]["I0_GeV2"] - closed) < 1e-11, (entries[0]["I0_GeV2"], closed)
    # From the origin the flow factor makes I0 the same in every direction (boost invariance).
    boosted = next(e for e, path in zip(entries, [p for p in PATHS for _ in (0, 1)]) if path == (0.0, 0.0, 1.0) and e["flow"])
    assert abs(boosted["I0_GeV2"] - closed) < 1e-11, boosted
    assert max(errors) < 1e-8, errors
    write_reference(
        "longitudinal",
        "Path integrals of the gluon's qhat in longitudinal expansion",
        ["Bjorken 1983, Phys. Rev. D 27:140 (field, flow)", "Baier, Mueller & Schiff 2007, nucl-th/0612068 (flow factor p.u/E)"],
        "qhat = coefficient T^3/(hbar c) (p.u/E if flow), T = T0 (tau0/tau)^(1/3) for tau0 <= tau while T >= end temperature, "
        "u = (t, 0, 0, z)/tau; l from birth along the light-like ray; I_k = int l^k qhat dl; phase integrals int qhat K(l/formation) dl, "
        "rescattering up to l = window * formation",
        {"largest_difference_to_scipy_quadrature": max(errors), "difference_of_I0_to_closed_form": abs(entries[0]["I0_GeV2"] - closed)},
        setup={
            "temperature_GeV": START_TEMPERATURE_GEV,
            "start_fm": START_FM,
            "end_temperature_GeV": END_TEMPERATURE_GEV,
            "coefficient": COEFFICIENT,
            "for": "gluon",
            "window": WINDOW,
        },
        cases=list(entries),
    )


if __name__ == "__main__":
    main()
