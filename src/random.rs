//! Keyed random streams: every draw belongs to (seed, event, branch, purpose), never to an order of visiting.
//!
//! A [`Key`] is a 128-bit hash that absorbs words one after another through the splitmix64 finaliser (variant 13 of
//! Stafford's table; Steele, Lea & Flood 2014, "Fast splittable pseudorandom number generators", OOPSLA). A stream is
//! the permuted congruential generator with a cheap multiplier (`Lcg128CmDxsm64`; O'Neill 2014) seeded with that
//! hash, so that neighbouring keys give independent streams (tested below).

use rand_pcg::Lcg128CmDxsm64;

/// The generator of one stream.
pub type Stream = Lcg128CmDxsm64;

/// 2^64 divided by the golden ratio, the increment of splitmix64.
const GOLDEN_GAMMA: u64 = 0x9e37_79b9_7f4a_7c15;
/// An odd multiplier (O'Neill's 64-bit congruential constant) that folds the first word into the second.
const FOLD_MULTIPLIER: u64 = 0xda94_2042_e4dd_58b5;
/// The increment of every stream; streams differ by their state alone.
const STREAM_INCREMENT: u128 = 0x5851_f42d_4c95_7f2d_1405_7b7e_f767_814f;

/// Splitmix64's finaliser: a bijection of 64-bit words in which each input bit flips half of the output bits.
const fn finalise(word: u64) -> u64 {
    let word = (word ^ (word >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let word = (word ^ (word >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    word ^ (word >> 31)
}

/// What a stream is for: the hash of a name, so that effects may have streams of their own.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Purpose(u64);

impl Purpose {
    /// Trials of the vacuum channel.
    pub const VACUUM: Purpose = Purpose::named("vacuum");
    /// Azimuth and lifetime of a branching.
    pub const GEOMETRY: Purpose = Purpose::named("geometry");
    /// Place of an induced branching along its path.
    pub const INDUCED_VERTEX: Purpose = Purpose::named("induced-vertex");
    /// The hard process.
    pub const SOURCE: Purpose = Purpose::named("source");
    /// Place of the hard process.
    pub const ORIGIN: Purpose = Purpose::named("origin");

    /// The purpose of a name.
    pub const fn named(name: &str) -> Purpose {
        let bytes = name.as_bytes();
        let mut hash = GOLDEN_GAMMA;
        let mut place = 0;
        while place < bytes.len() {
            hash = finalise(hash.wrapping_add(GOLDEN_GAMMA) ^ bytes[place] as u64);
            place += 1;
        }
        Purpose(hash)
    }
}

/// The key of an event or of a branch in it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Key {
    high: u64,
    low: u64,
}

impl Key {
    /// The key of an event: it depends on the seed and the event's number in the whole sample alone.
    pub const fn event(seed: u64, id: u64) -> Key {
        Key {
            high: 0,
            low: GOLDEN_GAMMA,
        }
        .absorb(seed)
        .absorb(id)
    }

    /// The key of a branch's daughter (0 or 1), or of a hard parton from the event's key.
    #[inline]
    pub const fn daughter(self, which: u64) -> Key {
        self.absorb(which)
    }

    /// The stream of this key for a purpose.
    #[inline]
    pub fn stream(self, purpose: Purpose) -> Stream {
        let low = finalise(self.low ^ purpose.0);
        let state = (((self.high ^ low) as u128) << 64) | low as u128;
        Stream::new(state, STREAM_INCREMENT)
    }

    #[inline]
    const fn absorb(self, word: u64) -> Key {
        let high = finalise(
            self.high
                .wrapping_add(word.wrapping_add(1).wrapping_mul(GOLDEN_GAMMA)),
        );
        Key {
            high,
            low: (self.low ^ high).wrapping_mul(FOLD_MULTIPLIER),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::RngExt;

    const BINS: usize = 32;
    const PAIRS: u64 = 1_000_000;
    /// Two-sided 10^-6 of a normal; the chi-square with 1023 degrees of freedom is normal to this accuracy.
    const LARGEST_PULL: f64 = 4.9;

    /// Pull of chi-square for the uniformity of pairs on a 32 x 32 grid (hypothesis: independent uniforms). With
    /// 10^6 pairs a correlation coefficient of 0.005 would be seen.
    fn pull(pairs: impl Iterator<Item = (f64, f64)>) -> f64 {
        let mut counts = vec![0u32; BINS * BINS];
        let mut total = 0.0;
        for (first, second) in pairs {
            let cell = (first * BINS as f64) as usize * BINS + (second * BINS as f64) as usize;
            counts[cell] += 1;
            total += 1.0;
        }
        let expected = total / counts.len() as f64;
        let chi_square: f64 = counts
            .iter()
            .map(|&n| (n as f64 - expected).powi(2) / expected)
            .sum();
        let freedom = (counts.len() - 1) as f64;
        (chi_square - freedom) / (2.0 * freedom).sqrt()
    }

    fn first(key: Key, purpose: Purpose) -> f64 {
        key.stream(purpose).random()
    }

    #[test]
    fn neighbouring_events_are_independent() {
        for seed in [0, 1, 12345] {
            let pairs = (0..PAIRS).map(|id| {
                let draw = |id| first(Key::event(seed, id), Purpose::VACUUM);
                (draw(id), draw(id + 1))
            });
            assert!(pull(pairs).abs() < LARGEST_PULL);
        }
    }

    #[test]
    fn neighbouring_seeds_daughters_and_purposes_are_independent() {
        let seeds = (0..PAIRS).map(|id| {
            (
                first(Key::event(1, id), Purpose::VACUUM),
                first(Key::event(2, id), Purpose::VACUUM),
            )
        });
        assert!(pull(seeds).abs() < LARGEST_PULL);
        let daughters = (0..PAIRS).map(|id| {
            let parent = Key::event(1, id);
            (
                first(parent.daughter(0), Purpose::VACUUM),
                first(parent.daughter(1), Purpose::VACUUM),
            )
        });
        assert!(pull(daughters).abs() < LARGEST_PULL);
        let generations = (0..PAIRS).map(|id| {
            let parent = Key::event(1, id);
            (
                first(parent, Purpose::VACUUM),
                first(parent.daughter(0), Purpose::VACUUM),
            )
        });
        assert!(pull(generations).abs() < LARGEST_PULL);
        let purposes = (0..PAIRS).map(|id| {
            let key = Key::event(1, id);
            (first(key, Purpose::VACUUM), first(key, Purpose::GEOMETRY))
        });
        assert!(pull(purposes).abs() < LARGEST_PULL);
    }

    #[test]
    fn successive_draws_of_one_short_stream_are_independent() {
        for skip in 0..3 {
            let pairs = (0..PAIRS).map(|id| {
                let mut stream = Key::event(7, id).stream(Purpose::GEOMETRY);
                for _ in 0..skip {
                    let _: f64 = stream.random();
                }
                (stream.random(), stream.random())
            });
            assert!(pull(pairs).abs() < LARGEST_PULL);
        }
    }

    #[test]
    fn a_correlated_pair_fails() {
        let pairs = (0..PAIRS).map(|id| {
            let mut stream = Key::event(1, id).stream(Purpose::VACUUM);
            let (common, own): (f64, f64) = (stream.random(), stream.random());
            (common, 0.98 * own + 0.02 * common)
        });
        assert!(pull(pairs).abs() > LARGEST_PULL);
    }

    #[test]
    fn the_keys_of_a_tree_do_not_repeat() {
        let mut keys = vec![Key::event(3, 4)];
        for level in 0..16 {
            let generation = keys[(1 << level) - 1..].to_vec();
            keys.extend(
                generation
                    .iter()
                    .flat_map(|key| [key.daughter(0), key.daughter(1)]),
            );
        }
        let unique: std::collections::HashSet<_> =
            keys.iter().map(|key| (key.high, key.low)).collect();
        assert_eq!(unique.len(), keys.len());
    }
}
