//! The checksum that HDF5's fletcher32 filter appends to every chunk.

/// Words that can be added before a 32-bit sum could overflow (the same block length as HDF5's own code).
const WORDS_BEFORE_REDUCTION: usize = 360;

/// Fletcher's checksum over big-endian 16-bit words with sums modulo 65535 (Fletcher 1982), as HDF5 computes it.
pub(super) fn fletcher32(bytes: &[u8]) -> u32 {
    let (mut sum1, mut sum2) = (0u32, 0u32);
    let even = bytes.len() & !1;
    for block in bytes[..even].chunks(2 * WORDS_BEFORE_REDUCTION) {
        for word in block.chunks_exact(2) {
            sum1 += u32::from(u16::from_be_bytes([word[0], word[1]]));
            sum2 += sum1;
        }
        (sum1, sum2) = (fold(sum1), fold(sum2));
    }
    if let [last] = bytes[even..] {
        sum1 += u32::from(last) << u8::BITS;
        sum2 += sum1;
        (sum1, sum2) = (fold(sum1), fold(sum2));
    }
    (fold(sum2) << u16::BITS) | fold(sum1)
}

fn fold(sum: u32) -> u32 {
    (sum & u32::from(u16::MAX)) + (sum >> u16::BITS)
}

#[cfg(test)]
mod tests {
    use super::fletcher32;

    // The check values circulated with the algorithm ("abcde" etc.) are for little-endian words; these are the
    // same strings with the big-endian words that HDF5 sums, added up by hand.
    #[test]
    fn short_inputs_by_hand() {
        assert_eq!(fletcher32(&[]), 0);
        assert_eq!(fletcher32(&[0x01, 0x02]), 0x0102_0102);
        // words 0x0102, 0x0300: sums 0x0402 and 0x0102 + 0x0402
        assert_eq!(fletcher32(&[1, 2, 3]), 0x0504_0402);
    }
}
