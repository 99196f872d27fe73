//! First approximations in double precision.
//!
//! Sources: D. A. Bini, "Numerical computation of polynomial zeros by means of Aberth's method", Numerical Algorithms
//! 13 (1996), for the starting points; O. Aberth, "Iteration methods for finding all zeros of a polynomial
//! simultaneously", Mathematics of Computation 27 (1973).

use super::wide::Wide;
use dashu_int::IBig;

/// Most sweeps; what has not settled by then is left to higher precision.
const SWEEPS: usize = 150;
/// Turns the starting points of each circle, so that none is on an axis of symmetry (Bini's choice).
const TURN: f64 = 0.7;
/// A correction this much smaller than the root is beyond double precision.
const SETTLED: f64 = -50.0;

/// Approximations to the roots of a square-free polynomial that has no root 0.
pub(super) fn approximate(exact: &[IBig]) -> Vec<Wide> {
    let a: Vec<Wide> = exact.iter().map(|c| Wide::from_parts(c, &IBig::ZERO, 0)).collect();
    let moduli: Vec<Wide> = a.iter().map(|c| c.abs()).collect();
    let mut z = starting_points(&moduli);
    let n = z.len();
    // Rounding errors of Horner's rule: Adams' bound, with room for the complex products.
    let noise = libm::log2(8.0 * n as f64) - 52.0;
    let mut settled = vec![false; n];
    for _ in 0..SWEEPS {
        let mut moved = false;
        for i in 0..n {
            if settled[i] {
                continue;
            }
            let modulus = z[i].abs();
            let (mut value, mut slope, mut sum) = (a[n], Wide::ZERO, moduli[n]);
            for k in (0..n).rev() {
                slope = slope.mul(z[i]).add(value);
                value = value.mul(z[i]).add(a[k]);
                sum = sum.mul(modulus).add(moduli[k]);
            }
            if value.log2() < sum.log2() + noise {
                settled[i] = true;
                continue;
            }
            // value is not 0 here
            let ratio = value.recip().map_or(Wide::ZERO, |r| slope.mul(r));
            let pull = z
                .iter()
                .enumerate()
                .filter(|t| t.0 != i)
                .filter_map(|(_, &other)| z[i].sub(other).recip())
                .fold(Wide::ZERO, Wide::add);
            let Some(step) = ratio.sub(pull).recip() else { continue };
            z[i] = z[i].sub(step);
            moved = true;
            settled[i] = step.log2() < z[i].log2() + SETTLED;
        }
        if !moved {
            break;
        }
    }
    z
}

/// As many points as roots, on the circles whose radii the Newton polygon of the coefficients' moduli gives.
fn starting_points(moduli: &[Wide]) -> Vec<Wide> {
    let n = moduli.len() - 1;
    let mut hull: Vec<(usize, f64)> = Vec::new();
    for (k, m) in moduli.iter().enumerate().filter(|t| !t.1.is_zero()) {
        let point = (k, m.log2());
        // The upper convex hull: the last corner goes while it lies below the line to the new point.
        while let [.., a, b] = hull[..] {
            let (run, rise) = ((point.0 - a.0) as f64, point.1 - a.1);
            if (b.1 - a.1) * run <= rise * (b.0 - a.0) as f64 {
                hull.pop()
            } else {
                break;
            };
        }
        hull.push(point);
    }
    let mut out = Vec::with_capacity(n);
    for pair in hull.windows(2) {
        let ((i, low), (j, high)) = (pair[0], pair[1]);
        let count = (j - i) as f64;
        let log_radius = (low - high) / count;
        for k in 0..j - i {
            let turn = k as f64 / count + i as f64 / n as f64;
            out.push(Wide::polar(log_radius, std::f64::consts::TAU * turn + TURN));
        }
    }
    out
}
