//! The audit finds each kind of offence, names the event, and passes sound files.

mod common;

use std::path::Path;
use std::sync::atomic::AtomicBool;

use common::{FakeCounters, FakeGenerator, decay, provenance};
use rand::SeedableRng;
use spindrift::config::History;
use spindrift::event::{
    CHANNEL_HARD_PROCESS, CheckRules, EventBlock, Imbalance, NO_PARENT, Parton, Status, check_event,
};
use spindrift::files::event_file::{
    AuditReport, EventFileWriter, Kinematics, Provenance, WriteOptions, audit,
};
use spindrift::run::{EventError, EventGenerator, Sink, run};

const EVENTS: i64 = 300;
const SPOILED: i64 = 217;

/// Spoils one event of another generator.
struct Spoiler<F> {
    inner: FakeGenerator,
    spoil: F,
}

impl<F: Fn(&mut EventBlock, usize) + Sync> EventGenerator for Spoiler<F> {
    type Worker = FakeCounters;
    type Counters = FakeCounters;

    fn worker(&self) -> FakeCounters {
        self.inner.worker()
    }

    fn generate(
        &self,
        worker: &mut FakeCounters,
        id: i64,
        out: &mut EventBlock,
    ) -> Result<(), EventError> {
        let first_row = out.partons.len();
        self.inner.generate(worker, id, out)?;
        if id == SPOILED {
            (self.spoil)(out, first_row);
        }
        Ok(())
    }

    fn counters(&self, worker: &FakeCounters) -> FakeCounters {
        *worker
    }
}

fn audit_of(
    path: &Path,
    provenance: &Provenance,
    spoil: impl Fn(&mut EventBlock, usize) + Sync,
) -> AuditReport {
    let generator = Spoiler {
        inner: FakeGenerator {
            history: provenance.history,
            exits: provenance.medium_exit,
            ..FakeGenerator::default()
        },
        spoil,
    };
    let writer = EventFileWriter::create(path, provenance, WriteOptions { overwrite: true });
    let never = AtomicBool::new(false);
    let sink = Sink::File(Box::new(writer.unwrap()));
    run(&generator, 0..EVENTS, 1, sink, &(), &never).unwrap();
    audit(path).unwrap()
}

#[test]
fn each_offence_is_found_in_its_event() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("spoiled.h5");
    type Offence = fn(&mut EventBlock, usize);
    // (what the finding says, history, the offence, done to the rows from the event's first one on)
    let offences: [(&str, History, Offence); 13] = [
        (
            "do not add up to the hard",
            History::Final,
            |block, first| {
                let row = &mut block.partons[first + 2].momentum_gev;
                // along its own direction, so that the mass shell stays
                *row = row.map(|component| component * (1.0 + 1e-7));
            },
        ),
        (
            "differs from the virtuality",
            History::Final,
            |block, first| {
                block.partons[first + 2].momentum_gev[3] *= 1.0 + 1e-7;
            },
        ),
        ("energy is negative", History::Final, |block, first| {
            block.partons[first + 2].momentum_gev[3] *= -1.0;
        }),
        ("not finite", History::Final, |block, first| {
            block.partons[first + 3].birth_fm[2] = f32::NAN;
        }),
        ("no two ends", History::Final, |block, first| {
            let row = block.partons[first + 2..]
                .iter_mut()
                .find(|row| row.colour != 0);
            row.unwrap().colour = 9999;
        }),
        ("do not fit a", History::Final, |block, first| {
            block.partons[first + 2].colour = 0;
            block.partons[first + 2].anticolour = 0;
        }),
        ("do not add up to 1", History::Final, |block, first| {
            block.partons[first + 2].jet_fraction *= 0.99;
        }),
        (
            "the parent is no hard parton",
            History::Final,
            |block, first| {
                block.partons[first + 3].parent = 2;
            },
        ),
        ("does not stand before", History::Final, |block, first| {
            block.partons[first + 2].parent = 2;
        }),
        ("no parton of a jet", History::Final, |block, first| {
            block.partons[first + 2].pdg = 22;
        }),
        ("daughters are due", History::Full, |block, first| {
            block.partons.last_mut().unwrap().parent = 0;
            let _ = first;
        }),
        (
            "do not add up to their parent",
            History::Full,
            |block, first| {
                // two vertices, whose sum over the event still balances
                let rows = &mut block.partons[first..];
                let branched: Vec<usize> = (0..rows.len())
                    .filter(|row| rows[*row].status == Status::Branched)
                    .collect();
                let last = branched[branched.len() - 1];
                let square = 1e-9 * rows[last].momentum_gev[3];
                rows[last].momentum_gev[0] += square.sqrt();
            },
        ),
        ("does not go on through", History::Full, |block, first| {
            let row = block.partons[first..]
                .iter_mut()
                .find(|row| row.status == Status::Branched && row.colour != 0);
            row.unwrap().colour = 777;
        }),
    ];
    for (what, history, offence) in offences {
        let provenance = Provenance {
            history,
            ..provenance(EVENTS)
        };
        let report = audit_of(&path, &provenance, offence);
        assert!(!report.is_clean(), "{what} went unnoticed");
        assert!(
            report
                .findings
                .iter()
                .all(|found| found.event == Some(SPOILED))
        );
        let said: Vec<String> = report.findings.iter().map(ToString::to_string).collect();
        assert!(
            said.iter().any(|text| text.contains(what)),
            "{what}: {said:?}"
        );
        assert!(report.digest.is_some());
    }
}

