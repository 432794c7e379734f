//! Lines through points.

use std::ops::Range;

/// Leaves out the points that lie within `tolerance` of the straight line between those that stay (Douglas and Peucker,
/// Cartographica 10, 112 (1973), with the deviation taken along the value).
pub fn simplified(points: &[[f64; 2]], tolerance: f64) -> Vec<[f64; 2]> {
    let Some(last) = points.len().checked_sub(1) else {
        return Vec::new();
    };
    let mut kept = vec![false; points.len()];
    (kept[0], kept[last]) = (true, true);
    let mut open: Vec<Range<usize>> = vec![0..last];
    while let Some(range) = open.pop() {
        let ([z0, v0], [z1, v1]) = (points[range.start], points[range.end]);
        let (mut worst, mut at) = (tolerance, None);
        for (k, [z, v]) in points
            .iter()
            .enumerate()
            .take(range.end)
            .skip(range.start + 1)
        {
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
            open.extend([range.start..k, k..range.end]);
        }
    }
    let kept = points.iter().zip(kept).filter(|(_, kept)| *kept);
    kept.map(|(point, _)| *point).collect()
}
