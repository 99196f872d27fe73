//! The symbols of units, built in and the user's own, and the prefixes.

use super::{Dimension, Scale, Unit};
use dashu_ratio::RBig;
use rustc_hash::FxHashMap;
use std::borrow::Cow;
use std::collections::BTreeMap;
use unicode_normalization::{UnicodeNormalization, is_nfc};

/// A built-in unit: its factor to coherent SI is `numerator / denominator` · π^`pi`.
struct Row {
    symbol: &'static str,
    prefixes: bool,
    /// Exponents of kg, m, s, A, K, mol, cd.
    exponents: [i32; 7],
    numerator: u32,
    denominator: u32,
    pi: i32,
}

/// A coherent unit that takes prefixes.
const fn coherent(symbol: &'static str, exponents: [i32; 7]) -> Row {
    Row { symbol, prefixes: true, exponents, numerator: 1, denominator: 1, pi: 0 }
}

/// A unit of another size.
const fn sized(symbol: &'static str, prefixes: bool, exponents: [i32; 7], over: (u32, u32), pi: i32) -> Row {
    Row { symbol, prefixes, exponents, numerator: over.0, denominator: over.1, pi }
}

const TIME: [i32; 7] = [0, 0, 1, 0, 0, 0, 0];
const NONE: [i32; 7] = [0; 7];

/// Every built-in unit. The order is that in which close names are offered.
static ROWS: [Row; 39] = [
    // Base units: SI brochure, table 2; the kilogram by way of the gram.
    coherent("s", TIME),
    coherent("m", [0, 1, 0, 0, 0, 0, 0]),
    sized("g", true, [1, 0, 0, 0, 0, 0, 0], (1, 1000), 0),
    coherent("A", [0, 0, 0, 1, 0, 0, 0]),
    coherent("K", [0, 0, 0, 0, 1, 0, 0]),
    coherent("mol", [0, 0, 0, 0, 0, 1, 0]),
    coherent("cd", [0, 0, 0, 0, 0, 0, 1]),
    // Units with special names: table 4, degree Celsius left out since its zero is not that of the kelvin.
    coherent("rad", NONE),
    coherent("sr", NONE),
    coherent("Hz", [0, 0, -1, 0, 0, 0, 0]),
    coherent("N", [1, 1, -2, 0, 0, 0, 0]),
    coherent("Pa", [1, -1, -2, 0, 0, 0, 0]),
    coherent("J", [1, 2, -2, 0, 0, 0, 0]),
    coherent("W", [1, 2, -3, 0, 0, 0, 0]),
    coherent("C", [0, 0, 1, 1, 0, 0, 0]),
    coherent("V", [1, 2, -3, -1, 0, 0, 0]),
    coherent("F", [-1, -2, 4, 2, 0, 0, 0]),
    coherent("\u{3a9}", [1, 2, -3, -2, 0, 0, 0]),
    coherent("ohm", [1, 2, -3, -2, 0, 0, 0]),
    coherent("S", [-1, -2, 3, 2, 0, 0, 0]),
    coherent("Wb", [1, 2, -2, -1, 0, 0, 0]),
    coherent("T", [1, 0, -2, -1, 0, 0, 0]),
    coherent("H", [1, 2, -2, -2, 0, 0, 0]),
    coherent("lm", [0, 0, 0, 0, 0, 0, 1]),
    coherent("lx", [0, -2, 0, 0, 0, 0, 1]),
    coherent("Bq", [0, 0, -1, 0, 0, 0, 0]),
    coherent("Gy", [0, 2, -2, 0, 0, 0, 0]),
    coherent("Sv", [0, 2, -2, 0, 0, 0, 0]),
    coherent("kat", [0, 0, -1, 0, 0, 1, 0]),
    // Units outside the SI: table 8, and the bar.
    sized("min", false, TIME, (60, 1), 0),
    sized("h", false, TIME, (3600, 1), 0),
    sized("d", false, TIME, (86_400, 1), 0),
    sized("deg", false, NONE, (1, 180), 1),
    sized("L", true, [0, 3, 0, 0, 0, 0, 0], (1, 1000), 0),
    sized("t", true, [1, 0, 0, 0, 0, 0, 0], (1000, 1), 0),
    sized("bar", true, [1, -1, -2, 0, 0, 0, 0], (100_000, 1), 0),
    // Ours: a revolution a minute is 2π/60 rad/s.
    sized("rpm", false, [0, 0, -1, 0, 0, 0, 0], (1, 30), 1),
    sized("%", false, NONE, (1, 100), 0),
    sized("dB", false, NONE, (1, 1), 0),
];

