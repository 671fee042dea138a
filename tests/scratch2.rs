use spindrift::config;
use spindrift::event::EventBlock;
use spindrift::run::EventGenerator;
use spindrift::run::assemble::assemble;
#[test]
fn grid() {
    for f in ["configs/first-look.json", "configs/first-look-vacuum.json"] {
        let plan = config::load(std::path::Path::new(f)).unwrap();
        let a = assemble(&plan).unwrap();
        let g = a.generator;
        let mut w = g.worker();
        let mut b = EventBlock::default();
        let n = 50000;
        let t0 = std::time::Instant::now();
        let mut parts = 0;
        for id in 0..n {
            b.clear();
            g.generate(&mut w, id, &mut b);
            parts += b.partons.len();
        }
        let ns = t0.elapsed().as_nanos() as f64 / n as f64;
        let c = &w.tally.counters;
        println!(
            "{f}: {ns:.0} ns/event partons {:.3} ns/branching {:.0} in medium {:.2} below {:.2} hot {:.4} {:?}",
            parts as f64 / n as f64,
            ns / (c.branchings as f64 / n as f64),
            c.legs_in_medium as f64 / n as f64,
            c.legs_below_min_energy as f64 / n as f64,
            c.paths_left_hot as f64 / n as f64,
            c.channels
                .iter()
                .map(|c| (
                    c.trials as f64 / n as f64,
                    c.accepted as f64 / n as f64,
                    c.cut_by_angle_limit() as f64 / n as f64,
                    c.overshoots
                ))
                .collect::<Vec<_>>()
        );
    }
}
