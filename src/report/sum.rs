//! Polynomials as words: sums of products that can be broken into lines.
//!
//! Nothing here holds a whole polynomial as text: a symbolic result may have millions of terms, and its words go to
//! the page as they are made.

use super::number::{self, superscript};
use crate::algebra::{IBig, Poly, RBig, UBig, Var};
use crate::results::Monomials;
use dashu_base::UnsignedAbs as _;
use std::collections::BTreeMap;

/// The longest word, in characters, before a product may be broken at one of its dots.
const LONGEST_WORD: usize = 40;

/// What stands between a word and the one before it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Joint {
    /// A blank: the next term of a sum.
    Space,
    /// Nothing: the same product goes on.
    Tight,
}

/// Takes words, each with its joint; answers whether to go on.
pub(super) type Sink<'a> = dyn FnMut(Joint, &str) -> bool + 'a;

/// Words being made.
pub(super) struct Words<'a> {
    current: String,
    joint: Joint,
    sink: &'a mut Sink<'a>,
    stopped: bool,
}

impl<'a> Words<'a> {
    /// Words for `sink`.
    pub(super) fn new(sink: &'a mut Sink<'a>) -> Self {
        Self { current: String::new(), joint: Joint::Tight, sink, stopped: false }
    }

    /// More of the current word.
    pub(super) fn push(&mut self, text: &str) {
        self.current.push_str(text);
    }

    /// The end of a word: after it a line may be broken.
    pub(super) fn end(&mut self, next: Joint) {
        if !self.current.is_empty() && !self.stopped {
            self.stopped = !(self.sink)(self.joint, &self.current);
        }
        self.current.clear();
        self.joint = next;
    }

    /// A centre dot; the product may be broken after it where it is long.
    pub(super) fn dot(&mut self) {
        self.push("·");
        if self.current.chars().count() > LONGEST_WORD {
            self.end(Joint::Tight);
        }
    }

    /// Breaks a long word after some of its dots.
    fn break_long(&mut self) {
        while self.current.len() > 2 * LONGEST_WORD {
            let Some((at, dot)) = self.current.match_indices('·').take_while(|(at, _)| *at <= LONGEST_WORD).last()
            else {
                return;
            };
            let rest = self.current.split_off(at + dot.len());
            self.end(Joint::Tight);
            self.current = rest;
        }
    }

    /// Whether something stands to the left that the next factor is multiplied with.
    fn in_product(&self) -> bool {
        !matches!(self.current.as_str(), "" | "-" | "+ " | "- ")
    }

    /// Whether nobody wants more words.
    pub(super) const fn stopped(&self) -> bool {
        self.stopped
    }
}

/// What the coefficients of a polynomial are multiplied with before they are told, and how they are told.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Scale {
    /// As they are, whole numbers.
    Whole,
    /// Multiplied with this, exactly.
    Exact(RBig),
    /// Multiplied with this and rounded.
    Rounded(RBig),
}

impl Scale {
    /// A coefficient's absolute value as it is told; none for 1.
    fn tell(&self, coefficient: &IBig) -> Option<String> {
        let size = coefficient.clone().unsigned_abs();
        match self {
            Self::Whole if size.is_one() => None,
            Self::Whole => Some(number::exact(&RBig::from(size))),
            Self::Exact(by) | Self::Rounded(by) => {
                let value = RBig::from(size) * by;
                if value.is_one() {
                    return None;
                }
                if matches!(self, Self::Rounded(_)) {
                    return Some(number::rounded(&value));
                }
                let text = number::exact(&value);
                Some(if text.contains('/') { format!("({text})") } else { text })
            }
        }
    }
}

/// How variables are called.
#[derive(Clone, Copy, Debug)]
pub(super) struct Naming<'a> {
    /// `s` or `z`.
    pub(super) variable: &'a str,
    /// Params, π and basic dead times.
    pub(super) names: &'a [(Var, String)],
    /// Whether coefficients carry powers of the second, in brackets: those of a factor in time constants.
    pub(super) seconds: bool,
}

type Monomial = Vec<(Var, u32)>;

