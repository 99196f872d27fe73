//! Horner's rule in integers of 128 bits, for the precision that most roots need: no allocation, a tenth of the time.

use super::point::Point;
use dashu_int::IBig;

/// Bits of a mantissa. Cutting products to them costs a few more at each step, see [`PRECISION`].
const BITS: i64 = 118;
/// Bits that count as kept: each step cuts off less than 2^(4 - `PRECISION`) of its two summands.
pub(super) const PRECISION: usize = 112;

/// (re + i·im)·2^exp with parts below 2^120 in magnitude.
#[derive(Clone, Copy, Default)]
pub(super) struct Narrow {
    pub(super) re: i128,
    pub(super) im: i128,
    pub(super) exp: i64,
}

/// a·b/2^120 for magnitudes below 2^120, cut towards 0.
fn product(a: i128, b: i128) -> i128 {
    let (x, y) = (a.unsigned_abs(), b.unsigned_abs());
    let (x1, x0) = ((x >> 64) as u64, x as u64);
    let (y1, y0) = ((y >> 64) as u64, y as u64);
    let wide = |p: u64, q: u64| u128::from(p) * u128::from(q);
    let low = wide(x0, y0);
    // Below 2^120 + 2^120 + 2^64: no overflow, as x1 and y1 are below 2^56.
    let middle = wide(x1, y0) + wide(x0, y1) + (low >> 64);
    let high = wide(x1, y1) + (middle >> 64);
    let magnitude = ((high << 8) | u128::from(middle as u64 >> 56)) as i128;
    if (a < 0) == (b < 0) { magnitude } else { -magnitude }
}

/// x·2^-shift, rounded down; x·2^shift where negative, which the caller knows to fit.
fn shifted(x: i128, shift: i64) -> i128 {
    if shift >= 0 { x >> shift.min(127) } else { x << (-shift).min(127) }
}

impl Narrow {
    /// Exponent of a power of two above both parts; `None` for 0.
    fn top(self) -> Option<i64> {
        let m = self.re.unsigned_abs().max(self.im.unsigned_abs());
        (m != 0).then(|| self.exp + 128 - i64::from(m.leading_zeros()))
    }
    /// A point of at most [`PRECISION`] bits, shifted up to the most that parts can have; 0 for 0.
    pub(super) fn new(re: &IBig, im: &IBig, exp: i64) -> Self {
        let part = |c: &IBig| i128::try_from(c).unwrap_or_default();
        let mut out = Self { re: part(re), im: part(im), exp };
        let Some(top) = out.top() else { return Self::default() };
        let shift = top - exp - 120;
        (out.re, out.im, out.exp) = (shifted(out.re, shift), shifted(out.im, shift), exp + shift);
        out
    }
    /// Its parts, whole, and their exponent.
    pub(super) fn point(self) -> Point {
        Point { re: IBig::from(self.re), im: IBig::from(self.im), exp: self.exp }
    }
    /// self·z + c, to [`BITS`] bits of the larger summand.
    pub(super) fn step(self, z: Self, c: Self) -> Self {
        let re = product(self.re, z.re) - product(self.im, z.im);
        let im = product(self.re, z.im) + product(self.im, z.re);
        let moved = Self { re, im, exp: self.exp + z.exp + 120 };
        let top = match (moved.top(), c.top()) {
            (Some(a), Some(b)) => a.max(b),
            (Some(a), None) => a,
            (None, Some(b)) => b,
            (None, None) => return Self::default(),
        };
        let floor = top - BITS;
        let sum = |x: i128, y: i128| {
            let x = if x == 0 { 0 } else { shifted(x, floor - moved.exp) };
            x + if y == 0 { 0 } else { shifted(y, floor - c.exp) }
        };
        Self { re: sum(moved.re, c.re), im: sum(moved.im, c.im), exp: floor }
    }
}
