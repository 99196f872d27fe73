//! From a fraction in lowest terms to the result that is printed.

use super::text::{self, Names};
use crate::algebra::roots::RootOf;
use crate::algebra::{Fraction, IBig, Poly, RBig, Var, decimal, functions};
use crate::netlist::TimeBase;
use crate::netlist::values::{DELAYS, PARAMS, PI, Values};
use crate::results::{Decimal, Form, Root, Terms, Transfer, TransferKind};
use dashu_base::Sign;
use std::sync::Arc;

/// Above this degree poles and zeros are found only on request: they cost more than the transfer function itself.
pub const MAX_ROOTS_DEGREE: u32 = 128;

/// Whether a variable stands for a dead time.
pub(crate) fn is_delay(var: Var) -> bool {
    (DELAYS..PARAMS).contains(&var.0)
}

/// The dead time of a variable in seconds, where it is one without symbols but π.
pub(crate) fn delay_in_seconds(values: &Values<'_>, var: Var) -> Option<RBig> {
    number(&values.delay(var)?)
}

/// The number that a fraction without symbols but π is.
pub(crate) fn number(f: &Fraction) -> Option<RBig> {
    let (n, below_n) = f.numerator().substitute(PI, &functions::pi());
    let (d, below_d) = f.denominator().substitute(PI, &functions::pi());
    let (n, d) = (n.as_constant()?, d.as_constant()?);
    Some(RBig::from_parts_signed(n, below_n) / RBig::from_parts_signed(d, below_d))
}

/// What identifies a result besides its polynomials.
#[derive(Clone, Debug)]
pub(crate) struct Head {
    pub(crate) kind: TransferKind,
    pub(crate) to: String,
    pub(crate) from: String,
    pub(crate) at: Vec<String>,
    pub(crate) open: Vec<String>,
    pub(crate) case: String,
    pub(crate) sampling_period: Option<String>,
}

/// Where the total dead time of a term stands in the order: numbers by size, then those with symbols.
type DelayOrder = (Option<RBig>, Vec<(Var, u32)>);

/// A sum of terms by its dead times (up) and powers of the main variable (down).
fn sorted_terms(values: &Values<'_>, p: &Poly) -> Vec<(Vec<(Var, u32)>, u32, Poly)> {
    let mut groups: Vec<(DelayOrder, Poly)> = Vec::new();
    if p.variables().iter().any(|&v| is_delay(v)) {
        let mut by_delay: std::collections::BTreeMap<Vec<(Var, u32)>, Vec<_>> = std::collections::BTreeMap::new();
        for (powers, c) in p.terms() {
            let (delays, rest): (Vec<_>, Vec<_>) = powers.into_iter().partition(|(v, _)| is_delay(*v));
            by_delay.entry(delays).or_default().push((rest, c));
        }
        for (delays, terms) in by_delay {
            let total = delays
                .iter()
                .try_fold(RBig::ZERO, |t, &(v, e)| delay_in_seconds(values, v).map(|d| t + d * RBig::from(e)));
            groups.push(((total, delays), Poly::from_terms(terms)));
        }
        groups.sort_by(|(a, _), (b, _)| match (&a.0, &b.0) {
            (Some(x), Some(y)) => x.cmp(y).then_with(|| a.1.cmp(&b.1)),
            (Some(_), None) => std::cmp::Ordering::Less,
            (None, Some(_)) => std::cmp::Ordering::Greater,
            (None, None) => a.1.cmp(&b.1),
        });
    } else {
        groups.push(((None, Vec::new()), p.clone()));
    }
    let mut out = Vec::new();
    for ((_, delays), group) in groups {
        for (power, c) in group.coefficients(Var::S).into_iter().enumerate().rev().filter(|(_, c)| !c.is_zero()) {
            out.push((delays.clone(), power as u32, c));
        }
    }
    out
}

/// Terms of a polynomial as JSON has them.
pub(crate) fn exact_terms(values: &Values<'_>, p: &Arc<Poly>) -> Terms {
    let names = Names::of(values, [&**p]).table();
    let mut known: Vec<(Vec<(Var, u32)>, DelayKey, String)> = Vec::new();
    Terms::new(p.clone(), names.into(), is_delay, |delays| {
        let at = known.iter().position(|k| k.0 == delays).unwrap_or_else(|| {
            let total = delays
                .iter()
                .try_fold(RBig::ZERO, |t, &(v, e)| delay_in_seconds(values, v).map(|d| t + d * RBig::from(e)));
            let key = (total.is_none(), total.unwrap_or(RBig::ZERO), delays.to_vec());
            known.push((delays.to_vec(), key, delay_text(values, delays)));
            known.len() - 1
        });
        (known[at].1.clone(), known[at].2.clone())
    })
}

/// The order of dead times: numbers by size, then those with symbols.
type DelayKey = (bool, RBig, Vec<(Var, u32)>);

/// The dead time of a product of dead-time variables: `0`, `7/2`, `2*T`.
fn delay_text(values: &Values<'_>, delays: &[(Var, u32)]) -> String {
    let mut total = Fraction::zero();
    for &(var, e) in delays {
        if let Some(t) = values.delay(var) {
            total = total.add(&t.mul(&Poly::constant(e.into()).into()));
        }
    }
    text::fraction(&Names::of(values, [total.numerator(), total.denominator()]), &total)
}

