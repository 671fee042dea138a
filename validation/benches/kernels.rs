//! Cost of the inner loop's parts, one call each: `cargo bench --bench kernels`.

use std::sync::Arc;

use divan::{Bencher, black_box};

use spindrift::medium::effects::collinear_expansion::CollinearExpansion;
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::field::{Brick, Grid, Longitudinal, Radial, Ray, TemperatureField};
use spindrift::medium::origin::{Nucleus, Origin, Overlap};
use spindrift::medium::trace::Trace;
use spindrift::medium::transport::{Transport, TransportTable};
use spindrift::medium::{
    ColourCharge, FieldKind, FieldSettings, Medium, MediumSettings, OriginSettings, TransportKind,
    TransportSettings,
};
use spindrift::numerics::elementary::{exp, ln};
use spindrift::qcd::{Coupling, CouplingLaw, CouplingSettings, Loops, ScaleArgument};
use spindrift::random::{Key, Purpose};
use spindrift::shower::accept::judge;
use spindrift::shower::proposal::FractionRange;
use spindrift::shower::proposal::staircase::{FlavourRule, Staircase, VacuumRate};
use spindrift::shower::{FlavourOpening, Kernels, Lifetime, Ordering, ShowerSettings, ZRange};

fn main() {
    divan::main();
}

const SETTINGS: ShowerSettings = ShowerSettings {
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
};
const QUARK_MASSES_GEV: [f64; 2] = [1.5, 4.75];

fn coupling(loops: Loops) -> Coupling {
    let law = CouplingLaw::Running {
        loops,
        alpha_s_mz: 0.118,
        freeze_gev: 1.0,
    };
    let argument = ScaleArgument::TransverseMomentum;
    Coupling::new(&CouplingSettings {
        law,
        argument,
        quark_masses_gev: QUARK_MASSES_GEV,
    })
    .expect("the default coupling is valid")
}

#[divan::bench]
fn elementary_ln(bencher: Bencher) {
    bencher.bench(|| ln(black_box(0.37)));
}

#[divan::bench]
fn elementary_exp(bencher: Bencher) {
    bencher.bench(|| exp(black_box(-3.7)));
}

#[divan::bench(args = ["one loop", "two loops"])]
fn alpha_s(bencher: Bencher, loops: &str) {
    let coupling = coupling(if loops == "one loop" {
        Loops::One
    } else {
        Loops::Two
    });
    bencher.bench(|| coupling.alpha_s(black_box(7.0)));
}

#[divan::bench]
fn keyed_stream(bencher: Bencher) {
    let key = Key::event(1, 2);
    bencher.bench(|| black_box(key).daughter(1).stream(Purpose::VACUUM));
}

/// A vacuum trial: proposal, density and verdict.
#[divan::bench(args = ["quark", "gluon"])]
fn vacuum_trial(bencher: Bencher, species: &str) {
    let range = FractionRange {
        end_t_gev2: 1.0,
        kind: ZRange::Kinematic,
    };
    let flavours = FlavourRule::new(&SETTINGS, QUARK_MASSES_GEV);
    let rate = VacuumRate::new(coupling(Loops::One), range, flavours);
    let stairs = Staircase::new(&rate, &SETTINGS, species == "gluon", 1e4);
    let mut stream = Key::event(1, 2).stream(Purpose::VACUUM);
    let start = stairs.height(1e4).expect("above the cutoff");
    let (mut height, mut trials, mut weight) = (start, 0, 1.0);
    bencher.bench_local(
        || match stairs.propose(&mut height, &mut stream, &mut trials) {
            Some(trial) => {
                judge(
                    rate.density(&trial) * trial.inverse_envelope,
                    trial.uniform,
                    &mut weight,
                )
                .accepted
            }
            None => {
                height = start;
                false
            }
        },
    );
}

/// Rays from near the centre, as the first partons of a jet fly.
fn rays() -> Vec<Ray> {
    let ray = |place: i32| {
        let (azimuth, radius) = (0.7 * f64::from(place), 0.1 * f64::from(place % 20));
        let (sin, cos) = azimuth.sin_cos();
        Ray {
            birth_fm: [radius, radius * sin, radius * cos, 0.0],
            direction: [cos, sin, 0.0],
        }
    };
    (0..1000).map(ray).collect()
}

fn field(name: &str) -> Arc<dyn TemperatureField> {
    match name {
        "brick" => Arc::new(Brick::new(0.3, 5.0)),
        "longitudinal" => Arc::new(Longitudinal::new(0.45, 0.6)),
        "radial" => Arc::new(Radial::new(3.0, 1.0 / 4.3, 0.6)),
        _ => {
            let path = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-data/lumpy-fireball.h5");
            let data = spindrift::files::field_file::read_field(path.as_ref());
            Arc::new(Grid::new(data.expect("the demo field is sound"), 0.15))
        }
    }
}

