//! Expressions of the text to expressions of the netlist, with the unit of each part.

use super::numbers;
use super::scope::{Entity, EnvId, ScopeId};
use super::suggest::did_you_mean;
use super::units::Dimension;
use super::write_out::Writer;
use super::{LimitReached, MAX_DECIMAL_EXPONENT};
use crate::algebra::RBig;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId};
use crate::netlist::{Param, ParamId};
use crate::source::Span;
use crate::syntax::ast::{BinaryOp, ExprId, ExprKind, Name};

/// What is known of a part's unit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Measure {
    /// Its dimension; none where a bare number in it can take whatever unit its place needs.
    pub known: Option<Dimension>,
    /// Its dimension if bare numbers were without one.
    pub strict: Dimension,
    /// The first bare number in it.
    pub bare: Option<Span>,
}

impl Measure {
    /// Anything that fits.
    pub(super) const FREE: Self = Self { known: None, strict: Dimension::ONE, bare: None };

    /// A known dimension.
    pub(super) const fn of(dimension: Dimension) -> Self {
        Self { known: Some(dimension), strict: dimension, bare: None }
    }

    pub(super) fn map(self, f: impl Fn(Dimension) -> Dimension) -> Self {
        Self { known: self.known.map(&f), strict: f(self.strict), bare: self.bare }
    }

    pub(super) fn join(self, other: Self, f: impl Fn(Dimension, Dimension) -> Dimension) -> Self {
        Self {
            known: self.known.zip(other.known).map(|(a, b)| f(a, b)),
            strict: f(self.strict, other.strict),
            bare: self.bare.or(other.bare),
        }
    }
}

/// A bound expression.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bound {
    /// Its place in the netlist.
    pub id: NodeId,
    /// Its unit.
    pub measure: Measure,
    /// Whether s is in it.
    pub s: bool,
    /// Whether z is in it.
    pub z: bool,
    /// Whether it is made of s and the number 1 alone: beside `+` and `-` it takes any power of the second, since a
    /// coefficient 1 is not written.
    pub pure: bool,
    /// The unit written after it, by its place in the netlist's list for display.
    pub unit: Option<u32>,
    /// Whether something in it was told to be in error: nothing that follows from it is told.
    pub broken: bool,
}

/// What may stand in an expression.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    /// A law: s or z may stand in it.
    Law,
    /// The value of a param, a factor, a bound: numbers and params only.
    Parameters,
}

/// Where an expression stands.
#[derive(Clone, Copy, Debug)]
pub(super) struct Context {
    /// The file.
    pub file: usize,
    /// The scope whose params it can name.
    pub scope: ScopeId,
    /// The indices around it.
    pub env: EnvId,
    /// The arguments that it can name, inside the body of a defined law: then the scope's params can't be named.
    pub frame: Option<usize>,
    /// What may stand in it.
    pub place: Place,
}

/// The function of a name, if it is one.
pub(super) fn function(name: &str) -> Option<&'static str> {
    const FUNCTIONS: [&str; 11] = ["sqrt", "sin", "cos", "tan", "atan", "exp", "ln", "min", "max", "abs", "sum"];
    FUNCTIONS.into_iter().find(|f| *f == name)
}

