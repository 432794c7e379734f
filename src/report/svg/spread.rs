//! Places for labels beside one another.

/// Moves labels of the given sizes as little as can be (in the sense of least squares) so that they keep their order,
/// do not overlap and stay between `low` and `high`. `wanted` holds the middles, ascending; so does the result. If
/// there is too little room they stand one after the other from `low` on.
///
/// With the labels pushed together their positions are a rising sequence: isotonic regression by pooling neighbours
/// that violate the order (Ayer et al., Ann. Math. Statist. 26, 641 (1955)).
pub(super) fn spread(wanted: &[f64], sizes: &[f64], low: f64, high: f64) -> Vec<f64> {
    let mut before = 0.0;
    let offsets: Vec<f64> = sizes
        .iter()
        .map(|size| {
            let middle = before + 0.5 * size;
            before += size;
            middle
        })
        .collect();
    let top = (high - before).max(low);
    // Blocks of the sum and the number of the pooled positions.
    let mut blocks: Vec<(f64, usize)> = Vec::new();
    for (wanted, offset) in wanted.iter().zip(&offsets) {
        let mut block = (wanted - offset, 1);
        while let Some(&(sum, count)) = blocks.last() {
            if sum / count as f64 <= block.0 / block.1 as f64 {
                break;
            }
            block = (block.0 + sum, block.1 + count);
            blocks.pop();
        }
        blocks.push(block);
    }
    let pooled = blocks
        .iter()
        .flat_map(|(sum, count)| std::iter::repeat_n(sum / *count as f64, *count));
    pooled
        .zip(&offsets)
        .map(|(position, offset)| position.clamp(low, top) + offset)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn leaves_labels_alone_that_have_room() {
        assert_eq!(spread(&[10.0, 30.0], &[8.0, 8.0], 0.0, 100.0), [10.0, 30.0]);
    }

    #[test]
    fn parts_labels_evenly_around_their_common_place() {
        assert_eq!(
            spread(&[50.0, 50.0, 50.0], &[10.0; 3], 0.0, 100.0),
            [40.0, 50.0, 60.0]
        );
        assert_eq!(
            spread(&[1.0, 1.0], &[10.0; 2], 0.0, 100.0),
            [5.0, 15.0],
            "kept inside"
        );
    }
}
