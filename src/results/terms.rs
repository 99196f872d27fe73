//! One side of an exact fraction, term by term. A symbolic result may have millions of terms in its coefficients: they
//! are kept as the polynomial that they are, and become text only on their way out.

use super::ExactTerm;
use crate::algebra::{IBig, Poly, Var};
use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::ser::{Serialize, SerializeSeq as _, SerializeStruct as _, Serializer};
use std::borrow::Cow;
use std::fmt::{self, Write as _};
use std::ops::Range;
use std::sync::Arc;

/// Bytes of text that are made before they are handed on.
const CHUNK_BYTES: usize = 1 << 13;

/// Terms coefficient · s^power · exp(-delay·s), by delay up, then power down.
#[derive(Clone, Debug)]
pub struct Terms {
    poly: Arc<Poly>,
    names: Arc<[(Var, String)]>,
    /// The variables that stand in coefficients: neither s nor a dead time.
    inner: Vec<Var>,
    runs: Vec<Run>,
}

/// The terms of one power and one dead time: they stand together, since s and dead times are the first variables.
#[derive(Clone, Debug)]
struct Run {
    power: u32,
    delay: String,
    places: Range<usize>,
}

impl Terms {
    /// The terms of a polynomial; `names` by the order of variables. `delay` says of a variable whether it stands for a
    /// dead time, and `told` gives the total dead time of some of them: its place in the order, and its text.
    pub(crate) fn new<O: Ord>(
        poly: Arc<Poly>,
        names: Arc<[(Var, String)]>,
        delay: impl Fn(Var) -> bool,
        mut told: impl FnMut(&[(Var, u32)]) -> (O, String),
    ) -> Self {
        let outer: Vec<_> = poly.fields().iter().filter(|f| f.var == Var::S || delay(f.var)).copied().collect();
        let exponents = |i: usize| outer.iter().map(|f| f.get(poly.key(i))).collect::<Vec<_>>();
        let mut runs: Vec<(O, Run)> = Vec::new();
        let mut start = 0;
        while start < poly.len() {
            let these = exponents(start);
            let same = |i: usize| outer.iter().zip(&these).all(|(f, &e)| f.get(poly.key(i)) == e);
            let end = (start + 1..poly.len()).find(|&i| !same(i)).unwrap_or(poly.len());
            let powers = outer.iter().zip(&these).map(|(f, &e)| (f.var, e as u32)).filter(|p| p.1 > 0);
            let (main, delays): (Vec<_>, Vec<_>) = powers.partition(|p| p.0 == Var::S);
            let (order, delay) = told(&delays);
            let power = main.first().map_or(0, |p| p.1);
            runs.push((order, Run { power, delay, places: start..end }));
            start = end;
        }
        runs.sort_by(|a, b| a.0.cmp(&b.0).then(b.1.power.cmp(&a.1.power)));
        let inner = poly.variables().into_iter().filter(|&v| v != Var::S && !delay(v)).collect();
        Self { runs: runs.into_iter().map(|r| r.1).collect(), poly, names, inner }
    }

    /// The terms, each with its coefficient as text.
    pub fn iter(&self) -> impl Iterator<Item = ExactTerm> + '_ {
        let monomials = self.monomials();
        self.runs.iter().map(move |run| ExactTerm {
            power: run.power,
            delay: run.delay.clone(),
            coefficient: Coefficient { monomials: &monomials, run }.to_string(),
        })
    }

    fn monomials(&self) -> Monomials<'_> {
        let name = |v: Var| {
            let at = self.names.binary_search_by_key(&v, |n| n.0).ok();
            self.inner.contains(&v).then(|| at.map_or("", |i| self.names[i].1.as_str()))
        };
        Monomials::new(&self.poly, name, "*", |out, name, exponent| {
            out.push_str(name);
            if exponent > 1 {
                // Writing to a string does not fail.
                let _ = write!(out, "^{exponent}");
            }
        })
    }
}

impl JsonSchema for Terms {
    fn inline_schema() -> bool {
        true
    }

    fn schema_name() -> Cow<'static, str> {
        Vec::<ExactTerm>::schema_name()
    }

    fn json_schema(generator: &mut SchemaGenerator) -> Schema {
        Vec::<ExactTerm>::json_schema(generator)
    }
}

impl Serialize for Terms {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let monomials = self.monomials();
        let mut list = serializer.serialize_seq(Some(self.runs.len()))?;
        for run in &self.runs {
            list.serialize_element(&Told { run, coefficient: Coefficient { monomials: &monomials, run } })?;
        }
        list.end()
    }
}

