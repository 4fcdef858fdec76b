/// How much smaller than the mean the median of the periodograms of `segments` independent segments
/// of Gaussian noise is expected to be, as a ratio in `(ln 2, 1]`.
///
/// ```text
/// b(K) = 1 + Σ_{i=1}^{⌊(K−1)/2⌋} ( 1/(2i + 1) − 1/(2i) )
/// ```
///
/// For K = 0, 1, 2 it is one; it falls to ln 2. Above a thousand terms the sum is continued by its
/// asymptotic series `ln 2 + 1/(2n) − 1/(4n²) + 1/(8n⁴)`, n = 2⌊(K−1)/2⌋ + 1, right to the last digit.
///
/// # Source
/// Allen et al. 2012, Physical Review D 85:122006, appendix B (odd K; from memory). For even K the
/// value of K − 1 is used, as general-purpose libraries do.
///
/// # Example
/// ```
/// use fixational::spectrum::median_bias;
/// assert!((median_bias(3) - (1.0 + 1.0 / 3.0 - 1.0 / 2.0)).abs() < 1e-15);
/// assert!((median_bias(usize::MAX) - std::f64::consts::LN_2).abs() < 1e-15);
/// ```
#[must_use]
pub fn median_bias(segments: usize) -> f64 {
    let pairs = segments.saturating_sub(1) / 2;
    if pairs > 1000 {
        let n = 2.0 * pairs as f64 + 1.0;
        return std::f64::consts::LN_2 + (0.5 - (0.25 - 0.125 / (n * n)) / n) / n;
    }
    // Smallest terms first.
    let terms = (1..=pairs).rev().map(|i| -1.0 / (2.0 * i as f64 * (2.0 * i as f64 + 1.0)));
    1.0 + terms.sum::<f64>()
}

/// Median of each bin over `rows` of `bins` values: the middle one, or the mean of the middle two.
///
/// Powers are not negative, and then their bits are in order as they are: whole numbers select faster.
pub(super) fn medians(rows: &[f64], bins: usize, columns: &mut Vec<u64>) -> Vec<f64> {
    /// Neighbouring bins are gathered together, so that each row gives a run of memory.
    const TOGETHER: usize = 16;
    let count = rows.len() / bins;
    let mut medians = Vec::with_capacity(bins);
    for start in (0..bins).step_by(TOGETHER) {
        let width = TOGETHER.min(bins - start);
        columns.clear();
        columns.resize(width * count, 0);
        for (k, row) in rows.chunks_exact(bins).enumerate() {
            for (column, value) in columns.chunks_exact_mut(count).zip(row.iter().skip(start)) {
                if let Some(place) = column.get_mut(k) {
                    *place = value.to_bits();
                }
            }
        }
        for column in columns.chunks_exact_mut(count) {
            let (below, &mut high, _) = column.select_nth_unstable(count / 2);
            let low =
                if count % 2 == 1 { high } else { below.iter().copied().max().unwrap_or(high) };
            medians.push(f64::from_bits(low) / 2.0 + f64::from_bits(high) / 2.0);
        }
    }
    medians
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The series and its continuation meet.
    #[test]
    fn the_asymptotic_bias_continues_the_sum() {
        let summed = |pairs: u32| {
            1.0 - (1..=pairs)
                .rev()
                .map(|i| 1.0 / (2.0 * f64::from(i) * (2.0 * f64::from(i) + 1.0)))
                .sum::<f64>()
        };
        for pairs in [1000_u32, 1001, 5000] {
            let continued = median_bias(2 * pairs as usize + 1);
            assert!((continued - summed(pairs)).abs() < 3e-16, "{pairs}");
        }
    }

    #[test]
    fn each_bin_has_its_own_median() {
        // Rows 0, 1, 2, …, each bin shifted by its own index.
        for (count, middle) in [(1, 0.0), (2, 0.5), (5, 2.0), (6, 2.5)] {
            for bins in [1, 15, 16, 17, 40] {
                let rows: Vec<f64> = (0..count * bins)
                    .map(|i| ((i / bins) * 7 % count) as f64 + 100.0 * (i % bins) as f64)
                    .collect();
                let expected: Vec<f64> = (0..bins).map(|k| middle + 100.0 * k as f64).collect();
                assert_eq!(medians(&rows, bins, &mut vec![7; 3]), expected);
            }
        }
    }
}
