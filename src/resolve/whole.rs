//! Whole numbers: ranges, indices, exponents, and what `sum( )` and `product( )` write out.

use super::bind::{Bound, Context, plain};
use super::numbers;
use super::scope::Entity;
use super::write_out::Writer;
use super::{LimitReached, MAX_DEFINE_DEPTH};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::ParamId;
use crate::netlist::expr::{Expr as Node, ExprId as NodeId};
use crate::source::Span;
use crate::syntax::ast::{BinaryOp, ExprId, ExprKind, Name, Repeated, TemplateId};

impl Writer<'_> {
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

    pub(super) fn whole_name(&mut self, name: Name, ctx: Context) -> Option<i64> {
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

    pub(super) fn is_argument(&self, id: ParamId) -> bool {
        self.argument_params.binary_search(&id).is_ok()
    }

    /// The whole number that a bound expression is, arguments of instances followed.
    pub(super) fn whole_value(&self, id: NodeId, mut steps: usize) -> Option<i64> {
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
}
