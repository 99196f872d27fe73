//! What a transfer function lost: factors of the characteristic polynomial of its part that its denominator lacks.

use super::graph::Wiring;
use super::rows::Laws;
use super::system::Part;
use super::text::{self, Names};
use super::transfer::is_delay;
use crate::algebra::factor::factor_with;
use crate::algebra::{Fraction, Poly, Var};
use crate::netlist::{Driver, Law};
use dashu_base::Sign;

/// How many denominators are offered as likely factors; each costs a division.
const MAX_KNOWN: usize = 100;

/// Whether a variable changes with s: s or z itself, or a dead time.
pub(super) fn is_dynamic(var: Var) -> bool {
    var == Var::S || is_delay(var)
}

/// The factors of `whole` over the denominator of `fraction`, with their multiplicities.
pub(super) fn factors(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    whole: &Poly,
    fraction: &Fraction,
) -> Vec<(Poly, u32)> {
    rest(whole, fraction).map_or_else(Vec::new, |rest| split(wiring, laws, part, &rest))
}

/// What `whole` has more than the denominator of `fraction`, up to factors without s and dead times.
pub(super) fn rest(whole: &Poly, fraction: &Fraction) -> Option<Poly> {
    // The quotient is small where both are large; only a matrix law leaves factors without s that don't divide.
    match whole.div_exact(fraction.denominator()) {
        Some(quotient) => Some(primitive(&quotient)),
        None => primitive(whole).div_exact(&primitive(fraction.denominator())),
    }
}

/// The factors of a polynomial that change with s, but for pure dead times exp(-T·s), which have no roots; the laws of a
/// part have the denominators that most likely divide it.
pub(super) fn split(wiring: &Wiring<'_>, laws: &Laws<'_>, part: &Part, p: &Poly) -> Vec<(Poly, u32)> {
    if !p.variables().into_iter().any(is_dynamic) {
        return Vec::new();
    }
    let mut known: Vec<Poly> = Vec::new();
    for &v in &part.rows {
        let Driver::Block(block) = wiring.netlist.signals[v.index()].driver else { continue };
        let Law::Scalar(law) = wiring.netlist.blocks[block.index()].law else { continue };
        let Ok(value) = laws.evaluate(law) else { continue };
        let below = value.fraction.denominator();
        if known.len() < MAX_KNOWN && below.degree(Var::S) > 0 && !known.contains(below) {
            known.push(below.clone());
        }
    }
    let mut factors = factor_with(p, &known).factors;
    factors.retain(|(f, _)| {
        let variables = f.variables();
        variables.iter().any(|&v| is_dynamic(v)) && !(f.len() == 1 && variables.iter().all(|&v| is_delay(v)))
    });
    factors
}

/// The polynomial without the factors that do not change with s, its leading coefficient positive.
pub(super) fn primitive(p: &Poly) -> Poly {
    let mut groups = vec![p.clone()];
    for var in p.variables().into_iter().filter(|&v| is_dynamic(v)) {
        groups = groups.iter().flat_map(|g| g.powers(var)).map(|(_, c)| c).collect();
    }
    let mut content = Poly::zero();
    for group in groups {
        content = content.gcd(&group);
        if content.is_one() {
            break;
        }
    }
    let rest = p.div_exact(&content).unwrap_or_else(|| p.clone());
    if rest.leading_coefficient().sign() == Sign::Negative { rest.neg() } else { rest }
}

/// Factors as text, each as often as its multiplicity.
pub(super) fn told(laws: &Laws<'_>, factors: &[(Poly, u32)], rounded: bool) -> Vec<String> {
    let names = Names::of(&laws.values, factors.iter().map(|(f, _)| f));
    let tell = |f: &Poly| if rounded { text::monic_decimal(&names, f) } else { text::monic(&names, f) };
    factors.iter().flat_map(|(f, m)| std::iter::repeat_n(tell(f), *m as usize)).collect()
}
