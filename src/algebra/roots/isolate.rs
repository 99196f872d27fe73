//! Roots parted: approximations of as much precision as it takes for their inclusion discs to be disjoint, and for
//! each root's symmetry (real, on the axis, on the circle) to be proved.
//!
//! Sources: B. T. Smith, "Error bounds for zeros of a polynomial based upon Gerschgorin's theorems", Journal of the
//! ACM 17 (1970), for the discs; O. Aberth (1973, see [`super::start`]) for the iteration; D. A. Bini and G. Fiorentino,
//! "Design, analysis, and implementation of a multiprecision polynomial rootfinder", Numerical Algorithms 23 (2000),
//! for doubling the precision only of what is not parted yet.

use super::point::{Point, Rounded};
use super::wide::Wide;
use super::{RootsError, Symmetry};
use dashu_int::IBig;
use rayon::prelude::*;

/// Bits of the first evaluation in more than double precision.
pub(super) const FIRST_PRECISION: usize = super::narrow::PRECISION;
/// Bits at which the search ends: roots this close together are beyond any model.
pub(super) const MOST_PRECISION: usize = 1 << 17;
/// Most sweeps at one precision.
const SWEEPS: usize = 100;
/// A correction this much smaller than the distance to the nearest neighbour is of no use for parting (log 2).
const PARTED: f64 = -20.0;
/// Room for the rounding of sums of logarithms.
const SLACK: f64 = 1e-3;

/// One root, alone in its disc.
#[derive(Clone, Debug)]
pub(super) struct Isolated {
    /// The centre.
    pub(super) point: Point,
    /// Lower bound on the distance to every other root's disc, log 2.
    pub(super) gap: f64,
    /// Which root is its conjugate: itself where it is real.
    pub(super) conjugate: usize,
    /// Proved to be on the imaginary axis.
    pub(super) on_axis: bool,
    /// Proved to be on the unit circle.
    pub(super) on_circle: bool,
}

/// log2(2^a + 2^b)
fn log_sum(a: f64, b: f64) -> f64 {
    let (high, low) = if a >= b { (a, b) } else { (b, a) };
    if high == f64::NEG_INFINITY { high } else { high + libm::log1p(libm::exp2(low - high)) / std::f64::consts::LN_2 }
}

/// The discs of one set of approximations.
struct Discs {
    points: Vec<Point>,
    /// log 2 of a bound on |p(z_i)|; NaN where not known.
    values: Vec<f64>,
    /// log 2 of the radii.
    radii: Vec<f64>,
}

/// Parts the roots of a square-free polynomial that has no root 0.
pub(super) fn isolate(exact: &[IBig], start: Vec<Wide>, symmetry: Symmetry) -> Result<Vec<Isolated>, RootsError> {
    let n = start.len();
    let lead = Wide::from_parts(&exact[n], &IBig::ZERO, 0).log2();
    let points: Vec<Point> = start.into_iter().map(|w| Point::from_wide(w).rounded(FIRST_PRECISION)).collect();
    let mut discs = Discs { points, values: vec![f64::NAN; n], radii: vec![f64::INFINITY; n] };
    let mut precision = FIRST_PRECISION;
    let mut open: Vec<usize> = (0..n).collect();
    while precision <= MOST_PRECISION {
        let rounded = Rounded::new(exact, precision);
        // The first time round, most approximations are good already; look before moving them.
        if precision > FIRST_PRECISION {
            discs.sweep(&rounded, &open, precision);
        }
        let done = discs.measure(&rounded, lead, symmetry);
        if done.iter().all(Option::is_some) {
            return Ok(done.into_iter().flatten().collect());
        }
        open = (0..n).filter(|&i| done[i].is_none()).collect();
        if precision == FIRST_PRECISION {
            discs.sweep(&rounded, &open, precision);
            let done = discs.measure(&rounded, lead, symmetry);
            if done.iter().all(Option::is_some) {
                return Ok(done.into_iter().flatten().collect());
            }
            open = (0..n).filter(|&i| done[i].is_none()).collect();
        }
        // Values that were mere noise are worth another look with more bits.
        for &i in &open {
            discs.values[i] = f64::NAN;
        }
        precision *= 2;
    }
    Err(RootsError::NoConvergence { unparted: open.len(), precision: MOST_PRECISION })
}

impl Discs {
    /// Aberth's iteration for the open roots, all of a sweep from the same old values, so that threads change nothing.
    fn sweep(&mut self, rounded: &Rounded, open: &[usize], precision: usize) {
        let mut moving = open.to_vec();
        for _ in 0..SWEEPS {
            let near = self.near();
            let steps: Vec<Option<(Wide, bool)>> = moving.par_iter().map(|&i| self.step(rounded, &near, i)).collect();
            let mut next = Vec::new();
            for (&i, step) in moving.iter().zip(steps) {
                let Some((step, more)) = step else { continue };
                self.points[i] = self.points[i].plus(step, precision);
                self.values[i] = f64::NAN;
                if more {
                    next.push(i);
                }
            }
            moving = next;
            if moving.is_empty() {
                break;
            }
        }
    }

