//! The 2-norm of a transfer function, from an exact solution in rational numbers.
//!
//! For G = B/A with A of degree n and all its roots left of the axis, and B of lower degree, there is one X of degree
//! below n with A(s)·X(-s) + A(-s)·X(s) = B(s)·B(-s), and ∫g² dt = x/a with the leading coefficients x of X (at n - 1)
//! and a of A. Source: K. J. Åström, *Introduction to Stochastic Control Theory* (1970), chapter 5.

use super::looked_at::Time;
use super::quasi::{Ratio, bilinear};
use crate::algebra::{IBig, RBig, dense};

/// The highest degree for which the linear equations are solved exactly: their work grows with its cube.
const MAX_DEGREE: usize = 60;

/// The root of ∫g² dt, in z of Σ g²; infinite norms and what is too large are told.
pub(crate) fn two_norm(ratio: &Ratio, time: &Time) -> Result<f64, String> {
    if ratio.num.is_zero() {
        return Ok(0.0);
    }
    // A dead time in front changes nothing.
    let Some((n, d, _)) = ratio.rational() else { return Err("dead times inside: it is not worked out".to_owned()) };
    if d.len() > MAX_DEGREE + 1 {
        return Err(format!("above degree {MAX_DEGREE} it is not worked out"));
    }
    let square = match time {
        Time::Continuous => {
            if n.len() >= d.len() {
                return Err("it is infinite: the impulse response has an impulse in it".to_owned());
            }
            integral(n, d)
        }
        Time::Sampled(_) => {
            // On the circle dω = 2 dν/(1 + ν²): the norm of the mapped function over 1 + w, twice.
            let degree = n.len().max(d.len()) - 1;
            let (above, below) = (bilinear(n, degree), bilinear(d, degree));
            let below = dense::product(&below, &[IBig::ONE, IBig::ONE]);
            integral(&above, &below).map(|v| v * RBig::from(2))
        }
    };
    let square = square.ok_or("its equations have no solution")?;
    Ok(libm::sqrt(square.to_f64().value()))
}

/// ∫g² dt of B/A.
fn integral(b: &[IBig], a: &[IBig]) -> Option<RBig> {
    let n = a.len() - 1;
    if n == 0 {
        return Some(RBig::ZERO);
    }
    let minus = |p: &[IBig]| -> Vec<IBig> {
        p.iter().enumerate().map(|(k, c)| if k % 2 == 1 { -c } else { c.clone() }).collect()
    };
    // Only even powers remain: 2·Σ_j (-1)^j·x_j·a_(2i-j) = the coefficient of s^(2i) on the right.
    let right = dense::product(b, &minus(b));
    let mut rows: Vec<Vec<RBig>> = (0..n)
        .map(|i| {
            let entry = |j: usize| {
                let c = (2 * i).checked_sub(j).and_then(|k| a.get(k)).cloned().unwrap_or_default();
                RBig::from(if j % 2 == 1 { -c } else { c } * IBig::from(2))
            };
            let value = RBig::from(right.get(2 * i).cloned().unwrap_or_default());
            (0..n).map(entry).chain([value]).collect()
        })
        .collect();
    // Gauss-Jordan elimination in rational numbers.
    for k in 0..n {
        let p = (k..n).find(|&i| rows[i][k] != RBig::ZERO)?;
        rows.swap(k, p);
        let pivot = rows[k].clone();
        for (i, row) in rows.iter_mut().enumerate() {
            if i == k || row[k] == RBig::ZERO {
                continue;
            }
            let factor = &row[k] / &pivot[k];
            for (c, p) in row.iter_mut().zip(&pivot).skip(k) {
                *c -= &factor * p;
            }
        }
    }
    let x = &rows[n - 1][n] / &rows[n - 1][n - 1];
    Some(x / RBig::from(a[n].clone()))
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{part, poly, ratio};
    use super::*;

    #[test]
    fn norms_from_closed_forms() {
        // k/(s + a): k²/(2 a); ω²/(s² + 2 ζ ω s + ω²): ω/(4 ζ).
        assert_eq!(integral(&poly(&[3]), &poly(&[2, 1])), Some(part(9, 4)));
        assert_eq!(integral(&poly(&[25]), &poly(&[25, 5, 1])), Some(part(5, 2)));
        // (s + 1)/((s + 2)(s + 3)) = -1/(s + 2) + 2/(s + 3): 1/4 - 4/5 + 4/6
        assert_eq!(integral(&poly(&[1, 1]), &poly(&[6, 5, 1])), Some(part(7, 60)));
        assert!(two_norm(&ratio(&[1, 1], &[2, 1]), &Time::Continuous).is_err_and(|w| w.contains("infinite")));
        // 1/(z - 1/2): Σ 4^-k = 4/3.
        let found = two_norm(&ratio(&[2], &[-1, 2]), &Time::Sampled(part(1, 1))).expect("finite");
        assert!((found * found - 4.0 / 3.0).abs() < 1e-15);
    }
}
