//! From a few choices to a generator, and samples of first branchings and of whole events.

use std::sync::Arc;

use std::ops::Range;

use spindrift::event::{EventBlock, EventSummary, Parton};
use spindrift::medium::effects::EffectSettings;
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::field::{Brick, Longitudinal, Radial, TemperatureField};
use spindrift::medium::origin::{Fixed, Origin};
use spindrift::medium::{
    ColourCharge, FieldKind, FieldSettings, Medium, MediumSettings, OriginSettings, TransportKind,
    TransportSettings,
};
use spindrift::qcd::{Coupling, CouplingLaw, CouplingSettings, Loops, ScaleArgument, Species};
use spindrift::random::{Key, Purpose};
use spindrift::run::EventGenerator;
use spindrift::run::generator::Generator;
use spindrift::shower::evolution::Evolution;
use spindrift::shower::leg::Branching;
use spindrift::shower::proposal::FractionRange;
use spindrift::shower::proposal::staircase::{FlavourRule, Staircase, VacuumRate};
use spindrift::shower::{
    FlavourOpening, Kernels, Lifetime, Ordering, Shower, ShowerSettings, ZRange,
};
use spindrift::source::{Direction, PairSettings, SingleSettings, SourceSettings, build};

/// Everything that makes a sample.
#[derive(Clone)]
pub struct Setup {
    pub seed: u64,
    pub source: SourceSettings,
    pub coupling: CouplingSettings,
    pub shower: ShowerSettings,
    pub medium: Option<MediumSettings>,
    pub full_history: bool,
}

pub const ALPHA_S: f64 = 0.15;
pub const ALPHA_S_MZ: f64 = 0.118;

pub fn up() -> Species {
    Species::quark(2)
}

pub fn shower_settings() -> ShowerSettings {
    ShowerSettings {
        virtuality_cutoff_gev: 1.0,
        ordering: Ordering::Virtuality,
        z_range: ZRange::Kinematic,
        lifetime: Lifetime::Exponential,
        kernels: Kernels {
            q_qg: true,
            g_gg: true,
            g_qq: true,
        },
        flavours: 5,
        flavour_opening: FlavourOpening::PairThreshold,
        envelope_factor: 1.0,
    }
}

pub fn fixed(alpha_s: f64) -> CouplingSettings {
    CouplingSettings {
        law: CouplingLaw::Fixed { alpha_s },
        argument: ScaleArgument::TransverseMomentum,
        quark_masses_gev: [1.5, 4.75],
    }
}

pub fn running(argument: ScaleArgument, loops: Loops) -> CouplingSettings {
    CouplingSettings {
        law: CouplingLaw::Running {
            loops,
            alpha_s_mz: ALPHA_S_MZ,
            freeze_gev: 1.0,
        },
        argument,
        quark_masses_gev: [1.5, 4.75],
    }
}

/// A brick with a constant qhat of the gluon and one phase factor.
pub fn brick(length_fm: f64, qhat_gev2_per_fm: f64, phase: PhaseSettings) -> MediumSettings {
    brick_with(length_fm, qhat_gev2_per_fm, vec![phase.into()])
}

/// A brick with a constant qhat of the gluon and any effects.
pub fn brick_with(
    length_fm: f64,
    qhat_gev2_per_fm: f64,
    effects: Vec<EffectSettings>,
) -> MediumSettings {
    MediumSettings {
        field: FieldSettings::new(
            FieldKind::Brick {
                temperature_gev: 0.3,
                length_fm,
            },
            0.15,
        ),
        origin: OriginSettings::Fixed {
            x_fm: 0.0,
            y_fm: 0.0,
        },
        transport: TransportSettings {
            kind: TransportKind::Constant { qhat_gev2_per_fm },
            stated_for: ColourCharge::Gluon,
            flow: true,
        },
        effects,
        limit_to_small_angles: true,
        min_energy_gev: 2.0,
    }
}

impl Setup {
    /// One parton of energy `energy_gev` along a random azimuth; running coupling at k_T, cutoff 1 GeV, vacuum.
    pub fn single(parton: Species, energy_gev: f64, start_virtuality_gev: f64) -> Setup {
        Setup {
            seed: 1,
            source: SourceSettings::Single(SingleSettings {
                parton,
                energy_gev,
                start_virtuality_gev,
                direction: Direction::Transverse,
            }),
            coupling: running(ScaleArgument::TransverseMomentum, Loops::One),
            shower: shower_settings(),
            medium: None,
            full_history: true,
        }
    }

