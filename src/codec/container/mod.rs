//! The archive file: a header, blocks that stand alone, an index; every byte under a checksum. The page
//! `docs/container.md` is its definition.

mod cbor;
mod header;
mod reader;
mod writer;

pub use header::{ArchivedAxis, ArchivedChannel, ArchivedLayout, Header, Origin, Rule};
pub use reader::{Archive, Entry, Lost};
pub use writer::Writer;

/// First bytes of an archive.
pub const MAGIC: [u8; 4] = [0x89, b'G', b'R', b'N'];
/// Last bytes of an archive.
pub const END: [u8; 4] = [b'G', b'R', b'N', 0x8a];
/// Version of the layout.
pub const VERSION: u8 = 1;

/// Runs without a value: how many values come before each, and how many are missing.
pub type Gaps = Vec<(usize, usize)>;

/// True for the first bytes of an archive.
pub fn is_archive(first: &[u8]) -> bool {
    first.starts_with(&MAGIC)
}