fn medium(field: &str) -> Medium {
    let settings = MediumSettings {
        field: FieldSettings::new(
            FieldKind::Brick {
                temperature_gev: 0.3,
                length_fm: 5.0,
            },
            0.15,
        ),
        origin: OriginSettings::Fixed {
            x_fm: 0.0,
            y_fm: 0.0,
        },
        transport: TransportSettings {
            kind: TransportKind::Cubic { coefficient: 4.0 },
            stated_for: ColourCharge::Gluon,
            flow: true,
        },
        effects: Vec::new(),
        limit_to_small_angles: true,
        min_energy_gev: 2.0,
    };
    Medium::new(&settings, self::field(field))
}

/// A path traced through a field.
#[divan::bench(args = ["brick", "longitudinal", "radial", "grid"], sample_size = 5000)]
fn trace(bencher: Bencher, field: &str) {
    let (medium, rays) = (medium(field), rays());
    let mut trace = Trace::default();
    let mut next = rays.iter().cycle();
    bencher.bench_local(|| {
        let ray = next.next().expect("a cycle does not end");
        medium.trace(medium.field(), ray, 100.0, &mut trace);
        trace.path.qhat_integral_gev2()
    });
}

/// A birth place in a peripheral overlap of two heavy nuclei.
#[divan::bench]
fn overlap_draw(bencher: Bencher) {
    let nucleus = Nucleus::named("Pb208").expect("the table holds it");
    let overlap = Overlap::new(&nucleus, 8.0).expect("these nuclei meet");
    let mut stream = Key::event(1, 1).stream(Purpose::ORIGIN);
    bencher.bench_local(|| overlap.draw(&mut stream));
}

/// The transport coefficient at a temperature and an energy.
#[divan::bench(args = ["cubic", "thermal", "table"])]
fn transport(bencher: Bencher, kind: &str) {
    let kind = match kind {
        "cubic" => TransportKind::Cubic { coefficient: 4.0 },
        "thermal" => TransportKind::Thermal {
            alpha_s: 0.3,
            flavours: 3,
        },
        _ => {
            let axis = |first: f64, step: f64| (0..30).map(move |k| first + step * f64::from(k));
            let values = axis(0.1, 0.02).flat_map(|t| axis(1.0, 10.0).map(move |e| t * t * t * e));
            let table = TransportTable::new(
                axis(0.1, 0.02).collect(),
                axis(1.0, 10.0).collect(),
                values.collect(),
            );
            TransportKind::Table(table.expect("the axes rise"))
        }
    };
    let transport = Transport::new(&TransportSettings {
        kind,
        stated_for: ColourCharge::Gluon,
        flow: true,
    });
    bencher.bench_local(|| transport.gluon_qhat_gev2_per_fm(black_box(0.31), black_box(40.0)));
}

/// The field at one point of a path.
#[divan::bench(args = ["brick", "longitudinal", "radial", "grid"], sample_size = 5000)]
fn field_at_a_point(bencher: Bencher, name: &str) {
    let (field, rays) = (field(name), rays());
    let mut next = rays.iter().cycle();
    let mut l_fm = 0.0;
    bencher.bench_local(|| {
        l_fm = if l_fm > 5.0 { 0.6 } else { l_fm + 0.37 };
        field.local(next.next().expect("a cycle does not end"), l_fm)
    });
}

/// The stretch of a path inside the medium.
#[divan::bench(args = ["brick", "longitudinal", "radial", "grid"], sample_size = 5000)]
fn field_stretch(bencher: Bencher, name: &str) {
    let (field, rays) = (field(name), rays());
    let mut next = rays.iter().cycle();
    bencher.bench_local(|| field.stretch(next.next().expect("a cycle does not end"), 0.15));
}

/// Bounds over the segments of a path.
#[divan::bench(args = ["brick", "longitudinal", "radial", "grid"], sample_size = 5000)]
fn field_ceilings(bencher: Bencher, name: &str) {
    let (field, rays) = (field(name), rays());
    let stretched: Vec<_> = rays
        .iter()
        .filter_map(|ray| Some((ray, field.stretch(ray, 0.15)?)))
        .collect();
    let mut next = stretched.iter().cycle();
    let mut ceilings = Vec::new();
    bencher.bench_local(|| {
        let (ray, stretch) = next.next().expect("a cycle does not end");
        field.ceilings(ray, stretch, &mut ceilings)
    });
}

/// The phase integral of a trial on a path through the grid.
#[divan::bench]
fn phase_integral(bencher: Bencher) {
    let mut trace = Trace::default();
    let grid = medium("grid");
    grid.trace(grid.field(), &rays()[3], 100.0, &mut trace);
    let effect = CollinearExpansion::new("bench".into(), PhaseSettings::Interference, false);
    bencher.bench_local(|| effect.strength_gev2(&trace.path, black_box(0.9)));
}
