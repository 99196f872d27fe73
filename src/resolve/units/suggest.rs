//! What to write instead of a symbol that is not known.

use super::UnitTable;

/// Other spellings that people use, each with the unit to write.
const SPELLINGS: &[(&str, &str)] = &[
    ("sec", "s"),
    ("secs", "s"),
    ("second", "s"),
    ("seconds", "s"),
    ("msec", "ms"),
    ("usec", "us"),
    ("mins", "min"),
    ("minute", "min"),
    ("minutes", "min"),
    ("hr", "h"),
    ("hrs", "h"),
    ("hour", "h"),
    ("hours", "h"),
    ("day", "d"),
    ("days", "d"),
    ("rads", "rad"),
    ("radian", "rad"),
    ("radians", "rad"),
    ("degree", "deg"),
    ("degrees", "deg"),
    ("\u{b0}", "deg"),
    ("metre", "m"),
    ("metres", "m"),
    ("meter", "m"),
    ("meters", "m"),
    ("gram", "g"),
    ("grams", "g"),
    ("kilogram", "kg"),
    ("kilograms", "kg"),
    ("kgs", "kg"),
    ("newton", "N"),
    ("newtons", "N"),
    ("volt", "V"),
    ("volts", "V"),
    ("amp", "A"),
    ("amps", "A"),
    ("ampere", "A"),
    ("amperes", "A"),
    ("ohms", "ohm"),
    ("watt", "W"),
    ("watts", "W"),
    ("joule", "J"),
    ("joules", "J"),
    ("hertz", "Hz"),
    ("kelvin", "K"),
    ("pascal", "Pa"),
    ("tesla", "T"),
    ("henry", "H"),
    ("farad", "F"),
    ("litre", "L"),
    ("liter", "L"),
    ("l", "L"),
    ("ml", "mL"),
    ("cc", "cm^3"),
    ("percent", "%"),
    ("pct", "%"),
    ("bars", "bar"),
    ("kph", "km/h"),
    ("kmh", "km/h"),
    ("mps", "m/s"),
];

/// Units that are not built in, each with the line that declares it. The inch, the pound and the pound-force are
/// exact by the yard and pound agreement of 1959; from memory.
const DECLARATIONS: &[(&str, &str)] = &[
    ("in", "unit in = 25.4 [mm]"),
    ("inch", "unit inch = 25.4 [mm]"),
    ("feet", "unit feet = 0.3048 [m]"),
    ("lb", "unit lb = 0.45359237 [kg]"),
    ("lbf", "unit lbf = 4.4482216152605 [N]"),
    ("psi", "unit psi = 6894.757 [Pa]"),
    ("turn", "unit turn = 360 [deg]"),
    ("revs", "unit revs = 360 [deg]"),
    ("grad", "unit grad = 0.9 [deg]"),
    ("atm", "unit atm = 101325 [Pa]"),
    ("week", "unit week = 7 [d]"),
    ("ppm", "unit ppm = 0.0001 [%]"),
    ("cps", "unit cps = 1 [Hz]"),
    ("mph", "unit mph = 1.609344 [km/h]"),
    ("knot", "unit knot = 1.852 [km/h]"),
    ("eV", "unit eV = 1.602176634e-19 [J]"),
    ("cal", "unit cal = 4.184 [J]"),
    ("hp", "unit hp = 745.7 [W]"),
    ("VA", "unit VA = 1 [W]"),
];

/// Names of the unit of temperature whose zero is not that of the kelvin.
const CELSIUS: [&str; 5] = ["degC", "\u{b0}C", "celsius", "Celsius", "\u{2103}"];

/// The message for an unknown symbol and, where there is one, what to write instead.
pub(super) fn unknown(table: &UnitTable, symbol: &str) -> (String, Option<String>) {
    if CELSIUS.contains(&symbol) {
        let message = "degree Celsius is no unit to calculate with: its zero is not that of the kelvin";
        return (message.to_owned(), Some("write `K`: a difference of 1 degree Celsius is 1 K".to_owned()));
    }
    let message = format!("unknown unit `{symbol}`");
    if let Some(&(_, declaration)) = DECLARATIONS.iter().find(|row| row.0 == symbol) {
        return (message, Some(format!("`{symbol}` is not built in; declare it: `{declaration}`")));
    }
    if symbol == "rev" {
        return (message, Some("declare it: `unit rev = 360 [deg]`; revolutions a minute are `rpm`".to_owned()));
    }
    let instead = SPELLINGS.iter().find(|row| row.0 == symbol).map(|row| row.1.to_owned());
    let instead = instead.or_else(|| power_without_sign(table, symbol)).or_else(|| other_case(table, symbol));
    let instead = instead.or_else(|| product_without_sign(table, symbol)).or_else(|| close(table, symbol));
    (message, instead.map(|unit| format!("did you mean `{unit}`?")))
}