/// Prefixes with their powers of ten: table 7. `da` stands before `d` so that the longer one is tried first.
const PREFIXES: [(&str, i32); 26] = [
    ("da", 1),
    ("q", -30),
    ("r", -27),
    ("y", -24),
    ("z", -21),
    ("a", -18),
    ("f", -15),
    ("p", -12),
    ("n", -9),
    ("u", -6),
    ("\u{b5}", -6),
    ("\u{3bc}", -6),
    ("m", -3),
    ("c", -2),
    ("d", -1),
    ("h", 2),
    ("k", 3),
    ("M", 6),
    ("G", 9),
    ("T", 12),
    ("P", 15),
    ("E", 18),
    ("Z", 21),
    ("Y", 24),
    ("R", 27),
    ("Q", 30),
];

/// The units that a file may use: the built-in ones and its own.
#[derive(Clone, Debug, Default)]
pub struct UnitTable {
    built_in: FxHashMap<&'static str, usize>,
    own: BTreeMap<String, Unit>,
}

impl UnitTable {
    /// The built-in units alone.
    pub fn new() -> Self {
        let built_in = ROWS.iter().enumerate().map(|(i, row)| (row.symbol, i)).collect();
        Self { built_in, own: BTreeMap::new() }
    }

    /// Adds a unit of the user's own, and gives back the one that had this name before, if any. The caller tells
    /// [`UnitTable::is_built_in`] names and doubles as mistakes.
    pub fn define(&mut self, name: &str, unit: Unit) -> Option<Unit> {
        self.own.insert(normal(name).into_owned(), unit)
    }

    /// Whether this is a whole built-in symbol, which a user may not give another meaning. Prefix and symbol together
    /// (`ft`, a femtotonne) may be taken, since a whole symbol wins.
    pub fn is_built_in(&self, name: &str) -> bool {
        self.built_in.contains_key(&*normal(name))
    }

    /// The unit with this symbol, prefix included: the user's own first, then whole symbols, then prefix and symbol.
    pub fn lookup(&self, symbol: &str) -> Option<Unit> {
        let symbol = &*normal(symbol);
        if let Some(unit) = self.own.get(symbol) {
            return Some(unit.clone());
        }
        if let Some(&i) = self.built_in.get(symbol) {
            return Some(ROWS[i].unit(0));
        }
        PREFIXES.iter().find_map(|&(prefix, exponent)| {
            let row = &ROWS[*self.built_in.get(symbol.strip_prefix(prefix)?)?];
            row.prefixes.then(|| row.unit(exponent))
        })
    }

    /// All whole symbols, built-in ones first in the order of their table, then the user's own by name.
    pub(super) fn symbols(&self) -> impl Iterator<Item = &str> {
        ROWS.iter().map(|row| row.symbol).chain(self.own.keys().map(String::as_str))
    }
}

impl Row {
    /// The unit with a prefix of this power of ten.
    fn unit(&self, exponent: i32) -> Unit {
        let own = RBig::from(self.numerator) / RBig::from(self.denominator);
        let ratio = own * RBig::from(10).pow(exponent as isize);
        let scale = Scale { ratio, pi: self.pi };
        Unit {
            dimension: Dimension::whole(self.exponents),
            scale,
            decibel: self.symbol == "dB",
            hertz: i32::from(self.symbol == "Hz"),
        }
    }
}

