//! Complex numbers of any precision, and exact polynomials evaluated there with a bound on the error.

use super::super::dense::bits;
use super::narrow::{self, Narrow};
use super::wide::Wide;
use dashu_int::IBig;

/// (re + i·im)·2^exp.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Point {
    /// Real part, times 2^-exp.
    pub(super) re: IBig,
    /// Imaginary part, times 2^-exp.
    pub(super) im: IBig,
    /// Binary exponent of both.
    pub(super) exp: i64,
}

/// x·2^shift, rounded down.
fn shifted(x: IBig, shift: i64) -> IBig {
    if shift >= 0 { x << shift as usize } else { x >> (-shift) as usize }
}

impl Point {
    /// The exact value of a number of double precision.
    pub(super) fn from_wide(w: Wide) -> Self {
        // Mantissas below 2 times 2^62 are whole up to what lies 2^-62 below the larger part.
        let part = |x: f64| IBig::from((x * (1u64 << 62) as f64) as i64);
        Self { re: part(w.re), im: part(w.im), exp: w.exp - 62 }
    }
    /// Its value in double precision.
    pub(super) fn to_wide(&self) -> Wide {
        Wide::from_parts(&self.re, &self.im, self.exp)
    }
    /// The mantissas of both with the lower of the two exponents.
    fn aligned(&self, other: &Self) -> (Self, Self) {
        let exp = self.exp.min(other.exp);
        let to =
            |p: &Self| Self { re: shifted(p.re.clone(), p.exp - exp), im: shifted(p.im.clone(), p.exp - exp), exp };
        (to(self), to(other))
    }
    /// self - other; exact until it is rounded to double precision.
    pub(super) fn minus(&self, other: &Self) -> Wide {
        let (a, b) = self.aligned(other);
        Wide::from_parts(&(a.re - b.re), &(a.im - b.im), a.exp)
    }
    /// self - other to 2^-30 of itself, from their values in double precision where these are far enough apart.
    pub(super) fn apart(&self, near: Wide, other: &Self, other_near: Wide) -> Wide {
        let quick = near.sub(other_near);
        let far = !quick.is_zero() && quick.exp > near.exp.max(other_near.exp) - 20;
        if far { quick } else { self.minus(other) }
    }
    /// self + step, rounded to `precision` bits of the modulus.
    pub(super) fn plus(&self, step: Wide, precision: usize) -> Self {
        let (a, b) = self.aligned(&Self::from_wide(step));
        Self { re: a.re + b.re, im: a.im + b.im, exp: a.exp }.rounded(precision)
    }
    /// Rounded to `precision` bits of the modulus.
    pub(super) fn rounded(self, precision: usize) -> Self {
        let shift = bits(&self.re).max(bits(&self.im)).saturating_sub(precision);
        Self { re: self.re >> shift, im: self.im >> shift, exp: self.exp + shift as i64 }
    }
    /// The conjugate.
    pub(super) fn conjugate(&self) -> Self {
        Self { re: self.re.clone(), im: -&self.im, exp: self.exp }
    }
    /// The mirror image in the imaginary axis.
    pub(super) fn mirrored(&self) -> Self {
        Self { re: -&self.re, im: self.im.clone(), exp: self.exp }
    }
    /// 1 - conj(self)·other; exact until it is rounded to double precision.
    pub(super) fn circle_defect(&self, other: &Self) -> Wide {
        let re = &self.re * &other.re + &self.im * &other.im;
        let im = &self.re * &other.im - &self.im * &other.re;
        let product = Self { re, im, exp: self.exp + other.exp };
        Self { re: IBig::ONE, im: IBig::ZERO, exp: 0 }.minus(&product)
    }
}

/// A polynomial with real coefficients rounded to a precision.
pub(super) struct Rounded {
    /// Mantissa and exponent of each coefficient, lowest power first.
    coefficients: Vec<(IBig, i64)>,
    /// The same in 128 bits, at that precision.
    narrow: Vec<Narrow>,
    /// Moduli of the coefficients.
    moduli: Vec<Wide>,
    /// Bits kept everywhere.
    precision: usize,
}

/// The value of a polynomial and of its derivative, with bounds on their errors (logarithms to base 2).
pub(super) struct Value {
    /// p(z).
    pub(super) value: Wide,
    /// p'(z).
    pub(super) slope: Wide,
    /// Bound on the error of p(z).
    pub(super) value_error: f64,
    /// Bound on the error of p'(z).
    pub(super) slope_error: f64,
}

/// A running value of Horner's rule.
struct Running {
    re: IBig,
    im: IBig,
    exp: i64,
}

