//! Expressions: from the flat row of operands and operators to nodes in the arena, children first.
//!
//! Operator precedence by two stacks, of values and of waiting operators (E. W. Dijkstra, An ALGOL 60 translator for
//! the X1, 1961), so that a sum of a million terms needs no recursion. Brackets are entered by recursion, and their
//! nesting is bounded before the grammar sees them.

use super::ast::{Argument, BinaryOp, Call, ExprId, ExprKind, Name, Repeated, RepeatedExpr, TemplateId};
use super::grammar::Rule;
use super::reader::{Outcome, Reader, reserved};
use super::split::MAX_NESTING;
use super::words::is_reserved;
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;

/// The deepest expression, where the left operands of `+ - * /` don't count: later passes walk along those in a loop
/// and go into everything else by recursion. Each bracket may carry a sum, a product, a sign and a power.
pub const MAX_DEPTH: u32 = 4 * MAX_NESTING as u32;

/// An operand that has been read.
#[derive(Clone, Copy, Debug)]
pub(super) struct Value {
    /// Its node.
    pub(super) id: ExprId,
    /// Its text, its own parentheses included.
    pub(super) span: Span,
    /// How deep it is; see [`MAX_DEPTH`].
    pub(super) depth: u32,
}

/// An operator that waits for its right operand.
#[derive(Clone, Copy, Debug)]
pub(super) enum Operator {
    /// A minus sign at this position before its only operand.
    Minus(u32),
    /// Between two operands.
    Between(BinaryOp),
}

impl Operator {
    /// How tightly it binds.
    fn strength(self) -> u32 {
        match self {
            Self::Between(BinaryOp::Add | BinaryOp::Sub) => 1,
            Self::Between(BinaryOp::Mul | BinaryOp::Div) => 2,
            Self::Minus(_) => 3,
            Self::Between(BinaryOp::Pow) => 4,
        }
    }
}

/// An expression, and the unit after its last operand with the place of that unit's end.
pub(super) type Row = (Value, Option<(u32, u32)>);

/// An expression at the end of a range, with the unit that covers both ends.
pub(super) struct RangeEnd {
    pub(super) value: ExprId,
    pub(super) unit: Option<u32>,
    pub(super) end: u32,
}

