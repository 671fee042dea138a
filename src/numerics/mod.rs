//! Small numerical tools that physics modules share.

pub mod elementary;
pub mod vectors;
