//! From an isolated root to both coordinates in full double precision.

use super::super::dense::bits;
use super::isolate::{FIRST_PRECISION, Isolated, MOST_PRECISION};
use super::point::{Point, Rounded};
use super::wide::Wide;
use super::{RootOf, RootsError};
use dashu_base::{Sign, UnsignedAbs};
use dashu_int::IBig;
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Bits of each coordinate that are certain before it is rounded to 53.
const CERTAIN: f64 = 62.0;
/// Most steps of Newton's iteration at one precision; it doubles the correct bits each time, at most 50 of them.
const STEPS: usize = 12;

/// Roots, in no particular order, of a square-free polynomial, each with `multiplicity`.
pub(super) fn refine(exact: &[IBig], isolated: &[Isolated], multiplicity: u32) -> Result<Vec<RootOf>, RootsError> {
    let mut levels: BTreeMap<usize, Rounded> = BTreeMap::new();
    let mut precision = FIRST_PRECISION;
    // One of each conjugate pair is enough.
    let mut open: Vec<usize> = (0..isolated.len()).filter(|&i| isolated[i].conjugate >= i).collect();
    let mut found: Vec<(usize, Point, f64)> = Vec::new();
    while !open.is_empty() {
        if precision > MOST_PRECISION {
            return Err(RootsError::NoConvergence { unparted: open.len(), precision: MOST_PRECISION });
        }
        let rounded = &*levels.entry(precision).or_insert_with(|| Rounded::new(exact, precision));
        let tried: Vec<Option<(Point, f64)>> =
            open.par_iter().map(|&i| newton(rounded, &isolated[i], i, precision)).collect();
        let mut left = Vec::new();
        for (i, t) in open.into_iter().zip(tried) {
            match t {
                Some((p, r)) => found.push((i, p, r)),
                None => left.push(i),
            }
        }
        open = left;
        precision *= 2;
    }
    let mut out = Vec::new();
    for (i, point, log_radius) in found {
        let (re, im) = (to_f64(&point.re, point.exp), to_f64(&point.im, point.exp));
        if !re.is_finite() || !im.is_finite() {
            return Err(RootsError::OutOfRange);
        }
        // Half of it is the rounding error; all of it also serves where a tiny part was rounded to 0.
        let ulp = |exact: &IBig, x: f64| if exact.is_zero() { 0.0 } else { x.abs().next_up() - x.abs() };
        let rounding = ulp(&point.re, re) + ulp(&point.im, im);
        // Rounded up: the sum is inexact by less than one part in 2^50.
        let radius = (libm::exp2(log_radius) + rounding) * (1.0 + 1e-15);
        let Isolated { conjugate, on_axis, on_circle, .. } = isolated[i];
        let root = RootOf { re, im, multiplicity, radius, on_axis, on_circle };
        if conjugate != i {
            out.push(RootOf { im: -im, ..root });
        }
        out.push(root);
    }
    Ok(out)
}

/// Newton's iteration at one precision. Gives the point and log 2 of the radius n·|p/p'| of a disc that holds a root
/// (E. Laguerre; see P. Henrici, Applied and Computational Complex Analysis, vol. 1, 1974, cor. 6.4g), as soon as that
/// is small beside both coordinates and the disc can't reach another root; `None` where it takes more bits.
fn newton(rounded: &Rounded, root: &Isolated, index: usize, precision: usize) -> Option<(Point, f64)> {
    let real = root.conjugate == index;
    let project = |p: Point| Point {
        re: if root.on_axis { IBig::ZERO } else { p.re },
        im: if real { IBig::ZERO } else { p.im },
        exp: p.exp,
    };
    let log_n = libm::log2(rounded.degree() as f64);
    let mut point = project(root.point.clone()).rounded(precision);
    for _ in 0..STEPS {
        let at = rounded.at(&point, true);
        let slope = at.slope.log2();
        if at.slope_error > slope - 1.0 {
            return None;
        }
        let reach = at.value.log2().max(at.value_error) + 1.0 - (slope - 1.0) + log_n;
        let moved = point.minus(&root.point).log2();
        let inside = reach.max(moved) + 1.0 < root.gap;
        if inside && small(&point, reach, root.on_axis, real) {
            return Some((point, reach));
        }
        if at.value.log2() < at.value_error {
            return None;
        }
        let step = at.value.mul(at.slope.recip()?).neg();
        point = project(point.plus(step, precision));
    }
    None
}

/// Whether a radius (log 2) is beyond what rounding each coordinate to double precision can tell, those proved to be 0
/// left aside.
fn small(point: &Point, log_radius: f64, re_is_zero: bool, im_is_zero: bool) -> bool {
    let part = |c: &IBig| log_radius < Wide::from_parts(c, &IBig::ZERO, point.exp).log2() - CERTAIN;
    (re_is_zero || part(&point.re)) && (im_is_zero || part(&point.im))
}

/// m·2^exp rounded to the nearest number of double precision; never -0.
fn to_f64(m: &IBig, exp: i64) -> f64 {
    if m.is_zero() {
        return 0.0;
    }
    let shift = bits(m).saturating_sub(64);
    let magnitude = m.unsigned_abs();
    let mut top = u64::try_from(&magnitude >> shift).unwrap_or(u64::MAX);
    // What was cut off only decides ties.
    if magnitude.trailing_zeros().is_some_and(|t| t < shift) {
        top |= 1;
    }
    let exp = (exp + shift as i64).clamp(-10_000, 10_000) as i32;
    let value = libm::scalbn(top as f64, exp);
    if value == 0.0 {
        0.0
    } else if m.sign() == Sign::Negative {
        -value
    } else {
        value
    }
}
