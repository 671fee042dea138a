//! The config file: read, checked, resolved into a [`RunPlan`].

mod plan;

pub use plan::{History, InputFile, RecordSettings, RunPlan};
