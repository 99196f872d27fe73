//! Exact counts of roots: left of, on and right of the imaginary axis; inside, on and outside the unit circle; and real
//! roots in intervals. Integers only, no approximation.
//!
//! Sources: F. R. Gantmacher, *The Theory of Matrices*, vol. 2 (1959), ch. XV: Cauchy indices by Sturm chains (§2),
//! Routh's count and its singular cases (§3, §4); W. S. Brown, J. F. Traub, "On Euclid's Algorithm and the Theory of
//! Subresultants", Journal of the ACM 18 (1971), for chains with small coefficients; G. E. Collins, A. G. Akritas,
//! "Polynomial real root isolation using Descartes' rule of signs", SYMSAC 1976.

mod routh;

use super::dense;
use dashu_base::{Sign, UnsignedAbs};
use dashu_int::IBig;
use dashu_ratio::RBig;

/// Roots by their side of the imaginary axis, with multiplicity.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct HalfPlane {
    /// With a negative real part.
    pub left: usize,
    /// On the imaginary axis.
    pub axis: usize,
    /// With a positive real part.
    pub right: usize,
}

/// Roots by their side of the unit circle, with multiplicity.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct UnitCircle {
    /// Of modulus below 1.
    pub inside: usize,
    /// Of modulus 1.
    pub on: usize,
    /// Of modulus above 1.
    pub outside: usize,
}

/// A real root and the interval that holds it and no other root.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RealRoot {
    /// Lower end; the root itself where it equals `high`.
    pub low: RBig,
    /// Upper end.
    pub high: RBig,
    /// How often the root counts.
    pub multiplicity: u32,
}

/// Which side of the imaginary axis each root is on. Coefficients from the lowest power up; no roots for a constant,
/// 0 included.
///
/// With p(iω) = U(ω) + iV(ω) and no root on the axis, the argument of p(iω) grows by π(left - right) along the axis,
/// which the Cauchy index of V/U (of U/V for odd degree) counts; where no pivot vanishes, Routh's array does, in integers
/// of bounded length with bounds on what was cut off. Roots on the axis are roots of gcd(U, V), all of whose
/// roots come in pairs r, -r; they are split off first and counted as the negative roots of a polynomial in s².
///
/// # Examples
///
/// ```
/// use loopwright::algebra::{IBig, stability::{HalfPlane, half_plane}};
/// // (s + 1)(s^2 + 4)(s - 3)
/// let p: Vec<IBig> = [-12, -8, 1, -2, 1].map(IBig::from).to_vec();
/// assert_eq!(half_plane(&p), HalfPlane { left: 1, axis: 2, right: 1 });
/// ```
pub fn half_plane(coefficients: &[IBig]) -> HalfPlane {
    let a = dense::trimmed(coefficients);
    let Some(zeros) = a.iter().position(|c| !c.is_zero()) else { return HalfPlane::default() };
    let a = dense::primitive(&a[zeros..]);
    let (even, odd) = dense::even_and_odd(&a);
    let paired = dense::primitive(&dense::gcd(&even, &odd));
    let divided = |p: &[IBig]| dense::divide_exactly(p, &paired).unwrap_or_default();
    let rest = a.len() - 1 - 2 * (paired.len() - 1);
    let (even, odd) = (divided(&even), divided(&odd));
    let right = routh::right(&even, &odd).unwrap_or_else(|| {
        let difference = left_minus_right(&even, &odd);
        (rest as isize - difference) as usize / 2
    });
    // Roots x of `paired` are squares of roots: a negative x gives two on the axis, any other one on either side.
    let negative: usize = dense::square_free(&paired)
        .iter()
        .map(|(factor, m)| *m as usize * real_count(factor, None, Some(&RBig::ZERO)))
        .sum();
    let pairs = paired.len() - 1 - negative;
    HalfPlane { left: rest - right + pairs, axis: zeros + 2 * negative, right: right + pairs }
}

