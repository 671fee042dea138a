//! What a person reads: summaries of files, one event as a tree.

mod event_tree;
mod field_picture;
mod field_summary;
mod numbers;
mod sample_summary;

pub use event_tree::event_tree;
pub use field_picture::field_picture;
pub use field_summary::{AxisError, FieldSummary};
pub use sample_summary::SampleSummary;
