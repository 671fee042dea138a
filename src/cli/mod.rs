//! The verbs: each reads its arguments, calls the library and prints.

pub mod audit;
pub mod field;
pub mod schema;
pub mod show;

/// Exit code of a request that cannot be served.
pub const EXIT_BAD_REQUEST: u8 = 2;
