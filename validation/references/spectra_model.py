"""Double-differential spectra of induced gluons in a uniform brick, written apart from the Rust engine.

Both are given as h, the induced part of (pi/(2 alpha_s C_R)) kappa^2 omega dI/(d omega d kappa^2); the vacuum's is 1/2.

Multiple soft scattering (Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9607355; Zakharov 1997; Salgado &
Wiedemann 2003, hep-ph/0302184, eq. 1, with n sigma(r) = qhat r^2/2), from memory:

    omega dI/(d omega d^2k) = alpha_s C_R/((2 pi)^2 omega^2) 2 Re int dy int_y dybar int d^2u e^{-i k.u}
                              exp(-(1/4) int_ybar qhat u^2) d_y.d_u K(u, ybar; 0, y),

K the propagator of an oscillator of frequency Omega = sqrt(-i qhat/(2 omega)). In units of L for times, of
omega_c = qhat L^2/2 for omega (e) and of qhat L for k^2 (x), with W = Omega L = (1 - i)/sqrt(2 e), the Gaussian
integrals over u leave

    h = x Re int_0^1 d ybar int_0^ybar d tau (-W^2/sin^2 W tau) [d/D^2 - b x/D^3] e^{-x/D} + Re e^{-i x tan W/(e W)} - 1,
    b = i e W cot(W tau),  d = 1 - ybar,  D = d - b.

The first term has both times inside, the others ybar behind the brick, less the vacuum's. At fixed tau the integral
over ybar closes: its antiderivative in d is E1(x/D) - b e^{-x/D}/D.

First order in opacity (Gyulassy, Levai & Vitev 2000-1, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129; screened
Coulomb centres spread evenly over L), from memory:

    omega dI/(d omega d^2k) = (2 alpha_s C_R/pi^2) n0 L int d^2q mu^2/(pi (q^2+mu^2)^2) k.q/(k^2 p^2) (1 - sin X/X),

p = k - q, X = p^2 L/(2 omega). With s = k^2/mu^2, r = p^2/mu^2, gamma = mu^2 L/(2 omega) the angle closes:

    h = n0 L s int_0^infinity dr/r (1 - sin(gamma r)/(gamma r)) (s + 1 - r)/((1 + s + r)^2 - 4 s r)^{3/2}.
"""

import math

import mpmath
import numpy as np
from scipy.integrate import quad
from scipy.interpolate import RectBivariateSpline
from scipy.special import exp1

from quadrature import gauss

NODES, WEIGHTS = gauss(12)
# Below this ratio of the range of d to |b| the two ends of the antiderivative cancel: Gauss in d instead.
CANCELLING = 0.3
# The integrand is gone where its exponents add up to this.
GONE = 42.0
# Beyond this many radians an oscillation is gone from both spectra.
RINGING = 80.0


def frequency(e):
    """W = Omega L at omega = e omega_c."""
    return (1.0 - 1.0j) / np.sqrt(2.0 * e)


def time_edges(e, x):
    """Ends of panels in tau. The integrand is analytic below the real axis, where its oscillation decays: the way goes
    from 0 down to a(1 - i), at most (1 - i)/2, along which W tau is imaginary, and from there, if anything is left, to 1."""
    fine = 0.5 * np.linspace(0.0, 1.0, 801)[1:] ** 4
    decay = 2.0 * fine / math.sqrt(2.0 * e)
    # Along this way -b = e W coth: the exponents at the two ends of the integral over ybar, and 1/sinh^2.
    bottom = e * frequency(e) / np.tanh(decay)
    weakest = np.minimum((x / bottom).real, (x / (1.0 - fine * (1.0 - 1.0j) + bottom)).real)
    # At tau = 1, on the real axis again, little may be damped where e is large.
    at_end = (1j * x * np.tan(frequency(e)) / (e * frequency(e))).real + 2.0 * decay[-1]
    over = np.flatnonzero((weakest + 2.0 * decay > GONE) & (at_end > GONE))
    turn = fine[over[0]] if over.size else 0.5
    smallest = 0.2 * min(e, math.sqrt(e), e / x, turn)
    # One panel a unit of this.
    measure = 1.5 * np.log1p(fine / smallest) + x / (1.5 * e) * math.sqrt(0.5 * e) * np.tanh(decay) + 1.5 * decay + 2.0 * np.minimum(x, 30.0) * fine
    fine, measure = np.concatenate([[0.0], fine]), np.concatenate([[0.0], measure])
    last = float(np.interp(turn, fine, measure))
    down = np.interp(np.linspace(0.0, last, int(math.ceil(last)) + 2), measure, fine) * (1.0 - 1.0j)
    if over.size:
        return down
    back = down[-1] + (1.0 - down[-1]) * np.linspace(0.0, 1.0, 3 + int(2.0 * abs(frequency(e)) + 0.5 * min(x, 100.0) / min(e, 1.0) ** 0.5))
    return np.concatenate([down, back[1:]])


