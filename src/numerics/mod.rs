//! Small numerical tools that physics modules share.

pub mod vectors;