/// The same fraction with the denominator's first coefficient positive, in the order of dead times, then powers.
pub(crate) fn with_sign(values: &Values<'_>, f: &Fraction) -> (Poly, Poly) {
    let (n, d) = (f.numerator().clone(), f.denominator().clone());
    let first = if d.variables().iter().any(|&v| is_delay(v)) {
        sorted_terms(values, &d).first().map(|(_, _, c)| c.leading_coefficient())
    } else {
        Some(d.leading_coefficient())
    };
    if first.is_some_and(|c| c.sign() == Sign::Negative) { (n.neg(), d.neg()) } else { (n, d) }
}

/// Whether nothing but the main variable, dead times without symbols, and π occurs.
fn has_figures(values: &Values<'_>, polys: [&Poly; 2]) -> bool {
    let plain = |v: Var| v == Var::S || v == PI || (is_delay(v) && delay_in_seconds(values, v).is_some());
    polys.iter().all(|p| p.variables().into_iter().all(plain))
}

/// The result for a fraction in lowest terms.
pub(crate) fn result(
    values: &Values<'_>,
    sampled: bool,
    head: Head,
    fraction: &Fraction,
    rounded: bool,
    cancelled: Vec<String>,
    all_roots: bool,
) -> Transfer {
    let (numerator, denominator) = with_sign(values, fraction);
    let (numerator, denominator) = (Arc::new(numerator), Arc::new(denominator));
    let names = Names::of(values, [&*numerator, &*denominator]);
    let result = Transfer {
        kind: head.kind,
        to: head.to,
        from: head.from,
        at: head.at,
        open: head.open,
        kept: values.kept().iter().map(|&p| values.name(Var(PARAMS + p.0))).collect(),
        case: head.case,
        variable: if sampled { "z" } else { "s" },
        sampling_period: head.sampling_period,
        exact: !rounded,
        numerator: (!rounded).then(|| exact_terms(values, &numerator)),
        denominator: (!rounded).then(|| exact_terms(values, &denominator)),
        decimal: None,
        cancelled,
        poles: None,
        zeros: None,
        dc_gain: None,
        converges_right_of: (!sampled).then_some(None),
        converges_outside: sampled.then_some(None),
        stable: None,
        verified: None,
        form: None,
    };
    let mut result = with_figures(values, result, [&numerator, &denominator], all_roots);
    result.form = Some(Form { numerator, denominator, names: names.table() });
    result
}

/// The same with its figures, where nothing but s, π and dead times without symbols occurs.
fn with_figures(values: &Values<'_>, mut result: Transfer, polys: [&Poly; 2], all_roots: bool) -> Transfer {
    if !has_figures(values, polys) {
        return result;
    }
    let sampled = result.variable == "z";
    // π gives way to a rational number of 200 binary digits. What holds exactly for all values of π (a double pole, a
    // pole on the axis) holds for that number too, and figures are told to 53 digits.
    let [(above, scale_above), (below, scale_below)] = polys.map(|p| p.substitute(PI, &functions::pi()));
    let at_rest = if sampled {
        decimal::at_one(&above, &below)
    } else {
        decimal::at_zero(&above, &below, &|var| delay_in_seconds(values, var).unwrap_or(RBig::ZERO))
    };
    let scale = RBig::from_parts_signed(scale_below.clone(), scale_above.clone());
    result.dc_gain = at_rest.map(|value| decimal::to_f64(&(value * scale)));
    let [above_delayed, below_delayed] = [&above, &below].map(|p| p.variables().iter().any(|&v| v != Var::S));
    if !above_delayed && !below_delayed {
        let (n, d) = (numbers(&above, &scale_above), numbers(&below, &scale_below));
        let (numerator, denominator) = decimal::coefficients(&n, &d, !result.exact);
        result.decimal = Some(Decimal { numerator, denominator });
    }
    if !all_roots && above.degree(Var::S).max(below.degree(Var::S)) > MAX_ROOTS_DEGREE {
        return result;
    }
    let told =
        |roots: &[RootOf]| roots.iter().map(|r| Root { re: r.re, im: r.im, multiplicity: r.multiplicity }).collect();
    if !above_delayed {
        result.zeros = decimal::roots_of(&above).as_deref().map(told);
    }
    if !below_delayed {
        let poles = decimal::roots_of(&below);
        let edge = poles.as_ref().and_then(|p| decimal::edge(p, sampled));
        result.converges_right_of = (!sampled).then_some(edge);
        result.converges_outside = sampled.then_some(edge);
        result.poles = poles.as_deref().map(told);
        result.stable = decimal::is_stable(&below, sampled);
    }
    result
}

/// The coefficients of a polynomial in the main variable alone over a number, from the highest power down.
fn numbers(p: &Poly, scale: &IBig) -> Vec<RBig> {
    let dense = p.to_dense(Var::S).unwrap_or_default();
    dense.into_iter().rev().map(|c| RBig::from_parts_signed(c, scale.clone())).collect()
}

/// Whether laws are in z.
pub(crate) fn is_sampled(base: TimeBase) -> bool {
    base == TimeBase::Sampled
}
