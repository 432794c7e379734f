//! What is said of a list of sampled numbers.

/// The normal quantile of a two-sided 95 % interval.
const Z_95: f64 = 1.959_963_984_540_054;
const BINS: usize = 40;

/// Mean, standard deviation and quantiles.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Statistics {
    pub mean: f64,
    /// With n − 1 in the denominator.
    pub deviation: f64,
    /// The 5, 50 and 95 % quantiles, linear between neighbours.
    pub quantiles: [f64; 3],
}

/// `None` for fewer than two numbers.
pub fn statistics(values: &[f64]) -> Option<Statistics> {
    let count = values.len();
    if count < 2 {
        return None;
    }
    let mean = values.iter().sum::<f64>() / count as f64;
    let squares: f64 = values.iter().map(|v| (v - mean).powi(2)).sum();
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let quantile = |part: f64| {
        let place = part * (count - 1) as f64;
        let below = place.floor() as usize;
        let above = (below + 1).min(count - 1);
        sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
    };
    Some(Statistics {
        mean,
        deviation: (squares / (count - 1) as f64).sqrt(),
        quantiles: [0.05, 0.5, 0.95].map(quantile),
    })
}

/// A share of wafers with its 95 % confidence interval.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Share {
    pub inside: usize,
    pub of: usize,
    pub share: f64,
    pub interval: [f64; 2],
}

/// Wilson's score interval (J. Am. Stat. Assoc. 22, 209 (1927)), which holds for independent draws, also where none or
/// all are inside.
pub fn share(inside: usize, of: usize) -> Share {
    let n = of as f64;
    let p = inside as f64 / n;
    let z2 = Z_95 * Z_95;
    let centre = (p + z2 / (2.0 * n)) / (1.0 + z2 / n);
    let half = Z_95 / (1.0 + z2 / n) * (p * (1.0 - p) / n + z2 / (4.0 * n * n)).sqrt();
    Share {
        inside,
        of,
        share: p,
        // Rounding must not take the ends away from where the formula has them.
        interval: [
            if inside == 0 { 0.0 } else { centre - half },
            if inside == of { 1.0 } else { centre + half },
        ],
    }
}

/// Counts in equal bins from the smallest to the largest number.
#[derive(Clone, Debug, PartialEq)]
pub struct Histogram {
    /// One more than there are counts.
    pub edges: Vec<f64>,
    pub counts: Vec<usize>,
}

/// `None` when all numbers are equal.
pub fn histogram(values: &[f64]) -> Option<Histogram> {
    let low = values.iter().copied().fold(f64::INFINITY, f64::min);
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if high.is_nan() || high <= low {
        return None;
    }
    let width = (high - low) / BINS as f64;
    let mut counts = vec![0; BINS];
    for value in values {
        counts[(((value - low) / width) as usize).min(BINS - 1)] += 1;
    }
    Some(Histogram {
        edges: (0..=BINS).map(|k| low + k as f64 * width).collect(),
        counts,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Worked by hand: five numbers, and Wilson's interval for 8 of 10 (0.490, 0.943; Newcombe, Stat. Med. 17, 857
    /// (1998) gives the formula).
    #[test]
    fn small_lists_come_out_as_by_hand() {
        let list = statistics(&[5.0, 1.0, 3.0, 2.0, 4.0]).unwrap();
        assert_eq!(list.mean, 3.0);
        assert!((list.deviation - 2.5f64.sqrt()).abs() < 1e-15);
        for (quantile, hand) in list.quantiles.iter().zip([1.2, 3.0, 4.8]) {
            assert!((quantile - hand).abs() < 1e-14);
        }
        let ten = share(8, 10);
        assert!((ten.interval[0] - 0.4902).abs() < 1e-4, "{ten:?}");
        assert!((ten.interval[1] - 0.9433).abs() < 1e-4, "{ten:?}");
        assert_eq!(share(0, 10).interval[0], 0.0);
        let bins = histogram(&[0.0, 1.0, 40.0]).unwrap();
        assert_eq!((bins.counts[0], bins.counts[1], bins.counts[39]), (1, 1, 1));
        assert_eq!(bins.edges.len(), bins.counts.len() + 1);
        assert!(statistics(&[1.0]).is_none() && histogram(&[2.0, 2.0]).is_none());
    }
}
