//! Proves: effects behave as a medium must: more of it does more, none of it does nothing, envelopes do not matter.
//!
//! - Longer path, hotter field, stronger transport: each effect on rates makes more branchings and softer leading partons
//!   from medium to medium; `resolved-only` makes fewer, and harder ones; virtuality diffusion makes more, drag softer ones
//!   of the same number. Three media a knob; mean difference of the same events (twins) over its error: for the number of
//!   partons at 4.9 a step, for the leading share at 4.9 from the first to the last and no step at 4.9 the other way.
//!   7 effects x 3 knobs x 6 checks = 126; N = 12000 events a medium.
//! - A medium of no strength, for every effect: the vacuum to the last bit of every column. With a strength of 10^-12 the
//!   vacuum's branchings, and momenta that differ by no more than the square root of it (deterministic).
//! - Effects on paths that leave virtuality alone leave every branching of the vacuum twin as it is.
//! - Twice the envelope: for every effect on rates the same number of partons, leading fraction and number of induced
//!   branchings (two-sample Kolmogorov-Smirnov) and their means; 5 effects x 5 checks; N = 3 x 10^4 events each; smallest
//!   visible bias 2 % of a cumulative distribution. A channel that is halved must be seen.
//!
//! 10^-6 each.
//!
//! See `more`, `nothing` and `envelopes`.

mod envelopes;
mod more;
mod nothing;

use spindrift::event::{Parton, Status};

/// What one event shows: number of final partons, and the largest energy of one over the jet's.
fn observe(rows: &[Parton]) -> [f64; 2] {
    let finals = || rows.iter().filter(|row| row.status == Status::Final);
    let leading = finals().map(|row| row.momentum_gev[3]).fold(0.0, f64::max);
    [finals().count() as f64, leading / rows[0].momentum_gev[3]]
}
