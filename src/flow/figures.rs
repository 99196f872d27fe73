//! The numbers of a transfer function: decimal coefficients, poles, zeros, the gain at rest, where it converges,
//! whether it is stable. Everything is found from the exact polynomials; decimals are made at the very end.

use crate::algebra::{IBig, Poly, RBig, UBig, Var, functions, roots, stability};
use crate::netlist::values::PI;
use crate::results::{Decimal, Root};
use dashu_base::Signed;

/// Above this degree poles and zeros are found only on request: they cost more than the transfer function itself.
pub(crate) const MAX_ROOTS_DEGREE: u32 = 128;

/// The numbers; each is absent where the contract has null.
#[derive(Clone, Debug, Default)]
pub(crate) struct Figures {
    pub(crate) decimal: Option<Decimal>,
    pub(crate) poles: Option<Vec<Root>>,
    pub(crate) zeros: Option<Vec<Root>>,
    pub(crate) dc_gain: Option<f64>,
    /// The largest real part of a pole, in z its largest modulus.
    pub(crate) edge: Option<f64>,
    pub(crate) stable: Option<bool>,
}

/// What a transfer function is like, besides its polynomials.
pub(crate) struct Kind<'d> {
    /// Whether the main variable is z.
    pub(crate) sampled: bool,
    /// Whether a value was rounded: then the whole coefficients mean nothing, and decimals have the lead 1.
    pub(crate) rounded: bool,
    /// Whether to find roots above [`MAX_ROOTS_DEGREE`].
    pub(crate) all_roots: bool,
    /// The dead time of a variable in seconds, where the variable is one.
    pub(crate) delay: &'d dyn Fn(Var) -> Option<RBig>,
}

/// The figures of a transfer function without symbols but dead times and π.
pub(crate) fn figures(numerator: &Poly, denominator: &Poly, kind: &Kind<'_>) -> Figures {
    // π gives way to a rational number of 200 binary digits. What holds exactly for all values of π (a double pole, a
    // pole on the axis) holds for that number too, and figures are told to 53 digits.
    let (above, scale_above) = numerator.substitute(PI, &functions::pi());
    let (below, scale_below) = denominator.substitute(PI, &functions::pi());
    let scale = RBig::from_parts_signed(scale_below, scale_above);
    let mut out = Figures { dc_gain: at_rest(&above, &below, &scale, kind), ..Figures::default() };
    let delayed = |p: &Poly| p.variables().iter().any(|&v| v != Var::S);
    let (above_delayed, below_delayed) = (delayed(&above), delayed(&below));
    let listed = |p: &Poly| kind.all_roots || p.degree(Var::S) <= MAX_ROOTS_DEGREE;
    if !above_delayed && !below_delayed {
        out.decimal = Some(decimal(&above, &below, &scale, kind.rounded));
    }
    if !above_delayed && listed(&above) {
        out.zeros = roots_of(&above);
    }
    if !below_delayed && listed(&below) {
        out.poles = roots_of(&below);
        let size = |r: &Root| if kind.sampled { libm::hypot(r.re, r.im) } else { r.re };
        out.edge = out.poles.iter().flatten().map(size).reduce(f64::max);
        out.stable = is_stable(&below, kind.sampled);
    }
    out
}

/// Whether every root lies strictly left of the axis, or strictly inside the circle; exact.
pub(crate) fn is_stable(p: &Poly, sampled: bool) -> Option<bool> {
    let coefficients = numbers(p)?;
    if coefficients.len() <= 1 {
        return Some(true);
    }
    Some(if sampled {
        let counts = stability::unit_circle(&coefficients);
        counts.outside == 0 && counts.circle == 0
    } else {
        let counts = stability::half_plane(&coefficients);
        counts.right == 0 && counts.axis == 0
    })
}

/// The coefficients of a polynomial in the main variable alone, the lowest power first.
pub(crate) fn numbers(p: &Poly) -> Option<Vec<IBig>> {
    p.coefficients(Var::S).iter().map(Poly::as_constant).collect()
}