impl Naming<'_> {
    fn name(&self, var: Var) -> &str {
        if var == Var::S {
            return self.variable;
        }
        let found = self.names.binary_search_by_key(&var, |n| n.0).ok();
        found.and_then(|i| self.names.get(i)).map_or("?", |n| &n.1)
    }

    /// Whether a variable stands for a dead time: no other has a name like this.
    pub(super) fn is_delay(&self, var: Var) -> bool {
        self.name(var).starts_with("exp(")
    }

    /// Adds a power of a variable; a dead time's is the dead time as often.
    fn power(&self, out: &mut Words<'_>, var: Var, exponent: u32) {
        let name = self.name(var);
        if exponent == 1 && !name.contains('(') {
            out.push(name);
        } else if self.is_delay(var) {
            out.push(&delay_power(name, exponent));
        } else {
            out.push(name);
            out.push(&superscript(exponent));
        }
    }

    /// The whole polynomial as a sum, collected by powers of the variable, and by dead times before that.
    pub(super) fn sum(&self, out: &mut Words<'_>, p: &Poly, scale: &Scale) {
        if p.is_zero() {
            out.push("0");
            return;
        }
        if !p.variables().into_iter().any(|v| self.is_delay(v)) {
            return self.collected(out, p, scale, false);
        }
        let mut groups: BTreeMap<Monomial, Vec<(Monomial, IBig)>> = BTreeMap::new();
        for (monomial, c) in p.terms() {
            let (delays, rest): (Monomial, Monomial) = monomial.into_iter().partition(|&(v, _)| self.is_delay(v));
            groups.entry(delays).or_default().push((rest, c));
        }
        let mut first = true;
        for (delays, terms) in groups {
            let group = Poly::from_terms(terms);
            if delays.is_empty() {
                self.collected(out, &group, scale, false);
            } else {
                let negative = group.leading_coefficient() < IBig::ZERO;
                sign(out, negative, first);
                if group.len() > 1 {
                    out.push("(");
                    self.collected(out, &group, scale, negative);
                    out.push(")");
                } else {
                    self.product(out, &Packed::new(&group, self), 0, scale, false);
                }
                for (v, e) in delays {
                    if out.in_product() {
                        out.dot();
                    }
                    self.power(out, v, e);
                }
            }
            first = false;
        }
    }

    /// Terms in descending powers of the variable: those of one power are put in parentheses where there are several.
    /// With `flipped`, all signs are turned.
    fn collected(&self, out: &mut Words<'_>, p: &Poly, scale: &Scale, flipped: bool) {
        let packed = Packed::new(p, self);
        let mut i = 0;
        while i < p.len() && !out.stopped() {
            let power = packed.power(i);
            let negative = packed.monomials.is_negative(i) != flipped;
            sign(out, negative, i == 0);
            let alone = power == 0 || i + 1 == p.len() || packed.power(i + 1) != power;
            if alone {
                self.product(out, &packed, i, scale, true);
                i += 1;
                continue;
            }
            out.push("(");
            Self::factor_of_power(out, &packed, i, scale);
            i += 1;
            while i < p.len() && packed.power(i) == power && !out.stopped() {
                sign(out, (packed.monomials.is_negative(i) != flipped) != negative, false);
                Self::factor_of_power(out, &packed, i, scale);
                i += 1;
            }
            out.push(")");
            out.dot();
            self.power(out, Var::S, power);
        }
    }

    /// One term without its sign and its power of the variable.
    fn factor_of_power(out: &mut Words<'_>, packed: &Packed<'_>, i: usize, scale: &Scale) {
        let any = tell_coefficient(out, packed, i, scale);
        if any {
            out.push("·");
        }
        if packed.monomials.push(&mut out.current, i) {
            out.break_long();
        } else if any {
            out.current.truncate(out.current.len() - "·".len());
        } else {
            out.push("1");
        }
    }

    /// One term without its sign; 1 is told only where asked for.
    fn product(&self, out: &mut Words<'_>, packed: &Packed<'_>, i: usize, scale: &Scale, one: bool) {
        let power = packed.power(i);
        let mut any = tell_coefficient(out, packed, i, scale);
        if self.seconds && power > 0 && any {
            out.push(&if power == 1 { " [s]".to_owned() } else { format!(" [s{}]", superscript(power)) });
        }
        if any {
            out.push("·");
        }
        if packed.monomials.push(&mut out.current, i) {
            any = true;
            out.break_long();
        } else if any {
            out.current.truncate(out.current.len() - "·".len());
        }
        if power > 0 {
            if any {
                out.dot();
            }
            self.power(out, Var::S, power);
        } else if !any && one {
            out.push("1");
        }
    }
}

/// A polynomial with the text of its products.
struct Packed<'p> {
    poly: &'p Poly,
    monomials: Monomials<'p>,
    degree: bool,
}

