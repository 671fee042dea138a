//! A look at a file's global heaps before HDF5 sees them.
//!
//! HDF5 1.14 walks through the objects of a heap by their sizes and never ends where a damaged one has size 0, so the
//! walk is made here first. Heaps hold the texts of attributes and the references between datasets and scales.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

/// Signature and version of a heap, with the zeros reserved after it (HDF5 File Format Specification, III.E).
const HEAP_START: [u8; 8] = *b"GCOL\x01\0\0\0";
/// Bytes of a heap's header: start and size.
const HEAP_HEADER: usize = 16;
/// Bytes of an object's header: index, reference count, reserved, size.
const OBJECT_HEADER: usize = 16;
/// Objects take multiples of this.
const ALIGNMENT: usize = 8;
/// The largest heap that is looked through; writers start a new one long before.
const LARGEST_HEAP: u64 = 1 << 30;

/// Checks the global heaps in the first `limit` bytes of a file.
///
/// # Errors
/// What the system says, or (as invalid data) which heap is damaged.
pub(super) fn check_global_heaps(path: &Path, limit: u64) -> io::Result<()> {
    let mut bytes = Vec::new();
    File::open(path)?.take(limit).read_to_end(&mut bytes)?;
    let starts = bytes.windows(HEAP_HEADER).enumerate();
    for (at, _) in starts.filter(|(_, window)| window.starts_with(&HEAP_START)) {
        check_heap(&bytes[at..]).map_err(|problem| {
            let message = format!("the global heap at byte {at} is damaged: {problem}");
            io::Error::new(io::ErrorKind::InvalidData, message)
        })?;
    }
    Ok(())
}

/// Walks through the objects of one heap, which may run beyond the bytes at hand.
fn check_heap(bytes: &[u8]) -> Result<(), String> {
    let size = number(&bytes[HEAP_START.len()..]);
    if !(HEAP_HEADER as u64..=LARGEST_HEAP).contains(&size) {
        return Err(format!("its size is {size}"));
    }
    let end = (size as usize).min(bytes.len());
    let mut at = HEAP_HEADER;
    while at + OBJECT_HEADER <= end {
        let index = u16::from_le_bytes([bytes[at], bytes[at + 1]]);
        let size = number(&bytes[at + OBJECT_HEADER - size_of::<u64>()..]);
        let room = (end - at) as u64;
        // object 0 is the free space, header included; the others are padded
        let taken = if index == 0 {
            size
        } else {
            size.checked_next_multiple_of(ALIGNMENT as u64)
                .and_then(|padded| padded.checked_add(OBJECT_HEADER as u64))
                .ok_or_else(|| format!("object {index} has {size} bytes"))?
        };
        if taken == 0 {
            return Err(format!("object {index} takes no room"));
        }
        if taken >= room {
            return Ok(());
        }
        at += taken as usize;
    }
    Ok(())
}

fn number(bytes: &[u8]) -> u64 {
    let mut eight = [0; size_of::<u64>()];
    eight.copy_from_slice(&bytes[..size_of::<u64>()]);
    u64::from_le_bytes(eight)
}

#[cfg(test)]
mod tests {
    use super::check_heap;

    fn heap(objects: &[(u16, u64)]) -> Vec<u8> {
        let mut bytes = super::HEAP_START.to_vec();
        bytes.extend(4096u64.to_le_bytes());
        for (index, size) in objects {
            bytes.extend(index.to_le_bytes());
            bytes.extend([0; 6]);
            bytes.extend(size.to_le_bytes());
            bytes.resize(
                bytes.len() + (*size as usize).min(4096).next_multiple_of(8),
                0,
            );
        }
        bytes.resize(4096, 0);
        bytes
    }

    #[test]
    fn objects_that_take_no_room_are_found() {
        assert!(check_heap(&heap(&[(1, 30), (2, 8), (0, 4096 - 16 - 48 - 24)])).is_ok());
        assert!(check_heap(&heap(&[(1, 30), (0, 0)])).is_err());
        assert!(check_heap(&heap(&[(1, u64::MAX)])).is_err());
    }
}