fn roots_of(p: &Poly) -> Option<Vec<Root>> {
    if p.is_zero() {
        return Some(Vec::new());
    }
    let found = roots::roots(&numbers(p)?).ok()?;
    Some(found.iter().map(|r| Root { re: r.re, im: r.im, multiplicity: r.multiplicity }).collect())
}

/// Coefficients in decimals. Where one of them would not fit the range of doubles, or where the numbers themselves mean
/// nothing (`scaled`), all are divided by the denominator's first.
fn decimal(above: &Poly, below: &Poly, scale: &RBig, scaled: bool) -> Decimal {
    let list = |p: &Poly| -> Vec<RBig> {
        p.coefficients(Var::S).iter().rev().filter_map(Poly::as_constant).map(RBig::from).collect()
    };
    let (mut n, mut d) = (list(above), list(below));
    n.iter_mut().for_each(|c| *c = &*c * scale);
    if n.is_empty() {
        n.push(RBig::ZERO);
    }
    let large = |c: &RBig| *c != RBig::ZERO && !(1e-290..1e290).contains(&to_f64(c).abs());
    if scaled || n.iter().chain(&d).any(large) {
        let lead = d.first().cloned().unwrap_or(RBig::ONE);
        n.iter_mut().chain(&mut d).for_each(|c| *c = &*c / &lead);
    }
    Decimal { numerator: n.iter().map(to_f64).collect(), denominator: d.iter().map(to_f64).collect() }
}

/// The nearest double.
pub(crate) fn to_f64(value: &RBig) -> f64 {
    value.to_f64().value()
}

/// The value at s = 0 or z = 1, or `None` where there is a pole.
fn at_rest(above: &Poly, below: &Poly, scale: &RBig, kind: &Kind<'_>) -> Option<f64> {
    let (n, d) = if kind.sampled {
        let at_one = |p: &Poly| RBig::from(p.substitute(Var::S, &RBig::ONE).0.as_constant().unwrap_or(IBig::ZERO));
        (at_one(above), at_one(below))
    } else {
        // Both may vanish at s = 0 where there are dead times, as (1 - exp(-s))/s does: the first powers that remain
        // of their power series decide. A sum of m terms c·s^k·exp(-T·s) that is not 0 has one among the first m.
        let most = above.len().max(below.len()) as u32;
        let first = |p: &Poly| (0..=most).map(|k| (k, taylor(p, k, kind))).find(|(_, c)| *c != RBig::ZERO);
        let Some((low_below, d)) = first(below) else { return None };
        match first(above) {
            None => (RBig::ZERO, d),
            Some((low_above, _)) if low_above > low_below => (RBig::ZERO, d),
            Some((low_above, _)) if low_above < low_below => return None,
            Some((_, n)) => (n, d),
        }
    };
    (d != RBig::ZERO).then(|| to_f64(&(&n / &d * scale)))
}

/// The coefficient of s^k in the power series of a sum of terms c·s^j·exp(-T·s) at s = 0.
fn taylor(p: &Poly, k: u32, kind: &Kind<'_>) -> RBig {
    let mut sum = RBig::ZERO;
    if p.len() == 0 {
        return sum;
    }
    for (powers, c) in p.terms() {
        let mut power = 0;
        let mut delay = RBig::ZERO;
        for (var, e) in powers {
            if var == Var::S {
                power = e;
            } else if let Some(t) = (kind.delay)(var) {
                delay += t * RBig::from(e);
            }
        }
        let Some(order) = k.checked_sub(power) else { continue };
        if delay == RBig::ZERO && order > 0 {
            continue;
        }
        let factorial = (1..=order).fold(UBig::ONE, |f, i| f * UBig::from(i));
        let part = RBig::from(c) * delay.pow(order as usize) / RBig::from(factorial);
        sum += if order % 2 == 1 { -part } else { part };
    }
    sum
}
