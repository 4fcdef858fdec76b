//! The discrete prolate spheroidal sequence that has most of its energy near zero frequency.

use std::f64::consts::PI;

/// Zeroth DPSS of `points ≥ 2` samples and time–half-bandwidth product `0 < nw < points/2`.
///
/// It is the top eigenvector of Slepian's tridiagonal matrix A, with diagonal `m_i² cos 2πW` and
/// neighbours `w_i = i(N − i)/2`, where `m_i = (N − 1)/2 − i` and `W = nw/N`. A's top eigenvalues lie
/// near N²/4 and only some `nw` apart, so solving A itself loses digits as N grows. But
///
/// ```text
/// (N² − 1)/4 · I − A = B,   (B f)_i = Σ_{neighbours} w (f_i − f_neighbour) + 2 m_i² sin²(πW) · f_i
/// ```
///
/// holds only positive quantities. B is eliminated without any subtraction, carrying the surplus of
/// each diagonal element over its neighbours, so that every step of the inverse iteration `f ← B⁻¹ f`
/// is right to rounding, in the smallest tail value too. Odd sequences never enter (half the sequence
/// is solved), and the next even eigenvalue is about five times larger, so 25 steps suffice.
///
/// # Source
/// Slepian 1978, Bell System Technical Journal 57:1371–1430. Elimination: Alfa, Xue & Ye 2002,
/// Mathematics of Computation 71:217–236 (from memory).
pub(super) fn zeroth_taper(points: usize, nw: f64) -> Vec<f64> {
    // Below this the taper differs from ones by less than rounding (and sin² would underflow).
    if nw < 1e-9 {
        return vec![1.0; points];
    }
    let n = points as f64;
    let half = points.div_ceil(2);
    let odd = points % 2 == 1;
    let sine = (PI * nw / n).sin();

    // The equations for i < half. A middle sample (odd N) is its own mirror image: its equation has
    // both neighbours in one and is halved, and its right-hand side with it.
    // `coupling` is w_i towards i − 1; pivots and surplus follow from left to right.
    let coupling = |i: usize| i as f64 * (n - i as f64) / 2.0;
    let mut surplus = 0.0;
    let mut carried = 0.0;
    let (mut inverse_pivots, mut carries) = (Vec::with_capacity(half), Vec::with_capacity(half));
    for i in 0..half {
        let m = (n - 1.0) / 2.0 - i as f64;
        surplus = 2.0 * (m * sine) * (m * sine) + carried * surplus;
        let right = if i + 1 < half { coupling(i + 1) } else { 0.0 };
        let pivot = surplus + right;
        inverse_pivots.push(1.0 / pivot);
        carried = right / pivot;
        carries.push(carried);
    }

    let mut f = vec![1.0; half];
    let mut solved = vec![0.0; half];
    for _ in 0..100 {
        // Forward: right-hand sides gather from the left.
        let mut gathered = 0.0;
        for ((y, f), carry) in solved.iter_mut().zip(&f).zip(&carries) {
            gathered += f;
            *y = gathered;
            gathered *= carry;
        }
        if let (true, Some(y), Some(f)) = (odd, solved.last_mut(), f.last()) {
            *y -= f / 2.0;
        }
        // Backward: f_i = (y_i + w_{i+1} f_{i+1}) / pivot_i.
        let mut next = 0.0;
        for ((y, inverse), carry) in solved.iter_mut().zip(&inverse_pivots).zip(&carries).rev() {
            next = *y * inverse + carry * next;
            *y = next;
        }
        // The middle is the largest value.
        let scale = solved.last().map_or(1.0, |middle| 1.0 / middle);
        let mut settled = true;
        for (f, y) in f.iter_mut().zip(&solved) {
            let value = y * scale;
            settled &= (value - *f).abs() <= 4.0 * f64::EPSILON * value + f64::MIN_POSITIVE;
            *f = value;
        }
        if settled {
            break;
        }
    }

    if !odd {
        let scale = n * n / (n * n + nw);
        f.iter_mut().for_each(|f| *f *= scale);
    }
    let mirrored = f.iter().rev().skip(usize::from(odd)).copied().collect::<Vec<_>>();
    f.extend(mirrored);
    f
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A · f, with Slepian's matrix as printed.
    fn slepian_product(f: &[f64], nw: f64) -> Vec<f64> {
        let n = f.len() as f64;
        let neighbour = |i: usize| i as f64 * (n - i as f64) / 2.0;
        (0..f.len())
            .map(|i| {
                let m = (n - 1.0 - 2.0 * i as f64) / 2.0;
                let left = if i > 0 { neighbour(i) * f[i - 1] } else { 0.0 };
                let right = if i + 1 < f.len() { neighbour(i + 1) * f[i + 1] } else { 0.0 };
                m * m * (2.0 * PI * nw / n).cos() * f[i] + left + right
            })
            .collect()
    }

    /// An eigenvector without a change of sign belongs to the top eigenvalue.
    #[test]
    fn short_tapers_solve_the_printed_matrix() {
        for points in 2..60 {
            for nw in [1e-12, 1e-9, 1e-3, 0.5, 1.0, 2.5, 4.0, 10.0, 29.0] {
                if nw >= points as f64 / 2.0 {
                    continue;
                }
                let f = zeroth_taper(points, nw);
                let product = slepian_product(&f, nw);
                let middle = points / 2;
                let eigenvalue = product[middle] / f[middle];
                let size = (points * points) as f64;
                for (i, (product, f)) in product.iter().zip(&f).enumerate() {
                    assert!(*f > 0.0, "{points} {nw} {i}");
                    let residual = (product - eigenvalue * f).abs();
                    assert!(residual <= 1e-14 * size, "{points} {nw} {i}: {residual:e}");
                }
            }
        }
    }

    /// The tails of a concentrated taper are tiny, and right. Values of the printed matrix by inverse
    /// iteration in 60-digit decimal arithmetic (Python's `decimal`).
    #[test]
    fn tiny_tails_keep_their_digits() {
        let f = zeroth_taper(400, 60.0);
        for (i, expected) in [
            (0, 3.74072776668331059314e-64),
            (1, 3.09671377292040250071e-62),
            (50, 1.11133836682316849554e-26),
            (100, 4.33246618706363575735e-11),
            (150, 3.60759040289802550196e-3),
        ] {
            assert!((f[i] / expected - 1.0).abs() < 1e-13, "{i}: {:e}", f[i]);
            assert_eq!(f[i].to_bits(), f[399 - i].to_bits());
        }
    }

    /// Three times the points hold all points of the shorter taper, 1/N² apart at the most: what
    /// rounding adds at a million points would show.
    #[test]
    fn a_million_points_lose_no_digit() {
        for nw in [2.5, 8.0] {
            let (long, short) = (zeroth_taper(999_999, nw), zeroth_taper(333_333, nw));
            let at_short = long.iter().skip(1).step_by(3);
            let apart = at_short.zip(&short).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
            let allowed = 4.0 * nw * nw / (333_333.0 * 333_333.0);
            assert!(apart <= allowed, "{nw}: {apart:e}, allowed {allowed:e}");
            assert_eq!(long.len(), 999_999);
        }
    }
}
