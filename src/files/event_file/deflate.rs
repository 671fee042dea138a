//! Deflate blocks (RFC 1951) for byte planes: stored, plain Huffman, or Huffman with runs.
//!
//! Matches other than runs of one byte are not looked for: planes of physics numbers hold none, and the search would
//! cost more time than the shower takes.

use super::huffman::{code_lengths, codes};

/// Longest code of a literal or length.
const LONGEST_CODE: u8 = 15;
/// Longest code of a code length.
const LONGEST_LENGTH_CODE: u8 = 7;
/// The symbol that ends a block.
const END_OF_BLOCK: usize = 256;
/// The symbol of the shortest match.
const FIRST_LENGTH_SYMBOL: usize = 257;
/// Literals, end of block, match lengths.
const SYMBOLS: usize = 286;
/// The shortest and longest match.
const MATCH: std::ops::RangeInclusive<usize> = 3..=258;
/// Largest stored block.
const LARGEST_STORED: usize = 65_535;
/// A token is a literal, or this plus the length of a run.
const RUN_TOKEN: usize = 256;
/// The order in which the lengths of length codes are sent.
const LENGTH_CODE_ORDER: [usize; 19] = [
    16, 17, 18, 0, 8, 7, 9, 6, 10, 5, 11, 4, 12, 3, 13, 2, 14, 1, 15,
];
/// Code-length symbols for runs of zeros: 3 to 10, and 11 to 138 of them.
const SHORT_ZERO_RUN: usize = 17;
const LONG_ZERO_RUN: usize = 18;

const STORED_BLOCK: u64 = 0b00;
const DYNAMIC_BLOCK: u64 = 0b10;
/// Bits of a block's type.
const TYPE_BITS: u32 = 2;

/// Appends bits to bytes, lowest bit first.
pub(super) struct BitWriter<'a> {
    bytes: &'a mut Vec<u8>,
    pending: u64,
    count: u32,
}

impl<'a> BitWriter<'a> {
    pub(super) fn new(bytes: &'a mut Vec<u8>) -> Self {
        BitWriter {
            bytes,
            pending: 0,
            count: 0,
        }
    }

    /// At most 32 bits at once.
    fn put(&mut self, bits: u64, count: u32) {
        self.pending |= bits << self.count;
        self.count += count;
        if self.count >= u32::BITS {
            self.bytes
                .extend_from_slice(&(self.pending as u32).to_le_bytes());
            self.pending >>= u32::BITS;
            self.count -= u32::BITS;
        }
    }

    /// Appends the codes of literals; the inner loop of packing, hence three literals for every store.
    fn put_literals(&mut self, bytes: &[u8], code: &BlockCode) {
        const WORD: usize = size_of::<u64>();
        let literals: [(u32, u8); RUN_TOKEN] = std::array::from_fn(|literal| code.tokens[literal]);
        let mut place = self.bytes.len();
        self.bytes.resize(place + code.literal_bytes + 3 * WORD, 0);
        let (mut pending, mut count) = (self.pending, self.count);
        let mut store = |pending: &mut u64, count: &mut u32| {
            self.bytes[place..place + WORD].copy_from_slice(&pending.to_le_bytes());
            place += (*count / u8::BITS) as usize;
            *pending >>= *count & !(u8::BITS - 1);
            *count &= u8::BITS - 1;
        };
        store(&mut pending, &mut count);
        let triples = bytes.chunks_exact(3);
        for triple in triples.clone() {
            for byte in triple {
                let (bits, length) = literals[usize::from(*byte)];
                pending |= u64::from(bits) << count;
                count += u32::from(length);
            }
            store(&mut pending, &mut count);
        }
        for byte in triples.remainder() {
            let (bits, length) = literals[usize::from(*byte)];
            pending |= u64::from(bits) << count;
            count += u32::from(length);
        }
        store(&mut pending, &mut count);
        self.bytes.truncate(place);
        (self.pending, self.count) = (pending, count);
    }

    /// Fills up the last byte with zeros.
    pub(super) fn align(&mut self) {
        while self.count > 0 {
            self.bytes.push(self.pending as u8);
            self.pending >>= u8::BITS;
            self.count = self.count.saturating_sub(u8::BITS);
        }
    }

    /// True between bytes.
    pub(super) fn is_aligned(&self) -> bool {
        self.count == 0
    }

    /// The bytes behind the writer, which must be aligned.
    pub(super) fn bytes(&mut self) -> &mut Vec<u8> {
        debug_assert!(self.is_aligned());
        self.bytes
    }

    fn header(&mut self, block_type: u64, last: bool) {
        self.put(u64::from(last), 1);
        self.put(block_type, TYPE_BITS);
    }
}

