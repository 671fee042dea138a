//! The config file: read, checked, resolved into a [`RunPlan`].
//!
//! ```text
//! text -> raw (nodes with their places) -> check (against the table of keys) -> rules (across keys) -> plan
//! ```
//!
//! One table (`keys`) says what a config may hold. The checker, the suggestions for misspelt keys, the resolved
//! config with every default filled in and the JSON Schema are all made from it.

mod build;
mod check;
mod complaint;
mod digest;
mod error;
mod inputs;
mod keys;
mod nearest;
mod plan;
mod raw;
mod resolve;
mod rules;
mod schema;
mod usage;
mod values;

pub use error::{ConfigError, ConfigErrors, Problem};
pub use plan::{History, InputFile, RecordSettings, RunPlan};
pub use resolve::{MAX_CONFIG_BYTES, Overrides, load, load_text, load_with};
pub use schema::schema;
