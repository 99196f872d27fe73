//! Linear combinations: what stands in a sum and on the right of a state equation.

use super::LimitReached;
use super::bind::{Bound, Context, Measure};
use super::scope::{Entity, ScopeId, Sym};
use super::suggest::did_you_mean;
use super::write_out::Writer;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::SignalId;
use crate::netlist::expr::Expr as Node;
use crate::source::Span;
use crate::syntax::ast::{BinaryOp, ExprId, ExprKind, Name, Repeated};

/// What a term stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Variable {
    /// A signal that is known.
    Known(SignalId),
    /// A name that nothing in the scope has: a signal that nothing drives, or else a mistake.
    Unknown(Sym),
}

/// One term: ± factor · \[s·\]variable.
#[derive(Clone, Copy, Debug)]
pub(super) struct LinearTerm {
    /// The signal.
    pub variable: Variable,
    /// Whether its derivative stands here.
    pub derivative: bool,
    /// Whether it is subtracted.
    pub negative: bool,
    /// Its factor, where one is written.
    pub factor: Option<Bound>,
    /// Its name in the text.
    pub span: Span,
    /// The sign before it, or its own place for the first.
    pub sign: Span,
}

/// An expression that is a number, or linear in signals.
#[derive(Clone, Debug)]
pub(super) enum Linear {
    /// No signal in it.
    Constant(Bound),
    /// A sum of terms.
    Terms(Vec<LinearTerm>),
}

/// In which statement a linear combination stands.
#[derive(Clone, Copy, Debug)]
pub(super) enum Reader {
    /// In a sum: a name that is nothing else is a signal.
    Sum,
    /// In state equations, whose own names lie in this scope; no other signals can be read.
    States(ScopeId),
}