/// Appends bytes as they are; `last` ends the stream. Without bytes, an empty block, which aligns the stream.
pub(super) fn put_stored(writer: &mut BitWriter, bytes: &[u8], last: bool) {
    let mut rest = bytes;
    loop {
        let (now, later) = rest.split_at(rest.len().min(LARGEST_STORED));
        writer.header(STORED_BLOCK, last && later.is_empty());
        writer.align();
        let length = now.len() as u16;
        let out = writer.bytes();
        out.extend_from_slice(&length.to_le_bytes());
        out.extend_from_slice(&(!length).to_le_bytes());
        out.extend_from_slice(now);
        if later.is_empty() {
            return;
        }
        rest = later;
    }
}

/// Appends bytes in a Huffman code of their own.
pub(super) fn put_huffman(writer: &mut BitWriter, bytes: &[u8], last: bool) {
    let mut frequencies = [0u32; SYMBOLS];
    // four counters each, so that equal neighbours need not wait for each other
    let mut counts = [[0u32; RUN_TOKEN]; 4];
    let quads = bytes.chunks_exact(4);
    for byte in quads.remainder() {
        counts[0][usize::from(*byte)] += 1;
    }
    for quad in quads {
        for (count, byte) in counts.iter_mut().zip(quad) {
            count[usize::from(*byte)] += 1;
        }
    }
    for (symbol, frequency) in frequencies[..RUN_TOKEN].iter_mut().enumerate() {
        *frequency = counts.iter().map(|count| count[symbol]).sum();
    }
    let code = BlockCode::new(&mut frequencies);
    code.put_header(writer, last);
    writer.put_literals(bytes, &code);
    code.put_end(writer);
}

/// Appends bytes in a Huffman code of literals and runs; `tokens` is scratch memory.
pub(super) fn put_runs(writer: &mut BitWriter, bytes: &[u8], tokens: &mut Vec<u16>, last: bool) {
    let mut frequencies = [0u32; SYMBOLS];
    tokens.clear();
    for_each_run(bytes, |byte, mut repeats| {
        tokens.push(byte.into());
        frequencies[usize::from(byte)] += 1;
        while repeats >= *MATCH.start() {
            let length = repeats.min(*MATCH.end());
            tokens.push((RUN_TOKEN + length) as u16);
            frequencies[length_symbol(length).symbol] += 1;
            repeats -= length;
        }
        tokens.extend(std::iter::repeat_n(u16::from(byte), repeats));
        frequencies[usize::from(byte)] += repeats as u32;
    });
    let code = BlockCode::new(&mut frequencies);
    code.put_header(writer, last);
    for token in tokens.iter() {
        let (bits, count) = code.tokens[usize::from(*token)];
        writer.put(bits.into(), count.into());
    }
    code.put_end(writer);
}

/// The farthest that a match may lie back.
pub(super) const WINDOW: usize = 32_768;

/// Appends, once more, the `WINDOW` bytes that came last, in matches over the whole window.
pub(super) fn put_window_again(writer: &mut BitWriter, last: bool) {
    // the fixed code (RFC 1951, section 3.2.6): lengths from 280 on have 8 bits from 0xc0 on, others are not needed
    const FIXED_BLOCK: u64 = 0b01;
    const FIRST_SYMBOL: usize = 280;
    const FIRST_CODE: u8 = 0xc0;
    // the last distance code reaches from 24577 to 32768 with 13 extra bits, here all set
    const FARTHEST: (u8, u32) = (29, 5);
    const FARTHEST_EXTRA: (u64, u32) = (0x1fff, 13);
    const END: (u64, u32) = (0, 7);
    writer.header(FIXED_BLOCK, last);
    let distance = FARTHEST.0.reverse_bits() >> (u8::BITS - FARTHEST.1);
    let mut left = WINDOW;
    while left > 0 {
        // the last two matches share what is left, so that neither is too short
        let length = match left {
            left if left >= 2 * MATCH.end() => *MATCH.end(),
            left if left > *MATCH.end() => left / 2,
            left => left,
        };
        let symbol = length_symbol(length);
        let code = (FIRST_CODE + (symbol.symbol - FIRST_SYMBOL) as u8).reverse_bits();
        writer.put(code.into(), u8::BITS);
        writer.put(symbol.extra.into(), symbol.extra_bits.into());
        writer.put(distance.into(), FARTHEST.1);
        writer.put(FARTHEST_EXTRA.0, FARTHEST_EXTRA.1);
        left -= length;
    }
    writer.put(END.0, END.1);
}