    /// The approximations in double precision.
    fn near(&self) -> Vec<Wide> {
        self.points.iter().map(Point::to_wide).collect()
    }

    /// The correction of one root and whether more of them are worth while; `None` where its value is mere noise.
    fn step(&self, rounded: &Rounded, near: &[Wide], i: usize) -> Option<(Wide, bool)> {
        let at = rounded.at(&self.points[i], true);
        if at.value.log2() < at.value_error {
            return None;
        }
        let (mut pull, mut nearest) = (Wide::ZERO, f64::INFINITY);
        for (j, other) in self.points.iter().enumerate().filter(|t| t.0 != i) {
            let difference = self.points[i].apart(near[i], other, near[j]);
            // Two approximations in one place: any small move parts them.
            let Some(reciprocal) = difference.recip() else {
                let nudge = Wide::new(1.0, if i > j { 0.5 } else { -0.5 }, -40);
                return Some((self.points[i].to_wide().mul(nudge), true));
            };
            nearest = nearest.min(difference.log2());
            pull = pull.add(reciprocal);
        }
        let ratio = at.slope.mul(at.value.recip()?);
        let step = ratio.sub(pull).recip()?.neg();
        Some((step, step.log2() > nearest + PARTED - libm::log2(rounded.degree() as f64)))
    }

    /// Radii of the discs, and of each root that is proved to be alone in its disc, what is known of it.
    fn measure(&mut self, rounded: &Rounded, lead: f64, symmetry: Symmetry) -> Vec<Option<Isolated>> {
        let n = self.points.len();
        let stale: Vec<usize> = (0..n).filter(|&i| self.values[i].is_nan()).collect();
        let fresh: Vec<f64> = stale
            .par_iter()
            .map(|&i| {
                let at = rounded.at(&self.points[i], false);
                log_sum(at.value.log2(), at.value_error)
            })
            .collect();
        for (i, v) in stale.into_iter().zip(fresh) {
            self.values[i] = v;
        }
        let log_n = libm::log2(n as f64);
        let near = self.near();
        // log 2 of all distances; -∞ where two approximations are in one place, which makes their radii infinite.
        let distances: Vec<Vec<f64>> = (0..n)
            .into_par_iter()
            .map(|i| (0..i).map(|j| self.points[i].apart(near[i], &self.points[j], near[j]).log2()).collect())
            .collect();
        let distance = |i: usize, j: usize| if i > j { distances[i][j] } else { distances[j][i] };
        self.radii = (0..n)
            .map(|i| {
                let product: f64 = (0..n).filter(|&j| j != i).map(|j| distance(i, j)).sum();
                log_n + self.values[i] - lead - product + SLACK
            })
            .collect();
        (0..n).into_par_iter().map(|i| self.judge(i, symmetry, &near, &distance)).collect()
    }

    /// What is proved of root `i`; `None` where its disc is not far enough from the others yet.
    fn judge(
        &self,
        i: usize,
        symmetry: Symmetry,
        near: &[Wide],
        distance: &impl Fn(usize, usize) -> f64,
    ) -> Option<Isolated> {
        let n = self.points.len();
        let radius = self.radii[i];
        let mut gap = f64::INFINITY;
        for j in (0..n).filter(|&j| j != i) {
            let d = distance(i, j) - SLACK;
            // d - r_j, not less than d/2 where r_j is at most d/2.
            if self.radii[j] > d - 1.0 {
                return None;
            }
            gap = gap.min(d - 1.0);
        }
        // Newton's iteration certainly converges from within a disc that is small beside the gap.
        if radius + libm::log2(4.0 * n as f64) > gap {
            return None;
        }
        let only = |image: &dyn Fn(usize) -> f64, image_radius: f64| {
            let mut met = (0..n).filter(|&j| image(j) - SLACK <= log_sum(image_radius, self.radii[j]));
            let first = met.next()?;
            met.next().is_none().then_some(first)
        };
        // The image of a root is a root. Where the image of its disc meets one disc only, that is where it is.
        let point = &self.points[i];
        let conjugate = point.conjugate();
        let image = conjugate.to_wide();
        let pair = only(&|j| conjugate.apart(image, &self.points[j], near[j]).log2(), radius)?;
        let on_axis = symmetry.axis && {
            let mirrored = point.mirrored();
            let image = mirrored.to_wide();
            only(&|j| mirrored.apart(image, &self.points[j], near[j]).log2(), radius)? == i
        };
        let on_circle = symmetry.circle && {
            // |1/conj(z) - 1/conj(c)| ≤ r/((|c| - r)·|c|) for |z - c| ≤ r; here r ≤ |c|/2.
            let modulus = point.to_wide().log2();
            if radius > modulus - 1.0 {
                return None;
            }
            let image_radius = radius - 2.0 * modulus + 1.0 + SLACK;
            only(&|j| point.circle_defect(&self.points[j]).log2() - modulus, image_radius)? == i
        };
        Some(Isolated { point: point.clone(), gap, conjugate: pair, on_axis, on_circle })
    }
}
