//! Expressions of the text to expressions of the netlist, with the unit of each part.

use super::files::DefineId;
use super::numbers;
use super::scope::{Entity, EnvId, Frame, ScopeId, Sym};
use super::suggest::did_you_mean;
use super::units::Dimension;
use super::write_out::Writer;
use super::{LimitReached, MAX_DECIMAL_EXPONENT, MAX_DEFINE_DEPTH};
use crate::algebra::RBig;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId, Function};
use crate::netlist::{Param, ParamId};
use crate::source::Span;
use crate::syntax::ast::{BinaryOp, DefineBody, ExprId, ExprKind, Name, Repeated, TemplateId};

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

    fn map(self, f: impl Fn(Dimension) -> Dimension) -> Self {
        Self { known: self.known.map(&f), strict: f(self.strict), bare: self.bare }
    }

    fn join(self, other: Self, f: impl Fn(Dimension, Dimension) -> Dimension) -> Self {
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

    fn bind_one(&mut self, id: ExprId, ctx: Context) -> Result<Bound, LimitReached> {
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

    fn bind_number(&mut self, text: &str, span: Span) -> Result<Bound, LimitReached> {
        let id = match numbers::small_decimal(text) {
            Some((n, d)) if n <= i32::MAX as u64 && d <= u64::from(u32::MAX) => {
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
            let near = did_you_mean(text, params.iter().map(String::as_str));
            let define = ctx.frame.is_some().then(|| "a define sees its own parameters only; add one to it".to_owned());
            d = d.help(near.or(define).unwrap_or_else(|| format!("declare it: `param {text} = …`")));
        }
        self.broken(d, ctx)
    }

    /// Names of params that an expression could name, for suggestions.
    fn nameable(&self, ctx: Context) -> Vec<String> {
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
    fn added(&mut self, op: BinaryOp, a: Bound, b: Bound, (ctx, between): (Context, Span)) -> Measure {
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

    fn bind_power(&mut self, base: ExprId, exponent: ExprId, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
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

    fn bind_with_unit(&mut self, value: ExprId, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
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

    /// A call of a defined law or a function.
    fn bind_call(&mut self, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let call = &file.tree.calls[place as usize];
        let name = file.text(call.callee);
        if let Some(define) = self.loaded.find_define(ctx.file, name) {
            return self.bind_defined(define, place, span, ctx);
        }
        if function(name).is_some() {
            return self.bind_function(place, span, ctx);
        }
        if file.incomplete || self.is_excused(name) {
            return Ok(self.unknown_value(span));
        }
        let known = self
            .loaded
            .callable(ctx.file)
            .chain(["sqrt", "sin", "cos", "tan", "atan", "exp", "ln", "min", "max", "abs"]);
        let near = did_you_mean(name, known);
        let help = near.unwrap_or_else(|| format!("define it: `define {name}(…) = …`, or `use` the file that does"));
        let d = Diagnostic::new(Code::UnknownName, format!("there is no define `{name}`"));
        Ok(self.broken(d.label(call.callee, "not known in this file").help(help), ctx))
    }

    fn bind_defined(&mut self, id: DefineId, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
        let loaded = self.loaded;
        let call = &loaded.files[ctx.file].tree.calls[place as usize];
        let Some(define) = loaded.define(id) else { return Ok(self.unknown_value(span)) };
        if self.circular_defines.contains(&id) {
            return Ok(self.unknown_value(span));
        }
        let DefineBody::Law(body) = define.body else {
            let name = loaded.files[ctx.file].text(call.callee);
            let d = Diagnostic::new(
                Code::Syntax,
                format!("`{name}` is a composite, and stands alone as a block's transfer function (law)"),
            )
            .label(call.callee, "can't be part of an expression")
            .help("give the instance a block of its own: `block name : inputs -> outputs = …`");
            return Ok(self.broken(d, ctx));
        };
        self.count(1, span)?;
        let depth = ctx.frame.map_or(0, |f| self.frames[f].depth) + 1;
        if depth > MAX_DEFINE_DEPTH {
            let message =
                format!("defined transfer functions (laws) call each other more than {MAX_DEFINE_DEPTH} deep");
            return self.limit(Diagnostic::new(Code::LimitReached, message).label(span, "here"));
        }
        let Some(arguments) = self.arguments(id, place, span, ctx)? else { return Ok(self.unknown_value(span)) };
        let mark = self.frames.len();
        self.frames.push(Frame { arguments, depth });
        let inner = Context { file: id.file, env: EnvId::EMPTY, frame: Some(mark), ..ctx };
        let result = self.bind(body, inner);
        self.frames.truncate(mark);
        result
    }

    /// The values of a define's parameters in one call, in their order; `None` where something was told.
    pub(super) fn arguments(
        &mut self,
        id: DefineId,
        place: u32,
        span: Span,
        ctx: Context,
    ) -> Result<Option<Vec<(Sym, Bound)>>, LimitReached> {
        let loaded = self.loaded;
        let (file, own) = (&loaded.files[ctx.file], &loaded.files[id.file]);
        let call = &file.tree.calls[place as usize];
        let Some(define) = loaded.define(id) else { return Ok(None) };
        let callee = own.text(define.name);
        let mut given: Vec<Option<ExprId>> = vec![None; define.params.len()];
        for (i, argument) in call.arguments.iter().enumerate() {
            let slot = match argument.name {
                None => i,
                Some(name) => {
                    let text = super::scope::normal(file.text(name));
                    match define.params.iter().position(|p| super::scope::normal(own.text(p.name)) == text) {
                        Some(slot) => slot,
                        None => {
                            let near = did_you_mean(&text, define.params.iter().map(|p| own.text(p.name)));
                            let list: Vec<_> =
                                define.params.iter().map(|p| format!("`{}`", own.text(p.name))).collect();
                            let help = near.unwrap_or_else(|| format!("its parameters are {}", list.join(", ")));
                            let d = Diagnostic::new(Code::UnknownName, format!("`{callee}` has no parameter `{text}`"));
                            self.tell(d.label(name, "not one of its parameters").help(help), ctx);
                            return Ok(None);
                        }
                    }
                }
            };
            let value_span = file.tree.expr(argument.value).span;
            if slot >= given.len() {
                let message =
                    format!("`{callee}` takes {}, not {}", count(given.len(), "argument"), call.arguments.len());
                self.tell(Diagnostic::new(Code::Syntax, message).label(value_span, "one too many"), ctx);
                return Ok(None);
            }
            if given[slot].replace(argument.value).is_some() {
                let name = own.text(define.params[slot].name);
                let d = Diagnostic::new(Code::Syntax, format!("parameter `{name}` of `{callee}` is given twice"));
                self.tell(d.label(value_span, "given again here"), ctx);
                return Ok(None);
            }
        }
        let missing: Vec<String> = (define.params.iter().zip(&given))
            .filter(|(p, g)| g.is_none() && p.default.is_none())
            .map(|(p, _)| format!("`{}`", own.text(p.name)))
            .collect();
        if !missing.is_empty() {
            let message = format!("`{callee}` needs a value for {}", missing.join(", "));
            let d = Diagnostic::new(Code::Syntax, message).label(span, "an argument is missing in this call");
            self.tell(d.label(define.name, "defined here"), ctx);
            return Ok(None);
        }
        let mut bound: Vec<(Sym, Bound)> = Vec::with_capacity(given.len());
        for (param, value) in define.params.iter().zip(given) {
            let name = self.symbols.intern(own.text(param.name));
            // A default stands in the define's own file and sees the parameters before it.
            let mark = self.frames.len();
            let (expr, at) = match (value, param.default) {
                (Some(expr), _) => (expr, Context { place: Place::Law, ..ctx }),
                (None, Some(expr)) => {
                    self.frames.push(Frame { arguments: bound.clone(), depth: 0 });
                    let at = Context { file: id.file, env: EnvId::EMPTY, frame: Some(mark), place: Place::Law, ..ctx };
                    (expr, at)
                }
                (None, None) => continue,
            };
            let result = self.bind(expr, at);
            self.frames.truncate(mark);
            let mut argument = result?;
            if let Some(unit) = param.unit {
                let from_define = value.is_none();
                argument = self.fitted(argument, (id.file, unit), from_define, ctx);
            }
            bound.push((name, argument));
        }
        Ok(Some(bound))
    }

    /// An argument at a parameter that declares a unit: a bare number takes it, another unit is told.
    fn fitted(&mut self, a: Bound, (file, unit): (usize, u32), own_default: bool, ctx: Context) -> Bound {
        let Some(unit) = self.unit(file, unit, ctx) else { return Bound { broken: true, ..a } };
        let span = self.net.exprs.span(a.id);
        if let Some(known) = a.measure.known {
            if known != unit.dimension && !a.broken {
                let (has, needs) = (known.spell(), unit.dimension.spell());
                let d = Diagnostic::new(
                    Code::UnitMismatch,
                    format!("an argument in [{has}] is given where [{needs}] is needed"),
                );
                return self.broken(d.label(span, format!("this is [{has}]")), ctx);
            }
            return a;
        }
        // A default beside its own unit is in that unit; an argument elsewhere is in coherent SI.
        let bare = self.is_bare_number(a.id);
        let id = if own_default && bare { self.scaled(a.id, &unit.scale, span) } else { a.id };
        if !own_default && bare && unit.scale != super::units::Scale::one() {
            let si = unit.dimension.spell();
            let d = Diagnostic::new(Code::BareNumber, format!("a bare number is taken in coherent SI here, in [{si}]"))
                .label(span, "this number carries a unit")
                .help("write the unit after the number");
            self.tell(d, ctx);
        }
        Bound { id, measure: Measure::of(unit.dimension), ..a }
    }

    /// Whether an expression is a number as written, perhaps with a sign.
    pub(super) fn is_bare_number(&self, id: NodeId) -> bool {
        match self.net.exprs.get(id) {
            Node::Ratio(..) | Node::Number(_) => true,
            Node::Neg(a) => matches!(self.net.exprs.get(a), Node::Ratio(..) | Node::Number(_)),
            _ => false,
        }
    }

    fn bind_function(&mut self, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let call = &file.tree.calls[place as usize];
        let name = file.text(call.callee);
        let needs = match name {
            "min" | "max" => "two or more arguments",
            _ => "one argument",
        };
        let two = matches!(name, "min" | "max");
        let fits = if two { call.arguments.len() >= 2 } else { call.arguments.len() == 1 };
        if !fits || call.arguments.iter().any(|a| a.name.is_some()) {
            let d = Diagnostic::new(Code::Syntax, format!("`{name}` takes {needs}, without names"));
            return Ok(self.broken(d.label(span, "wrong arguments"), ctx));
        }
        let mut values = Vec::with_capacity(call.arguments.len());
        for argument in &call.arguments {
            values.push(self.bind(argument.value, ctx)?);
        }
        let first = values[0];
        let broken = values.iter().any(|v| v.broken);
        if name == "exp" && (first.s || first.z) {
            return Ok(self.dead_time(first, span, ctx));
        }
        if values.iter().any(|v| v.s || v.z) {
            let d = Diagnostic::new(Code::Syntax, format!("`{name}` takes numbers and params, not s or z"));
            let d = d.label(span, "s or z stands in this argument");
            return Ok(self.broken(d.help("only `exp(-T*s)`, a dead time, can have s in it"), ctx));
        }
        if two {
            let mut result = first;
            for value in &values[1..] {
                let measure = self.added(BinaryOp::Add, result, *value, (ctx, span));
                let node = if name == "min" { Node::Min(result.id, value.id) } else { Node::Max(result.id, value.id) };
                let id = self.net.exprs.push(node, span);
                result = Bound { id, measure, pure: false, broken, ..result };
            }
            return Ok(result);
        }
        let (f, measure) = match name {
            "sqrt" => (Function::Sqrt, Measure { known: first.measure.known.and_then(|d| d.root(2)), ..first.measure }),
            "abs" => (Function::Abs, first.measure),
            _ => {
                if let Some(known) = first.measure.known
                    && !known.is_one()
                    && !broken
                {
                    let message = format!("`{name}` takes a plain number (or an angle), not [{}]", known.spell());
                    let d = Diagnostic::new(Code::UnitMismatch, message);
                    let at = self.net.exprs.span(first.id);
                    return Ok(self.broken(d.label(at, format!("this is [{}]", known.spell())), ctx));
                }
                let f = match name {
                    "sin" => Function::Sin,
                    "cos" => Function::Cos,
                    "tan" => Function::Tan,
                    "atan" => Function::Atan,
                    "ln" => Function::Ln,
                    _ => Function::Exp,
                };
                (f, Measure { known: first.measure.known.map(|_| Dimension::ONE), ..first.measure })
            }
        };
        let id = self.net.exprs.push(Node::Call(f, first.id), span);
        Ok(Bound { id, measure, pure: false, broken, ..first })
    }

    /// `exp(-T*s)`: a dead time.
    fn dead_time(&mut self, argument: Bound, span: Span, ctx: Context) -> Bound {
        if argument.z {
            let d = Diagnostic::new(Code::Syntax, "a dead time in z is a power, such as `z^-3`");
            return self.broken(d.label(span, "`exp` can't have z in it"), ctx);
        }
        if let Some(known) = argument.measure.known
            && !known.is_one()
            && !(argument.pure || argument.broken)
        {
            let found = known.div(Dimension::SECOND.pow(-1));
            let message = format!("a dead time must be in [s], this one is in [{}]", found.spell());
            let d = Diagnostic::new(Code::UnitMismatch, message);
            return self.broken(d.label(span, "the exponent T*s must be without a unit (s counts as 1/s)"), ctx);
        }
        let id = self.net.exprs.push(Node::Delay(argument.id), span);
        Bound { id, measure: Measure::of(Dimension::ONE), pure: false, ..argument }
    }

    /// `sum(k in a..b, …)` and `product(…)`, written out.
    pub(super) fn bind_repeated(&mut self, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let repeated = file.tree.repeated[place as usize];
        let Some((from, to)) = self.range(repeated.from, repeated.to, ctx)? else {
            return Ok(self.unknown_value(span));
        };
        let name = self.symbols.intern(file.text(repeated.index));
        self.count(u64::try_from(i128::from(to) - i128::from(from) + 1).unwrap_or(0), span)?;
        let mut result: Option<Bound> = None;
        for k in from..=to {
            let mark = self.indices.mark();
            let env = self.indices.with(ctx.env, name, k);
            let term = self.bind(repeated.body, Context { env, ..ctx });
            self.indices.forget(mark);
            let term = term?;
            let op = if repeated.kind == Repeated::Sum { BinaryOp::Add } else { BinaryOp::Mul };
            let between = (ctx, repeated.index);
            result = Some(result.map_or(term, |r| self.combine(op, r, term, span, between)));
        }
        Ok(result.unwrap_or_else(|| {
            let value = i32::from(repeated.kind == Repeated::Product);
            plain(self.net.exprs.push(Node::Ratio(value, 1), span))
        }))
    }

    /// Both ends of a range; `None` where one was told to be no whole number.
    pub(super) fn range(&mut self, from: ExprId, to: ExprId, ctx: Context) -> Result<Option<(i64, i64)>, LimitReached> {
        let mut ends = [0; 2];
        for (end, id) in ends.iter_mut().zip([from, to]) {
            let Some(n) = self.whole(id, ctx)? else {
                let at = self.loaded.files[ctx.file].tree.expr(id).span;
                let d = Diagnostic::new(Code::Syntax, "the ends of a range must be whole numbers")
                    .label(at, "not a whole number")
                    .help("use whole numbers, the indices around it and a define's arguments");
                self.tell(d, ctx);
                return Ok(None);
            };
            *end = n;
        }
        Ok(Some((ends[0], ends[1])))
    }

    /// Whole-number arithmetic on whole numbers, indices and a define's arguments; `None` where it is none.
    pub(super) fn whole(&mut self, id: ExprId, ctx: Context) -> Result<Option<i64>, LimitReached> {
        let loaded = self.loaded;
        let file = &loaded.files[ctx.file];
        let mut spine = Vec::new();
        let mut inner = id;
        while let ExprKind::Binary(op, left, right) = file.tree.expr(inner).kind
            && op != BinaryOp::Pow
        {
            spine.push((op, right));
            inner = left;
        }
        let expr = file.tree.expr(inner);
        let mut result = match expr.kind {
            ExprKind::Number => file.text(expr.span).parse().ok(),
            ExprKind::Name(template) => self.whole_name(Name { span: expr.span, template }, ctx),
            ExprKind::Neg(a) => self.whole(a, ctx)?.and_then(i64::checked_neg),
            ExprKind::Binary(op, a, b) => {
                let (a, b) = (self.whole(a, ctx)?, self.whole(b, ctx)?);
                a.zip(b).and_then(|(a, b)| numbers::whole(op, a, b))
            }
            ExprKind::Call(place) => {
                let call = &file.tree.calls[place as usize];
                let name = file.text(call.callee);
                let mut best: Option<i64> = None;
                for argument in &call.arguments {
                    let Some(value) = self.whole(argument.value, ctx)? else { return Ok(None) };
                    best = Some(match (name, best) {
                        (_, None) => value,
                        ("min", Some(b)) => b.min(value),
                        ("max", Some(b)) => b.max(value),
                        _ => return Ok(None),
                    });
                }
                best.filter(|_| matches!(name, "min" | "max"))
            }
            ExprKind::Derivative(_) | ExprKind::Repeated(_) | ExprKind::WithUnit(..) => None,
        };
        while let Some((op, right)) = spine.pop() {
            let Some(a) = result else { return Ok(None) };
            result = self.whole(right, ctx)?.and_then(|b| numbers::whole(op, a, b));
        }
        Ok(result)
    }

    fn whole_name(&mut self, name: Name, ctx: Context) -> Option<i64> {
        if name.template != TemplateId::NONE {
            return None;
        }
        let text = self.loaded.files[ctx.file].text(name.span);
        let sym = self.symbols.intern(text);
        if let Some(frame) = ctx.frame
            && let Some((_, bound)) = self.frames[frame].arguments.iter().find(|(n, _)| *n == sym)
        {
            return self.whole_value(bound.id, MAX_DEFINE_DEPTH);
        }
        if let Some(k) = self.indices.get(ctx.env, sym) {
            return Some(k);
        }
        if ctx.frame.is_some() {
            return None;
        }
        match self.scopes.get(ctx.scope, sym)? {
            Entity::Param(id) if self.is_argument(id) => {
                self.whole_value(self.net.params[id.index()].value?, MAX_DEFINE_DEPTH)
            }
            Entity::Law(place) => self.whole_value(self.law_arguments[place as usize].id, MAX_DEFINE_DEPTH),
            _ => None,
        }
    }

    fn is_argument(&self, id: ParamId) -> bool {
        self.argument_params.binary_search(&id).is_ok()
    }

    /// The whole number that a bound expression is, arguments of instances followed.
    fn whole_value(&self, id: NodeId, mut steps: usize) -> Option<i64> {
        let mut id = id;
        for _ in 0..=MAX_DEFINE_DEPTH {
            if steps == 0 {
                return None;
            }
            steps -= 1;
            match self.net.exprs.get(id) {
                Node::Ratio(n, 1) => return Some(i64::from(n)),
                Node::Neg(a) => match self.net.exprs.get(a) {
                    Node::Ratio(n, 1) => return Some(-i64::from(n)),
                    _ => return None,
                },
                Node::Add(a, b) => return self.whole_value(a, steps)?.checked_add(self.whole_value(b, steps)?),
                Node::Sub(a, b) => return self.whole_value(a, steps)?.checked_sub(self.whole_value(b, steps)?),
                Node::Mul(a, b) => return self.whole_value(a, steps)?.checked_mul(self.whole_value(b, steps)?),
                Node::Param(p) if self.is_argument(p) => id = self.net.params[p.index()].value?,
                _ => return None,
            }
        }
        None
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

fn plain(id: NodeId) -> Bound {
    Bound { id, measure: Measure::FREE, s: false, z: false, pure: false, unit: None, broken: false }
}

fn gcd(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a.max(1)
}
