"""A full branching history obeys the kinematics of the shower: read back from the file, vertex by vertex."""

import h5py
import numpy as np

FINAL, BRANCHED, HARD, GIVEN, TAKEN = 1, 2, 3, 4, 5
GLUON = 21
MOMENTUM_TOLERANCE = 1e-9
# t and the fractions are stored in single precision.
SINGLE_TOLERANCE = 4e-6
# A branching needs room for the smallest transverse momentum; single precision blurs the edge.
EDGE = 1e-4


class History:
    """All rows with parents as rows of the whole table."""

    def __init__(self, path):
        with h5py.File(path) as file:
            columns = {name: dataset[()] for name, dataset in file["partons"].items()}
            start = np.repeat(file["events/partons_start"][()], file["events/partons_count"][()])
        self.row = columns
        self.event_start = start
        self.momentum = np.stack([columns[name] for name in ("energy", "px", "py", "pz")], axis=1)
        parent = columns["parent"].astype("i8")
        self.parent = np.where(parent >= 0, parent + start, -1)
        self.status = columns["status"]
        self.rows = np.arange(len(parent))
        self.is_exchange = np.isin(self.status, (GIVEN, TAKEN))
        self.gained = self.momentum_gained()

    def momentum_gained(self):
        """What each parton took from the medium less what it gave, [row, (E, px, py, pz)]: rows hold momenta after it."""
        gained = np.zeros_like(self.momentum)
        rows = self.rows[self.is_exchange]
        sign = np.where(self.status[rows] == TAKEN, 1.0, -1.0)
        np.add.at(gained, self.parent[rows], sign[:, None] * self.momentum[rows])
        return gained

    def virtuality_at_birth(self):
        """t of each parton as its branching was drawn: what the medium added on its way is taken out again."""
        t = self.row["virtuality_squared"].astype("f8")
        energy, *momentum = (self.momentum - self.gained).T
        changed = np.any(self.gained != 0.0, axis=1)
        return np.where(changed, energy**2 - sum(component**2 for component in momentum), t)

    def daughters(self):
        """Rows of branched partons and of their two daughters."""
        branched = self.rows[self.status == BRANCHED]
        child = self.rows[(self.parent >= 0) & ~self.is_exchange]
        child = child[self.status[self.parent[child]] == BRANCHED]
        order = np.argsort(self.parent[child], kind="stable")
        child = child[order]
        assert len(child) == 2 * len(branched), "a branched parton without exactly two daughters"
        pairs = child.reshape(-1, 2)
        assert np.array_equal(self.parent[pairs[:, 0]], branched) and np.array_equal(self.parent[pairs[:, 1]], branched)
        return branched, pairs[:, 0], pairs[:, 1]


def check_momentum_at_vertices(path):
    """Four-momentum is conserved at every vertex, relative to the parent's energy."""
    history = History(path)
    parent, first, second = history.daughters()
    at_birth = history.momentum - history.gained
    missing = history.momentum[parent] - at_birth[first] - at_birth[second]
    worst = np.max(np.abs(missing) / history.momentum[parent, :1])
    assert worst < MOMENTUM_TOLERANCE, f"four-momentum off by {worst:.1e} of the parent's energy"


def check_masses(path):
    """virtuality_squared is the invariant mass squared of the four-momentum."""
    history = History(path)
    inside = history.status != HARD
    energy, momentum = history.momentum[inside, 0], history.momentum[inside, 1:]
    size = np.linalg.norm(momentum, axis=1)
    mass2 = (energy - size) * (energy + size)
    stored = history.row["virtuality_squared"][inside].astype("f8")
    # E - |p| loses digits of a fast parton: a few rounding errors of E^2.
    allowed = SINGLE_TOLERANCE * np.abs(stored) + 64 * np.finfo("f8").eps * np.max(energy) ** 2
    assert np.all(np.abs(mass2 - stored) <= allowed), f"worst {np.max(np.abs(mass2 - stored) / allowed):.1f} times allowed"
    assert np.all(stored[history.status[inside] == FINAL] == 0.0), "a final parton is off shell"


