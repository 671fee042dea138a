//! Byte planes to a zlib stream.

/// Compresses the byte planes of one chunk.
#[derive(Debug)]
pub(super) struct PlaneEncoder {
    level: u8,
}

impl PlaneEncoder {
    pub(super) fn new(level: u8) -> Self {
        PlaneEncoder { level }
    }

    /// Appends the zlib stream of `planes` (`count` planes of equal length) to `out`.
    pub(super) fn encode(&mut self, planes: &[u8], _count: usize, out: &mut Vec<u8>) {
        let level = libdeflater::CompressionLvl::new(i32::from(self.level)).expect("0 to 12");
        let mut compressor = libdeflater::Compressor::new(level);
        let start = out.len();
        out.resize(start + compressor.zlib_compress_bound(planes.len()), 0);
        let used = compressor
            .zlib_compress(planes, &mut out[start..])
            .expect("the bound suffices");
        out.truncate(start + used);
    }
}
