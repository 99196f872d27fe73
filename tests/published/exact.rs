//! Exact coefficients as JSON tells them: read, evaluated in rational arithmetic, compared as fractions.

use dashu_int::IBig;
use dashu_ratio::RBig;
use serde_json::Value;
use std::collections::{BTreeMap, BTreeSet};

/// Values of the symbols.
pub(crate) type Env = BTreeMap<String, RBig>;

/// One term coefficient · s^power · exp(-delay·s).
#[derive(Clone, Debug)]
pub(crate) struct Term {
    pub(crate) power: i64,
    pub(crate) delay: String,
    pub(crate) coefficient: String,
}

/// Terms from a list of coefficients, highest power first, or from a list of `{power, delay, coefficient}`.
pub(crate) fn terms(value: &Value) -> Result<Vec<Term>, String> {
    let list = value.as_array().ok_or_else(|| format!("no list of terms: {value}"))?;
    let text = |v: &Value| v.as_str().map_or_else(|| v.to_string(), str::to_owned);
    let highest = list.len() as i64 - 1;
    let term = |(i, v): (usize, &Value)| match v.get("power") {
        Some(power) => Ok(Term {
            power: power.as_i64().ok_or("a power is a whole number")?,
            delay: v.get("delay").map_or_else(|| "0".to_owned(), text),
            coefficient: text(&v["coefficient"]),
        }),
        None => Ok(Term { power: highest - i as i64, delay: "0".to_owned(), coefficient: text(v) }),
    };
    list.iter().enumerate().map(term).collect()
}

/// A recursive-descent reader of `+ - * / ^ ( )`, whole numbers, decimals and names; test data is shallow.
struct Reader<'a> {
    rest: &'a str,
    env: &'a Env,
}

/// The value of an expression.
pub(crate) fn value(text: &str, env: &Env) -> Result<RBig, String> {
    let mut reader = Reader { rest: text, env };
    let value = reader.sum()?;
    if reader.rest.trim().is_empty() { Ok(value) } else { Err(format!("cannot read `{text}`")) }
}

impl Reader<'_> {
    fn take(&mut self, sign: &str) -> bool {
        let rest = self.rest.trim_start();
        rest.strip_prefix(sign).is_some_and(|after| {
            self.rest = after;
            true
        })
    }

    fn sum(&mut self) -> Result<RBig, String> {
        let mut value = self.product()?;
        loop {
            if self.take("+") {
                value += self.product()?;
            } else if self.take("-") {
                value -= self.product()?;
            } else {
                return Ok(value);
            }
        }
    }

    fn product(&mut self) -> Result<RBig, String> {
        let mut value = self.sign()?;
        loop {
            if self.take("*") || self.take("·") {
                value *= self.sign()?;
            } else if self.take("/") {
                let divisor = self.sign()?;
                if divisor.is_zero() {
                    return Err("division by zero".to_owned());
                }
                value /= divisor;
            } else {
                return Ok(value);
            }
        }
    }

    fn sign(&mut self) -> Result<RBig, String> {
        if self.take("-") { Ok(-self.sign()?) } else { self.power() }
    }

    fn power(&mut self) -> Result<RBig, String> {
        let base = self.atom()?;
        if !self.take("^") {
            return Ok(base);
        }
        let exponent = isize::try_from(&self.sign()?.to_int().value()).map_err(|e| e.to_string())?;
        Ok(base.pow(exponent))
    }

    fn atom(&mut self) -> Result<RBig, String> {
        if self.take("(") {
            let value = self.sum()?;
            return if self.take(")") { Ok(value) } else { Err("a `)` is missing".to_owned()) };
        }
        let rest = self.rest.trim_start();
        let end = rest.find(|c: char| !c.is_alphanumeric() && c != '_' && c != '.').unwrap_or(rest.len());
        let (word, after) = rest.split_at(end);
        self.rest = after;
        if word.starts_with(|c: char| c.is_ascii_digit()) {
            return decimal(word);
        }
        self.env.get(word).cloned().ok_or_else(|| format!("no value for `{word}` before `{after}`"))
    }
}

fn decimal(word: &str) -> Result<RBig, String> {
    let (whole, fraction) = word.split_once('.').unwrap_or((word, ""));
    let digits: IBig = format!("{whole}{fraction}").parse().map_err(|_| format!("cannot read `{word}`"))?;
    Ok(RBig::from(digits) / RBig::from(10).pow(fraction.len() as isize))
}

/// The names in an expression.
fn names(text: &str, into: &mut BTreeSet<String>) {
    let words = text.split(|c: char| !c.is_alphanumeric() && c != '_' && c != '.');
    into.extend(words.filter(|w| w.starts_with(|c: char| c.is_alphabetic() || c == '_')).map(str::to_owned));
}

/// Small rational numbers, the same at every run: a linear congruential generator (Knuth's MMIX constants).
struct Numbers(u64);

impl Numbers {
    fn between(&mut self, low: u64, high: u64) -> RBig {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        RBig::from(low + (self.0 >> 33) % (high - low + 1))
    }

    fn ratio(&mut self, low: u64, high: u64, below: u64) -> RBig {
        self.between(low, high) / self.between(1, below)
    }
}

fn plain(delay: &str) -> Option<RBig> {
    value(delay, &Env::new()).ok()
}

/// The largest q of which every delay is a whole multiple; 1 where there is no delay.
fn common_delay(delays: &[RBig]) -> RBig {
    let gcd = |a: RBig, b: RBig| {
        let (mut a, mut b) = (a, b);
        while !b.is_zero() {
            let quotient = RBig::from((a.clone() / b.clone()).floor());
            let rest = a - quotient * b.clone();
            (a, b) = (b, rest);
        }
        a
    };
    let common = delays.iter().cloned().fold(RBig::ZERO, gcd);
    if common.is_zero() { RBig::ONE } else { common }
}

