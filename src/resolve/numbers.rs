//! Numbers as written, and whole-number arithmetic of indices.

use super::MAX_DECIMAL_EXPONENT;
use crate::algebra::{IBig, RBig, UBig};

/// The exact value of a number as written (`12`, `0.35`, `1.5e-3`), or `None` where its exponent passes
/// [`MAX_DECIMAL_EXPONENT`] or it is no number.
pub(super) fn decimal(text: &str) -> Option<RBig> {
    if let Some((n, d)) = small_decimal(text) {
        return Some(RBig::from_parts(IBig::from(n), UBig::from(d)));
    }
    let (mantissa, exponent) = match text.split_once(['e', 'E']) {
        Some((m, e)) => (m, e.parse::<i64>().ok()?),
        None => (text, 0),
    };
    let (whole, part) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let digits = UBig::from_str_radix(&format!("{whole}{part}"), 10).ok()?;
    let power = exponent.checked_sub(part.len() as i64)?;
    if exponent.abs() > MAX_DECIMAL_EXPONENT {
        return None;
    }
    let scale = UBig::from(10u8).pow(power.unsigned_abs() as usize);
    let digits = IBig::from(digits);
    Some(if power < 0 { RBig::from_parts(digits, scale) } else { RBig::from(digits * IBig::from(scale)) })
}

/// The common short form without an exponent, as a ratio that may not be in lowest terms.
pub(super) fn small_decimal(text: &str) -> Option<(u64, u64)> {
    if text.len() > 17 {
        return None;
    }
    let (mut n, mut d, mut point) = (0u64, 1u64, false);
    for b in text.bytes() {
        match b {
            b'0'..=b'9' => {
                n = n * 10 + u64::from(b - b'0');
                if point {
                    d *= 10;
                }
            }
            b'.' if !point => point = true,
            _ => return None,
        }
    }
    Some((n, d))
}

/// a op b in whole numbers; `None` where it does not fit or is not whole.
pub(super) fn whole(op: crate::syntax::ast::BinaryOp, a: i64, b: i64) -> Option<i64> {
    use crate::syntax::ast::BinaryOp as Op;
    match op {
        Op::Add => a.checked_add(b),
        Op::Sub => a.checked_sub(b),
        Op::Mul => a.checked_mul(b),
        Op::Pow => a.checked_pow(u32::try_from(b).ok()?),
        Op::Div => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decimals_are_exact() {
        let ratio = |n: i64, d: u64| RBig::from_parts(n.into(), d.into());
        assert_eq!(decimal("0.35"), Some(ratio(7, 20)));
        assert_eq!(decimal("1.5e-3"), Some(ratio(3, 2000)));
        assert_eq!(decimal("2.50e1"), Some(ratio(25, 1)));
        assert_eq!(decimal("123456789012345678901.5"), decimal("1234567890123456789015e-1"));
        assert_eq!(decimal("1e20000"), None);
    }
}
