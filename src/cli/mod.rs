//! placeholder

pub mod schema;
