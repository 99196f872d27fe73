//! Polynomials and fractions as the exact strings of results: `Kp*b + 3`, `10/(s + 2)`, `25/2`.

use crate::algebra::factor::{Factored, factor};
use crate::algebra::{Fraction, IBig, Poly, RBig, Var, decimal};
use crate::netlist::values::{PARAMS, Values};
use dashu_base::{Abs, Sign, Signed};

/// Fractions of more terms than this are not factored for reading: nobody would read them.
const MAX_FACTORED_TERMS: usize = 60;

/// Names of variables, looked up without an allocation: long symbolic results name some variable a hundred million
/// times.
#[derive(Clone, Debug, Default)]
pub(crate) struct Names {
    /// By the order of variables.
    table: Vec<(Var, String)>,
}

impl Names {
    /// The names of some variables.
    pub(crate) fn new(values: &Values<'_>, mut variables: Vec<Var>) -> Self {
        variables.push(Var::S);
        variables.sort_unstable();
        variables.dedup();
        Self { table: variables.into_iter().map(|v| (v, values.name(v))).collect() }
    }

    /// The names of all variables that occur in some polynomials.
    pub(crate) fn of<'p>(values: &Values<'_>, polys: impl IntoIterator<Item = &'p Poly>) -> Self {
        Self::new(values, polys.into_iter().flat_map(Poly::variables).collect())
    }

    /// The name of a variable; empty for one that is not in the table.
    fn get(&self, var: Var) -> &str {
        self.table.binary_search_by_key(&var, |e| e.0).map_or("", |i| &self.table[i].1)
    }

    /// Variables with their names, the main variable left out.
    pub(crate) fn table(&self) -> Vec<(Var, String)> {
        self.table.iter().filter(|(v, _)| *v != Var::S).cloned().collect()
    }
}

/// Appends a term to a sum: its sign, its coefficient (without sign) and its powers by name.
fn push_term<'a>(
    out: &mut String,
    negative: bool,
    coefficient: &str,
    powers: impl IntoIterator<Item = (&'a str, u64)>,
) {
    out.push_str(match (out.is_empty(), negative) {
        (true, true) => "-",
        (true, false) => "",
        (false, true) => " - ",
        (false, false) => " + ",
    });
    let start = out.len();
    if coefficient != "1" {
        out.push_str(coefficient);
    }
    for (name, power) in powers {
        if out.len() > start {
            out.push('*');
        }
        out.push_str(name);
        if power > 1 {
            out.push('^');
            out.push_str(&power.to_string());
        }
    }
    if out.len() == start {
        out.push_str(coefficient);
    }
}

/// The powers of one term by name.
fn named<'a>(names: &'a Names, powers: &'a [(Var, u32)]) -> impl Iterator<Item = (&'a str, u64)> {
    powers.iter().map(|&(var, power)| (names.get(var), u64::from(power)))
}

/// A polynomial as it is read: `K*s` rather than `s*K`.
pub(crate) fn sum(names: &Names, p: &Poly) -> String {
    let mut out = String::new();
    for (mut powers, c) in p.terms() {
        symbols_first(&mut powers);
        push_term(&mut out, c.sign() == Sign::Negative, &c.abs().to_string(), named(names, &powers));
    }
    if out.is_empty() { "0".to_owned() } else { out }
}

/// A rational number: `600`, `25/2`.
pub(crate) fn ratio(value: &RBig) -> String {
    if *value.denominator() == dashu_int::UBig::ONE {
        value.numerator().to_string()
    } else {
        format!("{}/{}", value.numerator(), value.denominator())
    }
}

/// A fraction: `10/(s + 2)`, `s/T`, `(K + 1)/(2*T)`.
pub(crate) fn fraction(names: &Names, f: &Fraction) -> String {
    quotient(f, |p| Side { text: sum(names, p), terms: p.len(), factors: factors_in(p) })
}

/// A fraction in factors where it is small enough to be read: `6*K*(s + 1)/(2*s + 3)`.
pub(crate) fn factored(names: &Names, f: &Fraction) -> String {
    if f.numerator().len() + f.denominator().len() > MAX_FACTORED_TERMS {
        return fraction(names, f);
    }
    quotient(f, |p| product(names, p))
}

/// What stands above or below in a quotient.
struct Side {
    text: String,
    /// How many terms the text has outside parentheses.
    terms: usize,
    /// How many factors, where it is one term.
    factors: usize,
}

fn quotient(f: &Fraction, side: impl Fn(&Poly) -> Side) -> String {
    let above = side(f.numerator());
    if f.denominator().is_one() {
        return above.text;
    }
    let below = side(f.denominator());
    let above = if above.terms > 1 { format!("({})", above.text) } else { above.text };
    if below.terms == 1 && below.factors <= 1 {
        format!("{above}/{}", below.text)
    } else {
        format!("{above}/({})", below.text)
    }
}

/// How many factors a polynomial of one term has.
fn factors_in(p: &Poly) -> usize {
    p.terms().next().map_or(0, |(powers, c)| powers.len() + usize::from(c != IBig::ONE))
}

/// A polynomial as a product: its number, symbols, then sums in parentheses.
fn product(names: &Names, p: &Poly) -> Side {
    let Factored { unit, mut factors } = factor(p);
    factors.sort_by_key(|(f, _)| f.len() > 1);
    let number = unit.clone().abs();
    let mut parts = Vec::new();
    if number != IBig::ONE || factors.is_empty() {
        parts.push(number.to_string());
    }
    let single = parts.is_empty() && factors.len() == 1 && factors[0].1 == 1;
    for (f, power) in &factors {
        let text = sum(names, f);
        let text = if f.len() > 1 && !single { format!("({text})") } else { text };
        parts.push(if *power > 1 { format!("{text}^{power}") } else { text });
    }
    let negative = unit.sign() == Sign::Negative;
    // A sum alone takes its sign into its terms.
    if single && negative {
        return Side { text: sum(names, p), terms: p.len(), factors: 1 };
    }
    let terms = if single { factors[0].0.len() } else { 1 };
    let text = parts.join("*");
    Side { text: if negative { format!("-{text}") } else { text }, terms, factors: parts.len() }
}

