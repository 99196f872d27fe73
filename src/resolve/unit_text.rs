//! Units as the text writes them: in brackets, and declared by `unit`.

use super::files::LoadedFile;
use super::numbers;
use super::units::{Dimension, Scale, Unit, UnitErrorKind};
use crate::algebra::RBig;
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;
use crate::syntax;
use crate::syntax::ast::{BinaryOp, ExprId, ExprKind};

/// How deep the value of a `unit` may nest: it is a number with a unit, or a short product of such.
const MAX_DEPTH: usize = 300;

/// The unit whose text a span of the file covers, brackets excluded.
pub(super) fn read(file: &LoadedFile, span: Span) -> Result<Unit, Diagnostic> {
    let text = file.text(span);
    let Some(expr) = syntax::parse_unit(text) else {
        let d = Diagnostic::new(Code::Syntax, format!("`{}` is no unit", text.trim()));
        let help = "a unit is made of symbols with `*`, `/`, `^` and parentheses, such as [N*m/rad] or [1]";
        return Err(d.label(span, "can't be read").help(help));
    };
    file.units.evaluate(&expr, text).map_err(|error| {
        let at = Span::new(span.start + error.span.start, span.start + error.span.end);
        let code = match error.kind {
            UnitErrorKind::Unknown => Code::UnknownName,
            UnitErrorKind::Senseless => Code::UnitMismatch,
            UnitErrorKind::Limit => Code::LimitReached,
        };
        let d = Diagnostic::new(code, error.message).label(at, "in this unit");
        match error.suggestion {
            Some(help) => d.help(help),
            None => d.help("declare a unit of your own: `unit name = 12 [m]`"),
        }
    })
}

/// The unit that `unit name = VALUE` declares: a number with a unit, or a product or quotient of such.
pub(super) fn declared(file: &LoadedFile, value: ExprId) -> Result<Unit, Diagnostic> {
    let unit = value_of(file, value, MAX_DEPTH)?;
    if unit.scale.ratio <= RBig::ZERO || unit.decibel {
        let d = Diagnostic::new(Code::Syntax, "a unit must be a positive amount of another one");
        return Err(d.label(file.tree.expr(value).span, "can't be a unit"));
    }
    Ok(unit)
}

fn value_of(file: &LoadedFile, id: ExprId, depth: usize) -> Result<Unit, Diagnostic> {
    let expr = file.tree.expr(id);
    let wrong = || {
        Diagnostic::new(Code::Syntax, "a unit is declared by a number and a unit")
            .label(expr.span, "can't stand here")
            .help("write it as `unit turn = 360 [deg]`")
    };
    let Some(depth) = depth.checked_sub(1) else { return Err(wrong()) };
    match expr.kind {
        ExprKind::Number => {
            let number = numbers::decimal(file.text(expr.span)).ok_or_else(wrong)?;
            Ok(Unit::of(Dimension::ONE, Scale::rational(number)))
        }
        ExprKind::Name(_) if file.text(expr.span) == "pi" => {
            Ok(Unit::of(Dimension::ONE, Scale { ratio: RBig::ONE, pi: 1 }))
        }
        ExprKind::WithUnit(inner, unit) => {
            let (number, unit) = (value_of(file, inner, depth)?, read(file, file.tree.units[unit as usize])?);
            Ok(product(&number, &unit))
        }
        ExprKind::Binary(BinaryOp::Mul, a, b) => Ok(product(&value_of(file, a, depth)?, &value_of(file, b, depth)?)),
        ExprKind::Binary(BinaryOp::Div, a, b) => {
            let (a, b) = (value_of(file, a, depth)?, value_of(file, b, depth)?);
            let inverse = b.scale.inverse().ok_or_else(|| {
                Diagnostic::new(Code::DivisionByZero, "division by zero").label(expr.span, "the divisor is zero")
            })?;
            Ok(Unit { hertz: a.hertz - b.hertz, ..Unit::of(a.dimension.div(b.dimension), a.scale.mul(&inverse)) })
        }
        _ => Err(wrong()),
    }
}

fn product(a: &Unit, b: &Unit) -> Unit {
    let decibel = a.decibel || b.decibel;
    Unit { hertz: a.hertz + b.hertz, decibel, ..Unit::of(a.dimension.mul(b.dimension), a.scale.mul(&b.scale)) }
}