impl Running {
    /// self·z + (re + i·im)·2^exp, to `precision` bits.
    fn step(&mut self, z: &Point, add: (&IBig, Option<&IBig>, i64), precision: usize) {
        let (re, im) = if z.im.is_zero() {
            (&self.re * &z.re, &self.im * &z.re)
        } else if z.re.is_zero() {
            (-(&self.im * &z.im), &self.re * &z.im)
        } else {
            (&self.re * &z.re - &self.im * &z.im, &self.re * &z.im + &self.im * &z.re)
        };
        let exp = self.exp + z.exp;
        let top = |r: &IBig, i: &IBig, e: i64| {
            let b = bits(r).max(bits(i));
            if b == 0 { i64::MIN } else { b as i64 + e }
        };
        let none = IBig::ZERO;
        let (add_re, add_im, add_exp) = (add.0, add.1.unwrap_or(&none), add.2);
        let (t, u) = (top(&re, &im, exp), top(add_re, add_im, add_exp));
        if t == i64::MIN && u == i64::MIN {
            *self = Self { re: IBig::ZERO, im: IBig::ZERO, exp: 0 };
            return;
        }
        // Everything below the last kept bit of the larger summand goes; the error bound counts this.
        let floor = t.max(u) - precision as i64;
        let at = |x: IBig, e: i64| if x.is_zero() { x } else { shifted(x, e - floor) };
        self.re = at(re, exp) + at(add_re.clone(), add_exp);
        self.im = if add_im.is_zero() { at(im, exp) } else { at(im, exp) + at(add_im.clone(), add_exp) };
        self.exp = floor;
    }
}

impl Rounded {
    /// The polynomial to `precision` bits a coefficient.
    pub(super) fn new(exact: &[IBig], precision: usize) -> Self {
        let coefficients: Vec<(IBig, i64)> = exact
            .iter()
            .map(|c| {
                let shift = bits(c).saturating_sub(precision);
                (c >> shift, shift as i64)
            })
            .collect();
        let moduli = exact.iter().map(|c| Wide::from_parts(c, &IBig::ZERO, 0).abs()).collect();
        let narrow = if precision == narrow::PRECISION {
            coefficients.iter().map(|(c, e)| Narrow::new(c, &IBig::ZERO, *e)).collect()
        } else {
            Vec::new()
        };
        Self { coefficients, narrow, moduli, precision }
    }
    /// Degree.
    pub(super) fn degree(&self) -> usize {
        self.coefficients.len() - 1
    }
    /// p(z) by Horner's rule, and p'(z) where asked for.
    ///
    /// Each step cuts off less than 2^(4-precision)·(|value·z| + |coefficient|), the coefficients' own rounding
    /// included, and these sums stay below S = Σ|a_k||z|^k; so the error is below n·2^(4-precision)·S, and the
    /// derivative's below n²·2^(5-precision)·S/|z|. Four times as much is claimed.
    pub(super) fn at(&self, z: &Point, with_slope: bool) -> Value {
        let n = self.degree();
        let (value, slope) =
            if self.narrow.is_empty() { self.horner(z, with_slope) } else { self.narrow(z, with_slope) };
        let modulus = z.to_wide().abs();
        let sum = self.moduli.iter().rev().fold(Wide::ZERO, |s, &a| s.mul(modulus).add(a));
        let value_error = sum.log2() + libm::log2(n as f64 + 1.0) + 6.0 - self.precision as f64;
        Value {
            value: value.to_wide(),
            slope: slope.to_wide(),
            value_error,
            slope_error: value_error + libm::log2(n as f64 + 1.0) + 1.0 - modulus.log2(),
        }
    }

    /// The values in integers of any length.
    fn horner(&self, z: &Point, with_slope: bool) -> (Point, Point) {
        let n = self.degree();
        let (top, top_exp) = &self.coefficients[n];
        let mut value = Running { re: top.clone(), im: IBig::ZERO, exp: *top_exp };
        let mut slope = Running { re: IBig::ZERO, im: IBig::ZERO, exp: 0 };
        for (c, e) in self.coefficients[..n].iter().rev() {
            if with_slope {
                slope.step(z, (&value.re, Some(&value.im), value.exp), self.precision);
            }
            value.step(z, (c, None, *e), self.precision);
        }
        let point = |r: Running| Point { re: r.re, im: r.im, exp: r.exp };
        (point(value), point(slope))
    }

    /// The values in integers of 128 bits.
    fn narrow(&self, z: &Point, with_slope: bool) -> (Point, Point) {
        let z = Narrow::new(&z.re, &z.im, z.exp);
        let mut value = self.narrow[self.degree()];
        let mut slope = Narrow::default();
        for &c in self.narrow[..self.degree()].iter().rev() {
            if with_slope {
                slope = slope.step(z, value);
            }
            value = value.step(z, c);
        }
        (value.point(), slope.point())
    }
}