impl<'p> Packed<'p> {
    fn new(poly: &'p Poly, naming: &Naming<'_>) -> Self {
        let name = |v: Var| (v != Var::S).then(|| naming.name(v));
        let monomials = Monomials::new(poly, name, "·", |out, name, exponent| {
            out.push_str(name);
            if exponent > 1 {
                out.push_str(&superscript(exponent as u32));
            }
        });
        Self { poly, monomials, degree: poly.degree(Var::S) > 0 }
    }

    /// The power of s or z in term `i`: it stands first in every monomial.
    fn power(&self, i: usize) -> u32 {
        if !self.degree {
            return 0;
        }
        self.poly.fields().first().map_or(0, |f| f.get(self.poly.key(i)) as u32)
    }
}

/// A term's coefficient without its sign; nothing for 1.
fn tell_coefficient(out: &mut Words<'_>, packed: &Packed<'_>, i: usize, scale: &Scale) -> bool {
    if *scale == Scale::Whole && matches!(packed.poly.small(i), Some(1 | -1)) {
        return false;
    }
    let told = scale.tell(&packed.poly.values().get(i));
    told.inspect(|text| out.push(text)).is_some()
}

/// The sign before a term, and the end of the word before it.
fn sign(out: &mut Words<'_>, negative: bool, first: bool) {
    if first {
        if negative {
            out.push("-");
        }
    } else {
        out.end(Joint::Space);
        out.push(if negative { "- " } else { "+ " });
    }
}

/// A dead time as often as its exponent says: `exp(-0.2·s)` for the second power of `exp(-(1/10)*s)`.
fn delay_power(name: &str, exponent: u32) -> String {
    let inner = name.strip_prefix("exp(-").and_then(|n| n.strip_suffix("*s)"));
    let Some(time) = inner else {
        return if exponent == 1 { name.to_owned() } else { format!("({name}){}", superscript(exponent)) };
    };
    let bare = time.strip_prefix('(').and_then(|t| t.strip_suffix(')')).unwrap_or(time);
    let (n, d) = bare.split_once('/').unwrap_or((bare, "1"));
    let number = n.parse::<IBig>().ok().zip(d.parse::<UBig>().ok()).filter(|(_, d)| !d.is_zero());
    let told = match number {
        Some((n, d)) => {
            let text = number::exact(&(RBig::from_parts(n, d) * RBig::from(exponent)));
            if text.contains('/') { format!("({text})") } else { text }
        }
        None if exponent == 1 => dotted(time),
        None => format!("{exponent}·{}", dotted(time)),
    };
    if told == "1" { "exp(-s)".to_owned() } else { format!("exp(-{told}·s)") }
}

/// An expression of the results' own notation as people write it: centre dots, raised exponents, decimals.
/// `2*Kp^2/(5/2*s + 17001600000000)` is `2·Kp²/(2.5·s + 1.70016e13)`.
pub(super) fn dotted(expression: &str) -> String {
    let mut out = String::with_capacity(expression.len());
    let mut rest = expression;
    let mut last = ' ';
    while let Some(c) = rest.chars().next() {
        let digits = rest.bytes().take_while(u8::is_ascii_digit).count();
        // Digits inside a name belong to it.
        if digits > 0 && !(last.is_alphanumeric() || matches!(last, '_' | '.')) {
            let (text, after) = number_at(rest, digits, last == '/');
            out.push_str(&text);
            rest = after;
            last = '0';
            continue;
        }
        rest = &rest[c.len_utf8()..];
        let power = rest.bytes().take_while(u8::is_ascii_digit).count();
        match (c, rest[..power].parse()) {
            ('^', Ok(exponent)) => {
                out.push_str(&superscript(exponent));
                rest = &rest[power..];
            }
            ('*', _) => out.push('·'),
            _ => out.push(c),
        }
        last = c;
    }
    out
}

/// A whole number or a ratio at the beginning of a text, as a decimal where it has a short one, and what follows.
fn number_at(text: &str, digits: usize, below: bool) -> (String, &str) {
    let (whole, rest) = text.split_at(digits);
    let told = |n: &str, d: &str| {
        let (n, d) = (n.parse::<IBig>().ok()?, d.parse::<UBig>().ok().filter(|d| !d.is_zero())?);
        number::short_decimal(&RBig::from_parts(n, d))
    };
    let divisor = rest.strip_prefix('/').map_or("", |r| &r[..r.bytes().take_while(u8::is_ascii_digit).count()]);
    let after = rest.get(1 + divisor.len()..).unwrap_or_default();
    // `3/4^2` and `1/2/3` are no ratio of the two.
    if !divisor.is_empty() && !below && !after.starts_with('^') {
        if let Some(text) = told(whole, divisor) {
            return (text, after);
        }
        return (format!("{whole}/{divisor}"), after);
    }
    (told(whole, "1").unwrap_or_else(|| whole.to_owned()), rest)
}

