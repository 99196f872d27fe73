//! Units: exact factors to coherent SI, and the dimensions by which laws and sums are checked.
//!
//! A unit is a [`Dimension`] (exponents of the seven base units) with a [`Scale`] (an exact factor, a rational number
//! times a power of π). Symbols and prefixes are those of BIPM, The International System of Units (SI brochure), 9th
//! edition (2019, with the prefixes of 2022), tables 2, 4, 7 and 8, from memory. `rad` and `sr` count as 1.

mod dimension;
mod suggest;
mod table;

pub use dimension::Dimension;
pub use table::UnitTable;

use crate::source::Span;
use crate::syntax::ast::UnitExpr;
use dashu_base::{BitTest, Inverse};
use dashu_ratio::RBig;

/// The most bits in numerator or denominator of a unit's factor: four times what quetta³⁰ would need, so that no
/// sensible unit meets it and `[km^999999999]` takes no memory.
pub const MAX_SCALE_BITS: usize = 8192;

/// A power of the unit whose exponent is larger than this is refused, as no dimension of a real quantity comes near.
pub const MAX_UNIT_EXPONENT: i32 = 1000;

/// An exact factor to coherent SI: `ratio` · π^`pi`.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Scale {
    /// The rational part; positive for every built-in unit.
    pub ratio: RBig,
    /// The exponent of π.
    pub pi: i32,
}

impl Scale {
    /// The factor 1.
    pub fn one() -> Self {
        Self::rational(RBig::ONE)
    }

    /// A rational factor.
    pub fn rational(ratio: RBig) -> Self {
        Self { ratio, pi: 0 }
    }

    /// The product of two factors.
    #[must_use]
    pub fn mul(&self, other: &Self) -> Self {
        Self { ratio: &self.ratio * &other.ratio, pi: self.pi.saturating_add(other.pi) }
    }

    /// The inverse factor; `None` for zero.
    pub fn inverse(&self) -> Option<Self> {
        if self.ratio.is_zero() {
            return None;
        }
        Some(Self { ratio: self.ratio.clone().inv(), pi: self.pi.saturating_neg() })
    }

    /// The `n`-th power; `None` for a negative power of zero and past [`MAX_SCALE_BITS`].
    pub fn pow(&self, n: i32) -> Option<Self> {
        if n < 0 && self.ratio.is_zero() {
            return None;
        }
        // 1 has no bits to multiply, whatever the exponent.
        let bits = |size: usize| if size <= 1 { 0 } else { size };
        let size = bits(self.ratio.numerator().bit_len()).max(bits(self.ratio.denominator().bit_len()));
        if size.checked_mul(n.unsigned_abs() as usize)? > MAX_SCALE_BITS {
            return None;
        }
        Some(Self { ratio: self.ratio.pow(n as isize), pi: self.pi.saturating_mul(n) })
    }

    fn is_too_long(&self) -> bool {
        self.ratio.numerator().bit_len().max(self.ratio.denominator().bit_len()) > MAX_SCALE_BITS
    }
}

/// A unit.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Unit {
    /// What kind of quantity it measures.
    pub dimension: Dimension,
    /// How much of coherent SI one of it is.
    pub scale: Scale,
    /// Whether it is `dB`, the logarithm of a ratio; its scale says nothing then.
    pub decibel: bool,
    /// The exponent of `Hz` in it: see [`Unit::angular_scale`].
    pub hertz: i32,
}

impl Unit {
    /// The unit `1`.
    pub fn one() -> Self {
        Self::of(Dimension::ONE, Scale::one())
    }

    /// A unit of this dimension and scale.
    pub fn of(dimension: Dimension, scale: Scale) -> Self {
        Self { dimension, scale, decibel: false, hertz: 0 }
    }

    /// The scale where an angular frequency is asked for: there 1 Hz is 2π rad/s, not 1/s.
    pub fn angular_scale(&self) -> Scale {
        let turn = Scale { ratio: RBig::from(2), pi: 1 };
        turn.pow(self.hertz).map_or_else(|| self.scale.clone(), |factor| self.scale.mul(&factor))
    }
}

/// What is wrong with a unit.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum UnitErrorKind {
    /// A symbol that is not known.
    Unknown,
    /// Symbols that are known and make no sense in this way, such as `dB/s`.
    Senseless,
    /// A power too large to be carried.
    Limit,
}

