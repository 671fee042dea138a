//! Conservation and colour checks, used by tests and by `audit`.
/// What does not balance.
#[derive(Clone, Debug, PartialEq)]
pub struct Imbalance;
/// placeholder
pub fn check_colour() {}
/// placeholder
pub fn check_momentum() {}