impl Reader<'_> {
    /// Reads the expression that begins next.
    pub(super) fn expression(&mut self) -> Outcome<Value> {
        Ok(self.row(false)?.0)
    }

    /// Reads a range `a .. b`, the second perhaps with a unit for both.
    pub(super) fn range(&mut self) -> Outcome<(Value, RangeEnd)> {
        let first = self.row(true)?;
        self.rest_of_range(first)
    }

    /// The rest of a range whose first end has been read.
    ///
    /// A unit at the very end covers both ends, unless the first end has one of its own there.
    pub(super) fn rest_of_range(&mut self, (from, own_unit): Row) -> Outcome<(Value, RangeEnd)> {
        let from = match own_unit {
            Some((unit, end)) => self.with_unit(from, unit, end)?,
            None => from,
        };
        self.accept(Rule::dots);
        let (mut to, last) = self.row(true)?;
        let (mut unit, mut end) = (None, to.span.end);
        if let Some((last, unit_end)) = last {
            end = unit_end;
            if own_unit.is_some() {
                to = self.with_unit(to, last, unit_end)?;
            } else {
                unit = Some(last);
            }
        }
        if self.begins(Rule::unit) {
            unit = self.unit()?;
            end = self.last_end() + 1;
        }
        Ok((from, RangeEnd { value: to.id, unit, end }))
    }

    /// The row of an expression. With `apart`, a unit after its last operand is given beside it, with its end.
    pub(super) fn row(&mut self, apart: bool) -> Outcome<Row> {
        self.take();
        let (first_value, first_operator) = (self.values.len(), self.operators.len());
        let mut last_unit = None;
        loop {
            let event = self.take();
            if !event.begins {
                break;
            }
            match event.rule {
                Rule::minus => {
                    self.take();
                    self.operators.push(Operator::Minus(self.span(event.at, event.at).start));
                }
                Rule::operator => {
                    let end = self.take();
                    let sign = self.slice(self.span(event.at, end.at));
                    let operator = Operator::Between(match sign {
                        "+" => BinaryOp::Add,
                        "-" => BinaryOp::Sub,
                        "*" => BinaryOp::Mul,
                        "/" => BinaryOp::Div,
                        _ => BinaryOp::Pow,
                    });
                    self.reduce(operator.strength(), first_operator)?;
                    self.operators.push(operator);
                }
                Rule::number => {
                    let end = self.take();
                    let span = self.span(event.at, end.at);
                    self.push_leaf(ExprKind::Number, span);
                }
                Rule::group => {
                    // The group begins after its `(`.
                    let inside = self.expression()?;
                    let end = self.take();
                    self.values.push(Value { span: self.span(event.at - 1, end.at), ..inside });
                }
                Rule::unit => {
                    self.step_back();
                    let Some(unit) = self.unit()? else { continue };
                    let end = self.last_end() + 1;
                    if apart && !self.event().begins {
                        last_unit = Some((unit, end));
                    } else if let Some(value) = self.values.pop() {
                        let value = self.with_unit(value, unit, end)?;
                        self.values.push(value);
                    }
                }
                _ => {
                    self.step_back();
                    self.named()?;
                }
            }
        }
        self.reduce(0, first_operator)?;
        self.values.truncate(first_value + 1);
        let value = self.values.pop().unwrap_or(Value { id: ExprId(0), span: Span::NONE, depth: 0 });
        Ok((value, last_unit))
    }

    fn push_leaf(&mut self, kind: ExprKind, span: Span) {
        let id = self.push_expr(kind, span);
        self.values.push(Value { id, span, depth: 1 });
    }

    fn with_unit(&mut self, value: Value, unit: u32, end: u32) -> Outcome<Value> {
        let span = Span::new(value.span.start, end);
        let id = self.push_expr(ExprKind::WithUnit(value.id, unit), span);
        self.deeper(Value { id, span, depth: value.depth + 1 })
    }

    /// Gives the waiting operators that bind at least as tightly as `strength` their operands; `^` waits for another
    /// `^`, since it goes to the right.
    fn reduce(&mut self, strength: u32, first: usize) -> Outcome<()> {
        while self.operators.len() > first {
            let Some(&operator) = self.operators.last() else { break };
            let binds = operator.strength();
            if binds < strength || (binds == strength && strength == 4) {
                break;
            }
            self.operators.pop();
            let Some(right) = self.values.pop() else { break };
            let value = match operator {
                Operator::Minus(at) => {
                    let span = Span::new(at, right.span.end);
                    let id = self.push_expr(ExprKind::Neg(right.id), span);
                    Value { id, span, depth: right.depth + 1 }
                }
                Operator::Between(sign) => {
                    let Some(left) = self.values.pop() else { break };
                    let span = left.span.to(right.span);
                    let id = self.push_expr(ExprKind::Binary(sign, left.id, right.id), span);
                    let spine = if sign == BinaryOp::Pow { left.depth + 1 } else { left.depth };
                    Value { id, span, depth: spine.max(right.depth + 1) }
                }
            };
            let value = self.deeper(value)?;
            self.values.push(value);
        }
        Ok(())
    }

    /// The value, unless it is deeper than [`MAX_DEPTH`].
    fn deeper(&mut self, value: Value) -> Outcome<Value> {
        if value.depth <= MAX_DEPTH {
            return Ok(value);
        }
        let start = Span::new(value.span.start, value.span.start + 1);
        self.fail(
            Diagnostic::new(Code::LimitReached, format!("an expression is nested more than {MAX_DEPTH} deep"))
                .label(start, "begins here")
                .help("give inner parts names of their own: a `param` or a `define`"),
        )
    }

    /// The name, derivative or call that begins next.
    fn named(&mut self) -> Outcome<()> {
        let (name, prime) = self.any_name()?;
        if self.begins(Rule::arguments) && !prime {
            let value = self.call(name)?;
            self.values.push(value);
            return Ok(());
        }
        self.check_name(name, !prime)?;
        if prime {
            let span = Span::new(name.span.start, name.span.end + 1);
            self.push_leaf(ExprKind::Derivative(name.template), span);
        } else {
            self.push_leaf(ExprKind::Name(name.template), name.span);
        }
        Ok(())
    }

    /// A call with its arguments, or a `sum( )` or `product( )` written out.
    fn call(&mut self, callee: Name) -> Outcome<Value> {
        self.take();
        let mut arguments = Vec::new();
        let mut index = None;
        let mut depth = 0;
        while self.enter(Rule::argument) {
            let value = self.expression()?;
            depth = depth.max(value.depth);
            if self.accept(Rule::in_word).is_some() {
                let name = self.lone_name(value)?;
                let (from, to) = self.whole_range()?;
                depth = depth.max(from.depth).max(to.depth);
                if index.is_some() || !arguments.is_empty() {
                    return self.fail(range_place(name));
                }
                index = Some((name, from.id, to.id));
            } else if self.accept(Rule::equals).is_some() {
                let name = Some(self.lone_name(value)?);
                let value = self.expression()?;
                depth = depth.max(value.depth);
                arguments.push(Argument { name, value: value.id });
            } else {
                arguments.push(Argument { name: None, value: value.id });
            }
            self.take();
            self.accept(Rule::comma);
        }
        let end = self.take().at;
        let span = Span::new(callee.span.start, self.span(end, end).end);
        let kind = match self.slice(callee.span) {
            "sum" => Some(Repeated::Sum),
            "product" => Some(Repeated::Product),
            _ => None,
        };
        let kind = match (kind, index) {
            (Some(kind), Some((index, from, to))) => {
                let [Argument { name: None, value: body }] = arguments[..] else {
                    return self.fail(repeated_form(span, self.slice(callee.span)));
                };
                self.tree.repeated.push(RepeatedExpr { kind, index, from, to, body });
                ExprKind::Repeated(self.tree.repeated.len() as u32 - 1)
            }
            (Some(Repeated::Sum), None) => return self.fail(repeated_form(span, "sum")),
            (None, Some((index, ..))) => return self.fail(range_place(index)),
            (_, None) => {
                self.check_callee(callee)?;
                self.tree.calls.push(Call { callee: callee.span, arguments: arguments.into() });
                ExprKind::Call(self.tree.calls.len() as u32 - 1)
            }
        };
        let id = self.push_expr(kind, span);
        self.deeper(Value { id, span, depth: depth + 1 })
    }

    /// The range of an index, whose ends are whole numbers and have no unit.
    pub(super) fn whole_range(&mut self) -> Outcome<(Value, Value)> {
        let from = self.expression()?;
        self.accept(Rule::dots);
        let to = self.expression()?;
        Ok((from, to))
    }

    /// Takes the name that was read as an expression back out of the arena, where it was pushed last.
    fn lone_name(&mut self, value: Value) -> Outcome<Span> {
        let node = self.expr(value.id);
        let lone = node.kind == ExprKind::Name(TemplateId::NONE) && node.span == value.span;
        let text = self.slice(node.span);
        if !lone || text.contains('.') {
            return self.fail(
                Diagnostic::new(Code::Syntax, "an argument's name is expected")
                    .label(value.span, "not a plain name")
                    .help("a named argument is `NAME = VALUE`, a range is `NAME in A..B`"),
            );
        }
        if is_reserved(text) {
            return self.fail(reserved(node.span, text));
        }
        self.tree.exprs.pop();
        Ok(node.span)
    }

    fn check_callee(&mut self, callee: Name) -> Outcome<()> {
        let text = self.slice(callee.span);
        if is_reserved(text) {
            return self.fail(match text {
                "s" | "z" | "pi" => missing_star(callee.span, text),
                _ => reserved(callee.span, text),
            });
        }
        if callee.template != TemplateId::NONE || text.contains('.') {
            return self.fail(
                Diagnostic::new(Code::Syntax, format!("`{text}` can't be called"))
                    .label(callee.span, "a plain name is expected")
                    .help("only a `define` and the functions of parameters are called; multiply with `*`"),
            );
        }
        Ok(())
    }
}

fn missing_star(span: Span, name: &str) -> Diagnostic {
    Diagnostic::new(Code::Syntax, format!("`{name}` can't be called"))
        .label(span, "`*` expected after this")
        .help(format!("there is no multiplication without `*`: write `{name}*(…)`"))
}

fn range_place(span: Span) -> Diagnostic {
    Diagnostic::new(Code::Syntax, "a range can't stand here")
        .label(span, "`in` is for `sum( )` and `product( )`")
        .help("a range is the first argument, such as in `sum(k in 1..8, x{k})`")
}

fn repeated_form(span: Span, word: &str) -> Diagnostic {
    Diagnostic::new(Code::Syntax, format!("`{word}( )` takes a range and what is written out"))
        .label(span, "not of that form")
        .help(format!("such as `{word}(k in 1..8, x{{k}})`"))
}