impl Writer<'_> {
    /// The terms of a linear combination; what is in error is told and left out.
    pub(super) fn linear_terms(
        &mut self,
        id: ExprId,
        reader: Reader,
        ctx: Context,
    ) -> Result<(Vec<LinearTerm>, bool), LimitReached> {
        let told = self.told_count();
        let terms = match self.linear(id, reader, ctx)? {
            Linear::Terms(terms) => terms,
            Linear::Constant(value) => {
                let zero = matches!(self.net.exprs.get(value.id), Node::Ratio(0, _));
                if !value.broken && !zero {
                    self.no_constant(self.net.exprs.span(value.id), reader, ctx);
                }
                Vec::new()
            }
        };
        Ok((terms, self.told_count() > told))
    }

    fn no_constant(&mut self, span: Span, reader: Reader, ctx: Context) {
        let d = match reader {
            Reader::Sum => Diagnostic::new(Code::NotLinear, "a sum adds signals; this term has none")
                .label(span, "a constant, not a signal")
                .help("make it an input, or write what it does as a block"),
            Reader::States(_) => {
                Diagnostic::new(Code::NotLinear, "a state equation must be linear, without a constant term")
                    .label(span, "a constant")
                    .help("make it an input of the block")
            }
        };
        self.tell(d, ctx);
    }

    fn linear(&mut self, id: ExprId, reader: Reader, ctx: Context) -> Result<Linear, LimitReached> {
        let tree = &self.loaded.files[ctx.file].tree;
        let mut spine = Vec::new();
        let mut inner = id;
        while let ExprKind::Binary(op, left, right) = tree.expr(inner).kind
            && op != BinaryOp::Pow
        {
            spine.push((op, left, right, tree.expr(inner).span));
            inner = left;
        }
        let mut result = self.linear_one(inner, reader, ctx)?;
        while let Some((op, left, right, span)) = spine.pop() {
            let r = self.linear(right, reader, ctx)?;
            let between = Span::new(tree.expr(left).span.end, tree.expr(right).span.start);
            result = self.joined(op, result, r, span, (reader, ctx, between));
        }
        Ok(result)
    }

    fn linear_one(&mut self, id: ExprId, reader: Reader, ctx: Context) -> Result<Linear, LimitReached> {
        let expr = self.loaded.files[ctx.file].tree.expr(id);
        match expr.kind {
            ExprKind::Name(template) => {
                let name = Name { span: expr.span, template };
                Ok(self.linear_name(name, false, reader, ctx))
            }
            ExprKind::Derivative(template) => {
                let name = Name { span: Span::new(expr.span.start, expr.span.end - 1), template };
                Ok(self.linear_name(name, true, reader, ctx))
            }
            ExprKind::Neg(a) => Ok(match self.linear(a, reader, ctx)? {
                Linear::Constant(a) => {
                    let id = self.net.exprs.push(Node::Neg(a.id), expr.span);
                    Linear::Constant(Bound { id, ..a })
                }
                Linear::Terms(terms) => Linear::Terms(negated(terms)),
            }),
            ExprKind::Repeated(place) => self.linear_repeated(place, expr.span, reader, ctx),
            ExprKind::Binary(..) | ExprKind::WithUnit(..) => self.linear_of_constant_or_signal(id, reader, ctx),
            ExprKind::Number | ExprKind::Call(_) => Ok(Linear::Constant(self.bind(id, ctx)?)),
        }
    }

    /// A power or a value with a unit: a number, unless a signal stands in it, which is told.
    fn linear_of_constant_or_signal(
        &mut self,
        id: ExprId,
        reader: Reader,
        ctx: Context,
    ) -> Result<Linear, LimitReached> {
        let expr = self.loaded.files[ctx.file].tree.expr(id);
        let base = match expr.kind {
            ExprKind::Binary(_, base, _) | ExprKind::WithUnit(base, _) => base,
            _ => id,
        };
        let base_expr = self.loaded.files[ctx.file].tree.expr(base);
        if let ExprKind::Name(template) = base_expr.kind
            && let Some(text) = self.name_text(ctx.file, Name { span: base_expr.span, template }, ctx.env)
        {
            let sym = self.symbols.intern(&text);
            if self.signal_named(sym, reader, ctx).is_some() {
                self.not_linear(expr.span, "a power or a unit on a signal", reader, ctx);
                return Ok(Linear::Terms(Vec::new()));
            }
        }
        Ok(Linear::Constant(self.bind(id, ctx)?))
    }

    /// The signal that a name stands for in a linear combination.
    fn signal_named(&self, sym: Sym, reader: Reader, ctx: Context) -> Option<SignalId> {
        let scope = match reader {
            Reader::Sum => ctx.scope,
            Reader::States(inside) => inside,
        };
        match self.scopes.get(scope, sym) {
            Some(Entity::Signal(signal)) => Some(signal),
            _ => None,
        }
    }

    fn linear_name(&mut self, name: Name, derivative: bool, reader: Reader, ctx: Context) -> Linear {
        let Some(text) = self.name_text(ctx.file, name, ctx.env) else { return Linear::Terms(Vec::new()) };
        let sym = self.symbols.intern(&text);
        let term = |variable| {
            let t =
                LinearTerm { variable, derivative, negative: false, factor: None, span: name.span, sign: name.span };
            Linear::Terms(vec![t])
        };
        if self.indices.get(ctx.env, sym).is_none() {
            if let Some(signal) = self.signal_named(sym, reader, ctx) {
                if derivative && !self.is_state(signal, reader) {
                    let d = Diagnostic::new(
                        Code::NotLinear,
                        format!("`{text}` is no state, so `{text}'` has no meaning here"),
                    );
                    let d = d.label(name.span, "not a state of this block");
                    self.tell(d.help(format!("a state has a line `{text}' = …`")), ctx);
                }
                return term(Variable::Known(signal));
            }
            let param = matches!(self.scopes.get(ctx.scope, sym), Some(Entity::Param(_) | Entity::Law(_)));
            let reserved = matches!(text.as_ref(), "s" | "z" | "pi");
            if derivative {
                let text = text.into_owned();
                let d = Diagnostic::new(Code::UnknownName, format!("there is no state `{text}`"))
                    .label(name.span, "not known here");
                self.tell(d, ctx);
                return Linear::Terms(Vec::new());
            }
            if !param && !reserved {
                if text.contains('.') {
                    return Linear::Constant(self.bind_name(name, ctx));
                }
                if matches!(reader, Reader::Sum) {
                    return term(Variable::Unknown(sym));
                }
                let text = text.into_owned();
                let outer = matches!(self.scopes.get(ctx.scope, sym), Some(Entity::Signal(_)));
                return self.unknown_in_states(&text, outer, name.span, reader, ctx);
            }
        }
        Linear::Constant(self.bind_name(name, ctx))
    }

    fn unknown_in_states(&mut self, text: &str, outer: bool, span: Span, reader: Reader, ctx: Context) -> Linear {
        if self.is_excused(text) {
            return Linear::Terms(Vec::new());
        }
        let Reader::States(inside) = reader else { return Linear::Terms(Vec::new()) };
        let d = Diagnostic::new(
            Code::UnknownName,
            format!("there is no state, input or param `{text}` in these equations"),
        );
        let own: Vec<&str> =
            self.scopes.list[inside.0 as usize].names.iter().map(|(n, _)| self.symbols.name(*n)).collect();
        let help = if outer {
            format!("`{text}` is a signal outside: make it an input of the block to read it")
        } else {
            did_you_mean(text, own.iter().copied())
                .unwrap_or_else(|| format!("add a line `{text} = …` or a param `{text}`"))
        };
        self.tell(d.label(span, "not known here").help(help), ctx);
        Linear::Constant(self.unknown_value(span))
    }

    fn joined(
        &mut self,
        op: BinaryOp,
        a: Linear,
        b: Linear,
        span: Span,
        (reader, ctx, between): (Reader, Context, Span),
    ) -> Linear {
        let sign = self.operator(ctx.file, between, op);
        match (op, a, b) {
            (_, Linear::Constant(a), Linear::Constant(b)) => {
                Linear::Constant(self.combine(op, a, b, span, (ctx, between)))
            }
            (BinaryOp::Add | BinaryOp::Sub, Linear::Terms(mut a), Linear::Terms(mut b)) => {
                if let Some(first) = b.first_mut() {
                    first.sign = sign;
                }
                a.extend(if op == BinaryOp::Sub { negated(b) } else { b });
                Linear::Terms(a)
            }
            (BinaryOp::Add | BinaryOp::Sub, Linear::Constant(c), Linear::Terms(t))
            | (BinaryOp::Add | BinaryOp::Sub, Linear::Terms(t), Linear::Constant(c)) => {
                let zero = matches!(self.net.exprs.get(c.id), Node::Ratio(0, _));
                if !c.broken && !zero {
                    self.no_constant(self.net.exprs.span(c.id), reader, ctx);
                }
                Linear::Terms(t)
            }
            (BinaryOp::Mul, Linear::Constant(c), Linear::Terms(t))
            | (BinaryOp::Mul, Linear::Terms(t), Linear::Constant(c)) => {
                Linear::Terms(self.times(t, BinaryOp::Mul, c, span, (ctx, between)))
            }
            (BinaryOp::Div, Linear::Terms(t), Linear::Constant(c)) => {
                Linear::Terms(self.times(t, BinaryOp::Div, c, span, (ctx, between)))
            }
            (BinaryOp::Div, Linear::Constant(_), Linear::Terms(t)) => self.misread_factor(&t, None, sign, reader, ctx),
            (_, Linear::Terms(a), Linear::Terms(b)) => self.misread_factor(&b, Some(a), sign, reader, ctx),
            (BinaryOp::Pow, a, _) => a,
        }
    }

    /// Two signals in one product: a mistyped param's name among them is told as such, two real signals otherwise.
    fn misread_factor(
        &mut self,
        b: &[LinearTerm],
        a: Option<Vec<LinearTerm>>,
        sign: Span,
        reader: Reader,
        ctx: Context,
    ) -> Linear {
        let unknown = |t: &[LinearTerm]| match t {
            [LinearTerm { variable: Variable::Unknown(name), span, .. }] => Some((*name, *span)),
            _ => None,
        };
        let a = a.unwrap_or_default();
        let (wrong, rest) = match (unknown(&a), unknown(b)) {
            (Some(name), _) => (name, b.to_vec()),
            (None, Some(name)) => (name, a),
            (None, None) => {
                if !a.is_empty() || !b.is_empty() {
                    self.not_linear(sign, "two signals are multiplied or divided here", reader, ctx);
                }
                return Linear::Terms(Vec::new());
            }
        };
        let text = self.symbols.name(wrong.0).to_owned();
        self.no_such_param(&text, wrong.1, false, ctx);
        Linear::Terms(rest)
    }

    fn not_linear(&mut self, span: Span, what: &str, reader: Reader, ctx: Context) {
        let message = match reader {
            Reader::Sum => "a sum must be linear in its signals",
            Reader::States(_) => "a state equation must be linear in states and inputs",
        };
        let d = Diagnostic::new(Code::NotLinear, message).label(span, what);
        self.tell(d.help("linearise about an operating point, and make the slope there a param"), ctx);
    }

    fn times(
        &mut self,
        mut terms: Vec<LinearTerm>,
        op: BinaryOp,
        c: Bound,
        span: Span,
        place: (Context, Span),
    ) -> Vec<LinearTerm> {
        for term in &mut terms {
            term.factor = Some(match (term.factor, op) {
                (Some(f), _) => self.combine(op, f, c, span, place),
                (None, BinaryOp::Mul) => c,
                (None, _) => {
                    let one = self.number_one(span);
                    self.combine(op, one, c, span, place)
                }
            });
        }
        terms
    }

    /// The number 1 as a factor, without a unit.
    fn number_one(&mut self, span: Span) -> Bound {
        let id = self.net.exprs.push(Node::Ratio(1, 1), span);
        let measure = Measure::of(super::units::Dimension::ONE);
        Bound { id, measure, s: false, z: false, pure: false, unit: None, broken: false }
    }

    fn linear_repeated(
        &mut self,
        place: u32,
        span: Span,
        reader: Reader,
        ctx: Context,
    ) -> Result<Linear, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let repeated = file.tree.repeated[place as usize];
        if repeated.kind == Repeated::Product {
            return Ok(Linear::Constant(self.bind_repeated(place, span, ctx)?));
        }
        let Some((from, to)) = self.range(repeated.from, repeated.to, ctx)? else {
            return Ok(Linear::Terms(Vec::new()));
        };
        let name = self.symbols.intern(file.text(repeated.index));
        self.count(u64::try_from(i128::from(to) - i128::from(from) + 1).unwrap_or(0), span)?;
        let mut result: Option<Linear> = None;
        for k in from..=to {
            let mark = self.indices.mark();
            let env = self.indices.with(ctx.env, name, k);
            let term = self.linear(repeated.body, reader, Context { env, ..ctx });
            self.indices.forget(mark);
            let term = term?;
            result = Some(match result {
                None => term,
                Some(r) => self.joined(BinaryOp::Add, r, term, span, (reader, ctx, repeated.index)),
            });
        }
        Ok(result.unwrap_or(Linear::Terms(Vec::new())))
    }
}

fn negated(mut terms: Vec<LinearTerm>) -> Vec<LinearTerm> {
    for term in &mut terms {
        term.negative = !term.negative;
    }
    terms
}