#[cfg(test)]
mod tests {
    use super::*;

    const DELAY: Var = Var(1);
    const K: Var = Var(2);
    const T: Var = Var(3);

    fn term(c: i64, powers: &[(Var, u32)]) -> (Monomial, IBig) {
        (powers.to_vec(), IBig::from(c))
    }

    fn told(terms: Vec<(Monomial, IBig)>, scale: &Scale) -> String {
        let names = [(DELAY, "exp(-(1/10)*s)".to_owned()), (K, "K".to_owned()), (T, "T".to_owned())];
        let naming = Naming { variable: "s", names: &names, seconds: false };
        let mut text = String::new();
        let mut sink = |joint: Joint, word: &str| {
            if joint == Joint::Space {
                text.push(' ');
            }
            text.push_str(word);
            true
        };
        let mut words = Words::new(&mut sink);
        naming.sum(&mut words, &Poly::from_terms(terms), scale);
        words.end(Joint::Tight);
        text
    }

    #[test]
    fn numbers_come_first_and_powers_stand_high() {
        let p = vec![term(25, &[(Var::S, 2)]), term(-1, &[(Var::S, 1)]), term(0, &[]), term(600, &[])];
        assert_eq!(told(p.clone(), &Scale::Whole), "25·s² - s + 600");
        let by = RBig::from_parts(IBig::ONE, UBig::from(25u8));
        assert_eq!(told(p, &Scale::Exact(by)), "s² - 0.04·s + 24");
        assert_eq!(told(vec![], &Scale::Whole), "0");
        assert_eq!(told(vec![term(-1, &[])], &Scale::Whole), "-1");
        let third = RBig::from_parts(IBig::ONE, UBig::from(3u8));
        assert_eq!(told(vec![term(1, &[(Var::S, 1)])], &Scale::Exact(third.clone())), "(1/3)·s");
        assert_eq!(told(vec![term(1, &[(Var::S, 1)])], &Scale::Rounded(third)), "0.333333·s");
    }

    #[test]
    fn symbols_are_collected_by_powers_of_s() {
        let p = vec![
            term(1, &[(Var::S, 2), (K, 2), (T, 1)]),
            term(-3, &[(Var::S, 1), (K, 1)]),
            term(2, &[(Var::S, 1)]),
            term(1, &[(K, 1)]),
            term(-1, &[(T, 1)]),
        ];
        assert_eq!(told(p, &Scale::Whole), "K²·T·s² - (3·K - 2)·s + K - T");
    }

    #[test]
    fn dead_times_stand_apart() {
        let p = vec![
            term(1, &[(Var::S, 2)]),
            term(2, &[]),
            term(-3, &[(Var::S, 1), (DELAY, 1)]),
            term(-1, &[(DELAY, 1)]),
            term(1, &[(DELAY, 3)]),
            term(5, &[(Var::S, 1), (DELAY, 2)]),
        ];
        assert_eq!(told(p, &Scale::Whole), "s² + 2 - (3·s + 1)·exp(-0.1·s) + 5·s·exp(-0.2·s) + exp(-0.3·s)");
        assert_eq!(delay_power("exp(-2*T*s)", 2), "exp(-2·2·T·s)");
        assert_eq!(delay_power("exp(-T*s)", 1), "exp(-T·s)");
        assert_eq!(delay_power("exp(-1*s)", 1), "exp(-s)");
    }

    #[test]
    fn the_notation_of_results_is_set_with_dots() {
        assert_eq!(dotted("2*Kp^2 - b^12*a"), "2·Kp² - b¹²·a");
        assert_eq!(dotted("(5/2*s + 17001600000000)/(3*y1 + C_2/3)"), "(2.5·s + 1.70016e13)/(3·y1 + C_2/3)");
        assert_eq!(dotted("1/3 - 23/200 + x/2/4 + 12/(s^10 + ζ2)"), "1/3 - 0.115 + x/2/4 + 12/(s¹⁰ + ζ2)");
    }

    #[test]
    fn words_stop_when_nobody_listens() {
        let p = Poly::from_terms((0..50).map(|k| term(1, &[(Var::S, k)])));
        let mut count = 0;
        let mut sink = |_: Joint, _: &str| {
            count += 1;
            count < 3
        };
        let mut words = Words::new(&mut sink);
        Naming { variable: "s", names: &[], seconds: false }.sum(&mut words, &p, &Scale::Whole);
        words.end(Joint::Tight);
        assert_eq!(count, 3);
    }
}