/// Visits each byte that differs from the one before it, with the number of repeats that follow it.
fn for_each_run(bytes: &[u8], mut visit: impl FnMut(u8, usize)) {
    let mut rest = bytes;
    while let [byte, after @ ..] = rest {
        let eight = [*byte; 8];
        let octets = after
            .chunks_exact(8)
            .take_while(|octet| **octet == eight)
            .count();
        let tail = &after[8 * octets..];
        let repeats = 8 * octets + tail.iter().take_while(|next| *next == byte).count();
        visit(*byte, repeats);
        rest = &after[repeats..];
    }
}

/// The code of one block: bits and their number for every token.
struct BlockCode {
    lengths: Vec<u8>,
    tokens: Vec<(u32, u8)>,
    end: (u32, u8),
    /// Bytes that the counted literals take.
    literal_bytes: usize,
}

impl BlockCode {
    fn new(frequencies: &mut [u32; SYMBOLS]) -> Self {
        frequencies[END_OF_BLOCK] = 1;
        let lengths = code_lengths(frequencies, LONGEST_CODE);
        let codes = codes(&lengths);
        let symbol = |symbol: usize| (u32::from(codes[symbol]), lengths[symbol]);
        let mut tokens: Vec<(u32, u8)> = (0..RUN_TOKEN).map(symbol).collect();
        tokens.resize(RUN_TOKEN + MATCH.start(), (0, 0));
        for length in MATCH {
            let place = length_symbol(length);
            let (code, bits) = symbol(place.symbol);
            // the distance is always 1: one code of one bit, zero
            let bits_with_distance = bits + place.extra_bits + 1;
            tokens.push((code | place.extra << bits, bits_with_distance));
        }
        let literal_bits: usize = frequencies[..RUN_TOKEN]
            .iter()
            .zip(&lengths)
            .map(|(frequency, length)| *frequency as usize * usize::from(*length))
            .sum();
        BlockCode {
            literal_bytes: literal_bits.div_ceil(u8::BITS as usize),
            end: symbol(END_OF_BLOCK),
            tokens,
            lengths,
        }
    }

    fn put_end(&self, writer: &mut BitWriter) {
        writer.put(self.end.0.into(), self.end.1.into());
    }

    /// The block's header with its code lengths, themselves in a Huffman code.
    fn put_header(&self, writer: &mut BitWriter, last: bool) {
        const COUNT_BITS: u32 = 5;
        const LENGTH_CODE_COUNT_BITS: u32 = 4;
        const LENGTH_CODE_BITS: u32 = 3;
        const FEWEST_LENGTH_CODES: usize = 4;
        writer.header(DYNAMIC_BLOCK, last);
        let used = self.lengths.iter().rposition(|length| *length > 0);
        let used = used.expect("the end of the block has a code") + 1;
        writer.put((used - FIRST_LENGTH_SYMBOL) as u64, COUNT_BITS);
        // one distance code
        writer.put(0, COUNT_BITS);
        let mut sent = self.lengths[..used].to_vec();
        sent.push(1);
        let symbols = length_symbols(&sent);
        let mut frequencies = [0u32; LENGTH_CODE_ORDER.len()];
        for (symbol, _, _) in &symbols {
            frequencies[*symbol] += 1;
        }
        let lengths = code_lengths(&frequencies, LONGEST_LENGTH_CODE);
        let codes = codes(&lengths);
        let last_sent = LENGTH_CODE_ORDER
            .iter()
            .rposition(|symbol| lengths[*symbol] > 0);
        let count = (last_sent.expect("some length was sent") + 1).max(FEWEST_LENGTH_CODES);
        writer.put((count - FEWEST_LENGTH_CODES) as u64, LENGTH_CODE_COUNT_BITS);
        for symbol in &LENGTH_CODE_ORDER[..count] {
            writer.put(lengths[*symbol].into(), LENGTH_CODE_BITS);
        }
        for (symbol, extra, extra_bits) in symbols {
            writer.put(codes[symbol].into(), lengths[symbol].into());
            writer.put(extra as u64, extra_bits);
        }
    }
}

/// Code lengths as symbols with extra bits: lengths as they are, zeros in runs.
fn length_symbols(lengths: &[u8]) -> Vec<(usize, usize, u32)> {
    const SHORT: (usize, u32) = (3, 3);
    const LONG: (usize, usize, u32) = (11, 138, 7);
    let mut symbols = Vec::new();
    for_each_run(lengths, |length, repeats| {
        let mut left = repeats + 1;
        while length == 0 && left >= SHORT.0 {
            let (run, symbol) = if left >= LONG.0 {
                let run = left.min(LONG.1);
                (run, (LONG_ZERO_RUN, run - LONG.0, LONG.2))
            } else {
                (left, (SHORT_ZERO_RUN, left - SHORT.0, SHORT.1))
            };
            symbols.push(symbol);
            left -= run;
        }
        symbols.extend(std::iter::repeat_n((usize::from(length), 0, 0), left));
    });
    symbols
}

