//! Functions of exact numbers that are not rational: exact where the value is rational, rounded to many digits
//! elsewhere, and said to be so.

use dashu_base::{Abs, SquareRoot};
use dashu_float::FBig;
use dashu_float::round::mode::HalfEven;
use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

/// Binary digits that a rounded value carries: far beyond the 53 of a printed decimal, so that one rounding more in
/// the middle of a computation is not seen at its end.
pub const ROUNDED_BITS: usize = 200;

/// The largest argument of [`exp`], [`sin`], [`cos`] and [`tan`]: beyond it the result would be astronomically large,
/// or its argument's reduction would need more digits than are carried.
pub const MAX_ARGUMENT: u64 = 100_000;

/// A value with a word on whether it is exact.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Rounded {
    /// The value.
    pub value: RBig,
    /// Whether it was rounded to [`ROUNDED_BITS`] binary digits.
    pub rounded: bool,
}

type Float = FBig<HalfEven, 2>;

fn exact(value: RBig) -> Rounded {
    Rounded { value, rounded: false }
}

fn rounded(value: &Float) -> Rounded {
    Rounded { value: to_ratio(value), rounded: true }
}

/// A binary floating-point number is a ratio.
fn to_ratio(value: &Float) -> RBig {
    let (significand, exponent) = value.repr().clone().into_parts();
    let power = IBig::from(UBig::ONE << exponent.unsigned_abs());
    if exponent < 0 { RBig::from_parts_signed(significand, power) } else { RBig::from(significand * power) }
}

fn to_float(value: &RBig) -> Float {
    let part = |i: IBig| Float::from(i).with_precision(ROUNDED_BITS).value();
    part(value.numerator().clone()) / part(IBig::from(value.denominator().clone()))
}

/// π to [`ROUNDED_BITS`] binary digits.
pub fn pi() -> RBig {
    to_ratio(&Float::pi(ROUNDED_BITS))
}

/// √x; `None` for negative x.
pub fn sqrt(x: &RBig) -> Option<Rounded> {
    if *x < RBig::ZERO {
        return None;
    }
    let (n, d) = (UBig::try_from(x.numerator().clone()).ok()?, x.denominator().clone());
    let (rn, rd) = (n.sqrt(), d.sqrt());
    if &rn * &rn == n && &rd * &rd == d {
        return Some(exact(RBig::from_parts(IBig::from(rn), rd)));
    }
    Some(rounded(&to_float(x).sqrt()))
}

fn small(x: &RBig) -> bool {
    x.clone().abs() <= RBig::from(MAX_ARGUMENT)
}

/// e^x; `None` where x passes [`MAX_ARGUMENT`].
pub fn exp(x: &RBig) -> Option<Rounded> {
    if *x == RBig::ZERO {
        return Some(exact(RBig::ONE));
    }
    small(x).then(|| rounded(&to_float(x).exp()))
}

/// Natural logarithm; `None` unless x > 0.
pub fn ln(x: &RBig) -> Option<Rounded> {
    if *x == RBig::ONE {
        return Some(exact(RBig::ZERO));
    }
    (*x > RBig::ZERO).then(|| rounded(&to_float(x).ln()))
}

/// Sine of x radians; `None` where x passes [`MAX_ARGUMENT`].
pub fn sin(x: &RBig) -> Option<Rounded> {
    if *x == RBig::ZERO {
        return Some(exact(RBig::ZERO));
    }
    small(x).then(|| rounded(&to_float(x).sin()))
}

/// Cosine of x radians; `None` where x passes [`MAX_ARGUMENT`].
pub fn cos(x: &RBig) -> Option<Rounded> {
    if *x == RBig::ZERO {
        return Some(exact(RBig::ONE));
    }
    small(x).then(|| rounded(&to_float(x).cos()))
}

/// Tangent of x radians; `None` where x passes [`MAX_ARGUMENT`].
pub fn tan(x: &RBig) -> Option<Rounded> {
    if *x == RBig::ZERO {
        return Some(exact(RBig::ZERO));
    }
    small(x).then(|| rounded(&to_float(x).tan()))
}

/// Arc tangent, in radians.
pub fn atan(x: &RBig) -> Rounded {
    if *x == RBig::ZERO {
        return exact(RBig::ZERO);
    }
    rounded(&to_float(x).atan())
}

/// Sine of `turns` whole turns where it is rational: sin(2π·turns) for multiples of 1/12 turn that are rational
/// (Niven, Irrational Numbers, 1956, corollary 3.12: 0, ±1/2 and ±1 are the only ones).
pub fn sin_of_turns(turns: &RBig) -> Option<RBig> {
    let twelfths = turns * RBig::from(12);
    let (n, d) = twelfths.into_parts();
    if d != UBig::ONE {
        return None;
    }
    let half = || RBig::from_parts(IBig::ONE, UBig::from(2u8));
    let k = i64::try_from(((n % IBig::from(12)) + IBig::from(12)) % IBig::from(12)).ok()?;
    match k {
        0 | 6 => Some(RBig::ZERO),
        1 | 5 => Some(half()),
        3 => Some(RBig::ONE),
        7 | 11 => Some(-half()),
        9 => Some(-RBig::ONE),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ratio(n: i64, d: u64) -> RBig {
        RBig::from_parts(IBig::from(n), UBig::from(d))
    }

    #[test]
    fn the_root_of_a_perfect_square_is_exact() {
        assert_eq!(sqrt(&ratio(49, 400)), Some(exact(ratio(7, 20))));
        assert!(sqrt(&ratio(2, 1)).is_some_and(|r| r.rounded));
        assert_eq!(sqrt(&ratio(-1, 1)), None);
    }

    /// Digits of √2, e, ln 2 and π from the NIST Digital Library of Mathematical Functions, 3.12 and 4.2; from memory.
    #[test]
    fn rounded_values_have_the_published_digits() {
        let digits = |r: &RBig| {
            let scaled = r * RBig::from(IBig::from(10u8).pow(30));
            (scaled.numerator() / IBig::from(scaled.denominator().clone())).to_string()
        };
        assert_eq!(digits(&sqrt(&ratio(2, 1)).unwrap().value), "1414213562373095048801688724209");
        assert_eq!(digits(&exp(&RBig::ONE).unwrap().value), "2718281828459045235360287471352");
        assert_eq!(digits(&ln(&ratio(2, 1)).unwrap().value), "693147180559945309417232121458");
        assert_eq!(digits(&pi()), "3141592653589793238462643383279");
        assert_eq!(digits(&(atan(&RBig::ONE).value * RBig::from(4))), "3141592653589793238462643383279");
    }

    #[test]
    fn rational_sines_are_exact() {
        assert_eq!(sin_of_turns(&ratio(1, 12)), Some(ratio(1, 2)));
        assert_eq!(sin_of_turns(&ratio(-1, 4)), Some(-RBig::ONE));
        assert_eq!(sin_of_turns(&ratio(1, 8)), None);
    }
}