def times_inside(tau, e, x):
    """The integrand over tau of the term with both times inside, the integral over ybar done."""
    w = frequency(e)
    sine = np.sin(w * tau)
    b = 1j * e * w * np.cos(w * tau) / sine
    room = 1.0 - tau
    # Both ends of the antiderivative nearly cancel where d changes D little and the exponent little.
    close = (np.abs(room) < CANCELLING * np.abs(b)) & (x * np.abs(room) < CANCELLING * np.abs(b) ** 2)
    inner = np.empty_like(b)
    d = 0.5 * room[close, None] * (1.0 + NODES)
    whole = d - b[close, None]
    inner[close] = np.sum((d / whole**2 - b[close, None] * x / whole**3) * np.exp(-x / whole) * WEIGHTS, axis=1) * 0.5 * room[close]
    far = ~close
    low, high = -b[far], room[far] - b[far]
    inner[far] = exp1(x / high) - b[far] * np.exp(-x / high) / high - exp1(x / low) - np.exp(-x / low)
    return -((w / sine) ** 2) * inner


def multiple_soft(e, x, edges=None):
    """h of multiple soft scattering at omega = e omega_c, k^2 = x qhat L; over these panels in tau, if given."""
    edges = time_edges(e, x) if edges is None else edges
    half = 0.5 * np.diff(edges)[:, None]
    tau = (edges[:-1, None] + half * (1.0 + NODES)).ravel()
    inside = float(np.sum(times_inside(tau, e, x).reshape(half.size, -1) * WEIGHTS * half).real)
    w = frequency(e)
    behind = np.exp(-1j * x * np.tan(w) / (e * w)).real - 1.0
    return x * inside + float(behind)


def multiple_soft_on_real_axis(e, x):
    """The same with tau real, and panels that know nothing of the integrand but its shortest period and its scales near 0."""
    near_zero = np.geomspace(1e-9, 1.0, 80) * min(1.0, e)
    return multiple_soft(e, x, np.unique(np.concatenate([np.linspace(0.0, 1.0, int(x / e) + int(4.0 / math.sqrt(e)) + 40), near_zero])))


def multiple_soft_by_two_times(e, x, digits=15):
    """The same by mpmath's double quadrature over both times, nothing closed but the Gaussian integrals over u."""
    mpmath.mp.dps = digits
    e, x = mpmath.mpf(e), mpmath.mpf(x)
    w = (1 - 1j) / mpmath.sqrt(2 * e)

    def amplitude(tau, d):
        b = 1j * e * w * mpmath.cot(w * tau)
        return -((w / mpmath.sin(w * tau)) ** 2) * (d / (d - b) ** 2 - b * x / (d - b) ** 3) * mpmath.exp(-x / (d - b))

    def over_tau(ybar):
        marks = [ybar * mpmath.mpf(k) / 6 for k in range(7)]
        return mpmath.quad(lambda tau: amplitude(tau, 1 - ybar).real, marks) if ybar > 0 else mpmath.mpf(0)

    inside = mpmath.quad(over_tau, mpmath.linspace(0, 1, 5))
    return float(x * inside + mpmath.exp(-1j * x * mpmath.tan(w) / (e * w)).real - 1)


def single_hard(gamma, s):
    """h/(n0 L) at first order in opacity."""
    # One panel a unit of this: geometric around 0 and around r = s, a radian and a half of sin(gamma r) while it matters.
    top = 1e5 * (1.0 + s)
    fine = np.expm1(np.linspace(0.0, np.log1p(top / 1e-3), 6001)) * 1e-3
    ringing = min(top, (400.0 + 40.0 * gamma) / gamma)
    measure = 3.0 * np.log1p(fine) + 3.0 * np.arcsinh((fine - s) / math.sqrt(1.0 + 4.0 * s)) + np.minimum(fine, ringing) * gamma / 1.5
    measure -= measure[0]
    edges = np.interp(np.linspace(0.0, measure[-1], int(math.ceil(measure[-1])) + 1), measure, fine)
    half = 0.5 * np.diff(edges)[:, None]
    r = edges[:-1, None] + half * (1.0 + NODES)
    phase = gamma * r
    plain = np.where(phase < 1e-2, phase**2 / 6.0 - phase**4 / 120.0, 1.0 - np.sin(phase) / phase)
    # Beyond, sin averages out: its envelope falls as r^-5 and is smooth.
    factor = np.where(r < ringing, plain, 1.0)
    body = (s + 1.0 - r) / ((1.0 + s + r) ** 2 - 4.0 * s * r) ** 1.5
    return s * float(np.sum(factor / r * body * WEIGHTS * half))


