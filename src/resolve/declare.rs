//! The names of a scope: signals, params, sums, blocks and instances, and what drives each signal.

use super::LimitReached;
use super::bind::{Context, Measure};
use super::files::DefineId;
use super::scope::{Entity, EnvId, ScopeId, Sym};
use super::write_out::{Claim, Item, Target, Writer};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::{Block, BlockId, Driver, Instance, InstanceId, Law, Param, ParamId, SignalId, Sum, SumId};
use crate::source::Span;
use crate::syntax::ast::{self, BlockBody, ExprKind, Name, SignalKind, StatementKind};

impl<'a> Writer<'a> {
    pub(super) fn declare_signals_and_params(
        &mut self,
        item: Item<'a>,
        ctx: Context,
        params: &mut Vec<(ParamId, &'a ast::Param, EnvId)>,
    ) {
        match &item.statement.kind {
            StatementKind::Signal { kind, name, unit, .. } => {
                let Some(text) = self.name_text(ctx.file, *name, item.env) else { return };
                let sym = self.symbols.intern(&text);
                if self.scopes.get(ctx.scope, sym).is_some() {
                    return self.given_twice(sym, name.span, ctx);
                }
                let id = self.new_signal(ctx.scope, sym, name.span);
                let unit = unit.and_then(|u| self.unit(ctx.file, u, ctx).map(|unit| (u, unit)));
                if let Some((place, unit)) = unit {
                    let shown = self.display_unit(ctx.file, place, &unit);
                    self.net.signals[id.index()].unit = Some(shown);
                    self.notes[id.index()].dimension = Some(unit.dimension);
                    self.notes[id.index()].scaled = unit.scale != super::units::Scale::one();
                }
                self.notes[id.index()].declared = true;
                match kind {
                    SignalKind::Input => {
                        self.net.signals[id.index()].driver = Driver::Input;
                        self.notes[id.index()].claim = Some(Claim { span: item.statement.span, by: None });
                    }
                    SignalKind::Output => self.net.signals[id.index()].output = true,
                    SignalKind::Inner => {}
                }
            }
            StatementKind::Param(param) => {
                let Some(text) = self.name_text(ctx.file, param.name, item.env) else { return };
                let sym = self.symbols.intern(&text);
                if self.scopes.get(ctx.scope, sym).is_some() {
                    return self.given_twice(sym, param.name.span, ctx);
                }
                let id = self.new_param(ctx.scope, sym, param.name.span);
                params.push((id, param, item.env));
            }
            _ => {}
        }
    }

    /// A new param without a value yet.
    pub(super) fn new_param(&mut self, scope: ScopeId, sym: Sym, span: Span) -> ParamId {
        let text = self.symbols.name(sym).to_owned();
        let name = self.full_name(scope, &text);
        let origin = self.origin(scope, span);
        let id = ParamId(self.net.params.len() as u32);
        self.net.params.push(Param { name, value: None, within: None, unit: None, origin });
        self.param_measures.push((Measure::FREE, false));
        self.scopes.put(scope, sym, Entity::Param(id), span);
        id
    }

    /// The signal of a name that is driven or read, a new one where there is none; `None` where it is told to be
    /// something else.
    pub(super) fn signal(&mut self, name: Name, ctx: Context, env: EnvId) -> Option<SignalId> {
        let text = self.name_text(ctx.file, name, env)?;
        if text.contains('.') {
            let d = Diagnostic::new(
                Code::Syntax,
                format!("`{text}` is a path into an instance, and wiring goes through ports"),
            );
            self.tell(d.label(name.span, "a path can't be wired").help("add a port to the define"), ctx);
            return None;
        }
        let sym = self.symbols.intern(&text);
        match self.scopes.get(ctx.scope, sym) {
            Some(Entity::Signal(id)) => Some(id),
            Some(_) => {
                let d = Diagnostic::new(
                    Code::DuplicateName,
                    format!("`{text}` is a signal here, and a param or a block elsewhere"),
                );
                let first = self.scopes.list[ctx.scope.0 as usize].names.iter().find(|(n, _)| *n == sym).map(|n| n.1);
                let mut d = d.label(name.span, "a signal is needed here");
                if let Some(first) = first {
                    d = d.label(first, "here the name means something else");
                }
                self.tell(d.help("rename one of them"), ctx);
                None
            }
            None => Some(self.new_signal(ctx.scope, sym, name.span)),
        }
    }

    /// Gives a signal its driver; a second one is told.
    pub(super) fn drive(&mut self, id: SignalId, driver: Driver, claim: Claim, ctx: Context) {
        let inside = self.scopes.list[ctx.scope.0 as usize].instance;
        let note = &mut self.notes[id.index()];
        match note.claim {
            // The inside of the instance that has taken it drives it at last.
            Some(Claim { by: Some(by), .. }) if Some(by) == inside => {}
            Some(first) => {
                let name = self.net.signal_name(id).to_owned();
                let is_input = self.net.signals[id.index()].driver == Driver::Input;
                let d = Diagnostic::new(Code::DrivenTwice, format!("signal `{name}` has two drivers"))
                    .label(claim.span, format!("`{name}` is driven again here"))
                    .label(first.span, if is_input { "it is an input" } else { "it is driven here already" })
                    .help("give one of them a signal of its own, and add the two in a `sum`");
                return self.tell(d, ctx);
            }
            None => {}
        }
        note.claim = Some(claim);
        self.net.signals[id.index()].driver = driver;
    }

    pub(super) fn declare_drivers(
        &mut self,
        item: Item<'a>,
        ctx: Context,
        work: &mut Vec<(Item<'a>, Target)>,
    ) -> Result<(), LimitReached> {
        let span = item.statement.span;
        match &item.statement.kind {
            StatementKind::Sum { output, .. } => {
                let Some(signal) = self.signal(*output, ctx, item.env) else { return Ok(()) };
                let id = SumId(self.net.sums.len() as u32);
                let origin = self.origin(ctx.scope, span);
                self.net.sums.push(Sum { output: signal, first_term: 0, term_count: 0, origin });
                self.drive(signal, Driver::Sum(id), Claim { span: output.span, by: None }, ctx);
                work.push((item, Target::Sum(id)));
            }
            StatementKind::Block(block) => self.declare_block(item, block, ctx, work)?,
            _ => {}
        }
        Ok(())
    }

    pub(super) fn declare_block(
        &mut self,
        item: Item<'a>,
        block: &'a ast::Block,
        ctx: Context,
        work: &mut Vec<(Item<'a>, Target)>,
    ) -> Result<(), LimitReached> {
        let Some(text) = self.name_text(ctx.file, block.name, item.env) else { return Ok(()) };
        let sym = self.symbols.intern(&text);
        let known = self.scopes.get(ctx.scope, sym);
        if known.is_some() {
            self.given_twice(sym, block.name.span, ctx);
        }
        let span = item.statement.span;
        let origin = self.origin(ctx.scope, span);
        let name = self.full_name(ctx.scope, &text);
        if let Some(define) = self.composite_of(block, ctx) {
            let depth = self.scopes.list[ctx.scope.0 as usize].depth + 1;
            if depth > super::MAX_DEFINE_DEPTH {
                let message = format!("instances stand in each other more than {} deep", super::MAX_DEFINE_DEPTH);
                return self.limit(Diagnostic::new(Code::LimitReached, message).label(span, "here"));
            }
            let id = InstanceId(self.net.instances.len() as u32);
            self.net.instances.push(Instance { name, origin });
            let prefix = format!("{}.", self.net.names.get(name));
            let inside = self.scopes.open(prefix, Some(id), depth);
            if known.is_none() {
                self.scopes.put(ctx.scope, sym, Entity::Instance(id, inside), block.name.span);
            }
            for output in &block.outputs {
                if let Some(signal) = self.signal(*output, ctx, item.env) {
                    self.drive(signal, Driver::Nothing, Claim { span: output.span, by: Some(id) }, ctx);
                }
            }
            work.push((item, Target::Instance(inside, define)));
            return Ok(());
        }
        let id = BlockId(self.net.blocks.len() as u32);
        if known.is_none() {
            self.scopes.put(ctx.scope, sym, Entity::Block(id), block.name.span);
        }
        let mut outputs = Vec::with_capacity(block.outputs.len());
        for output in &block.outputs {
            if let Some(signal) = self.signal(*output, ctx, item.env) {
                self.drive(signal, Driver::Block(id), Claim { span: output.span, by: None }, ctx);
                outputs.push(signal);
            }
        }
        let law = Law::Matrix(Box::default());
        self.net.blocks.push(Block { name, inputs: Box::default(), outputs: outputs.into(), law, every: None, origin });
        work.push((item, Target::Block(id)));
        Ok(())
    }

    /// The composite that a block is an instance of, if its body is a call of one.
    pub(super) fn composite_of(&self, block: &ast::Block, ctx: Context) -> Option<DefineId> {
        let BlockBody::Law(law) = block.body else { return None };
        let file = &self.loaded.files[ctx.file];
        let ExprKind::Call(call) = file.tree.expr(law).kind else { return None };
        let id = self.loaded.find_define(ctx.file, file.text(file.tree.calls[call as usize].callee))?;
        let define = self.loaded.define(id)?;
        matches!(define.body, ast::DefineBody::Composite { .. }).then_some(id)
    }

    /// Marks a signal as read.
    pub(super) fn read(&mut self, id: SignalId, span: Span, ctx: Context) {
        let instance = self.scopes.list[ctx.scope.0 as usize].instance;
        let note = &mut self.notes[id.index()];
        if note.read.is_none() {
            note.read = Some(span);
            note.reader = instance;
        }
    }
}
