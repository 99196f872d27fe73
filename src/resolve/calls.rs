//! Calls: defined laws, functions, dead times, and the arguments of all of them.

use super::bind::{Bound, Context, Measure, Place, count, function};
use super::files::DefineId;
use super::scope::{EnvId, Frame, Sym};
use super::suggest::did_you_mean;
use super::units::Dimension;
use super::write_out::Writer;
use super::{LimitReached, MAX_DEFINE_DEPTH};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId, Function};
use crate::source::Span;
use crate::syntax::ast::{BinaryOp, DefineBody, ExprId};

impl Writer<'_> {
    /// A call of a defined law or a function.
    pub(super) fn bind_call(&mut self, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
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

    pub(super) fn bind_defined(
        &mut self,
        id: DefineId,
        place: u32,
        span: Span,
        ctx: Context,
    ) -> Result<Bound, LimitReached> {
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
    pub(super) fn fitted(&mut self, a: Bound, (file, unit): (usize, u32), own_default: bool, ctx: Context) -> Bound {
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

    pub(super) fn bind_function(&mut self, place: u32, span: Span, ctx: Context) -> Result<Bound, LimitReached> {
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
    pub(super) fn dead_time(&mut self, argument: Bound, span: Span, ctx: Context) -> Bound {
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
}
