//! Lines through points.

/// Leaves out the points that lie within `tolerance` of the straight line between those that stay (Douglas and Peucker,
/// Cartographica 10, 112 (1973), with the deviation taken along the value).
pub fn simplified(points: &[[f64; 2]], tolerance: f64) -> Vec<[f64; 2]> {
    let Some(last) = points.len().checked_sub(1) else {
        return Vec::new();
    };
    let mut kept = vec![false; points.len()];
    (kept[0], kept[last]) = (true, true);
    let mut open = vec![(0, last)];
    while let Some((start, end)) = open.pop() {
        let ([z0, v0], [z1, v1]) = (points[start], points[end]);
        let (mut worst, mut at) = (tolerance, None);
        for (k, [z, v]) in points.iter().enumerate().take(end).skip(start + 1) {
            let chord = if z1 > z0 {
                v0 + (v1 - v0) * (z - z0) / (z1 - z0)
            } else {
                v0
            };
            if (v - chord).abs() > worst {
                (worst, at) = ((v - chord).abs(), Some(k));
            }
        }
        if let Some(k) = at {
            kept[k] = true;
            open.extend([(start, k), (k, end)]);
        }
    }
    let kept = points.iter().zip(kept).filter(|(_, kept)| *kept);
    kept.map(|(point, _)| *point).collect()
}

#[cfg(test)]
mod tests {
    use super::simplified;

    #[test]
    fn keeps_corners_and_jumps() {
        let line = [
            [0.0, 0.0],
            [1.0, 1.0],
            [2.0, 2.0],
            [2.0, 5.0],
            [3.0, 5.001],
            [4.0, 5.0],
        ];
        let expected = [[0.0, 0.0], [2.0, 2.0], [2.0, 5.0], [4.0, 5.0]];
        assert_eq!(simplified(&line, 0.01), expected);
        assert_eq!(
            simplified(&line, 0.0).len(),
            5,
            "only the point between 0 and 2 is on a line"
        );
        assert!(simplified(&[], 0.1).is_empty());
        assert_eq!(simplified(&[[1.0, 2.0]], 0.1), [[1.0, 2.0]]);
    }
}
