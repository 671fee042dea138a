//! Byte planes to one zlib stream (RFC 1950), each plane in the kind of block that suits it.
//!
//! The lower bytes of a mantissa are noise: deflating them takes time and gains nothing, so they are stored. Signs,
//! exponents and integers compress. Which plane is which is measured on a sample of each, column by column.

use super::deflate::{BitWriter, WINDOW, put_huffman, put_runs, put_stored, put_window_again};

/// zlib's first two bytes: deflate with a window of 32 KiB, fastest.
const ZLIB_HEADER: [u8; 2] = [0x78, 0x01];
/// The level at which only runs are looked for; above it, all matches.
const RUNS_ONLY: u8 = 1;
/// Bytes of each sample, and how many samples of a plane are taken.
const SAMPLE_BYTES: usize = 256;
const SAMPLES: usize = 8;
/// Probability that two bytes of a plane are equal below which it is stored. Pure noise has 1/256; a plane whose
/// every tenth byte is 0 and whose others are noise, 1.3 times that with a saving of 4 %.
const NOISE_COLLISIONS: f64 = 1.2 / 256.0;
/// Share of bytes equal to the one before them above which runs are looked for.
const RUN_SHARE: f64 = 0.5;

/// Compresses the byte planes of one chunk after another.
#[derive(Debug)]
pub(super) struct PlaneEncoder {
    level: u8,
    tokens: Vec<u16>,
}

/// What a plane is like.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Texture {
    /// All bytes about equally frequent.
    Noise,
    /// Some bytes more frequent than others.
    Skewed,
    /// Mostly repeats of the byte before.
    Runs,
    /// The same as the plane before, which lies just within reach of a match.
    Repeated,
}

impl PlaneEncoder {
    /// An encoder for a deflate level of 1 to 9.
    pub(super) fn new(level: u8) -> Self {
        PlaneEncoder {
            level,
            tokens: Vec::new(),
        }
    }

    /// Appends the zlib stream of `planes`, which are `count` planes of equal length, to `out`.
    pub(super) fn encode(&mut self, planes: &[u8], count: usize, out: &mut Vec<u8>) {
        out.extend_from_slice(&ZLIB_HEADER);
        let length = planes.len() / count;
        let mut before: &[u8] = &[];
        let mut textures = Vec::with_capacity(count);
        for plane in planes.chunks_exact(length) {
            textures.push(texture(plane, before));
            before = plane;
        }
        let matched = if self.level > RUNS_ONLY {
            let last_noise = textures
                .iter()
                .rposition(|texture| *texture == Texture::Noise);
            last_noise.map_or(0, |place| place + 1)
        } else {
            count
        };
        let mut writer = BitWriter::new(out);
        for (place, plane) in planes.chunks_exact(length).enumerate().take(matched) {
            let last = place + 1 == count;
            match textures[place] {
                Texture::Noise => put_stored(&mut writer, plane, last),
                Texture::Skewed => put_huffman(&mut writer, plane, last),
                Texture::Repeated => put_window_again(&mut writer, last),
                Texture::Runs => put_runs(&mut writer, plane, &mut self.tokens, last),
            }
        }
        if matched < count {
            self.put_matched(&mut writer, &planes[matched * length..]);
        }
        writer.align();
        out.extend_from_slice(&libdeflater::adler32(planes).to_be_bytes());
    }

    /// Ends the stream with planes in which all matches are looked for.
    fn put_matched(&self, writer: &mut BitWriter, planes: &[u8]) {
        if !writer.is_aligned() {
            put_stored(writer, &[], false);
        }
        let level = libdeflater::CompressionLvl::new(self.level.into()).expect("levels are 0 to 9");
        let mut compressor = libdeflater::Compressor::new(level);
        let out = writer.bytes();
        let start = out.len();
        out.resize(start + compressor.deflate_compress_bound(planes.len()), 0);
        let used = compressor
            .deflate_compress(planes, &mut out[start..])
            .expect("there is room for the bound");
        out.truncate(start + used);
    }
}

/// Looks at samples spread over a plane.
fn texture(plane: &[u8], before: &[u8]) -> Texture {
    if plane.len() == WINDOW && plane == before {
        let constant = plane.iter().all(|byte| *byte == plane[0]);
        return if constant {
            Texture::Runs
        } else {
            Texture::Repeated
        };
    }
    let mut counts = [0u32; 1 << u8::BITS];
    let (mut seen, mut repeats) = (0u32, 0);
    let stride = (plane.len() / SAMPLES).max(SAMPLE_BYTES);
    for window in plane.chunks(stride) {
        let sample = &window[..window.len().min(SAMPLE_BYTES)];
        for byte in sample {
            counts[usize::from(*byte)] += 1;
        }
        repeats += sample.windows(2).filter(|pair| pair[0] == pair[1]).count();
        seen += sample.len() as u32;
    }
    if repeats as f64 > RUN_SHARE * f64::from(seen) {
        return Texture::Runs;
    }
    let pairs: u64 = counts
        .iter()
        .map(|count| u64::from(*count) * u64::from(count.saturating_sub(1)))
        .sum();
    let collisions = pairs as f64 / (f64::from(seen) * f64::from(seen - 1)).max(1.0);
    if collisions < NOISE_COLLISIONS {
        Texture::Noise
    } else {
        Texture::Skewed
    }
}