/// `m2` for `m^2`, `kgm2` for `kg*m^2`.
fn power_without_sign(table: &UnitTable, symbol: &str) -> Option<String> {
    let base = symbol.trim_end_matches(|c: char| c.is_ascii_digit());
    let exponent = &symbol[base.len()..];
    if base.is_empty() || exponent.is_empty() || exponent.len() > 2 {
        return None;
    }
    if table.lookup(base).is_some() {
        return Some(format!("{base}^{exponent}"));
    }
    product_without_sign(table, base).map(|product| format!("{product}^{exponent}"))
}

/// `Nm` for `N*m`, `mNm` for `mN*m`, `Nms` for `N*m*s`: two or three symbols written together, of which only the first
/// has a prefix.
fn product_without_sign(table: &UnitTable, symbol: &str) -> Option<String> {
    // Longer words are no slip of this kind.
    if symbol.chars().count() > 9 {
        return None;
    }
    let known = |part: &str| table.lookup(part).is_some();
    let whole = |part: &str| table.symbols().any(|s| s == part);
    let first_and_rest = || splits(symbol).filter(|(a, _)| known(a));
    if let Some((a, b)) = first_and_rest().find(|(_, b)| whole(b)) {
        return Some(format!("{a}*{b}"));
    }
    first_and_rest().find_map(|(a, rest)| {
        let (b, c) = splits(rest).find(|(b, c)| whole(b) && whole(c))?;
        Some(format!("{a}*{b}*{c}"))
    })
}

/// All ways to cut a text in two parts.
fn splits(text: &str) -> impl Iterator<Item = (&str, &str)> {
    text.char_indices().skip(1).map(|(i, _)| text.split_at(i))
}

/// A symbol that differs by upper and lower case only: `hz` for `Hz`, `RPM` for `rpm`, `KHZ` for `kHz`.
fn other_case(table: &UnitTable, symbol: &str) -> Option<String> {
    let whole = |text: &str| {
        let lower = text.to_lowercase();
        table.symbols().find(|s| s.to_lowercase() == lower).map(str::to_owned)
    };
    whole(symbol).or_else(|| {
        let unit = format!("k{}", whole(symbol.strip_prefix('K')?)?);
        table.lookup(&unit).map(|_| unit)
    })
}

/// A whole symbol of at least three letters at one insertion, deletion or exchange of a letter.
fn close(table: &UnitTable, symbol: &str) -> Option<String> {
    let near = |s: &&str| s.chars().count() >= 3 && one_apart(s, symbol);
    table.symbols().find(near).map(str::to_owned)
}

/// Whether one inserted, left out or exchanged letter makes `a` into `b`.
fn one_apart(a: &str, b: &str) -> bool {
    let (a, b): (Vec<char>, Vec<char>) = (a.chars().collect(), b.chars().collect());
    let head = a.iter().zip(&b).take_while(|(x, y)| x == y).count();
    let (a, b) = (&a[head..], &b[head..]);
    match a.len().cmp(&b.len()) {
        std::cmp::Ordering::Equal => !a.is_empty() && a[1..] == b[1..],
        std::cmp::Ordering::Less => b.len() == a.len() + 1 && b[1..] == *a,
        std::cmp::Ordering::Greater => a.len() == b.len() + 1 && a[1..] == *b,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slips_of_everyday() {
        let cases = [
            ("Nm", "`N*m`"),
            ("Nms", "`N*m*s`"),
            ("kgm2", "`kg*m^2`"),
            ("m2", "`m^2`"),
            ("sec", "`s`"),
            ("rads", "`rad`"),
            ("hz", "`Hz`"),
            ("HZ", "`Hz`"),
            ("KHz", "`kHz`"),
            ("Kg", "`kg`"),
            ("RPM", "`rpm`"),
            ("Ohm", "`ohm`"),
            ("Vs", "`V*s`"),
            ("Pas", "`Pa*s`"),
            ("mNm", "`mN*m`"),
            ("l", "`L`"),
            ("\u{b0}", "`deg`"),
            ("rpn", "`rpm`"),
            ("psi", "`unit psi = 6894.757 [Pa]`"),
            ("rev", "`unit rev = 360 [deg]`"),
            ("\u{b0}C", "`K`"),
        ];
        for (symbol, part) in cases {
            let (_, suggestion) = unknown(&UnitTable::new(), symbol);
            assert!(suggestion.as_deref().is_some_and(|s| s.contains(part)), "{symbol}: {suggestion:?}");
        }
        assert_eq!(unknown(&UnitTable::new(), "blorb"), ("unknown unit `blorb`".to_owned(), None));
    }

    #[test]
    fn declarations_are_for_units_that_are_not_there() {
        let table = UnitTable::new();
        let known = SPELLINGS.iter().chain(DECLARATIONS).map(|row| row.0).find(|s| table.lookup(s).is_some());
        assert_eq!(known, None);
    }
}