/// The symbol of a match length with its extra bits.
struct LengthSymbol {
    symbol: usize,
    extra: u32,
    extra_bits: u8,
}

/// RFC 1951, section 3.2.5: from 11 on, every four symbols take one more extra bit; 258 has a symbol of its own.
fn length_symbol(length: usize) -> LengthSymbol {
    let from_shortest = length - MATCH.start();
    if length == *MATCH.end() {
        return LengthSymbol {
            symbol: SYMBOLS - 1,
            extra: 0,
            extra_bits: 0,
        };
    }
    let extra_bits = from_shortest.max(4).ilog2() - 2;
    LengthSymbol {
        symbol: FIRST_LENGTH_SYMBOL + 4 * extra_bits as usize + (from_shortest >> extra_bits),
        extra: (from_shortest & ((1 << extra_bits) - 1)) as u32,
        extra_bits: extra_bits as u8,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn inflate(stream: &[u8], length: usize) -> Vec<u8> {
        let mut bytes = vec![0; length];
        let mut decompressor = libdeflater::Decompressor::new();
        let found = decompressor.deflate_decompress(stream, &mut bytes).unwrap();
        assert_eq!(found, length);
        bytes
    }

    fn noisy(length: usize, modulus: u32) -> Vec<u8> {
        let mut state = 12345u32;
        let mut next = || {
            state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            ((state >> 16) % modulus) as u8
        };
        (0..length).map(|_| next()).collect()
    }

    #[test]
    fn length_symbols_of_the_standard() {
        // (length, symbol, extra bits, extra), from the table in section 3.2.5
        for (length, symbol, extra_bits, extra) in [
            (3, 257, 0, 0),
            (10, 264, 0, 0),
            (11, 265, 1, 0),
            (12, 265, 1, 1),
            (18, 268, 1, 1),
            (19, 269, 2, 0),
            (130, 280, 4, 15),
            (131, 281, 5, 0),
            (257, 284, 5, 30),
            (258, 285, 0, 0),
        ] {
            let found = length_symbol(length);
            assert_eq!(
                (found.symbol, found.extra_bits, found.extra),
                (symbol, extra_bits, extra),
                "length {length}"
            );
        }
    }

    #[test]
    fn every_kind_of_block_inflates_to_its_bytes() {
        let mut samples = vec![vec![], vec![7], vec![0; 100_000], noisy(70_000, 256)];
        samples.extend([noisy(999, 2), noisy(4096, 37), noisy(32_768, 200)]);
        for repeats in 0..600 {
            samples.push([vec![1], vec![9; repeats], vec![1; 4]].concat());
        }
        let mut tokens = Vec::new();
        for bytes in samples {
            for kind in 0..3 {
                let mut stream = Vec::new();
                let mut writer = BitWriter::new(&mut stream);
                match kind {
                    0 => put_stored(&mut writer, &bytes, true),
                    1 if bytes.is_empty() => continue,
                    1 => put_huffman(&mut writer, &bytes, true),
                    _ if bytes.is_empty() => continue,
                    _ => put_runs(&mut writer, &bytes, &mut tokens, true),
                }
                writer.align();
                assert_eq!(inflate(&stream, bytes.len()), bytes, "kind {kind}");
            }
        }
    }

    #[test]
    fn a_window_is_repeated() {
        let plane = noisy(WINDOW, 256);
        let mut stream = Vec::new();
        let mut writer = BitWriter::new(&mut stream);
        put_stored(&mut writer, &plane, false);
        put_window_again(&mut writer, false);
        put_window_again(&mut writer, true);
        writer.align();
        assert!(stream.len() < WINDOW + 1000);
        assert_eq!(inflate(&stream, 3 * WINDOW), [&plane[..]; 3].concat());
    }

    #[test]
    fn blocks_follow_each_other_in_one_stream() {
        let (a, b, c) = (noisy(5000, 256), vec![3; 5000], noisy(5000, 5));
        let mut stream = Vec::new();
        let mut writer = BitWriter::new(&mut stream);
        put_runs(&mut writer, &b, &mut Vec::new(), false);
        put_stored(&mut writer, &a, false);
        put_huffman(&mut writer, &c, false);
        put_runs(&mut writer, &b, &mut Vec::new(), true);
        writer.align();
        assert_eq!(inflate(&stream, 20_000), [b.clone(), a, c, b].concat());
    }
}