#[test]
fn summaries_are_checked_too() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("spoiled.h5");
    let weight = audit_of(&path, &provenance(EVENTS), |block, _| {
        block.events.last_mut().unwrap().weight = f64::NAN;
    });
    assert!(weight.findings[0].to_string().contains("weight"));
    let field = audit_of(&path, &provenance(EVENTS), |block, _| {
        block.events.last_mut().unwrap().field = 5;
    });
    assert!(field.findings[0].to_string().contains("field 5"));
}

#[test]
fn exits_from_the_medium_are_checked() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("spoiled.h5");
    /// The place of a parton that left the medium far from its birth.
    fn left(block: &EventBlock, first: usize) -> usize {
        let place = |row: &usize| {
            let [from, to] = [
                block.partons[*row].birth_fm[0],
                block.exits[*row].place_fm[0],
            ];
            to - from > 0.5
        };
        (first..block.partons.len()).find(place).unwrap()
    }
    type Offence = fn(&mut EventBlock, usize);
    let offences: [(&str, Offence); 10] = [
        ("is no final parton", |block, first| {
            block.exits[first].temperature_gev = 0.15;
        }),
        ("without one", |block, _| {
            block.events.last_mut().unwrap().field = -1;
        }),
        ("in part, or not finite", |block, first| {
            let row = left(block, first);
            block.exits[row].velocity[1] = f32::NAN;
        }),
        ("in part, or not finite", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[3] = f32::INFINITY;
        }),
        ("is cold", |block, first| {
            let row = left(block, first);
            block.exits[row].temperature_gev = 0.0;
        }),
        ("before its birth", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[0] = block.partons[row].birth_fm[0].next_down();
        }),
        ("does not lie on its path", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[0] += 1e-5;
        }),
        ("does not lie on its path", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[1] += 1e-5;
        }),
        ("does not lie on its path", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[2] -= 1e-5;
        }),
        ("does not lie on its path", |block, first| {
            let row = left(block, first);
            block.exits[row].place_fm[3] += 1e-5;
        }),
    ];
    for history in [History::Final, History::Full] {
        let provenance = Provenance {
            history,
            medium_exit: true,
            ..provenance(EVENTS)
        };
        let sound = audit_of(&path, &provenance, |_, _| {});
        assert!(sound.is_clean(), "{:?}", sound.findings);
        for (what, offence) in offences {
            let report = audit_of(&path, &provenance, offence);
            let said: Vec<String> = report.findings.iter().map(ToString::to_string).collect();
            assert!(!said.is_empty(), "{what} went unnoticed");
            let expected = |text: &String| {
                text.starts_with(&format!("event {SPOILED} row")) && text.contains(what)
            };
            assert!(said.iter().all(expected), "{what}: {said:?}");
        }
    }
}

/// Directions are as good as the momenta that are kept, and no better.
#[test]
fn exits_fit_rounded_momenta() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rounded.h5");
    let rounded = Provenance {
        momentum_bits: Some(12),
        medium_exit: true,
        ..provenance(EVENTS)
    };
    let report = audit_of(&path, &rounded, |_, _| {});
    let about_exits = |text: &String| text.contains("exit");
    let said: Vec<String> = report.findings.iter().map(ToString::to_string).collect();
    assert!(!said.iter().any(about_exits), "{said:?}");
    let spoiled = audit_of(&path, &rounded, |block, first| {
        for (row, exit) in block.partons.iter().zip(&mut block.exits).skip(first) {
            exit.place_fm[1] += 1e-3 * (exit.place_fm[0] - row.birth_fm[0]);
        }
    });
    assert!(!spoiled.is_clean());
}

#[test]
fn attributes_that_do_not_match_the_events_are_found() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("attributes.h5");
    let sound = audit_of(&path, &provenance(EVENTS), |_, _| {});
    assert!(sound.is_clean(), "{:?}", sound.findings);
    let change = |name: &str, value: f64| {
        let file = hdf5::File::open_rw(&path).unwrap();
        let attribute = file.attr(name).unwrap();
        let before: f64 = attribute.read_scalar().unwrap();
        attribute.write_scalar(&value).unwrap();
        drop((attribute, file));
        let report = audit(&path).unwrap();
        let file = hdf5::File::open_rw(&path).unwrap();
        file.attr(name).unwrap().write_scalar(&before).unwrap();
        assert!(report.findings_total > 0, "{name}");
        report.findings[0].to_string()
    };
    assert!(change("sum_of_weights", 299.9).contains("sum_of_weights"));
    assert!(change("sum_of_source_weights", 299.0).contains("sum_of_source_weights"));
    assert!(change("sum_of_squared_weights", 1.0).contains("sum_of_squared_weights"));
    assert!(change("last_id", 200.0).contains("last_id"));
    assert!(audit(&path).unwrap().is_clean());
}