def single_hard_by_angle(gamma, s):
    """The same by scipy's adaptive quadrature over the modulus and the angle of p, the angular integral not closed."""

    def over_angle(r):
        def term(angle):
            kp = math.sqrt(s * r) * math.cos(angle)
            return (s - kp) / (s + r - 2.0 * kp + 1.0) ** 2 / math.pi

        return 2.0 * quad(term, 0.0, math.pi, epsabs=1e-13, epsrel=1e-12, limit=200)[0]

    def over_r(r):
        return over_angle(r) * (1.0 - np.sinc(gamma * r / math.pi)) / (2.0 * r)

    width = math.sqrt(1.0 + 4.0 * s)
    marks = [0.0, *(s + k * width for k in (-4, -1, 1, 4, 16) if s + k * width > 0.0), 30.0 * (1.0 + s)]
    pieces = np.concatenate([np.linspace(low, high, 2 + int((high - low) * gamma / 6.0))[:-1] for low, high in zip(marks[:-1], marks[1:])])
    pieces = [*pieces, *(marks[-1] * 10.0 ** np.arange(7))]
    return sum(quad(over_r, low, high, epsabs=1e-12, epsrel=1e-10, limit=400)[0] for low, high in zip(pieces[:-1], pieces[1:]))


def stretched(ratio):
    """The logarithm, with as many more steps as the oscillation in its argument asks for."""
    return np.log(ratio) + 0.5 * RINGING * np.tanh(ratio / RINGING)


class Table:
    """A function of two positive variables a, b that oscillates in phase(a, b), as a quintic spline in ln a and stretched(phase)."""

    def __init__(self, function, phase, of_phase, ranges, steps):
        self.function, self.phase, self.ranges = function, phase, ranges
        corners = [phase(a, b) for a in ranges[0] for b in ranges[1]]
        fine = np.geomspace(0.9 * min(corners), 1.1 * max(corners), 20001)
        firsts = np.linspace(*np.log(ranges[0]), steps[0])
        seconds = np.linspace(stretched(fine[0]), stretched(fine[-1]), steps[1])
        phases = np.exp(np.interp(seconds, stretched(fine), np.log(fine)))
        self.spline = RectBivariateSpline(firsts, stretched(phases), [self._row(a, of_phase(a, phases)) for a in np.exp(firsts)], kx=5, ky=5, s=0)

    def _row(self, a, b):
        """Values along the phase; beyond what is asked for, with room for the spline to settle, the last one stays."""
        low, high = self.ranges[1]
        wanted = np.clip(b, 0.2 * low, 5.0 * high)
        few, back = np.unique(wanted, return_inverse=True)
        return np.array([self.function(a, one) for one in few])[back]

    def __call__(self, a, b):
        a, b = np.broadcast_arrays(a, b)
        for value, (low, high) in zip((a, b), self.ranges):
            assert low * (1 - 1e-9) <= np.min(value) and np.max(value) <= high * (1 + 1e-9), (np.min(value), np.max(value), low, high)
        return self.spline.ev(np.log(a.ravel()), stretched(self.phase(a, b).ravel())).reshape(a.shape)

    def errors(self, points=400, seed=5):
        """Differences to the function at random points, and the points."""
        draws = np.random.default_rng(seed)
        places = np.exp([draws.uniform(*np.log(edges), points) for edges in self.ranges]).T
        return np.array([float(self(np.float64(a), np.float64(b))) - self.function(a, b) for a, b in places]), places


def multiple_soft_table(e_range, x_range, steps=(110, 260)):
    """h of multiple soft scattering for e and x in these ranges."""
    return Table(multiple_soft, lambda e, x: x / e, lambda e, phase: e * phase, (e_range, x_range), steps)


def single_hard_table(gamma_range, s_range, steps=(110, 260)):
    """h/(n0 L) at first order in opacity for gamma and s in these ranges."""
    return Table(single_hard, lambda gamma, s: gamma * s, lambda gamma, phase: phase / gamma, (gamma_range, s_range), steps)