/// NFC, in which names compare; the ohm sign U+2126 becomes the Greek letter by it.
fn normal(name: &str) -> Cow<'_, str> {
    if is_nfc(name) { Cow::Borrowed(name) } else { Cow::Owned(name.nfc().collect()) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn spelled(symbol: &str) -> Option<(String, i32, String)> {
        UnitTable::new().lookup(symbol).map(|u| (u.scale.ratio.to_string(), u.scale.pi, u.dimension.spell()))
    }

    fn dimension_of(factors: &[(&str, i32)]) -> Option<Dimension> {
        let table = UnitTable::new();
        factors.iter().try_fold(Dimension::ONE, |product, &(symbol, power)| {
            Some(product.mul(table.lookup(symbol)?.dimension.pow(power)))
        })
    }

    /// BIPM, SI brochure, 9th edition (2019), table 4: the special names in terms of other SI units; from memory.
    #[test]
    fn derived_units_of_table_4() {
        let cases: &[(&str, &[(&str, i32)])] = &[
            ("rad", &[("m", 1), ("m", -1)]),
            ("sr", &[("m", 2), ("m", -2)]),
            ("Hz", &[("s", -1)]),
            ("N", &[("kg", 1), ("m", 1), ("s", -2)]),
            ("Pa", &[("N", 1), ("m", -2)]),
            ("J", &[("N", 1), ("m", 1)]),
            ("W", &[("J", 1), ("s", -1)]),
            ("C", &[("A", 1), ("s", 1)]),
            ("V", &[("W", 1), ("A", -1)]),
            ("F", &[("C", 1), ("V", -1)]),
            ("\u{3a9}", &[("V", 1), ("A", -1)]),
            ("S", &[("A", 1), ("V", -1)]),
            ("Wb", &[("V", 1), ("s", 1)]),
            ("T", &[("Wb", 1), ("m", -2)]),
            ("H", &[("Wb", 1), ("A", -1)]),
            ("lm", &[("cd", 1), ("sr", 1)]),
            ("lx", &[("lm", 1), ("m", -2)]),
            ("Bq", &[("s", -1)]),
            ("Gy", &[("J", 1), ("kg", -1)]),
            ("Sv", &[("J", 1), ("kg", -1)]),
            ("kat", &[("mol", 1), ("s", -1)]),
        ];
        let table = UnitTable::new();
        for (symbol, factors) in cases {
            let unit = table.lookup(symbol);
            assert_eq!(unit.as_ref().map(|u| u.dimension), dimension_of(factors), "{symbol}");
            assert_eq!(unit.map(|u| u.scale), Some(Scale::one()), "{symbol} is coherent");
        }
    }

    /// BIPM, SI brochure, 9th edition, table 7, with the four prefixes of 2022; from memory.
    #[test]
    fn prefixes_of_table_7() {
        let cases = "Qm 30, Rm 27, Ym 24, Zm 21, Em 18, Pm 15, Tm 12, Gm 9, Mm 6, km 3, hm 2, dam 1, dm -1, cm -2, \
                     mm -3, um -6, \u{b5}m -6, \u{3bc}m -6, nm -9, pm -12, fm -15, am -18, zm -21, ym -24, rm -27, qm -30";
        for case in cases.split(", ") {
            let Some((symbol, exponent)) = case.split_once(' ') else { panic!("a symbol and a power") };
            let exponent: i32 = exponent.parse().unwrap_or(0);
            let ten = format!("1{}", "0".repeat(exponent.unsigned_abs() as usize));
            let ratio = if exponent < 0 { format!("1/{ten}") } else { ten };
            assert_eq!(spelled(symbol), Some((ratio, 0, "m".to_owned())), "{symbol}");
        }
    }

    /// BIPM, SI brochure, 9th edition, table 8, from memory; `bar`, `rpm` and `%` by common practice.
    #[test]
    fn units_outside_the_si() {
        let cases = [
            ("min", "60", 0, "s"),
            ("h", "3600", 0, "s"),
            ("d", "86400", 0, "s"),
            ("deg", "1/180", 1, "1 (no unit)"),
            ("L", "1/1000", 0, "m^3"),
            ("mL", "1/1000000", 0, "m^3"),
            ("t", "1000", 0, "kg"),
            ("kt", "1000000", 0, "kg"),
            ("bar", "100000", 0, "Pa"),
            ("mbar", "100", 0, "Pa"),
            ("rpm", "1/30", 1, "1/s"),
            ("%", "1/100", 0, "1 (no unit)"),
        ];
        for (symbol, ratio, pi, dimension) in cases {
            assert_eq!(spelled(symbol), Some((ratio.to_owned(), pi, dimension.to_owned())), "{symbol}");
        }
    }

    #[test]
    fn whole_symbols_win_and_prefixes_are_read_once() {
        let cases = [
            ("kg", Some(("1", "kg"))),
            ("mg", Some(("1/1000000", "kg"))),
            ("cd", Some(("1", "cd"))),
            ("mol", Some(("1", "mol"))),
            ("mmol", Some(("1/1000", "mol"))),
            ("Pa", Some(("1", "Pa"))),
            ("mPa", Some(("1/1000", "Pa"))),
            ("MPa", Some(("1000000", "Pa"))),
            ("T", Some(("1", "T"))),
            ("dam", Some(("10", "m"))),
            ("mrad", Some(("1/1000", "1 (no unit)"))),
            ("kohm", Some(("1000", "ohm"))),
            ("k\u{2126}", Some(("1000", "ohm"))),
            ("m\u{3a9}", Some(("1/1000", "ohm"))),
            ("kkg", None),
            ("mmin", None),
            ("krpm", None),
            ("kdeg", None),
            ("mdB", None),
            ("k%", None),
            ("", None),
            ("k", None),
        ];
        for (symbol, told) in cases {
            let told = told.map(|(ratio, dimension): (&str, &str)| (ratio.to_owned(), dimension.to_owned()));
            assert_eq!(spelled(symbol).map(|(ratio, _, dimension)| (ratio, dimension)), told, "{symbol}");
        }
    }

    #[test]
    fn units_of_ones_own() {
        let mut table = UnitTable::new();
        let foot = Unit::of(Dimension::METRE, Scale::rational(RBig::from_parts(3048.into(), 10_000u32.into())));
        assert!(!table.is_built_in("ft") && table.is_built_in("min") && table.is_built_in("\u{2126}"));
        assert_eq!(table.define("ft", foot.clone()), None);
        assert_eq!(table.lookup("ft"), Some(foot.clone()), "wins over the femtotonne");
        assert_eq!(table.lookup("mft"), None, "takes no prefix");
        assert_eq!(table.define("ft", Unit::one()), Some(foot));
    }
}
