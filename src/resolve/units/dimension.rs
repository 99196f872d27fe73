//! Dimensions: exponents of the seven SI base units, and how they are spelled for people.

use std::fmt::Write as _;

/// Exponents are kept in twelfths, so that square, cube and fourth roots of a whole power have a place.
const TWELFTHS: i32 = 12;

/// Symbols of the base units, in the order of the exponents.
const BASE: [&str; 7] = ["kg", "m", "s", "A", "K", "mol", "cd"];

/// What kind of quantity something is: the exponents of kg, m, s, A, K, mol and cd.
///
/// Exponents past some hundred millions saturate; no text that is checked within the limits comes near.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Dimension([i32; 7]);

impl Dimension {
    /// Of a plain number.
    pub const ONE: Self = Self([0; 7]);
    /// Of a mass.
    pub const KILOGRAM: Self = Self::whole([1, 0, 0, 0, 0, 0, 0]);
    /// Of a length.
    pub const METRE: Self = Self::whole([0, 1, 0, 0, 0, 0, 0]);
    /// Of a time.
    pub const SECOND: Self = Self::whole([0, 0, 1, 0, 0, 0, 0]);
    /// Of `s` and of every frequency.
    pub const PER_SECOND: Self = Self::whole([0, 0, -1, 0, 0, 0, 0]);

    /// From whole exponents of kg, m, s, A, K, mol and cd.
    pub const fn whole(exponents: [i32; 7]) -> Self {
        let mut twelfths = exponents;
        let mut i = 0;
        while i < twelfths.len() {
            twelfths[i] *= TWELFTHS;
            i += 1;
        }
        Self(twelfths)
    }

    /// Of a product.
    #[must_use]
    pub fn mul(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].saturating_add(other.0[i])))
    }

    /// Of a quotient.
    #[must_use]
    pub fn div(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].saturating_sub(other.0[i])))
    }

    /// Of a whole power.
    #[must_use]
    pub fn pow(self, n: i32) -> Self {
        Self(self.0.map(|e| e.saturating_mul(n)))
    }

    /// Of the `n`-th root; `None` where an exponent would be no twelfth, or `n` is 0.
    pub fn root(self, n: u32) -> Option<Self> {
        let n = i32::try_from(n).ok().filter(|&n| n > 0)?;
        self.0.iter().all(|e| e % n == 0).then(|| Self(self.0.map(|e| e / n)))
    }

    /// Whether it is that of a plain number.
    pub fn is_one(self) -> bool {
        self == Self::ONE
    }

    /// Whether it is a power of the second, the plain number included: what the number 1 takes beside `+` and `-`.
    pub fn is_power_of_second(self) -> bool {
        self.0.iter().enumerate().all(|(i, &e)| i == 2 || e == 0)
    }

    /// Names it for people in familiar terms: `N*m`, `kg*m^2`, `V`, `1/s`, `1 (no unit)`.
    ///
    /// The spelling is the shortest of one symbol of a derived unit (or none) times powers of base units, each symbol
    /// counted as often as its exponent says; of equal ones the first wins: base units, then the order of the table.
    /// A derived unit, which has the kilogram in it, never stands beside one: an acceleration is no N/kg.
    pub fn spell(self) -> String {
        if self.is_one() {
            return "1 (no unit)".to_owned();
        }
        let mut best = (self.length(), None);
        for power in [1, -1] {
            for (symbol, dimension) in &FAMILIAR {
                let rest = self.div(dimension.pow(power));
                let length = rest.length() + i64::from(TWELFTHS);
                if rest.0[0] == 0 && length < best.0 {
                    best = (length, Some((*symbol, power * TWELFTHS, rest)));
                }
            }
        }
        let (factors, rest) = best.1.map_or((Vec::new(), self), |(symbol, power, rest)| (vec![(symbol, power)], rest));
        write_out(factors.into_iter().chain(BASE.into_iter().zip(rest.0)))
    }

    /// How long it is in base units, in twelfths: see [`Dimension::spell`].
    fn length(self) -> i64 {
        self.0.iter().map(|&e| i64::from(e).abs()).sum()
    }
}

/// Derived units by which people know a dimension. Left out are those that would hide another: J (torque is N*m), Wb
/// (V*s), C, Bq, Gy, Sv, kat, lm.
const FAMILIAR: [(&str, Dimension); 9] = [
    ("N", Dimension::whole([1, 1, -2, 0, 0, 0, 0])),
    ("V", Dimension::whole([1, 2, -3, -1, 0, 0, 0])),
    ("W", Dimension::whole([1, 2, -3, 0, 0, 0, 0])),
    ("Pa", Dimension::whole([1, -1, -2, 0, 0, 0, 0])),
    ("ohm", Dimension::whole([1, 2, -3, -2, 0, 0, 0])),
    ("S", Dimension::whole([-1, -2, 3, 2, 0, 0, 0])),
    ("H", Dimension::whole([1, 2, -2, -2, 0, 0, 0])),
    ("F", Dimension::whole([-1, -2, 4, 2, 0, 0, 0])),
    ("T", Dimension::whole([1, 0, -2, -1, 0, 0, 0])),
];