def check_ordering(path, cutoff_gev):
    """Daughters lie below z t and (1-z) t, fractions add to 1, k_T^2 >= 0, z within the range of the parent's t."""
    history = History(path)
    parent, first, second = history.daughters()
    t = history.row["virtuality_squared"].astype("f8")
    t_drawn = history.virtuality_at_birth()
    # A difference of squares of momenta is known to a rounding of the energy's square.
    blur = 1e-12 * np.max(history.momentum[:, 0]) ** 2
    z1, z2 = (history.row["splitting_fraction"][rows].astype("f8") for rows in (first, second))
    assert np.all(np.abs(z1 + z2 - 1.0) < SINGLE_TOLERANCE), "fractions do not add to 1"
    for rows, z in ((first, z1), (second, z2)):
        assert np.all(t_drawn[rows] <= z * t[parent] * (1.0 + SINGLE_TOLERANCE) + blur), "a daughter starts too high"
    kt2 = z1 * z2 * t[parent] - z2 * t_drawn[first] - z1 * t_drawn[second]
    assert np.all(kt2 >= -SINGLE_TOLERANCE * t[parent] - blur), f"smallest k_T^2/t {np.min(kt2 / t[parent]):.1e}"
    assert np.all(z1 * z2 * t[parent] >= cutoff_gev**2 / 4.0 * (1.0 - EDGE)), "z beyond the kinematic range"
    jet = history.row["jet_fraction"].astype("f8")
    for rows, z in ((first, z1), (second, z2)):
        # Products in single precision: one more rounding a generation.
        assert np.all(np.abs(jet[rows] - z * jet[parent]) <= 1e-6 * jet[parent]), "jet_fraction is not the product"


def check_flavour_and_colour(path):
    """q -> q g, g -> g g or g -> q qbar; colour lines flow through every vertex."""
    history = History(path)
    parent, first, second = history.daughters()
    pdg, colour, anticolour = (history.row[name] for name in ("pdg", "colour", "anticolour"))
    gluon = pdg == GLUON
    from_quark = ~gluon[parent]
    quark_keeps = (pdg[first] == pdg[parent]) & gluon[second]
    gluons = gluon[first] & gluon[second]
    pair = (pdg[first] == -pdg[second]) & ~gluon[first] & (np.abs(pdg[first]) <= 5)
    assert np.all(np.where(from_quark, quark_keeps, gluons | pair)), "a splitting that does not exist"
    for incoming, one, other in zip(parent, first, second):
        ends_in = [colour[incoming], -anticolour[incoming]]
        ends_out = [colour[one], -anticolour[one], colour[other], -anticolour[other]]
        # A line that starts and ends at the daughters cancels; what is left is the parent's.
        assert sorted(cancelled(ends_out)) == sorted(cancelled(ends_in)), f"colour at row {incoming}: {ends_in} -> {ends_out}"
    has = (np.where(colour > 0, 1, 0), np.where(anticolour > 0, 1, 0))
    assert np.all(has[0] == (gluon | (pdg > 0))) and np.all(has[1] == (gluon | (pdg < 0))), "colour does not fit the species"


def cancelled(ends):
    """Line ends without zeros and without pairs (+n, -n)."""
    left = [end for end in ends if end != 0]
    for end in list(left):
        if end > 0 and -end in left:
            left.remove(end)
            left.remove(-end)
    return left


def check_parents_first(path):
    """Parents stand before daughters; births come at the parent's later times."""
    history = History(path)
    has_parent = history.parent >= 0
    assert np.all(history.parent[has_parent] < history.rows[has_parent]), "a daughter stands before its parent"
    assert np.all(history.parent[has_parent] >= history.event_start[has_parent]), "a parent in another event"
    born = history.row["birth_t"]
    assert np.all(born[has_parent] >= born[history.parent[has_parent]]), "a daughter is born before its parent"
