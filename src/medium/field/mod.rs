//! Temperature fields.

mod data;

pub use data::FieldData;