/// A unit that can't be used, with the place in its text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct UnitError {
    /// What kind of mistake it is.
    pub kind: UnitErrorKind,
    /// The symbol, or the whole unit; counts from the start of the unit's text.
    pub span: Span,
    /// What is wrong, in lower case.
    pub message: String,
    /// How to mend it.
    pub suggestion: Option<String>,
}

/// One step of the evaluation in post-order; a stack instead of recursion, since the text decides on the depth.
enum Step<'a> {
    Visit(&'a UnitExpr),
    Multiply,
    Divide,
    Raise(i32),
}

impl UnitTable {
    /// The unit that `expr`, read from `text`, stands for.
    ///
    /// # Errors
    ///
    /// A [`UnitError`] for a symbol that is not known, for `dB` beside another symbol, and for a power that is too
    /// large to be carried.
    pub fn evaluate(&self, expr: &UnitExpr, text: &str) -> Result<Unit, UnitError> {
        let whole = Span::new(0, text.len() as u32);
        let mut steps = vec![Step::Visit(expr)];
        let mut values: Vec<Unit> = Vec::new();
        while let Some(step) = steps.pop() {
            let value = match step {
                Step::Visit(UnitExpr::Symbol(span)) => self.symbol(text, *span)?,
                Step::Visit(UnitExpr::One) => Unit::one(),
                Step::Visit(UnitExpr::Mul(a, b)) => {
                    steps.extend([Step::Multiply, Step::Visit(b), Step::Visit(a)]);
                    continue;
                }
                Step::Visit(UnitExpr::Div(a, b)) => {
                    steps.extend([Step::Divide, Step::Visit(b), Step::Visit(a)]);
                    continue;
                }
                Step::Visit(UnitExpr::Pow(a, n)) => {
                    steps.extend([Step::Raise(*n), Step::Visit(a)]);
                    continue;
                }
                Step::Multiply => {
                    let (b, a) = (values.pop().unwrap_or_else(Unit::one), values.pop().unwrap_or_else(Unit::one));
                    product(&a, &b, 1, whole)?
                }
                Step::Divide => {
                    let (b, a) = (values.pop().unwrap_or_else(Unit::one), values.pop().unwrap_or_else(Unit::one));
                    product(&a, &b, -1, whole)?
                }
                Step::Raise(n) => raise(&values.pop().unwrap_or_else(Unit::one), n, whole)?,
            };
            values.push(value);
        }
        Ok(values.pop().unwrap_or_else(Unit::one))
    }

    fn symbol(&self, text: &str, span: Span) -> Result<Unit, UnitError> {
        let symbol = text.get(span.start as usize..span.end as usize).unwrap_or("");
        self.lookup(symbol).ok_or_else(|| {
            let (message, suggestion) = suggest::unknown(self, symbol);
            UnitError { kind: UnitErrorKind::Unknown, span, message, suggestion }
        })
    }
}

fn product(a: &Unit, b: &Unit, sign: i32, whole: Span) -> Result<Unit, UnitError> {
    let b = raise(b, sign, whole)?;
    if a.decibel || b.decibel {
        return Err(decibel_beside(whole));
    }
    let scale = a.scale.mul(&b.scale);
    if scale.is_too_long() {
        return Err(too_large(whole));
    }
    let dimension = a.dimension.mul(b.dimension);
    Ok(Unit { dimension, scale, decibel: false, hertz: a.hertz.saturating_add(b.hertz) })
}

fn raise(a: &Unit, n: i32, whole: Span) -> Result<Unit, UnitError> {
    if n == 1 {
        return Ok(a.clone());
    }
    if a.decibel {
        return Err(decibel_beside(whole));
    }
    if n.unsigned_abs() > MAX_UNIT_EXPONENT.unsigned_abs() {
        return Err(too_large(whole));
    }
    let scale = a.scale.pow(n).ok_or_else(|| too_large(whole))?;
    Ok(Unit { dimension: a.dimension.pow(n), scale, decibel: false, hertz: a.hertz.saturating_mul(n) })
}

fn decibel_beside(span: Span) -> UnitError {
    UnitError {
        kind: UnitErrorKind::Senseless,
        span,
        message: "`dB` is the logarithm of a ratio and can't be multiplied, divided or raised".to_owned(),
        suggestion: Some("let `dB` stand alone: `require gain_margin at u >= 6 [dB]`".to_owned()),
    }
}