#[test]
fn collinear_samples_are_checked_for_fractions_and_colour_only() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("collinear.h5");
    let provenance = Provenance {
        kinematics: Kinematics::Collinear,
        ..provenance(EVENTS)
    };
    let unbalanced = audit_of(&path, &provenance, |block, first| {
        block.partons[first + 2].momentum_gev[3] *= 2.0;
    });
    assert!(unbalanced.is_clean(), "{:?}", unbalanced.findings);
    let fraction = audit_of(&path, &provenance, |block, first| {
        block.partons[first + 2].jet_fraction *= 0.5;
    });
    assert!(!fraction.is_clean());
}

/// A quark of 100 GeV along x without recoiler that emits one gluon; the primary keeps the energy.
fn single_quark() -> (Vec<Parton>, CheckRules) {
    let (energy, square) = (100.0, 400.0f64);
    let momentum = (energy * energy - square).sqrt();
    let primary = [momentum, 0.0, 0.0, energy];
    let mut random = rand_pcg::Pcg64::seed_from_u64(1);
    let daughters = decay(&mut random, primary, [0.0; 2]);
    let row = |momentum_gev, status, pdg, colour, anticolour, fraction| Parton {
        momentum_gev,
        birth_fm: [0.0; 4],
        virtuality_squared_gev2: 0.0,
        splitting_fraction: fraction,
        jet_fraction: fraction,
        pdg,
        parent: if status == Status::Hard { NO_PARENT } else { 0 },
        colour,
        anticolour,
        status,
        channel: CHANNEL_HARD_PROCESS,
    };
    let rows = vec![
        row([energy, 0.0, 0.0, energy], Status::Hard, 2, 501, 0, 1.0),
        row(daughters[0], Status::Final, 2, 502, 0, 0.25),
        row(daughters[1], Status::Final, 21, 501, 502, 0.75),
    ];
    let rules = CheckRules {
        full_history: false,
        exact_kinematics: true,
        open_colour_lines: 1,
        momentum_tolerance: CheckRules::tolerance_of_bits(None),
    };
    (rows, rules)
}

fn said(rows: &[Parton], rules: &CheckRules) -> Vec<String> {
    let texts = check_event(rows, rules).into_iter();
    texts.map(|Imbalance { what, .. }| what).collect()
}

#[test]
fn a_source_without_recoiler_conserves_energy_and_transverse_momentum() {
    let (rows, rules) = single_quark();
    assert_eq!(check_event(&rows, &rules), []);
    let with_recoiler = CheckRules {
        open_colour_lines: 0,
        ..rules
    };
    let offences = said(&rows, &with_recoiler);
    assert!(
        offences
            .iter()
            .any(|text| text.contains("do not add up to the hard"))
    );
    assert!(offences.iter().any(|text| text.contains("no two ends")));
    for axis in [1, 2, 3] {
        let mut spoiled = rows.clone();
        spoiled[1].momentum_gev[axis] += 1e-5;
        let offences = said(&spoiled, &rules);
        assert!(
            offences
                .iter()
                .any(|text| text.contains("do not add up to the hard"))
        );
    }
}

#[test]
fn open_lines_must_be_those_of_the_hard_parton() {
    let (mut rows, rules) = single_quark();
    rows[2].colour = 600;
    assert!(
        said(&rows, &rules)
            .iter()
            .any(|text| text.contains("no two ends"))
    );
    let (rows, mut rules) = single_quark();
    rules.open_colour_lines = 2;
    assert!(
        said(&rows, &rules)
            .iter()
            .any(|text| text.contains("opens 1 colour lines"))
    );
}

#[test]
fn momentum_taken_from_and_given_to_the_medium_is_booked() {
    let (mut rows, rules) = single_quark();
    let kick = [0.0, 0.3, 0.0, 0.001];
    let mut exchange = rows[2];
    exchange.pdg = 0;
    exchange.colour = 0;
    exchange.anticolour = 0;
    exchange.parent = 2;
    exchange.momentum_gev = kick;
    exchange.status = Status::TakenFromMedium;
    // a final gluon that took the kick, put back on its mass shell by energy taken as well
    let gluon = &mut rows[2].momentum_gev;
    let before = gluon[3];
    gluon[1] += kick[1];
    gluon[3] = (gluon[0] * gluon[0] + gluon[1] * gluon[1] + gluon[2] * gluon[2]).sqrt();
    exchange.momentum_gev[3] = gluon[3] - before;
    let unbooked = said(&rows, &rules);
    assert!(
        unbooked
            .iter()
            .any(|text| text.contains("do not add up to the hard"))
    );
    rows.push(exchange);
    assert_eq!(said(&rows, &rules), [""; 0]);
    rows[3].status = Status::GivenToMedium;
    rows[3].momentum_gev = rows[3].momentum_gev.map(|component| -component);
    assert_eq!(said(&rows, &rules), [""; 0]);
}