/// Roots on the left less roots on the right of even(s²) + s·odd(s²), whose parts are coprime.
fn left_minus_right(even: &[IBig], odd: &[IBig]) -> isize {
    // p(iω): U(ω) = even(-ω²), V(ω) = ω·odd(-ω²).
    let alternating = |p: &[IBig]| -> Vec<IBig> {
        p.iter().enumerate().map(|(k, c)| if k % 2 == 1 { -c } else { c.clone() }).collect()
    };
    let u = dense::of_square(&alternating(even));
    let mut v = dense::of_square(&alternating(odd));
    if !v.is_empty() {
        v.insert(0, IBig::ZERO);
    }
    if u.len() > v.len() { -cauchy_index(&u, &v) } else { cauchy_index(&v, &u) }
}

/// The Cauchy index of `numerator`/`denominator` over the whole line: jumps from -∞ to +∞ less jumps from +∞ to -∞.
/// The denominator's degree is not less than the numerator's.
fn cauchy_index(denominator: &[IBig], numerator: &[IBig]) -> isize {
    let chain = Chain::new(denominator, numerator);
    chain.variations(|f| if f.len() % 2 == 0 { -lead_sign(f) } else { lead_sign(f) }) - chain.variations(lead_sign)
}

/// The sign at +∞.
fn lead_sign(f: &[IBig]) -> i32 {
    f.last().map_or(0, dense::sign)
}

/// A signed remainder sequence: each member is a positive multiple of minus the remainder of the two before it.
struct Chain(Vec<Vec<IBig>>);

impl Chain {
    /// The sequence that starts with two polynomials, the second not 0 and of no higher degree.
    fn new(first: &[IBig], second: &[IBig]) -> Self {
        let mut chain = vec![first.to_vec()];
        let mut next = second.to_vec();
        // Subresultants: the known factor g·h^d is divided out of each pseudo-remainder, its sign left aside.
        let (mut g, mut h) = (IBig::ONE, IBig::ONE);
        while !next.is_empty() {
            let last = &chain[chain.len() - 1];
            let step = last.len() - next.len();
            let remainder = negative_remainder(last, &next);
            let factor = &g * h.pow(step);
            let divided = remainder.iter().map(|c| c / &factor).collect();
            let lead = &next[next.len() - 1];
            g = IBig::from(lead.unsigned_abs());
            h = match step {
                0 => h,
                1 => g.clone(),
                _ => g.pow(step) / h.pow(step - 1),
            };
            chain.push(std::mem::replace(&mut next, divided));
        }
        Self(chain)
    }

    /// How often the sign changes along the sequence, zeros left out.
    fn variations(&self, sign: impl Fn(&[IBig]) -> i32) -> isize {
        let (mut count, mut last) = (0, 0);
        for s in self.0.iter().map(|f| sign(f)).filter(|&s| s != 0) {
            if last == -s {
                count += 1;
            }
            last = s;
        }
        count
    }
}

/// -(|lead of b|^(deg a - deg b + 1)·a mod b).
fn negative_remainder(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    let lead = &b[b.len() - 1];
    let scale = IBig::from(lead.unsigned_abs());
    let negative = lead.sign() == Sign::Negative;
    let mut rest = a.to_vec();
    for k in (0..=a.len() - b.len()).rev() {
        let top = rest.pop().unwrap_or_default();
        // scale·rest - (±top)·x^k·b: the sign makes the leading terms cancel.
        for c in &mut rest {
            if !c.is_zero() {
                *c *= &scale;
            }
        }
        if top.is_zero() {
            continue;
        }
        let top = if negative { -top } else { top };
        for (c, d) in rest[k..].iter_mut().zip(b).filter(|t| !t.1.is_zero()) {
            *c -= &top * d;
        }
    }
    dense::trim(rest.into_iter().map(|c| -c).collect())
}

/// Which side of the unit circle each root is on. Coefficients from the lowest power up; no roots for a constant.
///
/// z = (1 + s)/(1 - s) takes the left half-plane to the inside. Only z = -1 has no s; such roots are split off first.
pub fn unit_circle(coefficients: &[IBig]) -> UnitCircle {
    let mut a = dense::trimmed(coefficients).to_vec();
    if a.is_empty() {
        return UnitCircle::default();
    }
    let at_minus_one = [IBig::ONE, IBig::ONE];
    let mut on = 0;
    while let Some(quotient) = dense::divide_exactly(&a, &at_minus_one).filter(|_| a.len() > 1) {
        a = quotient;
        on += 1;
    }
    // z = -1 + 2/(1 - s): in y = 2/(1 - s) the polynomial is a(y - 1); times (1 - s)^n it is one in v = 1 - s, in which
    // the coefficient of y^k goes with 2^k v^(n-k); then v = 1 - s.
    let in_y = dense::shifted(&a, -1);
    let in_v: Vec<IBig> = in_y.iter().enumerate().rev().map(|(k, c)| c << k).collect();
    let in_minus_s = dense::shifted(&in_v, 1);
    let in_s: Vec<IBig> = in_minus_s.iter().enumerate().map(|(k, c)| if k % 2 == 1 { -c } else { c.clone() }).collect();
    let HalfPlane { left, axis, right } = half_plane(&in_s);
    UnitCircle { inside: left, on: on + axis, outside: right }
}