/// As an [`ExactTerm`], its coefficient written as it goes.
struct Told<'a> {
    run: &'a Run,
    coefficient: Coefficient<'a>,
}

impl Serialize for Told<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut told = serializer.serialize_struct("ExactTerm", 3)?;
        told.serialize_field("power", &self.run.power)?;
        told.serialize_field("delay", &self.run.delay)?;
        told.serialize_field("coefficient", &self.coefficient)?;
        told.end()
    }
}

/// The coefficient of a run, in the notation of results: `Kp*b + 3`.
struct Coefficient<'a> {
    monomials: &'a Monomials<'a>,
    run: &'a Run,
}

impl Serialize for Coefficient<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.collect_str(self)
    }
}

impl fmt::Display for Coefficient<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut text = String::with_capacity(CHUNK_BYTES + 256);
        for i in self.run.places.clone() {
            text.push_str(match (i == self.run.places.start, self.monomials.is_negative(i)) {
                (true, true) => "-",
                (true, false) => "",
                (false, true) => " - ",
                (false, false) => " + ",
            });
            let start = text.len();
            self.monomials.push_size(&mut text, i);
            if text.len() > start {
                text.push('*');
            }
            if !self.monomials.push(&mut text, i) {
                if text.len() > start {
                    text.pop();
                } else {
                    text.push('1');
                }
            }
            if text.len() >= CHUNK_BYTES {
                f.write_str(&text)?;
                text.clear();
            }
        }
        f.write_str(&text)
    }
}

/// The most bits of packed exponents that are looked up together, and how many terms make the table worth it.
///
/// With symbols of degree 1 a term names up to half of some forty symbols; a table of 256 products makes that five
/// steps instead of forty.
const TABLE: (u8, usize) = (8, 1000);

/// The products of powers of a polynomial's terms, as text.
pub(crate) struct Monomials<'p> {
    poly: &'p Poly,
    pieces: Vec<Piece>,
    dot: &'static str,
}

/// Neighbouring exponents of a packed monomial, with the text of each combination and a dot at its end.
struct Piece {
    word: usize,
    shift: u8,
    bits: u8,
    texts: Texts,
}

enum Texts {
    Table(Vec<String>),
    /// One variable: its name, and how a power of it is written.
    One(String, fn(&mut String, &str, u64)),
}

