//! How a fraction is written: expanded, in factors, or in time constants.

use super::number;
use super::sum::{Naming, Scale, Words};
use crate::algebra::factor::factor;
use crate::algebra::{IBig, Poly, RBig, Var};
use dashu_base::{BitTest as _, UnsignedAbs as _};

/// How `derive` writes a fraction.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum FractionStyle {
    /// In factors where they are nice, else expanded.
    #[default]
    Automatic,
    /// Sums of powers of s.
    Expanded,
    /// Products, each factor with the leading coefficient 1: `(s + 2)`.
    Factored,
    /// Products, each factor with the constant 1: `(0.5 [s]·s + 1)`.
    TimeConstants,
}

/// The largest degree and the most terms of a polynomial that is factored without being asked to.
const FACTORED_UNASKED: (u32, usize) = (24, 200);

/// The most terms for which the shortest way to write all coefficients is looked for.
const MOST_TERMS_SCALED: usize = 200;

/// The most digits of a coefficient that is told exactly; beyond, text rounds, and says so.
const MOST_EXACT_DIGITS: usize = 24;

/// A fraction ready to be written.
pub(super) struct Written {
    /// What stands above the rule.
    pub(super) numerator: Side,
    /// What stands below it, unless that is 1.
    pub(super) denominator: Option<Side>,
    /// Whether coefficients are rounded.
    pub(super) rounded: bool,
}

/// Above or below the rule.
pub(super) enum Side {
    /// A sum.
    Sum(Poly, Scale),
    /// A number times factors.
    Product(String, Vec<Factor>),
}

/// A factor as often as its exponent.
pub(super) struct Factor {
    poly: Poly,
    exponent: u32,
    scale: Scale,
    seconds: bool,
}

/// Decides how to write a fraction.
pub(super) fn write(numerator: &Poly, denominator: &Poly, style: FractionStyle, naming: Naming<'_>) -> Written {
    if numerator.is_zero() {
        return Written { numerator: Side::Sum(Poly::zero(), Scale::Whole), denominator: None, rounded: false };
    }
    let no_time = naming.variable == "z" && style == FractionStyle::TimeConstants;
    let style = if no_time { FractionStyle::Factored } else { style };
    if style != FractionStyle::Expanded
        && let Some(written) = factored(numerator, denominator, style, naming)
    {
        return written;
    }
    let (scale, rounded) = common_scale(numerator, denominator);
    let one = denominator.as_constant().is_some_and(|c| scale_of(&scale) * RBig::from(c) == RBig::ONE);
    let below = (!one).then(|| Side::Sum(denominator.clone(), scale.clone()));
    Written { numerator: Side::Sum(numerator.clone(), scale), denominator: below, rounded }
}

fn scale_of(scale: &Scale) -> RBig {
    match scale {
        Scale::Whole => RBig::ONE,
        Scale::Exact(by) | Scale::Rounded(by) => by.clone(),
    }
}

/// The number that all coefficients of an expanded fraction are multiplied with: of the whole numbers as they are,
/// a denominator that begins with 1, and one that ends with 1, what takes the fewest digits.
fn common_scale(numerator: &Poly, denominator: &Poly) -> (Scale, bool) {
    let leading = denominator.leading_coefficient();
    let monic = RBig::from_parts_signed(IBig::ONE, leading);
    let long = |p: &Poly| p.terms().take(MOST_TERMS_SCALED).any(|t| digits(&t.1) > MOST_EXACT_DIGITS);
    let symbols = |p: &Poly| p.variables().into_iter().any(|v| v != Var::S);
    if (long(numerator) || long(denominator)) && !symbols(numerator) && !symbols(denominator) {
        return (Scale::Rounded(monic), true);
    }
    if numerator.len() + denominator.len() > MOST_TERMS_SCALED {
        return (Scale::Whole, false);
    }
    let last = denominator.terms().last().map_or(IBig::ONE, |t| t.1);
    let last = RBig::from_parts_signed(IBig::ONE, last);
    let cost = |by: &RBig| {
        let all = numerator.terms().chain(denominator.terms());
        all.map(|(_, c)| number::short_decimal(&(RBig::from(c) * by)).map(|t| t.trim_start_matches('-').len()))
            .sum::<Option<usize>>()
    };
    // A whole number alone below the rule is no fraction to be built up where decimals will do.
    if denominator.is_constant() && cost(&monic).is_some() {
        return (Scale::Exact(monic), false);
    }
    let whole: usize = numerator.terms().chain(denominator.terms()).map(|t| digits(&t.1)).sum();
    let mut best = (whole, Scale::Whole);
    // From the least wished to the most: what costs as much as what is there already takes its place.
    for by in [last, monic] {
        if by > RBig::ZERO
            && let Some(cost) = cost(&by)
            && cost <= best.0
        {
            best = (cost, Scale::Exact(by));
        }
    }
    (best.1, false)
}

/// How many digits a whole number has.
fn digits(c: &IBig) -> usize {
    let bits = c.clone().unsigned_abs().bit_len();
    if bits <= 60 { c.to_string().trim_start_matches('-').len() } else { bits * 301 / 1000 + 1 }
}