/// Says why two fractions differ, or nothing: cross-multiplied and evaluated at five points, in exact arithmetic while
/// all delays are numbers. With `reduced` the same powers and delays must be there too, that is, lowest terms.
pub(crate) fn same_fraction(got: [&Value; 2], wanted: [&Value; 2], reduced: bool) -> Result<(), String> {
    let sides = [terms(got[0])?, terms(got[1])?, terms(wanted[0])?, terms(wanted[1])?];
    let all = || sides.iter().flatten();
    let mut symbols = BTreeSet::new();
    for term in all() {
        names(&term.coefficient, &mut symbols);
        names(&term.delay, &mut symbols);
    }
    let delays: Option<Vec<RBig>> = all().map(|t| plain(&t.delay)).collect();
    let mut numbers = Numbers(20_240_501);
    let mut envs = Vec::new();
    for _ in 0..5 {
        let env: Env = symbols.iter().map(|n| (n.clone(), numbers.ratio(2, 997, 31))).collect();
        match &delays {
            Some(delays) => exact_point(&sides, &env, &common_delay(delays), &mut numbers)?,
            None => rounded_point(&sides, &env, &mut numbers)?,
        }
        envs.push(env);
    }
    if reduced && delays.is_some() {
        let keys: Vec<_> = sides.iter().map(|side| nonzero(side, &envs)).collect::<Result<_, _>>()?;
        if keys[0] != keys[2] || keys[1] != keys[3] {
            return Err("equal in value but not in lowest terms".to_owned());
        }
    }
    Ok(())
}

fn exact_point(sides: &[Vec<Term>; 4], env: &Env, unit: &RBig, numbers: &mut Numbers) -> Result<(), String> {
    let s = numbers.ratio(2, 99, 17);
    let x = numbers.between(2, 99) / numbers.between(101, 199);
    let sum = |side: &[Term]| {
        side.iter().try_fold(RBig::ZERO, |sum, t| {
            let steps = (plain(&t.delay).unwrap_or(RBig::ZERO) / unit).to_int().value();
            let steps = isize::try_from(&steps).map_err(|e| e.to_string())?;
            Ok::<_, String>(sum + value(&t.coefficient, env)? * s.clone().pow(t.power as isize) * x.clone().pow(steps))
        })
    };
    let [a, b, c, d] = [sum(&sides[0])?, sum(&sides[1])?, sum(&sides[2])?, sum(&sides[3])?];
    if b.is_zero() {
        return Err("denominator is zero".to_owned());
    }
    if a * d == c * b { Ok(()) } else { Err("not the expected function".to_owned()) }
}

fn rounded_point(sides: &[Vec<Term>; 4], env: &Env, numbers: &mut Numbers) -> Result<(), String> {
    let env: Env = env.iter().map(|(n, v)| (n.clone(), v / RBig::from(300))).collect();
    let s = (numbers.ratio(2, 99, 17) / RBig::from(100)).to_f64().value();
    let sum = |side: &[Term]| {
        side.iter().try_fold(0.0, |sum, t| {
            let coefficient = value(&t.coefficient, &env)?.to_f64().value();
            let delay = value(&t.delay, &env)?.to_f64().value();
            Ok::<_, String>(sum + coefficient * s.powi(t.power as i32) * (-delay * s).exp())
        })
    };
    let [a, b, c, d]: [f64; 4] = [sum(&sides[0])?, sum(&sides[1])?, sum(&sides[2])?, sum(&sides[3])?];
    let (left, right) = (a * d, c * b);
    let close = (left - right).abs() <= 1e-9 * left.abs().max(right.abs()).max(1e-300);
    if close { Ok(()) } else { Err("not the expected function".to_owned()) }
}

/// Powers and delays of the terms that are not zero at every one of the points.
fn nonzero(side: &[Term], envs: &[Env]) -> Result<BTreeSet<(i64, RBig)>, String> {
    let mut keys = BTreeSet::new();
    for term in side {
        for env in envs {
            if !value(&term.coefficient, env)?.is_zero() {
                keys.insert((term.power, plain(&term.delay).unwrap_or(RBig::ZERO)));
            }
        }
    }
    Ok(keys)
}

/// Says how a result departs from the canonical form of one without symbols, or nothing.
pub(crate) fn canonical(numerator: &Value, denominator: &Value) -> Result<(), String> {
    let sides = [terms(numerator)?, terms(denominator)?];
    let none = Env::new();
    let mut divisor = RBig::ZERO;
    for term in sides.iter().flatten() {
        let coefficient = value(&term.coefficient, &none)?;
        if !coefficient.is_int() {
            return Err("a coefficient is not an integer".to_owned());
        }
        divisor = common_of(divisor, coefficient);
    }
    if divisor != RBig::ONE {
        return Err(format!("coefficients have the common divisor {divisor}"));
    }
    let first = sides[1].first().ok_or("no denominator")?;
    if value(&first.coefficient, &none)? <= RBig::ZERO {
        return Err("the denominator's first coefficient is not positive".to_owned());
    }
    for side in &sides {
        let order: Vec<_> = side.iter().map(|t| (plain(&t.delay), -t.power)).collect();
        if !order.is_sorted() {
            return Err("terms are not ordered by delay up, then power down".to_owned());
        }
    }
    Ok(())
}

fn common_of(a: RBig, b: RBig) -> RBig {
    let positive = |x: RBig| if x < RBig::ZERO { -x } else { x };
    match (a.is_zero(), b.is_zero()) {
        (true, _) => positive(b),
        (_, true) => positive(a),
        _ => common_delay(&[positive(a), positive(b)]),
    }
}