/// How many distinct real roots are above `low` and not above `high` (no bound where `None`), by Sturm's theorem.
pub fn real_count(coefficients: &[IBig], low: Option<&RBig>, high: Option<&RBig>) -> usize {
    let a = dense::trimmed(coefficients);
    if a.len() < 2 {
        return 0;
    }
    let chain = Chain::new(a, &dense::derivative(a));
    let minus = |f: &[IBig]| if f.len().is_multiple_of(2) { -lead_sign(f) } else { lead_sign(f) };
    let at = |x: &RBig, f: &[IBig]| dense::sign_at(f, x.numerator(), &IBig::from(x.denominator().clone()));
    // Where an end is a multiple root every member vanishes; dividing by the last, the gcd, changes no sign elsewhere.
    let chain = chain.without_gcd();
    let below = low.map_or_else(|| chain.variations(minus), |x| chain.variations(|f| at(x, f)));
    let above = high.map_or_else(|| chain.variations(lead_sign), |x| chain.variations(|f| at(x, f)));
    (below - above).max(0) as usize
}

impl Chain {
    /// Every member divided by the last one.
    fn without_gcd(self) -> Self {
        match self.0.last() {
            Some(g) if g.len() > 1 => {
                let g = dense::primitive(g);
                Self(self.0.iter().map(|f| dense::divide_exactly(f, &g).unwrap_or_default()).collect())
            }
            _ => self,
        }
    }
}

/// All real roots in rising order, each in an interval of its own that is not wider than 2^-`bits` and no longer than
/// that part of the root's magnitude; where both ends are equal, they are the root.
pub fn real_roots(coefficients: &[IBig], bits: usize) -> Vec<RealRoot> {
    let a = dense::trimmed(coefficients);
    let Some(zeros) = a.iter().position(|c| !c.is_zero()) else { return Vec::new() };
    let mut out = Vec::new();
    if zeros > 0 {
        out.push(RealRoot { low: RBig::ZERO, high: RBig::ZERO, multiplicity: zeros as u32 });
    }
    let square_free = dense::square_free(&a[zeros..]);
    for (factor, multiplicity) in &square_free {
        let mirrored: Vec<IBig> =
            factor.iter().enumerate().map(|(k, c)| if k % 2 == 1 { -c } else { c.clone() }).collect();
        for interval in positive_roots(factor) {
            let (low, high) = interval.bisected(factor, bits);
            out.push(RealRoot { low, high, multiplicity: *multiplicity });
        }
        for interval in positive_roots(&mirrored) {
            let (low, high) = interval.bisected(&mirrored, bits);
            out.push(RealRoot { low: -high, high: -low, multiplicity: *multiplicity });
        }
    }
    // Roots of different factors differ, but their intervals may still overlap.
    while let Some(width) = overlap(&mut out) {
        for root in &mut out {
            let Some((factor, _)) = square_free.iter().find(|f| f.1 == root.multiplicity) else { continue };
            let (low, high) = narrowed(factor, root.low.clone(), root.high.clone(), &width);
            (root.low, root.high) = (low, high);
        }
    }
    out
}

/// Sorts the intervals; where two overlap, gives a width to narrow them to.
fn overlap(all: &mut [RealRoot]) -> Option<RBig> {
    all.sort_by(|a, b| a.low.cmp(&b.low).then_with(|| a.high.cmp(&b.high)));
    let widest = |a: &RealRoot, b: &RealRoot| (&a.high - &a.low).max(&b.high - &b.low);
    all.windows(2).find(|w| w[1].low <= w[0].high).map(|w| widest(&w[0], &w[1]) / RBig::from(2))
}