    /// Two partons back to back.
    pub fn pair(partons: [Species; 2], sqrt_s_gev: f64, start_virtuality_gev: f64) -> Setup {
        Setup {
            source: SourceSettings::Pair(PairSettings {
                partons,
                sqrt_s_gev,
                start_virtuality_gev,
                direction: Direction::Transverse,
            }),
            ..Setup::single(partons[0], sqrt_s_gev, start_virtuality_gev)
        }
    }

    pub fn with_medium(mut self, medium: MediumSettings) -> Setup {
        self.medium = Some(medium);
        self
    }

    pub fn with_coupling(mut self, coupling: CouplingSettings) -> Setup {
        self.coupling = coupling;
        self
    }

    pub fn with_seed(mut self, seed: u64) -> Setup {
        self.seed = seed;
        self
    }

    pub fn generator(&self) -> Generator {
        let source = build(&self.source);
        let medium = self.medium();
        let largest = source.largest_virtuality_gev();
        let shower = Shower::new(&self.shower, &self.coupling, medium, largest)
            .expect("the coupling of a test stays below 1");
        Generator {
            seed: self.seed,
            source,
            shower,
            origin: self.medium.as_ref().map(|medium| birth(&medium.origin)),
            fields: None,
            full_history: self.full_history,
            exits: None,
        }
    }

    /// What the legs of this set-up share, for tests that drive them by hand.
    pub fn evolution(&self) -> Evolution {
        let coupling = &self.coupling;
        let rate = VacuumRate::new(
            Coupling::new(coupling).expect("the coupling of a test stays below 1"),
            FractionRange {
                end_t_gev2: self.shower.virtuality_cutoff_gev.powi(2),
                kind: self.shower.z_range,
            },
            FlavourRule::new(&self.shower, coupling.quark_masses_gev),
        );
        let largest_t = build(&self.source).largest_virtuality_gev().powi(2);
        let stairs =
            [false, true].map(|gluon| Staircase::new(&rate, &self.shower, gluon, largest_t));
        let medium = self.medium();
        let purposes = |medium: &Medium| {
            let rates = medium.rates().iter();
            rates
                .map(|rate| Purpose::named(rate.effect.name()))
                .collect()
        };
        Evolution {
            rate,
            stairs,
            emits: [self.shower.kernels.q_qg, self.shower.kernels.g_gg],
            makes_pairs: self.shower.kernels.g_qq,
            effect_purposes: medium.as_ref().map_or(Vec::new(), purposes),
            path_purposes: Vec::new(),
            medium,
            envelope_factor: self.shower.envelope_factor,
        }
    }

    fn medium(&self) -> Option<Medium> {
        let settings = self.medium.as_ref()?;
        Some(Medium::new(settings, analytic_field(&settings.field.kind)))
    }

    /// Calls `visit` with the first branching of the first hard parton and the weight, for `events` events.
    pub fn first_branchings(&self, events: u64, mut visit: impl FnMut(Option<Branching>, f64)) {
        let generator = self.generator();
        let mut walker = generator.worker().walker;
        for id in 0..events {
            let key = Key::event(self.seed, id);
            let hard = generator.source.draw(&mut key.stream(Purpose::SOURCE));
            let shower = &generator.shower;
            let (branchings, weight) = shower.first_branchings(&mut walker, &hard, key, [0.0; 4]);
            visit(branchings[0], weight);
        }
    }

    /// Calls `visit` with each event and its rows.
    pub fn events(&self, ids: Range<i64>, mut visit: impl FnMut(&EventSummary, &[Parton])) {
        let generator = self.generator();
        let mut worker = generator.worker();
        let mut block = EventBlock::default();
        for id in ids {
            block.clear();
            generator.generate(&mut worker, id, &mut block).unwrap();
            visit(&block.events[0], &block.partons);
        }
    }
}

fn analytic_field(kind: &FieldKind) -> Arc<dyn TemperatureField> {
    match *kind {
        FieldKind::Brick {
            temperature_gev,
            length_fm,
        } => Arc::new(Brick::new(temperature_gev, length_fm)),
        FieldKind::Longitudinal {
            temperature_gev,
            start_fm,
        } => Arc::new(Longitudinal::new(temperature_gev, start_fm)),
        FieldKind::Radial {
            amplitude,
            q_per_fm,
            start_fm,
        } => Arc::new(Radial::new(amplitude, q_per_fm, start_fm)),
        FieldKind::Grid { .. } => panic!("tests build grids from numbers, not from files"),
    }
}

fn birth(settings: &OriginSettings) -> Arc<dyn Origin> {
    match settings {
        OriginSettings::Fixed { x_fm, y_fm } => Arc::new(Fixed {
            x_fm: *x_fm,
            y_fm: *y_fm,
        }),
        other => panic!("{other:?}: these set-ups know fixed origins alone"),
    }
}