fn too_large(span: Span) -> UnitError {
    UnitError {
        kind: UnitErrorKind::Limit,
        span,
        message: format!("the powers in this unit are too large (an exponent may be up to {MAX_UNIT_EXPONENT})"),
        suggestion: Some("use smaller exponents".to_owned()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn symbol(text: &str, part: &str) -> UnitExpr {
        let start = text.find(part).unwrap_or(0) as u32;
        UnitExpr::Symbol(Span::new(start, start + part.len() as u32))
    }

    fn ratio(n: i64, d: u64) -> RBig {
        RBig::from_parts(n.into(), d.into())
    }

    #[test]
    fn a_power_takes_the_prefix_along() {
        let text = "cm^2";
        let unit = UnitTable::new().evaluate(&UnitExpr::Pow(Box::new(symbol(text, "cm")), 2), text);
        assert_eq!(unit, Ok(Unit::of(Dimension::METRE.pow(2), Scale::rational(ratio(1, 10_000)))));
    }

    #[test]
    fn a_slash_divides_by_what_follows() {
        let text = "km/h";
        let expr = UnitExpr::Div(Box::new(symbol(text, "km")), Box::new(symbol(text, "h")));
        let unit = UnitTable::new().evaluate(&expr, text);
        assert_eq!(unit, Ok(Unit::of(Dimension::METRE.div(Dimension::SECOND), Scale::rational(ratio(5, 18)))));
    }

    #[test]
    fn decibel_stands_alone() {
        let text = "dB/s";
        let expr = UnitExpr::Div(Box::new(symbol(text, "dB")), Box::new(symbol(text, "s")));
        let told = UnitTable::new().evaluate(&expr, text).map_err(|e| e.kind);
        assert_eq!(told, Err(UnitErrorKind::Senseless));
        assert!(UnitTable::new().evaluate(&symbol("dB", "dB"), "dB").is_ok_and(|u| u.decibel));
    }

    #[test]
    fn huge_powers_take_no_memory() {
        let mut expr = symbol("km", "km");
        for _ in 0..8 {
            expr = UnitExpr::Pow(Box::new(expr), 1000);
        }
        let told = UnitTable::new().evaluate(&expr, "km").map_err(|e| e.kind);
        assert_eq!(told, Err(UnitErrorKind::Limit));
        // A power of 1 is 1, however often.
        let one = UnitExpr::Pow(Box::new(UnitExpr::Pow(Box::new(UnitExpr::One), 1000)), 1000);
        assert_eq!(UnitTable::new().evaluate(&one, "1"), Ok(Unit::one()));
    }

    #[test]
    fn a_chain_of_any_length_needs_no_stack() {
        let text = "m";
        let mut expr = symbol(text, "m");
        for _ in 0..20_000 {
            expr = UnitExpr::Mul(Box::new(expr), Box::new(UnitExpr::One));
        }
        let unit = UnitTable::new().evaluate(&expr, text);
        assert_eq!(unit, Ok(Unit::of(Dimension::METRE, Scale::one())));
        // Taken apart by hand: dropping the chain is the tree's business, not this test's.
        while let UnitExpr::Mul(a, _) = expr {
            expr = *a;
        }
    }

    #[test]
    fn hertz_is_an_angular_frequency_only_where_one_is_asked_for() {
        let Some(hertz) = UnitTable::new().lookup("kHz") else { panic!("kHz is a unit") };
        assert_eq!(hertz.scale, Scale::rational(ratio(1000, 1)));
        assert_eq!(hertz.angular_scale(), Scale { ratio: ratio(2000, 1), pi: 1 });
        let Some(second) = UnitTable::new().lookup("s") else { panic!("s is a unit") };
        assert_eq!(second.angular_scale(), second.scale);
    }

    #[test]
    fn the_unknown_symbol_is_pointed_at() {
        let text = "kg*sec";
        let expr = UnitExpr::Mul(Box::new(symbol(text, "kg")), Box::new(symbol(text, "sec")));
        let Err(told) = UnitTable::new().evaluate(&expr, text) else { panic!("sec is no unit") };
        assert_eq!((told.kind, told.span), (UnitErrorKind::Unknown, Span::new(3, 6)));
        assert!(told.suggestion.is_some_and(|s| s.contains("`s`")));
    }
}
