//! The checksum that HDF5's fletcher32 filter appends to every chunk.

/// Bytes of a block: few enough that no sum over it overflows 32 bits (180 x 181 / 2 x 65535 < 2^32), and a multiple
/// of the eight that are added at once.
const BLOCK_BYTES: usize = 180 * LANE_BYTES;
/// Bytes of a machine word.
const LANE_BYTES: usize = size_of::<u64>();
/// Every second 16-bit word of a machine word, each with room for a 32-bit sum.
const EVEN_WORDS: u64 = 0x0000_ffff_0000_ffff;
/// The sums are taken modulo this.
const MODULUS: u64 = 65_535;

/// Fletcher's checksum over big-endian 16-bit words with sums modulo 65535 (Fletcher 1982), as HDF5 computes it.
///
/// HDF5 reduces its sums by folding, which leaves 65535 where a remainder would be 0; so does [`residue`].
pub(super) fn fletcher32(bytes: &[u8]) -> u32 {
    let (mut sum1, mut sum2) = (0u64, 0u64);
    let even = bytes.len() & !1;
    for block in bytes[..even].chunks(BLOCK_BYTES) {
        let lanes = block.chunks_exact(LANE_BYTES);
        let rest = lanes.remainder();
        let (first, second) = sums_of_lanes(lanes);
        let words = ((block.len() - rest.len()) / 2) as u64;
        sum2 += words * sum1 + second;
        sum1 += first;
        for word in rest.chunks_exact(2) {
            sum1 += u64::from(u16::from_be_bytes([word[0], word[1]]));
            sum2 += sum1;
        }
        (sum1, sum2) = (residue(sum1), residue(sum2));
    }
    if let [last] = bytes[even..] {
        sum1 += u64::from(last) << u8::BITS;
        sum2 += sum1;
        (sum1, sum2) = (residue(sum1), residue(sum2));
    }
    ((sum2 as u32) << u16::BITS) | sum1 as u32
}

/// Both sums over whole machine words, starting from zero: word i of n enters the second n - i times.
fn sums_of_lanes(lanes: std::slice::ChunksExact<u8>) -> (u64, u64) {
    let (mut even, mut odd) = (0u64, 0u64);
    let (mut even_weighted, mut odd_weighted) = (0u64, 0u64);
    for lane in lanes {
        let lane: [u8; LANE_BYTES] = lane.try_into().expect("chunks of that size");
        // from the front: word 0 stands highest
        let words = u64::from_be_bytes(lane);
        odd += words & EVEN_WORDS;
        even += (words >> u16::BITS) & EVEN_WORDS;
        odd_weighted += odd;
        even_weighted += even;
    }
    let [word0, word2] = halves(even);
    let [word1, word3] = halves(odd);
    let first = word0 + word1 + word2 + word3;
    let weighted: u64 = halves(even_weighted)
        .into_iter()
        .chain(halves(odd_weighted))
        .sum();
    let later_in_lane = word1 + 2 * word2 + 3 * word3;
    (first, WORDS_IN_LANE * weighted - later_in_lane)
}

/// 16-bit words in a machine word.
const WORDS_IN_LANE: u64 = (LANE_BYTES / 2) as u64;

/// The high and the low 32 bits.
fn halves(sums: u64) -> [u64; 2] {
    [sums >> u32::BITS, sums & u64::from(u32::MAX)]
}

/// A number modulo 65535, with 65535 for multiples of it but 0 itself.
fn residue(sum: u64) -> u64 {
    match (sum, sum % MODULUS) {
        (0, _) => 0,
        (_, 0) => MODULUS,
        (_, rest) => rest,
    }
}

#[cfg(test)]
mod tests {
    use super::fletcher32;

    // The check values circulated with the algorithm ("abcde" etc.) are for little-endian words; these are
    // big-endian words, as HDF5 sums them, added up by hand.
    #[test]
    fn short_inputs_by_hand() {
        assert_eq!(fletcher32(&[]), 0);
        assert_eq!(fletcher32(&[0x01, 0x02]), 0x0102_0102);
        // words 0x0102, 0x0300: sums 0x0402 and 0x0102 + 0x0402
        assert_eq!(fletcher32(&[1, 2, 3]), 0x0504_0402);
    }

    /// The sums word by word, folded as often as possible.
    fn word_by_word(bytes: &[u8]) -> u32 {
        let fold = |sum: u32| (sum & 0xffff) + (sum >> 16);
        let (mut sum1, mut sum2) = (0u32, 0u32);
        for word in bytes.chunks(2) {
            let low = word.get(1).copied().unwrap_or(0);
            sum1 = fold(sum1 + u32::from(u16::from_be_bytes([word[0], low])));
            sum2 = fold(sum2 + sum1);
        }
        (sum2 << 16) | sum1
    }

    #[test]
    fn many_words_at_once_are_word_by_word() {
        let mut bytes = vec![0u8; 20_011];
        let mut state = 1u32;
        for byte in &mut bytes {
            state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            *byte = (state >> 24) as u8;
        }
        for length in (0..64).chain([1439, 1440, 1441, 1448, 5000, 20_010, 20_011]) {
            assert_eq!(fletcher32(&bytes[..length]), word_by_word(&bytes[..length]));
        }
        for fill in [0, 255] {
            bytes.fill(fill);
            assert_eq!(fletcher32(&bytes), word_by_word(&bytes), "all {fill}");
        }
    }
}
