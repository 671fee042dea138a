//! The event file: its layout, packing of columns into finished chunks, writing and reading.
//!
//! Rows are gathered from blocks in memory and packed by any number of workers ([`RowGrouper`], [`Packer`]); one
//! thread owns the file and appends whole chunks ([`EventFileWriter`]).

mod audit;
mod checksum;
mod create;
mod deflate;
mod digest;
mod error;
mod huffman;
mod layout;
mod lock;
mod pack;
mod planes;
mod provenance;
mod read_attributes;
mod read_columns;
mod reader;
mod row_groups;
mod writer;

pub use audit::{AuditReport, Finding, audit};
pub use digest::ContentDigest;
pub use error::EventFileError;
pub use layout::{
    Column, ColumnSet, EVENT_CHUNK_ROWS, EVENT_COLUMNS, EXIT_COLUMNS, Element, FORMAT_NAME,
    FORMAT_VERSION, MOST_FIELDS, PARTON_CHUNK_ROWS, PARTON_COLUMNS, Table,
};
pub use pack::{PackedGroup, Packer};
pub use provenance::{CrossSection, FieldEntry, Kinematics, Provenance, WeightSums};
pub use reader::{Blocks, EventFile};
pub use row_groups::{RowGroup, RowGrouper};
pub use writer::{EventFileWriter, WriteOptions};