/// A polynomial divided by its leading coefficient in the main variable: `s^2 + 2*s + 5`, `s + 1/T`,
/// `s + 1/2*exp(-s)`.
pub(crate) fn monic(names: &Names, p: &Poly) -> String {
    let coefficients = p.coefficients(Var::S);
    let Some(lead) = coefficients.last() else { return "0".to_owned() };
    let mut out = String::new();
    if let Some(lead) = lead.as_constant() {
        for (mut powers, c) in p.terms() {
            let c = RBig::from_parts_signed(c, lead.clone());
            symbols_first(&mut powers);
            push_term(&mut out, c.is_negative(), &ratio(&c.clone().abs()), named(names, &powers));
        }
        return out;
    }
    for (power, coefficient) in coefficients.iter().enumerate().rev().filter(|(_, c)| !c.is_zero()) {
        let Some(c) = Fraction::new(coefficient.clone(), lead.clone()) else { continue };
        let negative = c.numerator().leading_coefficient().sign() == Sign::Negative;
        let mut text = fraction(names, &if negative { c.neg() } else { c.clone() });
        if power > 0 && c.numerator().len() > 1 && c.denominator().is_one() {
            text = format!("({text})");
        }
        let powers = if power == 0 { Vec::new() } else { vec![(Var::S, power as u32)] };
        push_term(&mut out, negative, &text, named(names, &powers));
    }
    out
}

/// A fraction with coefficients in decimals, the denominator's leading one 1: of what was rounded on the way.
pub(crate) fn fraction_decimal(names: &Names, f: &Fraction) -> String {
    let lead = f.denominator().leading_coefficient();
    let side = |p: &Poly| {
        let mut out = String::new();
        for (powers, c) in p.terms() {
            let c = RBig::from_parts_signed(c, lead.clone());
            let negative = c.is_negative();
            push_term(&mut out, negative, &decimal::text(&c.abs()), named(names, &powers));
        }
        if out.is_empty() { "0".to_owned() } else { out }
    };
    let (above, below) = (side(f.numerator()), side(f.denominator()));
    let wrapped = |text: String| if text.contains(' ') { format!("({text})") } else { text };
    if below == "1" { above } else { format!("{}/{}", wrapped(above), wrapped(below)) }
}

/// As [`monic`], with coefficients in decimals: of what was rounded on the way.
pub(crate) fn monic_decimal(names: &Names, p: &Poly) -> String {
    let lead = p.leading_coefficient();
    if lead == IBig::ZERO {
        return "0".to_owned();
    }
    let mut out = String::new();
    for (powers, c) in p.terms() {
        let c = RBig::from_parts_signed(c, lead.clone());
        let negative = c.is_negative();
        push_term(&mut out, negative, &decimal::text(&c.abs()), named(names, &powers));
    }
    out
}

/// `K*s` rather than `s*K`: params come before s and dead times.
fn symbols_first(powers: &mut [(Var, u32)]) {
    powers.sort_by_key(|(var, _)| (var.0 < PARAMS, *var));
}

#[cfg(test)]
mod tests {
    use super::*;

    fn letters() -> Names {
        Names { table: [(0, "s"), (PARAMS, "K"), (PARAMS + 1, "T")].map(|(i, n)| (Var(i), n.to_owned())).to_vec() }
    }

    fn v(i: u32) -> Poly {
        Poly::var(if i == 0 { Var::S } else { Var(PARAMS + i - 1) })
    }

    fn c(i: i64) -> Poly {
        Poly::constant(IBig::from(i))
    }

    #[test]
    fn polynomials_and_fractions_read_as_the_contract_says() {
        let p = v(1).mul(&v(2)).add(&c(3)).sub(&v(1).pow(2));
        assert_eq!(sum(&letters(), &p), "-K^2 + K*T + 3");
        let f = Fraction::new(c(10), v(0).add(&c(2))).unwrap_or_else(Fraction::one);
        assert_eq!(fraction(&letters(), &f), "10/(s + 2)");
        let f = Fraction::new(v(1), v(2)).unwrap_or_else(Fraction::one);
        assert_eq!(fraction(&letters(), &f), "K/T");
        let f = Fraction::new(v(1).add(&c(1)), v(2).scale(&IBig::from(2))).unwrap_or_else(Fraction::one);
        assert_eq!(fraction(&letters(), &f), "(K + 1)/(2*T)");
        let f = Fraction::new(v(1).mul(&v(0).add(&c(1))).scale(&IBig::from(-6)), v(0).add(&c(2)).pow(2));
        assert_eq!(factored(&letters(), &f.unwrap_or_else(Fraction::one)), "-6*K*(s + 1)/(s + 2)^2");
    }

    #[test]
    fn monic_factors_have_rational_coefficients() {
        assert_eq!(monic(&letters(), &c(2).mul(&v(0)).add(&c(1))), "s + 1/2");
        assert_eq!(monic(&letters(), &v(2).mul(&v(0)).add(&c(1))), "s + 1/T");
        assert_eq!(monic(&letters(), &v(0).pow(2).sub(&c(4))), "s^2 - 4");
        let p = v(0).pow(2).add(&v(0).mul(&v(1).add(&v(2)))).add(&v(1));
        assert_eq!(monic(&letters(), &p), "s^2 + K*s + T*s + K");
    }
}
