//! Fraction-free elimination (Bareiss, "Sylvester's identity and multistep integer-preserving Gaussian elimination",
//! 1968).

use super::{Augmented, Solutions, SolveError};
use crate::algebra::Poly;

/// Determinant and numerators. After elimination to a diagonal, each row has the determinant on it and a numerator at
/// each right side.
pub(super) fn solve(system: &Augmented) -> Result<Solutions, SolveError> {
    let (n, width) = (system.unknowns, system.unknowns + system.rights);
    let mut a = vec![vec![Poly::zero(); width]; n];
    for (i, row) in system.rows.iter().enumerate() {
        for (j, p) in row {
            a[i][*j] = p.clone();
        }
    }
    let (mut last, mut negative) = (Poly::one(), false);
    for k in 0..n {
        let Some(p) = (k..n).filter(|&i| !a[i][k].is_zero()).min_by_key(|&i| (a[i][k].len(), a[i][k].bits())) else {
            return Err(SolveError::Singular);
        };
        if p != k {
            a.swap(p, k);
            negative = !negative;
        }
        let pivot = std::mem::take(&mut a[k]);
        for (i, row) in a.iter_mut().enumerate() {
            // Rows above are eliminated too, where an unknown is wanted of them.
            if i == k || (i < k && !system.wanted.contains(&i)) {
                continue;
            }
            let factor = std::mem::take(&mut row[k]);
            for j in k + 1..width {
                if row[j].is_zero() && (factor.is_zero() || pivot[j].is_zero()) {
                    continue;
                }
                let t = pivot[k].mul(&row[j]).sub(&factor.mul(&pivot[j]));
                row[j] = t.div_exact(&last).unwrap_or_default();
            }
        }
        last = pivot[k].clone();
        a[k] = pivot;
    }
    let signed = |p: &Poly| if negative { p.neg() } else { p.clone() };
    let numerators = (n..width).map(|j| system.wanted.iter().map(|&w| signed(&a[w][j])).collect()).collect();
    Ok(Solutions { numerators, determinant: signed(&last) })
}