/// Writes factors with exponents in twelfths: those with a positive exponent first, the others after one `/`.
fn write_out(factors: impl Iterator<Item = (&'static str, i32)>) -> String {
    let (above, below): (Vec<_>, Vec<_>) = factors.filter(|f| f.1 != 0).partition(|f| f.1 > 0);
    let join = |part: &[(&str, i32)]| {
        let texts: Vec<String> = part.iter().map(|&(symbol, e)| power(symbol, e.saturating_abs())).collect();
        texts.join("*")
    };
    let mut text = if above.is_empty() { "1".to_owned() } else { join(&above) };
    match below.len() {
        0 => {}
        1 => text = format!("{text}/{}", join(&below)),
        _ => text = format!("{text}/({})", join(&below)),
    }
    text
}

/// `symbol^exponent`, the exponent in twelfths and positive.
fn power(symbol: &str, twelfths: i32) -> String {
    let mut text = symbol.to_owned();
    let common = (1..=TWELFTHS).rev().find(|d| TWELFTHS % d == 0 && twelfths % d == 0).unwrap_or(1);
    // Writing to a String can't fail.
    let _ = match (twelfths / common, TWELFTHS / common) {
        (1, 1) => Ok(()),
        (n, 1) => write!(text, "^{n}"),
        (n, d) => write!(text, "^({n}/{d})"),
    };
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    const NEWTON: Dimension = Dimension::whole([1, 1, -2, 0, 0, 0, 0]);
    const VOLT: Dimension = Dimension::whole([1, 2, -3, -1, 0, 0, 0]);
    const AMPERE: Dimension = Dimension::whole([0, 0, 0, 1, 0, 0, 0]);
    const KELVIN: Dimension = Dimension::whole([0, 0, 0, 0, 1, 0, 0]);

    #[test]
    fn arithmetic_of_exponents() {
        let speed = Dimension::METRE.div(Dimension::SECOND);
        assert_eq!(speed.mul(Dimension::SECOND), Dimension::METRE);
        assert_eq!(speed.pow(2).root(2), Some(speed));
        assert_eq!(speed.pow(-1).mul(speed), Dimension::ONE);
        assert_eq!(Dimension::METRE.root(2).map(|d| d.pow(2)), Some(Dimension::METRE));
        assert_eq!(Dimension::METRE.root(5), None);
        assert_eq!(Dimension::METRE.root(0), None);
    }

    #[test]
    fn powers_of_the_second() {
        assert!(Dimension::ONE.is_power_of_second() && Dimension::ONE.is_one());
        assert!(Dimension::PER_SECOND.is_power_of_second() && !Dimension::PER_SECOND.is_one());
        assert!(!Dimension::METRE.is_power_of_second());
    }

    #[test]
    fn spelled_as_people_know_them() {
        let m = Dimension::METRE;
        let s = Dimension::SECOND;
        let kg = Dimension::KILOGRAM;
        let cases = [
            (Dimension::ONE, "1 (no unit)"),
            (s, "s"),
            (s.pow(-1), "1/s"),
            (s.pow(-2), "1/s^2"),
            (m, "m"),
            (m.div(s), "m/s"),
            (m.div(s.pow(2)), "m/s^2"),
            (m.pow(3).div(s), "m^3/s"),
            (kg.mul(m.pow(2)), "kg*m^2"),
            (kg.div(s), "kg/s"),
            (NEWTON, "N"),
            (NEWTON.mul(m), "N*m"),
            (NEWTON.mul(m).mul(s), "N*m*s"),
            (NEWTON.div(m), "N/m"),
            (NEWTON.div(m.pow(2)), "Pa"),
            (NEWTON.div(m.pow(2)).mul(s), "Pa*s"),
            (NEWTON.mul(m).div(AMPERE), "V*s"),
            (NEWTON.mul(m).div(s), "W"),
            (VOLT, "V"),
            (VOLT.div(AMPERE), "ohm"),
            (AMPERE.div(VOLT), "S"),
            (VOLT.div(m), "V/m"),
            (VOLT.mul(s).div(AMPERE), "H"),
            (AMPERE.mul(s).div(VOLT), "F"),
            (AMPERE.mul(s), "s*A"),
            (VOLT.mul(AMPERE).div(KELVIN), "W/K"),
            (m.pow(3).div(s).div(NEWTON.div(m.pow(2))), "m^3/(Pa*s)"),
            (m.div(VOLT), "m/V"),
            (m.root(2).unwrap_or(m), "m^(1/2)"),
        ];
        for (dimension, text) in cases {
            assert_eq!(dimension.spell(), text);
        }
    }
}