/// Halves an interval with one simple root until it is no wider than `width`.
fn narrowed(factor: &[IBig], mut low: RBig, mut high: RBig, width: &RBig) -> (RBig, RBig) {
    let sign_of = |f: &[IBig], x: &RBig| dense::sign_at(f, x.numerator(), &IBig::from(x.denominator().clone()));
    let sign = |x: &RBig| sign_of(factor, x);
    // The upper end may be a root of its own; just below it, the sign is then minus the derivative's.
    let at_high = match sign(&high) {
        0 => -sign_of(&dense::derivative(factor), &high),
        s => s,
    };
    while &(&high - &low) > width {
        let middle = (&low + &high) / RBig::from(2);
        match sign(&middle) {
            0 => return (middle.clone(), middle),
            s if s == at_high => high = middle,
            _ => low = middle,
        }
    }
    (low, high)
}

/// The interval from c/2^k to (c + 1)/2^k, or the point c/2^k.
struct Dyadic {
    c: IBig,
    k: isize,
    point: bool,
}

impl Dyadic {
    /// c/2^k.
    fn fraction(c: &IBig, k: isize) -> RBig {
        if k <= 0 {
            RBig::from(c << (-k) as usize)
        } else {
            RBig::from_parts(c.clone(), dashu_int::UBig::ONE << k as usize)
        }
    }
    /// Its ends, after narrowing to 2^-bits of the root and of 1.
    fn bisected(&self, factor: &[IBig], bits: usize) -> (RBig, RBig) {
        let low = Self::fraction(&self.c, self.k);
        if self.point {
            return (low.clone(), low);
        }
        let high = Self::fraction(&(&self.c + IBig::ONE), self.k);
        let tiny = RBig::from_parts(IBig::ONE, dashu_int::UBig::ONE << bits);
        let (mut low, mut high) = narrowed(factor, low, high, &tiny);
        // Relative to a root below 1.
        while &high - &low > &high * &tiny {
            let width = (&high - &low) / RBig::from(2);
            (low, high) = narrowed(factor, low, high, &width);
        }
        (low, high)
    }
}

/// Isolating intervals of the positive roots of a square-free polynomial that has no root 0, by bisection and
/// Descartes' rule of signs.
fn positive_roots(a: &[IBig]) -> Vec<Dyadic> {
    // All roots are below 2^reach (A.-L. Cauchy's bound 1 + max|a_k/a_n|, generously).
    let lead = dense::bits(&a[a.len() - 1]);
    let reach = (dense::height_bits(a) + 2).saturating_sub(lead);
    // a(2^reach·x): roots in (0, 1).
    let scaled: Vec<IBig> = a.iter().enumerate().map(|(k, c)| c << (k * reach)).collect();
    let mut out = Vec::new();
    // Each entry: the polynomial whose roots in (0, 1) are those in (c/2^k, (c + 1)/2^k).
    let mut stack = vec![(scaled, IBig::ZERO, 0usize)];
    while let Some((p, c, k)) = stack.pop() {
        // x = 1/(1 + y): roots in (0, 1) become positive ones.
        let image = dense::shifted(&p.iter().rev().cloned().collect::<Vec<_>>(), 1);
        let depth = k as isize - reach as isize;
        match sign_changes(&image) {
            0 => {}
            1 => out.push(Dyadic { c, k: depth, point: false }),
            _ => {
                let n = p.len() - 1;
                let left: Vec<IBig> = p.iter().enumerate().map(|(j, x)| x << (n - j)).collect();
                let mut right = dense::shifted(&left, 1);
                let c0: IBig = &c * 2;
                let c1 = &c0 + IBig::ONE;
                if right[0].is_zero() {
                    out.push(Dyadic { c: c1.clone(), k: depth + 1, point: true });
                    right.remove(0);
                }
                stack.push((right, c1, k + 1));
                stack.push((left, c0, k + 1));
            }
        }
    }
    out
}

/// Sign changes along the coefficients, zeros left out.
fn sign_changes(a: &[IBig]) -> usize {
    let signs: Vec<i32> = a.iter().map(dense::sign).filter(|&s| s != 0).collect();
    signs.windows(2).filter(|w| w[0] != w[1]).count()
}

#[cfg(test)]
mod tests;
