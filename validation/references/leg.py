"""One parton leg evolving down in virtuality: no-branching probability and first-branching distributions.

The leg branches with density (per d ln t dz)

    f(t, z) = alpha_s/(2 pi) P(z)          [vacuum]
    f(t, z) (1 + R(t, z))                  [with an induced rate R on q -> q g and g -> g g]

and survives from t_max to t with exp(-integral of the density). All integrals are done in u = ln(z/(1-z)), in which
the kinematic range z(1-z) t >= t0/4 is |u| <= l with t = t0 cosh^2(l/2), and in l itself (ln t for a constant range),
in which nothing is singular. Kinks (thresholds, freezing, edges of the medium's regime) are made ends of panels.
"""

import numpy as np
from scipy.interpolate import CubicHermiteSpline

import conventions as qcd
from quadrature import antiderivative_matrix, gauss, integrate_rows, thinned

ORDER = 10
PANELS = 96
# The integrand's nearest poles in u lie at a distance of pi, segments reach half a length of 6: 1.65^(-2 order).
INNER_ORDER = 32
Z_PANELS, Z_ORDER = 1600, 2
T_POINTS = 20000
CHUNK_ROWS = 64


class Leg:
    """A quark or gluon with its scales, its coupling, its z range and perhaps a medium."""

    def __init__(self, parton, start_gev, cutoff_gev, coupling, epsilon=None, opening="always", flavours=5, medium=None):
        self.parton, self.start_gev, self.cutoff_gev = parton, start_gev, cutoff_gev
        self.coupling, self.epsilon, self.opening, self.flavours, self.medium = coupling, epsilon, opening, flavours, medium
        self.t_max, self.t0 = start_gev**2, cutoff_gev**2

    def description(self):
        """What this leg is, in the words of a config."""
        z_range = {"kind": "kinematic"} if self.epsilon is None else {"kind": "constant", "epsilon": self.epsilon}
        words = {
            "parton": self.parton,
            "start_virtuality_GeV": self.start_gev,
            "virtuality_cutoff_GeV": self.cutoff_gev,
            "coupling": self.coupling.description,
            "z_range": z_range,
        }
        if self.parton == "gluon":
            words |= {"flavours": self.flavours, "flavour_opening": self.opening}
        if self.medium is not None:
            words["medium"] = self.medium.description
        return words

    # The evolution variable y and the range of u.

    def t_of(self, y):
        return np.exp(y) if self.epsilon is not None else self.t0 * np.cosh(0.5 * y) ** 2

    def y_of(self, t):
        if self.epsilon is not None:
            return np.log(t)
        return 2.0 * np.arccosh(np.sqrt(np.maximum(t / self.t0, 1.0)))

    def dlnt_dy(self, y):
        return np.ones_like(y) if self.epsilon is not None else np.tanh(0.5 * y)

    def widest_u(self, y):
        if self.epsilon is None:
            return y
        return np.full_like(y, np.log((1.0 - self.epsilon) / self.epsilon))

    def lowest_y(self, u):
        """Where the evolution may begin to give this u."""
        return np.abs(u) if self.epsilon is None else np.full_like(u, np.log(self.t0))

    @property
    def y_range(self):
        return float(self.y_of(self.t0)), float(self.y_of(self.t_max))

    def channels(self):
        return ("q-qg",) if self.parton == "quark" else ("g-gg", "g-qq")

    def density(self, channel, t, u):
        """Density per d ln t du of one channel, without the cut of the z range."""
        return self.vacuum_density(channel, t, u) * (1.0 + self.induced_ratio(channel, t, u))

    def part_density(self, channel, t, u, part):
        """The density of all, of what the vacuum channel keeps, or of what is induced."""
        ratio = self.induced_ratio(channel, t, u)
        share = {"all": 1.0 + ratio, "vacuum": 1.0 + np.minimum(ratio, 0.0), "induced": np.maximum(ratio, 0.0)}[part]
        return self.vacuum_density(channel, t, u) * share

    def vacuum_density(self, channel, t, u):
        z, rest = 1.0 / (1.0 + np.exp(-u)), 1.0 / (1.0 + np.exp(u))
        if channel == "q-qg":
            kernel = qcd.quark_to_quark_gluon(z, rest)
        elif channel == "g-gg":
            kernel = qcd.gluon_to_gluons(z, rest)
        else:
            kernel = qcd.gluon_to_one_flavour(z, rest) * qcd.open_flavours(t, self.flavours, self.opening)
        return self.coupling(z * rest, t) / (2.0 * np.pi) * kernel * z * rest

    def induced_ratio(self, channel, t, u):
        """D/f of this channel; zero in vacuum and for g -> q qbar."""
        if self.medium is None or channel == "g-qq":
            return np.zeros(np.broadcast(t, u).shape)
        return self.medium.ratio(t, u)

    # Where panels must end.

    def kinks_in_u(self, t):
        """Non-negative u [n, k] at which the density has a kink at fixed t."""
        kinks = []
        if getattr(self.coupling, "argument", "") == "transverse-momentum":
            for scale in self.coupling.kinks_gev:
                kinks.append(2.0 * np.arctanh(np.sqrt(np.clip(1.0 - 4.0 * scale**2 / t, 0.0, 1.0 - 1e-15))))
        if self.medium is not None:
            kinks += self.medium.kinks_in_u(t)
        return np.array(kinks).reshape(len(kinks), t.size).T

    def kinks_in_t(self):
        """Values of t at which the z-integrated density has a kink."""
        argument = getattr(self.coupling, "argument", "")
        kinks = [(4.0 if argument == "transverse-momentum" else 1.0) * scale**2 for scale in self.coupling.kinks_gev]
        if self.epsilon is not None and argument == "transverse-momentum":
            kinks += [scale**2 / (self.epsilon * (1.0 - self.epsilon)) for scale in self.coupling.kinks_gev]
        if self.parton == "gluon" and self.opening == "pair-threshold":
            kinks += [4.0 * qcd.CHARM_GEV**2, 4.0 * qcd.BOTTOM_GEV**2]
        if self.medium is not None:
            kinks += self.medium.kinks_in_t(self)
        return [t for t in kinks if self.t0 < t < self.t_max]

    def kinks_in_t_at(self, u):
        """Values of t [n, k] at which the density at fixed u has a kink."""
        four_cosh2 = 4.0 * np.cosh(0.5 * u) ** 2
        kinks = [np.full_like(u, t) for t in self.kinks_in_t()]
        if getattr(self.coupling, "argument", "") == "transverse-momentum":
            kinks += [scale**2 * four_cosh2 for scale in self.coupling.kinks_gev]
        if self.medium is not None:
            kinks += self.medium.kinks_in_t_at(u)
        return np.array(kinks).reshape(len(kinks), u.size).T

    def kinks_in_first_z(self, widest):
        """Values of u at which the distribution of the first z has a kink."""
        if self.medium is None:
            return np.zeros(0)
        # Where the regime's edge meets t_max, and where it meets the edge of the z range.
        meets = np.array([self.t_max, *self.medium.kinks_in_t(self)])
        kinks = np.unique(np.array(self.medium.kinks_in_u(meets)).ravel())
        kinks = kinks[kinks < widest]
        return np.concatenate([-kinks, kinks])

    def panel_edges(self, panels):
        low, high = self.y_range
        # Above a kink the z-integrated density grows like a root: panels shrink towards it.
        kinks = self.y_of(np.array(self.kinks_in_t()))
        near = kinks[:, None] + (high - low) / panels * 0.25 ** np.arange(6)
        edges = [np.linspace(low, high, panels + 1), kinks, near.ravel()]
        if self.medium is not None:
            edges.append(self.y_of(self.medium.phase_panels(self.t0, self.t_max)))
        return np.unique(np.clip(np.concatenate(edges), low, high))

    # Integrals.

    def rate(self, t, rule, weight=None):
        """Density integrated over u at each t, one column a channel."""
        y = self.y_of(t)
        limit = self.widest_u(y)[:, None]
        inner = np.sort(np.minimum(np.hstack([np.zeros_like(limit), self.kinks_in_u(t), limit]), limit), axis=1)
        edges = np.hstack([-inner[:, ::-1], inner[:, 1:]])
        use = self.density if weight is None else weight
        columns = [integrate_rows(lambda u, c=c: use(c, t[:, None, None], u), edges, rule) for c in self.channels()]
        return np.array(columns).T

    def evolve(self, panels=PANELS, order=ORDER, rule=None):
        """Exponent of the survival at every panel end and node; fills self.grid."""
        rule = rule or gauss(INNER_ORDER)
        edges = self.panel_edges(panels)
        nodes, weights = gauss(order)
        half = 0.5 * np.diff(edges)
        y = edges[:-1, None] + half[:, None] * (1.0 + nodes)
        t = self.t_of(y).ravel()
        per_y = np.concatenate([self.rate(part, rule).sum(axis=1) for part in np.array_split(t, max(1, t.size // 512))])
        per_y = per_y.reshape(y.shape) * self.dlnt_dy(y)
        whole = half * (per_y @ weights)
        below = np.concatenate([[0.0], np.cumsum(whole)])
        inside = below[:-1, None] + half[:, None] * (per_y @ antiderivative_matrix(order).T)
        self.exponent = float(below[-1])
        # Survival from t_max down to y: total less what lies below y.
        self.node_y, self.node_slope = y.ravel(), per_y.ravel()
        self.node_exponent = self.exponent - inside.ravel()
        self.edge_y, self.edge_exponent = edges, self.exponent - below
        edge_slope = self.rate(self.t_of(edges), rule).sum(axis=1) * self.dlnt_dy(edges)
        # Slopes may jump at panel ends, so each panel gets a spline of its own through its ends and nodes.
        self.survival_spline = self._spline(edges, edge_slope)
        return self

    def _spline(self, edges, edge_slope):
        y = np.concatenate([edges, self.node_y])
        value = np.concatenate([self.edge_exponent, self.node_exponent])
        slope = -np.concatenate([edge_slope, self.node_slope])
        order = np.argsort(y, kind="stable")
        return CubicHermiteSpline(y[order], value[order], slope[order])

    def no_branching(self):
        """Probability (weighted, where the density changes sign) to reach the cutoff unbranched."""
        return float(np.exp(-self.exponent))

    def first_t(self, points=T_POINTS):
        """ln t and P(first branching below t), unconditional: it ends at 1 - Delta."""
        y = np.linspace(*self.y_range, points + 1)
        survival = np.exp(-self.survival_spline(y))
        return self._thinned(np.log(self.t_of(y)), survival - survival[0])

    def first_z(self, channel, part="all", panels=Z_PANELS):
        """u and P(first branching in this channel and below u), unconditional."""
        widest = float(self.widest_u(np.array([self.y_range[1]]))[0])
        ends = np.linspace(-widest, widest, panels + 1)
        grid = np.unique(np.concatenate([ends, self.kinks_in_first_z(widest)]))
        nodes, weights = gauss(Z_ORDER)
        half = 0.5 * np.diff(grid)
        u = (grid[:-1, None] + half[:, None] * (1.0 + nodes)).ravel()
        chunks = [self._density_in_u(channel, piece, part) for piece in np.array_split(u, max(1, u.size // CHUNK_ROWS))]
        per_panel = half * (np.concatenate(chunks).reshape(-1, nodes.size) @ weights)
        return self._thinned(grid, np.concatenate([[0.0], np.cumsum(per_panel)]))

    def _thinned(self, x, cumulative):
        """The points to store; keeps the largest error of linear interpolation between them."""
        few_x, few = thinned(x, cumulative)
        error = float(np.max(np.abs(np.interp(x, few_x, few) - cumulative)))
        self.interpolation_error = max(getattr(self, "interpolation_error", 0.0), error)
        return few_x, few

    def _density_in_u(self, channel, u, part):
        high = self.y_range[1]
        start = self.lowest_y(u)[:, None]
        panels = self.panel_edges(24)
        common = np.broadcast_to(panels, (u.size, panels.size))
        edges = np.hstack([start, common, self.y_of(self.kinks_in_t_at(u)), np.full_like(start, high)])
        edges = np.sort(np.clip(edges, start, high), axis=1)
        column = u[:, None, None]

        def integrand(y):
            t = self.t_of(y)
            return self.part_density(channel, t, column, part) * np.exp(-self.survival_spline(y)) * self.dlnt_dy(y)

        return integrate_rows(integrand, edges, gauss(12))
