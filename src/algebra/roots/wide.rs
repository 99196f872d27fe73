//! Complex numbers of double precision with an exponent of their own: coefficients of thousands of bits, and their
//! products with high powers, neither overflow nor underflow.

use dashu_base::{Sign, UnsignedAbs};
use dashu_int::IBig;

/// Beyond this difference of exponents the smaller of two summands no longer matters (53 bits, and some room).
const NEGLIGIBLE: i64 = 200;

/// (re + i·im)·2^exp with the larger of |re|, |im| in [1, 2), or 0.
#[derive(Clone, Copy, Debug)]
pub(super) struct Wide {
    /// Real part of the mantissa.
    pub(super) re: f64,
    /// Imaginary part of the mantissa.
    pub(super) im: f64,
    /// Binary exponent of both.
    pub(super) exp: i64,
}

/// 2^k for -1022 ≤ k ≤ 1023.
fn power_of_two(k: i64) -> f64 {
    f64::from_bits(((k + 1023) as u64) << 52)
}

impl Wide {
    /// 0.
    pub(super) const ZERO: Self = Self { re: 0.0, im: 0.0, exp: 0 };

    /// (re + i·im)·2^exp; the parts are finite and, unless 0, of moderate size.
    pub(super) fn new(re: f64, im: f64, exp: i64) -> Self {
        let m = re.abs().max(im.abs());
        if m == 0.0 {
            return Self::ZERO;
        }
        let e = ((m.to_bits() >> 52) & 0x7ff) as i64 - 1023;
        let scale = power_of_two((-e).clamp(-1022, 1023));
        Self { re: re * scale, im: im * scale, exp: exp + e }
    }
    /// A positive real number by its logarithm to base 2, and its angle.
    pub(super) fn polar(log2: f64, angle: f64) -> Self {
        let whole = libm::floor(log2);
        let m = libm::exp2(log2 - whole);
        Self::new(m * libm::cos(angle), m * libm::sin(angle), whole as i64)
    }
    /// The nearest value of an exact number re + i·im times 2^exp; correct to 2^-52 of its modulus.
    pub(super) fn from_parts(re: &IBig, im: &IBig, exp: i64) -> Self {
        let bits = super::super::dense::bits(re).max(super::super::dense::bits(im));
        let shift = bits.saturating_sub(62);
        let part = |c: &IBig| {
            let m = c.unsigned_abs() >> shift;
            let f = u64::try_from(m).unwrap_or(u64::MAX) as f64;
            if c.sign() == Sign::Negative { -f } else { f }
        };
        Self::new(part(re), part(im), exp + shift as i64)
    }
    /// Whether it is 0.
    pub(super) fn is_zero(self) -> bool {
        self.re == 0.0 && self.im == 0.0
    }
    /// Sum.
    pub(super) fn add(self, other: Self) -> Self {
        if self.is_zero() {
            return other;
        }
        if other.is_zero() {
            return self;
        }
        let (high, low) = if self.exp >= other.exp { (self, other) } else { (other, self) };
        let gap = high.exp - low.exp;
        if gap > NEGLIGIBLE {
            return high;
        }
        let scale = power_of_two(-gap);
        Self::new(high.re + low.re * scale, high.im + low.im * scale, high.exp)
    }
    /// The negative.
    pub(super) fn neg(self) -> Self {
        Self { re: -self.re, im: -self.im, exp: self.exp }
    }
    /// Difference.
    pub(super) fn sub(self, other: Self) -> Self {
        self.add(other.neg())
    }
    /// Product.
    pub(super) fn mul(self, other: Self) -> Self {
        Self::new(
            self.re * other.re - self.im * other.im,
            self.re * other.im + self.im * other.re,
            self.exp + other.exp,
        )
    }
    /// 1/self; `None` for 0.
    pub(super) fn recip(self) -> Option<Self> {
        if self.is_zero() {
            return None;
        }
        let square = self.re * self.re + self.im * self.im;
        Some(Self::new(self.re / square, -self.im / square, -self.exp))
    }
    /// Its modulus as a real number.
    pub(super) fn abs(self) -> Self {
        Self::new(libm::sqrt(self.re * self.re + self.im * self.im), 0.0, self.exp)
    }
    /// Logarithm to base 2 of the modulus; -∞ for 0.
    pub(super) fn log2(self) -> f64 {
        if self.is_zero() {
            return f64::NEG_INFINITY;
        }
        self.exp as f64 + 0.5 * libm::log2(self.re * self.re + self.im * self.im)
    }
}
