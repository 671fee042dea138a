//! Proves: what effects on paths do to settled partons, and that every exchange with the medium is booked.
//!
//! Everything is read from whole events with their full history: a parton's row holds its momentum at the end of its
//! way, the exchange rows behind it what each effect gave or took, its daughters' birth its lifetime. So the momentum
//! at birth and the path inside the medium are known for each parton, and with them what is expected of it. Jets fly
//! along z: q is (px, py), plus momentum E + pz.
//!
//! See `broadening`, `drag`, `virtuality_diffusion` and `expanding` for the laws, `exchanges` for order, rows and conservation.

mod broadening;
mod drag;
mod exchanges;
mod expanding;
mod virtuality_diffusion;

/// Channel number of the first effect.
const FIRST_CHANNEL: u8 = 2;
const TEMPERATURE_GEV: f64 = 0.3;

/// A number of f32 near `value` is off by at most this.
fn rounding(value: f64) -> f64 {
    0.5 * f64::from(f32::EPSILON) * value.abs()
}