impl Writer<'_> {
    /// Binds an expression. What is in error is told, and the result says so.
    pub(super) fn bind(&mut self, id: ExprId, ctx: Context) -> Result<Bound, LimitReached> {
        let tree = &self.loaded.files[ctx.file].tree;
        // Long sums and products lean to the left: their spine is walked in a loop.
        let mut spine = Vec::new();
        let mut inner = id;
        while let ExprKind::Binary(op, left, right) = tree.expr(inner).kind
            && op != BinaryOp::Pow
        {
            spine.push((op, left, right, tree.expr(inner).span));
            inner = left;
        }
        let mut result = self.bind_one(inner, ctx)?;
        while let Some((op, left, right, span)) = spine.pop() {
            let right_bound = self.bind(right, ctx)?;
            let between = Span::new(tree.expr(left).span.end, tree.expr(right).span.start);
            result = self.combine(op, result, right_bound, span, (ctx, between));
        }
        Ok(result)
    }

    pub(super) fn bind_one(&mut self, id: ExprId, ctx: Context) -> Result<Bound, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let expr = file.tree.expr(id);
        match expr.kind {
            ExprKind::Number => self.bind_number(file.text(expr.span), expr.span),
            ExprKind::Name(template) => Ok(self.bind_name(Name { span: expr.span, template }, ctx)),
            ExprKind::Derivative(_) => {
                let message = "a derivative `x'` stands only in state equations";
                Ok(self.broken(Diagnostic::new(Code::Syntax, message).label(expr.span, "here"), ctx))
            }
            ExprKind::Neg(a) => {
                let a = self.bind(a, ctx)?;
                let id = self.net.exprs.push(Node::Neg(a.id), expr.span);
                Ok(Bound { id, ..a })
            }
            ExprKind::Binary(_, base, exponent) => self.bind_power(base, exponent, expr.span, ctx),
            ExprKind::WithUnit(value, unit) => self.bind_with_unit(value, unit, expr.span, ctx),
            ExprKind::Call(call) => self.bind_call(call, expr.span, ctx),
            ExprKind::Repeated(place) => self.bind_repeated(place, expr.span, ctx),
        }
    }

    pub(super) fn bind_number(&mut self, text: &str, span: Span) -> Result<Bound, LimitReached> {
        let id = match numbers::small_decimal(text) {
            Some((n, d)) if i32::try_from(n).is_ok() && u32::try_from(d).is_ok() => {
                let g = gcd(n, d);
                self.net.exprs.push(Node::Ratio((n / g) as i32, (d / g) as u32), span)
            }
            _ => match numbers::decimal(text) {
                Some(value) => self.net.exprs.push_number(value, span),
                None => {
                    let message = format!("the exponent of a number may be {MAX_DECIMAL_EXPONENT} at most");
                    return self.limit(Diagnostic::new(Code::LimitReached, message).label(span, "this one passes it"));
                }
            },
        };
        let pure = self.net.exprs.get(id) == Node::Ratio(1, 1);
        Ok(Bound { pure, measure: Measure { bare: Some(span), ..Measure::FREE }, ..plain(id) })
    }

    pub(super) fn bind_name(&mut self, name: Name, ctx: Context) -> Bound {
        let Some(text) = self.name_text(ctx.file, name, ctx.env) else { return self.unknown_value(name.span) };
        match (text.as_ref(), ctx.place) {
            ("pi", _) => return plain(self.net.exprs.push(Node::Pi, name.span)),
            ("s", Place::Law) => {
                let id = self.net.exprs.push(Node::S, name.span);
                return Bound { s: true, pure: true, measure: Measure::of(Dimension::SECOND.pow(-1)), ..plain(id) };
            }
            ("z", Place::Law) => {
                let id = self.net.exprs.push(Node::Z, name.span);
                return Bound { z: true, measure: Measure::of(Dimension::ONE), ..plain(id) };
            }
            ("s" | "z", Place::Parameters) => {
                let d = Diagnostic::new(
                    Code::Syntax,
                    format!("`{text}` can stand only in a block's transfer function (law)"),
                );
                return self.broken(d.label(name.span, "a number or a param is needed here"), ctx);
            }
            _ => {}
        }
        let sym = self.symbols.intern(&text);
        if let Some(frame) = ctx.frame
            && let Some((_, bound)) = self.frames[frame].arguments.iter().find(|(n, _)| *n == sym)
        {
            return Bound { pure: false, ..*bound };
        }
        if let Some(value) = self.indices.get(ctx.env, sym) {
            return plain(self.net.exprs.push_number(RBig::from(value), name.span));
        }
        let entity = if ctx.frame.is_some() { None } else { self.scopes.get(ctx.scope, sym) };
        match entity {
            Some(Entity::Param(id)) => self.param_value(id, name.span),
            Some(Entity::Law(place)) => self.law_arguments[place as usize],
            other => {
                let text = text.into_owned();
                self.no_such_param(&text, name.span, other.is_some(), ctx)
            }
        }
    }

    /// A param's value as an expression.
    pub(super) fn param_value(&mut self, id: ParamId, span: Span) -> Bound {
        let (measure, broken) = self.param_measures[id.index()];
        let node = self.net.exprs.push(Node::Param(id), span);
        Bound { measure, broken, ..plain(node) }
    }

    pub(super) fn no_such_param(&mut self, text: &str, span: Span, is_other: bool, ctx: Context) -> Bound {
        if self.is_excused(text) {
            return self.unknown_value(span);
        }
        let params = self.nameable(ctx);
        let mut d = Diagnostic::new(Code::UnknownName, format!("there is no param `{text}`"));
        if is_other {
            d = d.label(span, "this is the name of a signal or a block");
            d = d.help("only numbers and params can stand here; signals are joined by sums and blocks");
        } else if text.contains('.') {
            d = d.label(span, "a path into an instance can't be named here");
            d = d.help(
                "paths are for requests, requirements, cases, `keep` and `--set`; hand the value over as an argument",
            );
        } else {
            d = d.label(span, "not known here");
            let reserved = ["s", "z", "pi"].into_iter().filter(|word| word.eq_ignore_ascii_case(text));
            let near = did_you_mean(text, reserved.chain(params.iter().map(String::as_str)));
            let define = ctx.frame.is_some().then(|| "a define sees its own parameters only; add one to it".to_owned());
            d = d.help(near.or(define).unwrap_or_else(|| format!("declare it: `param {text} = …`")));
        }
        self.broken(d, ctx)
    }

    /// Names of params that an expression could name, for suggestions.
    pub(super) fn nameable(&self, ctx: Context) -> Vec<String> {
        let prefix = self.scopes.list[ctx.scope.0 as usize].prefix.clone();
        match ctx.frame {
            Some(frame) => self.frames[frame].arguments.iter().map(|(n, _)| self.symbols.name(*n).to_owned()).collect(),
            None => self.scopes.list[ctx.scope.0 as usize]
                .names
                .iter()
                .filter(|(sym, _)| matches!(self.scopes.get(ctx.scope, *sym), Some(Entity::Param(_) | Entity::Law(_))))
                .map(|(sym, _)| self.symbols.name(*sym).trim_start_matches(&prefix).to_owned())
                .collect(),
        }
    }

    /// a op b for `+ - * /`.
    pub(super) fn combine(&mut self, op: BinaryOp, a: Bound, b: Bound, span: Span, place: (Context, Span)) -> Bound {
        let (node, measure) = match op {
            BinaryOp::Mul => (Node::Mul(a.id, b.id), a.measure.join(b.measure, Dimension::mul)),
            BinaryOp::Div => (Node::Div(a.id, b.id), a.measure.join(b.measure, Dimension::div)),
            _ => {
                let node = if op == BinaryOp::Add { Node::Add(a.id, b.id) } else { Node::Sub(a.id, b.id) };
                (node, self.added(op, a, b, place))
            }
        };
        let id = self.net.exprs.push(node, span);
        Bound {
            id,
            measure,
            s: a.s || b.s,
            z: a.z || b.z,
            pure: a.pure && b.pure,
            unit: None,
            broken: a.broken || b.broken,
        }
    }

    /// The unit of a + b or a - b; two that don't agree are told at the operator.
    pub(super) fn added(&mut self, op: BinaryOp, a: Bound, b: Bound, (ctx, between): (Context, Span)) -> Measure {
        let agree = match (a.measure.known, b.measure.known) {
            (Some(x), Some(y)) => x == y || ((a.pure || b.pure) && x.div(y).is_power_of_second()),
            (None, Some(y)) if a.pure => y.is_power_of_second(),
            (Some(x), None) if b.pure => x.is_power_of_second(),
            _ => true,
        };
        if !agree && !a.broken && !b.broken {
            let sign = self.operator(ctx.file, between, op);
            let spell =
                |m: Bound| m.measure.known.map_or_else(|| "the number 1".to_owned(), |d| format!("[{}]", d.spell()));
            let (x, y) = (spell(a), spell(b));
            let verb = if op == BinaryOp::Add { "added to" } else { "subtracted from" };
            let d = Diagnostic::new(Code::UnitMismatch, format!("{y} can't be {verb} {x}"))
                .label(sign, "the two sides have different units")
                .label(self.net.exprs.span(a.id), format!("this is {x}"))
                .label(self.net.exprs.span(b.id), format!("this is {y}"));
            let help = if a.pure || b.pure {
                "beside `+` or `-` the number 1 stands for a power of the second; check the unit of what stands on the other side (s counts as 1/s)"
            } else {
                "check the units of the params on both sides (s counts as 1/s)"
            };
            self.tell(d.help(help), ctx);
        }
        let known = if a.pure { b.measure.known.or(a.measure.known) } else { a.measure.known.or(b.measure.known) };
        let strict = if a.measure.known.is_some() { a.measure.strict } else { b.measure.strict };
        Measure { known, strict, bare: a.measure.bare.or(b.measure.bare) }
    }

    /// Where an operator stands between its operands.
    pub(super) fn operator(&self, file: usize, between: Span, op: BinaryOp) -> Span {
        let sign = match op {
            BinaryOp::Add => '+',
            BinaryOp::Sub => '-',
            BinaryOp::Mul => '*',
            BinaryOp::Div => '/',
            BinaryOp::Pow => '^',
        };
        let text = self.loaded.files[file].text(between);
        let at = text.find(sign).map_or(between.start, |i| between.start + i as u32);
        Span::new(at, at + 1)
    }

    pub(super) fn bind_power(
        &mut self,
        base: ExprId,
        exponent: ExprId,
        span: Span,
        ctx: Context,
    ) -> Result<Bound, LimitReached> {
        let a = self.bind(base, ctx)?;
        let power = self.whole(exponent, ctx)?.and_then(|n| i32::try_from(n).ok());
        let Some(n) = power else {
            let at = self.loaded.files[ctx.file].tree.expr(exponent).span;
            let d = Diagnostic::new(Code::Syntax, "an exponent must be a whole number")
                .label(at, "not a whole number")
                .help("use whole numbers, indices and a define's arguments; a root is written `sqrt(x)`");
            return Ok(self.broken(d, ctx));
        };
        let id = self.net.exprs.push(Node::Pow(a.id, n), span);
        Ok(Bound { id, measure: a.measure.map(|d| d.pow(n)), ..a })
    }

    pub(super) fn bind_with_unit(
        &mut self,
        value: ExprId,
        place: u32,
        span: Span,
        ctx: Context,
    ) -> Result<Bound, LimitReached> {
        let a = self.bind(value, ctx)?;
        let Some(unit) = self.unit(ctx.file, place, ctx) else { return Ok(Bound { broken: true, ..a }) };
        if unit.decibel {
            let d = Diagnostic::new(Code::UnitMismatch, "decibels can stand only at the bound of a requirement")
                .label(span, "here a plain ratio is needed")
                .help("write the factor itself: 6 dB is about 1.995");
            return Ok(self.broken(d, ctx));
        }
        if let Some(known) = a.measure.known
            && !known.is_one()
            && !a.broken
        {
            let message = format!("a value that is in [{}] already gets a unit once more", known.spell());
            let d = Diagnostic::new(Code::UnitMismatch, message).label(span, "two units on one value");
            return Ok(self.broken(d.help("leave the unit out"), ctx));
        }
        let id = self.scaled(a.id, &unit.scale, span);
        let shown = self.display_unit(ctx.file, place, &unit);
        Ok(Bound { id, measure: Measure::of(unit.dimension), pure: false, unit: Some(shown), ..a })
    }

    /// A value that stands for what is in error: a nameless param, so that nothing wrong is concluded from it.
    pub(super) fn unknown_value(&mut self, span: Span) -> Bound {
        let id = if let Some(id) = self.nameless {
            id
        } else {
            let name = self.net.names.push("?");
            let origin = crate::netlist::Origin { span, instance: None };
            self.net.params.push(Param { name, value: None, within: None, unit: None, origin });
            self.param_measures.push((Measure::FREE, true));
            let id = ParamId(self.net.params.len() as u32 - 1);
            self.nameless = Some(id);
            id
        };
        Bound { broken: true, ..plain(self.net.exprs.push(Node::Param(id), span)) }
    }

    /// Tells what is wrong and gives a value that nothing follows from.
    pub(super) fn broken(&mut self, diagnostic: Diagnostic, ctx: Context) -> Bound {
        let span = diagnostic.labels.first().map_or(Span::NONE, |l| l.span);
        self.tell(diagnostic, ctx);
        self.unknown_value(span)
    }
}

/// "1 argument", "2 arguments".
pub(super) fn count(n: usize, what: &str) -> String {
    format!("{n} {what}{}", if n == 1 { "" } else { "s" })
}

pub(super) fn plain(id: NodeId) -> Bound {
    Bound { id, measure: Measure::FREE, s: false, z: false, pure: false, unit: None, broken: false }
}

fn gcd(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a.max(1)
}