impl<'p> Monomials<'p> {
    /// Of `poly`; variables without a name are left out. `power` writes a power of a name, `dot` stands between two.
    pub(crate) fn new<'n>(
        poly: &'p Poly,
        name: impl Fn(Var) -> Option<&'n str>,
        dot: &'static str,
        power: fn(&mut String, &str, u64),
    ) -> Self {
        let most_bits = if poly.len() >= TABLE.1 { TABLE.0 } else { 0 };
        let named: Vec<_> = poly.fields().iter().filter_map(|f| Some((*f, name(f.var)?))).collect();
        let mut pieces: Vec<Piece> = Vec::new();
        let mut k = 0;
        while k < named.len() {
            let (first, text) = named[k];
            let mut low = first.shift;
            let mut end = k + 1;
            while let Some((f, _)) = named.get(end) {
                let joined = f.word == first.word && f.shift + f.bits == low;
                if !joined || first.shift + first.bits - f.shift > most_bits {
                    break;
                }
                low = f.shift;
                end += 1;
            }
            let bits = first.shift + first.bits - low;
            let texts = if bits > most_bits {
                Texts::One(text.to_owned(), power)
            } else {
                let told = |pattern: u64| {
                    let mut out = String::new();
                    for (f, name) in &named[k..end] {
                        let exponent = pattern >> (f.shift - low) & f.mask();
                        if exponent > 0 {
                            power(&mut out, name, exponent);
                            out.push_str(dot);
                        }
                    }
                    out
                };
                Texts::Table((0..1 << bits).map(told).collect())
            };
            pieces.push(Piece { word: first.word as usize, shift: low, bits, texts });
            k = end;
        }
        Self { poly, pieces, dot }
    }

    /// Appends the product of powers of term `i`; tells whether there is any.
    pub(crate) fn push(&self, out: &mut String, i: usize) -> bool {
        let (key, start) = (self.poly.key(i), out.len());
        for piece in &self.pieces {
            let pattern = key[piece.word] >> piece.shift & (u64::MAX >> (64 - piece.bits));
            match &piece.texts {
                Texts::Table(texts) => out.push_str(&texts[pattern as usize]),
                Texts::One(name, power) if pattern > 0 => {
                    power(out, name, pattern);
                    out.push_str(self.dot);
                }
                Texts::One(..) => {}
            }
        }
        let any = out.len() > start;
        if any {
            out.truncate(out.len() - self.dot.len());
        }
        any
    }

    /// Appends the coefficient of term `i` without its sign; nothing for 1.
    fn push_size(&self, out: &mut String, i: usize) {
        // Writing to a string does not fail.
        let _ = match self.poly.small(i) {
            Some(1 | -1) => Ok(()),
            Some(small) => write!(out, "{}", small.unsigned_abs()),
            None => {
                let c = self.poly.values().get(i);
                if c < IBig::ZERO { write!(out, "{}", -c) } else { write!(out, "{c}") }
            }
        };
    }

    /// Whether the coefficient of term `i` is negative.
    pub(crate) fn is_negative(&self, i: usize) -> bool {
        self.poly.values().is_negative(i)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const NAMES: [(u32, &str); 4] = [(1, "exp(-2*s)"), (10, "Kp"), (11, "b"), (12, "ω_n")];

    fn terms(list: &[(i64, &[(u32, u32)])]) -> Terms {
        let poly = Poly::from_terms(
            list.iter().map(|(c, m)| (m.iter().map(|&(v, e)| (Var(v), e)).collect::<Vec<_>>(), IBig::from(*c))),
        );
        let names = NAMES.map(|(v, n)| (Var(v), n.to_owned()));
        let told = |delays: &[(Var, u32)]| {
            let total = delays.iter().map(|d| 2 * d.1).sum::<u32>();
            (total, total.to_string())
        };
        Terms::new(Arc::new(poly), names.to_vec().into(), |v| v == Var(1), told)
    }

    #[test]
    fn terms_stand_by_dead_time_then_power_and_read_as_the_contract_says() {
        let t = terms(&[
            (1, &[(0, 1), (1, 1)]),
            (-1, &[(0, 2), (10, 1), (11, 1)]),
            (3, &[(0, 2)]),
            (12, &[]),
            (-7, &[(10, 2), (12, 3)]),
            (1, &[(11, 1)]),
        ]);
        let told: Vec<_> = t.iter().map(|t| format!("{} {} {}", t.power, t.delay, t.coefficient)).collect();
        assert_eq!(told, ["2 0 -Kp*b + 3", "0 0 -7*Kp^2*ω_n^3 + b + 12", "1 2 1"]);
        let list: Vec<ExactTerm> = t.iter().collect();
        let text = |value: &dyn Fn() -> serde_json::Result<String>| value().expect("it is JSON");
        assert_eq!(text(&|| serde_json::to_string(&t)), text(&|| serde_json::to_string(&list)));
    }

    #[test]
    fn a_long_sum_is_the_same_with_and_without_tables() {
        // All products of ten symbols, two of them with higher powers, so that tables and wide fields both occur.
        let mut list = Vec::new();
        for k in 0..1 << 10_u32 {
            let powers = (0..10).filter(|b| k >> b & 1 == 1).map(|b| (Var(20 + b), if b % 7 == 0 { 300 } else { 1 }));
            list.push((powers.collect::<Vec<_>>(), IBig::from(i64::from(k) - 500)));
        }
        let names: Vec<(Var, String)> = (0..10).map(|b| (Var(20 + b), format!("k{b}"))).collect();
        let poly = Poly::from_terms(list);
        let wanted = poly.terms().fold(String::new(), |text, (powers, c)| {
            let negative = c < IBig::ZERO;
            let sign = match (text.is_empty(), negative) {
                (true, true) => "-",
                (true, false) => "",
                (false, true) => " - ",
                (false, false) => " + ",
            };
            let size = if negative { -c } else { c };
            let mut parts: Vec<String> = Vec::new();
            if size != IBig::ONE || powers.is_empty() {
                parts.push(size.to_string());
            }
            parts.extend(powers.iter().map(|&(v, e)| {
                let name = format!("k{}", v.0 - 20);
                if e == 1 { name } else { format!("{name}^{e}") }
            }));
            text + sign + &parts.join("*")
        });
        let told = Terms::new(Arc::new(poly), names.into(), |_| false, |_| ((), "0".to_owned()));
        let all: Vec<ExactTerm> = told.iter().collect();
        assert_eq!(all.len(), 1);
        assert!(all[0].coefficient == wanted);
    }
}
