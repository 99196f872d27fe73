//! Numbers as an engineer writes them: a short decimal where there is one, else a ratio; a rounded one where asked.

use crate::algebra::{IBig, RBig, UBig};
use dashu_base::{BitTest as _, UnsignedAbs as _};

/// The most significant digits of a decimal that still reads well; a longer one is told as a ratio, or rounded.
const MAX_DECIMAL_DIGITS: usize = 12;

/// Significant digits of a rounded number in text. JSON has them all.
pub(super) const ROUNDED_DIGITS: usize = 6;

/// The exact decimal of a rational number where it has a short one: `0.35`, `12`, `2.5e-6`.
pub(super) fn short_decimal(value: &RBig) -> Option<String> {
    let mut rest = value.denominator().clone();
    let twos = rest.trailing_zeros().unwrap_or(0);
    rest >>= twos;
    let (five, mut fives) = (UBig::from(5u8), 0);
    // No short decimal has more places than digits and a decimal exponent together; the bound keeps this loop short.
    while fives <= 40 && !rest.is_one() && (&rest % &five).is_zero() {
        rest /= &five;
        fives += 1;
    }
    let places = twos.max(fives);
    if !rest.is_one() || places > 40 {
        return None;
    }
    let scaled = value.numerator() * IBig::from(10u8).pow(places) / IBig::from(value.denominator().clone());
    let text = scaled.to_string();
    let digits = text.trim_start_matches('-');
    let significant = digits.trim_end_matches('0');
    if significant.is_empty() {
        return Some("0".to_owned());
    }
    if significant.len() > MAX_DECIMAL_DIGITS && !(places == 0 && digits.len() <= 15) {
        return None;
    }
    Some(styled(text.starts_with('-'), significant, digits.len() as i64 - 1 - places as i64))
}

/// The exact value: a short decimal, or else a ratio `2/3` or a whole number.
pub(super) fn exact(value: &RBig) -> String {
    short_decimal(value).unwrap_or_else(|| {
        if value.denominator().is_one() {
            value.numerator().to_string()
        } else {
            format!("{}/{}", value.numerator(), value.denominator())
        }
    })
}

/// A rational number rounded to [`ROUNDED_DIGITS`] significant digits, of any size.
pub(super) fn rounded(value: &RBig) -> String {
    let negative = *value.numerator() < IBig::ZERO;
    let n = IBig::from(value.numerator().clone().unsigned_abs());
    let d = IBig::from(value.denominator().clone());
    if n == IBig::ZERO {
        return "0".to_owned();
    }
    let bits = |x: &IBig| x.clone().unsigned_abs().bit_len() as f64;
    let low = IBig::from(10u8).pow(ROUNDED_DIGITS - 1);
    let high = IBig::from(10u8).pow(ROUNDED_DIGITS);
    // The estimate from the lengths is off by one at most; the loop mends that, and a rounding up to 10^6.
    let mut exponent = ((bits(&n) - bits(&d)) * std::f64::consts::LOG10_2).floor() as i64;
    for _ in 0..4 {
        let shift = ROUNDED_DIGITS as i64 - 1 - exponent;
        let ten = IBig::from(10u8).pow(shift.unsigned_abs() as usize);
        let (up, down) = if shift >= 0 { (&n * ten, d.clone()) } else { (n.clone(), &d * ten) };
        let digits = (up * IBig::from(2u8) + &down) / (down * IBig::from(2u8));
        if digits < low {
            exponent -= 1;
        } else if digits >= high {
            exponent += 1;
        } else {
            return styled(negative, digits.to_string().trim_end_matches('0'), exponent);
        }
    }
    styled(negative, "1", exponent)
}

/// A floating-point number rounded to [`ROUNDED_DIGITS`] significant digits.
pub(super) fn float(value: f64) -> String {
    rounded_float(value, ROUNDED_DIGITS)
}

/// A floating-point number rounded to so many significant digits.
pub(super) fn rounded_float(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".to_owned();
    }
    if !value.is_finite() {
        return if value > 0.0 { "∞".to_owned() } else { "-∞".to_owned() };
    }
    let text = format!("{:.*e}", digits - 1, value.abs());
    let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, "0"));
    let digits = mantissa.replace('.', "");
    styled(value < 0.0, digits.trim_end_matches('0'), exponent.parse().unwrap_or(0))
}

/// A number from its significant digits (no zero at either end) and the decimal exponent of the first.
fn styled(negative: bool, digits: &str, exponent: i64) -> String {
    let sign = if negative { "-" } else { "" };
    let count = digits.len() as i64;
    if (0..=5).contains(&exponent) || (exponent > 0 && exponent <= 15 && exponent < count + 3) {
        let zeros = "0".repeat((exponent + 1 - count).max(0) as usize);
        let (whole, part) = digits.split_at((exponent + 1).min(count) as usize);
        let point = if part.is_empty() { "" } else { "." };
        format!("{sign}{whole}{zeros}{point}{part}")
    } else if (-4..0).contains(&exponent) {
        format!("{sign}0.{}{digits}", "0".repeat((-exponent - 1) as usize))
    } else {
        let (first, part) = digits.split_at(1);
        let point = if part.is_empty() { "" } else { "." };
        format!("{sign}{first}{point}{part}e{exponent}")
    }
}

/// A whole number in superscript digits.
pub(super) fn superscript(number: u32) -> String {
    const DIGITS: [char; 10] = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    number.to_string().bytes().map(|b| DIGITS[usize::from(b - b'0')]).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ratio(n: i64, d: u64) -> RBig {
        RBig::from_parts(IBig::from(n), UBig::from(d))
    }

    #[test]
    fn decimals_are_exact_and_short_or_ratios() {
        let told = |n, d| exact(&ratio(n, d));
        assert_eq!(told(7, 20), "0.35");
        assert_eq!(told(-12, 1), "-12");
        assert_eq!(told(1, 3), "1/3");
        assert_eq!(told(-25, 6), "-25/6");
        assert_eq!(told(1, 400_000), "2.5e-6");
        assert_eq!(told(1, 10_000), "0.0001");
        assert_eq!(told(0, 1), "0");
        assert_eq!(told(120_000, 1), "120000");
        assert_eq!(told(12_000_000_000, 1), "1.2e10");
        assert_eq!(told(123_456_789, 1), "123456789");
        assert_eq!(told(1_124_546_350_400_000_000, 1), "1.1245463504e18");
        assert_eq!(told(1_002_001, 10_000), "100.2001");
        assert_eq!(told(1, 1 << 40), "1/1099511627776");
    }

    #[test]
    fn rounding_keeps_six_digits() {
        assert_eq!(rounded(&ratio(2, 3)), "0.666667");
        assert_eq!(rounded(&ratio(-999_999_999, 1000)), "-1e6");
        assert_eq!(rounded(&ratio(1, 1)), "1");
        assert_eq!(rounded(&RBig::from(IBig::from(10u8).pow(400) / IBig::from(3u8))), "3.33333e399");
        assert_eq!(rounded(&ratio(1, 700_000_000)), "1.42857e-9");
        assert_eq!(float(3.605_551_275_463_989), "3.60555");
        assert_eq!(float(-0.5), "-0.5");
        assert_eq!(float(0.0), "0");
        assert_eq!(float(1.5e-9), "1.5e-9");
        assert_eq!(float(999_999.96), "1e6");
        assert_eq!(float(123_456.4), "123456");
    }

    #[test]
    fn exponents_stand_high() {
        assert_eq!(superscript(12), "¹²");
    }
}
