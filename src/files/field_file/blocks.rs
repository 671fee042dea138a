//! A large array cut into blocks that are read one after the other: whole chunks, so that none is unpacked twice, and as
//! many of them as fit into a little memory.

use std::ops::Range;

/// Elements that are read at once, unless a single chunk holds more.
const BLOCK_ELEMENTS: usize = 1 << 20;

/// The blocks that meet a part (a range along each axis) of an array of a shape, each cut to the part. `chunk` is the
/// shape of the array's chunks; `None` where it is stored in one piece.
pub(super) fn blocks(
    shape: &[usize],
    chunk: Option<&[usize]>,
    part: &[Range<usize>],
) -> impl Iterator<Item = Vec<Range<usize>>> {
    let size = block_size(shape, chunk);
    let part = part.to_vec();
    let counts: Vec<Range<usize>> = part
        .iter()
        .zip(&size)
        .map(|(range, size)| range.start / size..range.end.div_ceil(*size))
        .collect();
    let total: usize = counts.iter().map(Range::len).product();
    (0..total).map(move |number| {
        let mut rest = number;
        let mut block: Vec<Range<usize>> = Vec::with_capacity(size.len());
        for ((count, size), range) in counts.iter().zip(&size).zip(&part).rev() {
            let place = count.start + rest % count.len();
            rest /= count.len();
            let (first, end) = (place * size, (place + 1) * size);
            block.push(first.max(range.start)..end.min(range.end));
        }
        block.reverse();
        block
    })
}

/// A chunk, grown along the last axes first.
fn block_size(shape: &[usize], chunk: Option<&[usize]>) -> Vec<usize> {
    let one = vec![1; shape.len()];
    let chunk = chunk.unwrap_or(&one);
    let mut size: Vec<usize> = chunk
        .iter()
        .zip(shape)
        .map(|(chunk, length)| (*chunk).clamp(1, (*length).max(1)))
        .collect();
    let mut elements: usize = size.iter().product();
    for axis in (0..shape.len()).rev() {
        let fitting = (BLOCK_ELEMENTS / elements).max(1);
        let wanted = shape[axis].div_ceil(size[axis]).max(1);
        let factor = fitting.min(wanted);
        elements *= factor;
        size[axis] *= factor;
        if factor < wanted {
            break;
        }
    }
    size
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every element of the part lies in exactly one block, and no chunk in two.
    #[test]
    fn blocks_cover_a_part_once() {
        let shapes: [(&[usize], Option<&[usize]>); 5] = [
            (&[7, 300, 700], None),
            (&[7, 300, 700], Some(&[2, 64, 100])),
            (&[3, 5], Some(&[10, 2])),
            (&[4, 2000, 2000], Some(&[4, 2000, 300])),
            (&[1_500_000], Some(&[1000])),
        ];
        for (shape, chunk) in shapes {
            let part: Vec<Range<usize>> = shape.iter().map(|n| n / 5..n - n / 3).collect();
            let mut seen = vec![0u8; shape.iter().product()];
            for block in blocks(shape, chunk, &part) {
                let elements: usize = block.iter().map(Range::len).product();
                let of_chunk: usize = chunk.unwrap_or(&[1]).iter().product();
                assert!(elements > 0 && elements <= BLOCK_ELEMENTS.max(of_chunk));
                for (axis, range) in block.iter().enumerate() {
                    let whole = chunk.map_or(1, |chunk| chunk[axis]);
                    assert!(range.start % whole == 0 || range.start == part[axis].start);
                }
                for element in 0..elements {
                    let (mut rest, mut place, mut stride) = (element, 0, 1);
                    for (range, length) in block.iter().zip(shape).rev() {
                        place += (range.start + rest % range.len()) * stride;
                        rest /= range.len();
                        stride *= length;
                    }
                    seen[place] += 1;
                }
            }
            let covered = seen.iter().filter(|count| **count == 1).count();
            assert_eq!(covered, part.iter().map(Range::len).product::<usize>());
            assert!(seen.iter().all(|count| *count <= 1));
        }
    }
}
