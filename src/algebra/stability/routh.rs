//! Routh's array in integers of bounded length.
//!
//! Exact entries grow to n times the length of the coefficients; only the signs of the first column are wanted. Each
//! entry is cut to a number of bits, with a bound on its error; the precision is doubled until no sign is in doubt.
//! Source: F. R. Gantmacher, *The Theory of Matrices*, vol. 2 (1959), ch. XV §3 (the regular case).

use super::super::dense;
use dashu_base::{Sign, UnsignedAbs};
use dashu_int::IBig;

/// Bits of the first attempt.
const FIRST_PRECISION: usize = 192;

/// A number between (m - 2^(error - exp))·2^exp and (m + 2^(error - exp))·2^exp; exact where `error` is `EXACT`.
#[derive(Clone)]
struct Ball {
    m: IBig,
    exp: i64,
    error: i64,
}

/// The error of an exact entry: so far down that no sum of real exponents gets there.
const EXACT: i64 = i64::MIN / 8;

impl Ball {
    /// An exact number, cut to `precision` bits.
    fn new(c: &IBig, precision: usize) -> Self {
        Self { m: c.clone(), exp: 0, error: EXACT }.cut(precision)
    }
    /// Exponent of a power of two above the magnitude of the midpoint.
    fn top(&self) -> i64 {
        if self.m.is_zero() { EXACT } else { self.exp + dense::bits(&self.m) as i64 }
    }
    fn cut(self, precision: usize) -> Self {
        let shift = dense::bits(&self.m).saturating_sub(precision);
        if shift == 0 {
            return self;
        }
        let exp = self.exp + shift as i64;
        Self { m: self.m >> shift, exp, error: self.error.max(exp) + 1 }
    }
    fn mul(&self, other: &Self) -> Self {
        // |a|·δb + |b|·δa + δa·δb, three summands: at most 4 times the largest.
        let errors = [self.top() + other.error, other.top() + self.error, self.error + other.error];
        let largest = errors.into_iter().max().unwrap_or(EXACT);
        let error = if self.error == EXACT && other.error == EXACT { EXACT } else { largest.max(EXACT) + 2 };
        Self { m: &self.m * &other.m, exp: self.exp + other.exp, error }
    }
    fn sub(self, other: Self) -> Self {
        let error = if self.error == EXACT && other.error == EXACT { EXACT } else { self.error.max(other.error) + 1 };
        if other.m.is_zero() {
            return Self { error, ..self };
        }
        if self.m.is_zero() {
            return Self { m: -other.m, exp: other.exp, error };
        }
        let exp = self.exp.min(other.exp);
        let at = |b: Self| b.m << (b.exp - exp) as usize;
        Self { m: at(self) - at(other), exp, error }
    }
    /// The sign, where it is certain; 0 is never certain but for an exact entry.
    fn sign(&self) -> Option<i32> {
        if self.error == EXACT || self.top() - 1 > self.error { Some(dense::sign(&self.m)) } else { None }
    }
    fn magnitude(&self) -> Self {
        Self { m: IBig::from((&self.m).unsigned_abs()), ..*self }
    }
}

/// How many roots of even(s²) + s·odd(s²) are on the right; `None` where a pivot is 0 or would take too many bits to
/// tell from it, so that the exact way is no dearer.
pub(super) fn right(even: &[IBig], odd: &[IBig]) -> Option<usize> {
    let degree = (2 * even.len()).max(2 * odd.len() + 1).checked_sub(2)?;
    let (first, second) = if degree % 2 == 0 { (even, odd) } else { (odd, even) };
    // A missing second row's head is a pivot 0.
    if second.len() < first.len() - usize::from(degree % 2 == 0) {
        return None;
    }
    let longest = dense::height_bits(even).max(dense::height_bits(odd));
    let most = (longest * degree / 4).max(4 * FIRST_PRECISION);
    let mut precision = FIRST_PRECISION;
    while precision <= most {
        if let Some(changes) = sign_changes(first, second, degree, precision) {
            return Some(changes);
        }
        precision *= 2;
    }
    None
}

/// Sign changes down the first column. Every row but the first two is a positive multiple of Routh's.
fn sign_changes(first: &[IBig], second: &[IBig], degree: usize, precision: usize) -> Option<usize> {
    let row = |a: &[IBig]| -> Vec<Ball> { a.iter().rev().map(|c| Ball::new(c, precision)).collect() };
    let (mut above, mut below) = (row(first), row(second));
    let mut last = above.first()?.sign().filter(|&s| s != 0)?;
    let mut changes = 0;
    for _ in 0..degree {
        let pivot = below.first()?;
        let sign = pivot.sign().filter(|&s| s != 0)?;
        if sign != last {
            changes += 1;
        }
        last = sign;
        // |pivot|·above - sign·(head of above)·below, the head dropped
        let (scale, mut head) = (pivot.magnitude(), above[0].clone());
        if pivot.m.sign() == Sign::Negative {
            head.m = -head.m;
        }
        let mut next: Vec<Ball> = (1..above.len())
            .map(|j| {
                let product = above[j].mul(&scale);
                let entry = if let Some(b) = below.get(j) { product.sub(head.mul(b)) } else { product };
                entry.cut(precision)
            })
            .collect();
        // Exponents would double from row to row; a power of two less changes no sign.
        let top = next.iter().map(Ball::top).max().unwrap_or(0);
        for b in next.iter_mut().filter(|_| top > EXACT) {
            b.exp -= top;
            b.error = if b.error == EXACT { EXACT } else { b.error - top };
        }
        above = std::mem::replace(&mut below, next);
    }
    Some(changes)
}
