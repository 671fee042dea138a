use spindrift::event::*;
use spindrift::medium::field::*;
use spindrift::medium::*;
use spindrift::qcd::*;
use spindrift::run::EventGenerator;
use spindrift::run::generator::Generator;
use spindrift::shower::*;
use spindrift::source::*;
fn shower_settings() -> ShowerSettings {
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
fn run(
    src: SourceSettings,
    c: CouplingSettings,
    s: ShowerSettings,
    m: Option<MediumSettings>,
    n: i64,
    label: &str,
) {
    let source = build(&src);
    let med = m.map(|m| {
        let f: Box<dyn TemperatureField> = match m.field.kind {
            FieldKind::Brick {
                temperature_gev,
                length_fm,
            } => Box::new(Brick::new(temperature_gev, length_fm)),
            FieldKind::Longitudinal {
                temperature_gev,
                start_fm,
            } => Box::new(Longitudinal::new(temperature_gev, start_fm)),
            _ => panic!(),
        };
        Medium::new(&m, f)
    });
    let shower = Shower::new(&s, &c, med, source.largest_virtuality_gev()).unwrap();
    let g = Generator {
        seed: 1,
        source,
        shower,
        origin: None,
        full_history: false,
    };
    let mut w = g.worker();
    let mut b = EventBlock::default();
    let t0 = std::time::Instant::now();
    let mut parts = 0u64;
    let mut nobranch = 0u64;
    let mut ww = 0.0;
    for id in 0..n {
        b.clear();
        g.generate(&mut w, id, &mut b);
        parts += b.partons.len() as u64 - 1;
        if b.partons.len() == 2 {
            nobranch += 1;
        }
        ww += b.events[0].weight;
    }
    let ns = t0.elapsed().as_nanos() as f64 / n as f64;
    let c = &w.tally.counters;
    println!(
        "{label}: {ns:.0} ns/event  partons {:.4}  nobranch {:.6}  <w> {:.4} branchings/event {:.3} ns/branching {:.0} channels {:?} legs {:.2} in medium {:.2} below {:.2}",
        parts as f64 / n as f64,
        nobranch as f64 / n as f64,
        ww / n as f64,
        c.branchings as f64 / n as f64,
        ns / (c.branchings as f64 / n as f64),
        c.channels
            .iter()
            .map(|c| (
                c.trials as f64 / n as f64,
                c.accepted as f64 / n as f64,
                c.cut_by_angle_limit() as f64 / n as f64,
                c.overshoots
            ))
            .collect::<Vec<_>>(),
        0.0,
        c.legs_in_medium as f64 / n as f64,
        c.legs_below_min_energy as f64 / n as f64
    );
}
fn main_case() -> (SourceSettings, CouplingSettings) {
    (
        SourceSettings::Single(SingleSettings {
            parton: Species::quark(2),
            energy_gev: 100.0,
            start_virtuality_gev: 100.0,
            direction: Direction::Transverse,
        }),
        CouplingSettings {
            law: CouplingLaw::Running {
                loops: Loops::One,
                alpha_s_mz: 0.118,
                freeze_gev: 1.0,
            },
            argument: ScaleArgument::TransverseMomentum,
            quark_masses_gev: [1.5, 4.75],
        },
    )
}
#[test]
fn speed() {
    let (src, c) = main_case();
    for _ in 0..3 {
        run(src.clone(), c, shower_settings(), None, 300000, "vacuum");
    }
    if std::env::var("ONLY").is_ok() {
        return;
    }
    let fixed = CouplingSettings {
        law: CouplingLaw::Fixed { alpha_s: 0.15 },
        ..c
    };
    let mut s = shower_settings();
    s.flavour_opening = FlavourOpening::Always;
    run(
        src.clone(),
        fixed,
        s.clone(),
        None,
        300000,
        "fixed always (nb .0469308, n 6.031)",
    );
    run(
        src.clone(),
        c,
        s.clone(),
        None,
        300000,
        "kT always (nb .00425868, n 10.378)",
    );
    let g = SourceSettings::Single(SingleSettings {
        parton: Species::GLUON,
        energy_gev: 100.0,
        start_virtuality_gev: 100.0,
        direction: Direction::Transverse,
    });
    run(
        g.clone(),
        fixed,
        s.clone(),
        None,
        300000,
        "gluon fixed (nb 8.96e-4 n 10.39)",
    );
    run(
        g,
        c,
        s.clone(),
        None,
        300000,
        "gluon kT (nb 3.75e-6, n 17.299)",
    );
    let s10 = SourceSettings::Single(SingleSettings {
        parton: Species::quark(2),
        energy_gev: 100.0,
        start_virtuality_gev: 10.0,
        direction: Direction::Transverse,
    });
    let med = |l: f64, lim: bool, phase| MediumSettings {
        field: FieldSettings {
            kind: FieldKind::Brick {
                temperature_gev: 0.3,
                length_fm: l,
            },
            end_temperature_gev: 0.15,
        },
        origin: OriginSettings::Fixed {
            x_fm: 0.0,
            y_fm: 0.0,
        },
        transport: TransportSettings {
            kind: TransportKind::Constant {
                qhat_gev2_per_fm: 1.0,
            },
            stated_for: ColourCharge::Gluon,
            flow: true,
        },
        effects: vec![EffectSettings::CollinearExpansion { phase }],
        limit_to_small_angles: lim,
        min_energy_gev: 2.0,
    };
    run(
        s10.clone(),
        fixed,
        s.clone(),
        Some(med(2.0, false, PhaseSettings::Interference)),
        100000,
        "brick L=2 nb .125812",
    );
    run(
        s10.clone(),
        fixed,
        s.clone(),
        Some(med(5.0, false, PhaseSettings::Interference)),
        100000,
        "brick L=5 nb .00193208",
    );
    run(
        src.clone(),
        c,
        shower_settings(),
        Some(med(5.0, true, PhaseSettings::Interference)),
        100000,
        "brick L=5 Q100",
    );
    run(
        src.clone(),
        c,
        shower_settings(),
        Some(med(5.0, true, PhaseSettings::SoftGradient)),
        100000,
        "brick L=5 Q100 soft",
    );
    run(
        src.clone(),
        c,
        shower_settings(),
        Some(med(5.0, true, PhaseSettings::Rescattering { window: 1.0 })),
        100000,
        "brick L=5 Q100 resc",
    );
    let mut l = med(5.0, true, PhaseSettings::Interference);
    l.field.kind = FieldKind::Longitudinal {
        temperature_gev: 0.45,
        start_fm: 0.6,
    };
    l.transport.kind = TransportKind::Cubic { coefficient: 4.0 };
    run(src, c, shower_settings(), Some(l), 100000, "long Q100");
}
