//! The shape of a unit's text; what its symbols mean is no business of this room.

use super::ast::UnitExpr;
use super::grammar::{self, Event, Events, Failure, Rule};
use super::split::MAX_NESTING;
use crate::source::Span;

/// Reads the text between the brackets of a unit, such as `kg*m^2/s`; spans count from its start. `None` where it is
/// none, which [`super::parse`] has told for every unit in a tree.
pub fn parse_unit(text: &str) -> Option<UnitExpr> {
    read_unit(text).ok()
}

/// [`parse_unit`] with the place where the text leaves the grammar.
pub(super) fn read_unit(text: &str) -> Result<UnitExpr, Failure> {
    // The grammar is recursive over parentheses; products are boxes in boxes, which are dropped recursively.
    let at = |at: usize| Failure { at, expected: Vec::new(), stack_full: false };
    let signs = text.bytes().filter(|b| matches!(b, b'(' | b'*' | b'/')).count();
    if signs > MAX_NESTING {
        return Err(at(0));
    }
    let mut events = Events::default();
    grammar::read(Rule::unit_text, text, &mut events)?;
    let mut reader = Reader { text, events: &events.row, next: 1 };
    reader.product().ok_or_else(|| at(0))
}

struct Reader<'t> {
    text: &'t str,
    events: &'t [Event],
    next: usize,
}

impl Reader<'_> {
    fn peek(&self) -> Option<(Rule, bool)> {
        self.events.get(self.next).map(|e| (e.rule, e.begins))
    }

    /// Takes a rule without inner rules and gives its span.
    fn leaf(&mut self) -> Option<Span> {
        let (begin, end) = (self.events.get(self.next)?, self.events.get(self.next + 1)?);
        self.next += 2;
        Some(Span::new(begin.at, end.at))
    }

    fn product(&mut self) -> Option<UnitExpr> {
        let mut left = self.power()?;
        while self.peek() == Some((Rule::unit_operator, true)) {
            let sign = self.leaf()?;
            let right = self.power()?;
            left = if self.text.as_bytes().get(sign.start as usize) == Some(&b'*') {
                UnitExpr::Mul(Box::new(left), Box::new(right))
            } else {
                UnitExpr::Div(Box::new(left), Box::new(right))
            };
        }
        Some(left)
    }

    fn power(&mut self) -> Option<UnitExpr> {
        let factor = match self.peek()?.0 {
            Rule::unit_symbol => UnitExpr::Symbol(self.leaf()?),
            Rule::unit_one => {
                self.leaf()?;
                UnitExpr::One
            }
            _ => {
                self.next += 2;
                let inside = self.product()?;
                self.next += 2;
                inside
            }
        };
        if self.peek() == Some((Rule::unit_exponent, true)) {
            let span = self.leaf()?;
            let sign = self.text.get(span.start as usize..span.end as usize)?;
            let exponent = sign.trim_start_matches('^').trim_start().parse().ok()?;
            return Some(UnitExpr::Pow(Box::new(factor), exponent));
        }
        Some(factor)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A unit written with all its parentheses.
    fn shape(text: &str) -> String {
        fn write(unit: &UnitExpr, text: &str) -> String {
            match unit {
                UnitExpr::Symbol(span) => text[span.start as usize..span.end as usize].to_owned(),
                UnitExpr::One => "1".to_owned(),
                UnitExpr::Mul(a, b) => format!("({}*{})", write(a, text), write(b, text)),
                UnitExpr::Div(a, b) => format!("({}/{})", write(a, text), write(b, text)),
                UnitExpr::Pow(a, n) => format!("({}^{n})", write(a, text)),
            }
        }
        parse_unit(text).map_or_else(|| "-".to_owned(), |unit| write(&unit, text))
    }

    #[test]
    fn units_have_their_shape() {
        assert_eq!(shape("N*m/rad"), "((N*m)/rad)");
        assert_eq!(shape("kg*m^2/s"), "((kg*(m^2))/s)");
        assert_eq!(shape(" 1 / s "), "(1/s)");
        assert_eq!(shape("J/(kg*K)^2"), "(J/((kg*K)^2))");
        assert_eq!(shape("%"), "%");
        assert_eq!(shape("m^-2"), "(m^-2)");
        assert_eq!(shape("\u{b5}m*\u{2126}"), "(\u{b5}m*\u{2126})");
    }

    #[test]
    fn what_is_no_unit_is_none() {
        for text in ["", "N*", "N m", "2*m", "m^", "m^0.5", "(m", "m)", "m^99999999999", "m**2"] {
            assert_eq!(parse_unit(text), None, "{text}");
        }
        assert_eq!(parse_unit(&"(".repeat(100_000)), None);
        assert_eq!(parse_unit(&vec!["m"; 100_000].join("*")), None);
    }
}
