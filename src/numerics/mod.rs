//! Small numerical tools that physics modules share.

pub mod complex;
pub mod elementary;
pub mod gauss;
pub mod trigonometry;
pub mod vectors;
