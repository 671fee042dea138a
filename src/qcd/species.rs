//! Parton species, by the standard Monte Carlo particle numbers (Review of Particle Physics).

/// A gluon, a quark or an antiquark.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Species(i8);

const GLUON_CODE: i8 = 0;
const GLUON_PDG: i32 = 21;

/// The heaviest flavour that a jet may hold (no top quark).
pub const HEAVIEST_FLAVOUR: u8 = 5;

/// Config names in the order of [`Species::ALL`].
const NAMES: [&str; 11] = [
    "g", "d", "u", "s", "c", "b", "dbar", "ubar", "sbar", "cbar", "bbar",
];

impl Species {
    /// The gluon.
    pub const GLUON: Species = Species(GLUON_CODE);

    /// All species: gluon, quarks d u s c b, antiquarks in the same order.
    pub const ALL: [Species; 11] = [
        Species(0),
        Species(1),
        Species(2),
        Species(3),
        Species(4),
        Species(5),
        Species(-1),
        Species(-2),
        Species(-3),
        Species(-4),
        Species(-5),
    ];

    /// The quark of a flavour: 1 d, 2 u, 3 s, 4 c, 5 b.
    pub const fn quark(flavour: u8) -> Species {
        assert!(flavour >= 1 && flavour <= HEAVIEST_FLAVOUR);
        Species(flavour as i8)
    }

    /// The charge conjugate; the gluon is its own.
    pub const fn conjugate(self) -> Species {
        Species(-self.0)
    }

    /// True for the gluon.
    pub const fn is_gluon(self) -> bool {
        self.0 == GLUON_CODE
    }

    /// True for an antiquark.
    pub const fn is_antiquark(self) -> bool {
        self.0 < 0
    }

    /// Flavour number 1 to 5 of a quark or antiquark, 0 of a gluon.
    pub const fn flavour(self) -> u8 {
        self.0.unsigned_abs()
    }

    /// The standard Monte Carlo particle number.
    pub const fn pdg(self) -> i32 {
        if self.is_gluon() {
            GLUON_PDG
        } else {
            self.0 as i32
        }
    }

    /// The species of a particle number, `None` where it is no parton of a jet.
    pub fn from_pdg(pdg: i32) -> Option<Species> {
        Species::ALL
            .into_iter()
            .find(|species| species.pdg() == pdg)
    }

    /// The name that a config uses: `g d u s c b`, antiquarks with `bar`.
    pub fn name(self) -> &'static str {
        let place = Species::ALL.iter().position(|other| *other == self);
        NAMES[place.expect("ALL lists every species")]
    }

    /// The species of a config name.
    pub fn from_name(name: &str) -> Option<Species> {
        NAMES
            .iter()
            .position(|known| *known == name)
            .map(|place| Species::ALL[place])
    }

    /// All config names.
    pub fn names() -> &'static [&'static str] {
        &NAMES
    }

    /// Casimir colour factor.
    pub const fn casimir(self) -> f64 {
        if self.is_gluon() {
            super::C_A
        } else {
            super::C_F
        }
    }
}