/// The fraction as products, or as a product over or under a sum; `None` where that is not wished or not nice.
fn factored(numerator: &Poly, denominator: &Poly, style: FractionStyle, naming: Naming<'_>) -> Option<Written> {
    let asked = style != FractionStyle::Automatic;
    let delays = |p: &Poly| p.variables().into_iter().any(|v| naming.is_delay(v));
    let side = |p: &Poly| {
        if !asked && (p.degree(Var::S) > FACTORED_UNASKED.0 || p.len() > FACTORED_UNASKED.1 || delays(p)) {
            return None;
        }
        let made = product(p, style);
        (asked || nice(&made.1, p)).then_some(made)
    };
    let (above, below) = (side(numerator), side(denominator));
    let whole = |p: &Poly| Side::Sum(p.clone(), Scale::Whole);
    let short = |p: &Poly| p.terms().all(|t| digits(&t.1) <= MOST_EXACT_DIGITS);
    match (above, below) {
        (Some(above), Some(below)) => {
            let gain = above.0 / below.0;
            let (up, down) = match number::short_decimal(&gain) {
                Some(text) => (text, "1".to_owned()),
                None => (gain.numerator().to_string(), gain.denominator().to_string()),
            };
            let one = below.1.is_empty() && down == "1";
            let below = (!one).then(|| Side::Product(down, below.1));
            Some(Written { numerator: Side::Product(up, above.1), denominator: below, rounded: false })
        }
        // A product beside a sum of whole numbers, where it really is one.
        (Some((gain, factors)), None) if is_product(&factors) && short(denominator) => {
            let above = Side::Product(number::exact(&gain), factors);
            Some(Written { numerator: above, denominator: Some(whole(denominator)), rounded: false })
        }
        (None, Some((gain, factors))) if is_product(&factors) && short(numerator) => {
            let below = Side::Product(number::exact(&gain), factors);
            Some(Written { numerator: whole(numerator), denominator: Some(below), rounded: false })
        }
        _ => None,
    }
}

/// Whether there is more than one factor, repeated ones counted.
fn is_product(factors: &[Factor]) -> bool {
    factors.iter().map(|f| f.exponent).sum::<u32>() > 1
}

/// A polynomial as a number times factors, each written with its leading coefficient or its constant 1 where that
/// makes short decimals.
fn product(p: &Poly, style: FractionStyle) -> (RBig, Vec<Factor>) {
    let parts = factor(p);
    let mut unit = RBig::from(parts.unit.clone());
    let mut factors = Vec::new();
    for (poly, exponent) in parts.factors {
        let numeric = poly.variables().iter().all(|&v| v == Var::S);
        let constant = poly.terms().last().filter(|t| t.0.is_empty()).map(|t| t.1);
        let time = style == FractionStyle::TimeConstants && numeric && constant.is_some();
        let by = if time { constant.unwrap_or(IBig::ONE) } else { poly.leading_coefficient() };
        let scale = RBig::from_parts_signed(IBig::ONE, by.clone());
        let short = poly.terms().all(|t| number::short_decimal(&(RBig::from(t.1) * &scale)).is_some());
        // A ratio in a factor that nobody takes in at a glance helps nobody.
        let wished = short || (time && poly.degree(Var::S) <= 2);
        let scale = if wished && !by.is_one() {
            for _ in 0..exponent {
                unit *= RBig::from(by.clone());
            }
            Scale::Exact(scale)
        } else {
            Scale::Whole
        };
        factors.push(Factor { poly, exponent, scale, seconds: time && wished });
    }
    // Constants, then powers of s, then the rest by degree, the slow ones first.
    factors.sort_by_cached_key(|f| (f.poly.degree(Var::S), f.poly.len(), last_over_first(&f.poly)));
    (unit, factors)
}

/// The last coefficient over the first.
fn last_over_first(p: &Poly) -> RBig {
    let last = p.terms().last().map_or(IBig::ZERO, |t| t.1);
    RBig::from_parts_signed(last, p.leading_coefficient())
}

/// Whether a product reads better than the sum: it really has factors, all of a degree that a person takes in, and
/// is not longer.
fn nice(factors: &[Factor], sum: &Poly) -> bool {
    let small = factors.iter().all(|f| f.poly.degree(Var::S) <= 2);
    let terms: usize = factors.iter().map(|f| f.poly.len()).sum();
    small && terms <= sum.len().max(3) * 2
}

impl Side {
    /// The words of it.
    pub(super) fn words(&self, out: &mut Words<'_>, naming: Naming<'_>) {
        match self {
            Self::Sum(p, scale) => naming.sum(out, p, scale),
            Self::Product(gain, factors) => {
                let told = match gain.as_str() {
                    "1" if !factors.is_empty() => "",
                    "-1" if !factors.is_empty() => "-",
                    other => other,
                };
                out.push(told);
                let mut dot = !told.is_empty() && told != "-";
                let alone = !dot && told.is_empty() && factors.len() == 1;
                for f in factors {
                    if dot {
                        out.push("·");
                        out.end(super::sum::Joint::Tight);
                    }
                    dot = true;
                    f.words(out, naming, alone);
                }
            }
        }
    }
}

impl Factor {
    fn words(&self, out: &mut Words<'_>, naming: Naming<'_>, alone: bool) {
        let bare = (self.poly.len() == 1 || alone) && self.exponent == 1;
        let naming = Naming { seconds: self.seconds, ..naming };
        if !bare && self.poly.len() == 1 && self.poly.leading_coefficient().is_one() {
            // A single variable: s² and not (s)².
            naming.sum(out, &self.poly.pow(self.exponent), &self.scale);
            return;
        }
        if !bare {
            out.push("(");
        }
        naming.sum(out, &self.poly, &self.scale);
        if !bare {
            out.push(")");
            if self.exponent > 1 {
                out.push(&number::superscript(self.exponent));
            }
        }
    }
}
