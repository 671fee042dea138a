//! Huffman codes of limited length, canonical as deflate wants them (RFC 1951, section 3.2.2).

/// Code lengths in bits for symbols of the given frequencies; 0 for symbols that do not occur.
///
/// Lengths are optimal unless one exceeds `longest`; then frequencies are flattened until none does. At least two
/// symbols must occur.
pub(super) fn code_lengths(frequencies: &[u32], longest: u8) -> Vec<u8> {
    let mut frequencies = frequencies.to_vec();
    loop {
        let lengths = optimal_lengths(&frequencies);
        if lengths.iter().all(|length| *length <= longest) {
            return lengths;
        }
        for frequency in frequencies.iter_mut().filter(|frequency| **frequency > 0) {
            *frequency = *frequency / 2 + 1;
        }
    }
}

/// Huffman's construction with two queues, both sorted: single symbols, and pairs as they are made.
fn optimal_lengths(frequencies: &[u32]) -> Vec<u8> {
    let mut symbols: Vec<(u32, usize)> = frequencies
        .iter()
        .enumerate()
        .filter(|(_, frequency)| **frequency > 0)
        .map(|(symbol, frequency)| (*frequency, symbol))
        .collect();
    symbols.sort_unstable();
    let count = symbols.len();
    debug_assert!(count >= 2);
    // nodes 0..count are the symbols, the pairs follow; the last one is the root
    let mut weights: Vec<u32> = symbols.iter().map(|(frequency, _)| *frequency).collect();
    let mut parents = vec![0; 2 * count - 1];
    let (mut next_symbol, mut next_pair) = (0, count);
    for pair in count..2 * count - 1 {
        let mut weight = 0;
        for _ in 0..2 {
            let symbol_is_lighter = next_symbol < count
                && (next_pair == pair || weights[next_symbol] <= weights[next_pair]);
            let lightest = if symbol_is_lighter {
                &mut next_symbol
            } else {
                &mut next_pair
            };
            weight += weights[*lightest];
            parents[*lightest] = pair;
            *lightest += 1;
        }
        weights.push(weight);
    }
    let mut depths = vec![0u8; 2 * count - 1];
    for node in (0..2 * count - 2).rev() {
        depths[node] = depths[parents[node]] + 1;
    }
    let mut lengths = vec![0; frequencies.len()];
    for ((_, symbol), depth) in symbols.iter().zip(&depths) {
        lengths[*symbol] = *depth;
    }
    lengths
}

/// The canonical codes of these lengths, first bit lowest as deflate packs them.
pub(super) fn codes(lengths: &[u8]) -> Vec<u16> {
    let mut count_of_length = [0u16; u16::BITS as usize + 1];
    for length in lengths.iter().filter(|length| **length > 0) {
        count_of_length[usize::from(*length)] += 1;
    }
    let mut next = [0u16; u16::BITS as usize + 1];
    for length in 1..next.len() {
        next[length] = (next[length - 1] + count_of_length[length - 1]) << 1;
    }
    lengths
        .iter()
        .map(|length| {
            if *length == 0 {
                return 0;
            }
            let code = next[usize::from(*length)];
            next[usize::from(*length)] += 1;
            code.reverse_bits() >> (u16::BITS - u32::from(*length))
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::{code_lengths, codes};

    /// The example of RFC 1951, section 3.2.2.
    #[test]
    fn canonical_codes_of_the_standard() {
        let lengths = [3, 3, 3, 3, 3, 2, 4, 4];
        let in_order = [0b010, 0b011, 0b100, 0b101, 0b110, 0b00, 0b1110, 0b1111u16];
        let reversed: Vec<u16> = in_order
            .iter()
            .zip(lengths)
            .map(|(code, length): (&u16, u8)| code.reverse_bits() >> (16 - u32::from(length)))
            .collect();
        assert_eq!(codes(&lengths), reversed);
    }

    #[test]
    fn limited_lengths_still_fill_the_code_space() {
        // Fibonacci frequencies make the deepest tree
        let mut frequencies = vec![1u32, 1];
        while frequencies.len() < 25 {
            frequencies
                .push(frequencies[frequencies.len() - 1] + frequencies[frequencies.len() - 2]);
        }
        for longest in [7, 15] {
            let lengths = code_lengths(&frequencies, longest);
            let space: f64 = lengths
                .iter()
                .map(|length| 0.5f64.powi(i32::from(*length)))
                .sum();
            assert_eq!(space, 1.0);
            assert!(lengths.iter().all(|length| (1..=longest).contains(length)));
        }
    }

    #[test]
    fn two_symbols_take_one_bit_each() {
        assert_eq!(code_lengths(&[0, 9, 0, 1], 15), [0, 1, 0, 1]);
    }
}
