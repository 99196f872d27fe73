//! All roots of a polynomial with whole coefficients, certified and in full double precision.
//!
//! The polynomial is split exactly before any approximation: powers of the variable, square-free factors (so that
//! multiplicities are exact), the part whose roots come in pairs r, -r (which holds every root on the imaginary axis)
//! and the part whose roots come in pairs r, 1/r (which holds every root on the unit circle). Of each part, all roots
//! are approximated at once (module `start`), parted by inclusion discs in as much precision as that takes
//! (`isolate`), and refined one by one (`refine`).
//!
//! That a root is real, on the axis or on the circle is proved, never read off a tolerance: the mirror image of a root
//! is a root, and where the image of its disc meets no disc but its own, the root is its own image.

mod isolate;
mod narrow;
mod point;
mod refine;
mod start;
mod wide;

use super::dense;
use super::{Poly, Var};
use dashu_int::IBig;

/// A root with its multiplicity.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RootOf {
    /// Real part, correctly rounded; exactly 0 where the root is on the imaginary axis, never -0.
    pub re: f64,
    /// Imaginary part, correctly rounded; exactly 0 where the root is real, never -0.
    pub im: f64,
    /// How often it counts; exact.
    pub multiplicity: u32,
    /// The exact root lies within this distance of (re, im).
    pub radius: f64,
    /// Whether it is exactly on the imaginary axis.
    pub on_axis: bool,
    /// Whether it is exactly on the unit circle.
    pub on_circle: bool,
}

/// Why there are no roots to tell.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RootsError {
    /// Every number is a root of the polynomial 0.
    Zero,
    /// Another variable than the one asked for occurs.
    OtherVariable,
    /// Roots remained that could not be told apart with the most precision allowed.
    NoConvergence {
        /// How many.
        unparted: usize,
        /// Bits.
        precision: usize,
    },
    /// A root is too large for double precision.
    OutOfRange,
}

/// Which mirror images of a polynomial's roots are known to be roots as well.
#[derive(Clone, Copy, Debug)]
struct Symmetry {
    /// -r with r.
    axis: bool,
    /// 1/r with r.
    circle: bool,
}

/// All roots of a polynomial given by its coefficients, the lowest power first; ordered by real, then imaginary part.
///
/// Conjugates are exactly conjugate. The same coefficients give the same bytes whatever the number of threads.
///
/// # Errors
///
/// [`RootsError::Zero`] for the polynomial 0; [`RootsError::NoConvergence`] where roots are closer together than the
/// greatest precision tells, [`RootsError::OutOfRange`] where one is beyond 1.8e308.
///
/// # Examples
///
/// ```
/// use loopwright::algebra::{IBig, roots::roots};
/// // (s + 2)^2 (s^2 + 9)
/// let p: Vec<IBig> = [36, 36, 13, 4, 1].map(IBig::from).to_vec();
/// let found: Vec<_> = roots(&p).unwrap().iter().map(|r| (r.re, r.im, r.multiplicity)).collect();
/// assert_eq!(found, [(-2.0, 0.0, 2), (0.0, -3.0, 1), (0.0, 3.0, 1)]);
/// ```
pub fn roots(coefficients: &[IBig]) -> Result<Vec<RootOf>, RootsError> {
    let a = dense::trimmed(coefficients);
    let zeros = a.iter().position(|c| !c.is_zero()).ok_or(RootsError::Zero)?;
    let mut out = Vec::new();
    if zeros > 0 {
        let multiplicity = zeros as u32;
        out.push(RootOf { re: 0.0, im: 0.0, multiplicity, radius: 0.0, on_axis: true, on_circle: false });
    }
    for (factor, multiplicity) in dense::square_free(&a[zeros..]) {
        for (part, symmetry) in split(factor) {
            let isolated = isolate::isolate(&part, start::approximate(&part), symmetry)?;
            out.extend(refine::refine(&part, &isolated, multiplicity)?);
        }
    }
    out.sort_by(|a, b| a.re.total_cmp(&b.re).then(a.im.total_cmp(&b.im)));
    Ok(out)
}

/// [`roots()`] of a polynomial in the main variable alone.
///
/// # Errors
///
/// As [`roots()`], and [`RootsError::OtherVariable`].
pub fn roots_of(poly: &Poly) -> Result<Vec<RootOf>, RootsError> {
    roots(&poly.to_dense(Var::S).ok_or(RootsError::OtherVariable)?)
}

/// A square-free polynomial without root 0, in parts of known symmetry.
fn split(factor: Vec<IBig>) -> Vec<(Vec<IBig>, Symmetry)> {
    let (even, odd) = dense::even_and_odd(&factor);
    let paired = dense::of_square(&dense::primitive(&dense::gcd(&even, &odd)));
    let mut out = Vec::new();
    for (part, axis) in halves(factor, &paired) {
        let inverse = dense::primitive(&dense::gcd(&part, &dense::reversed(&part)));
        for (part, circle) in halves(part, &inverse) {
            out.push((part, Symmetry { axis, circle }));
        }
    }
    out
}

/// A factor (with `true`) and its cofactor (with `false`), leaving out what is constant.
fn halves(whole: Vec<IBig>, factor: &[IBig]) -> Vec<(Vec<IBig>, bool)> {
    if factor.len() < 2 {
        return vec![(whole, false)];
    }
    let cofactor = dense::divide_exactly(&whole, factor).unwrap_or_default();
    let mut out = vec![(factor.to_vec(), true)];
    if cofactor.len() > 1 {
        out.push((cofactor, false));
    }
    out
}

#[cfg(test)]
mod tests;
