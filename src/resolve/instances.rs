//! Instances of composites: arguments, ports, and the inside written out.

use super::LimitReached;
use super::bind::{Bound, Context, Place};
use super::files::DefineId;
use super::scope::{Entity, EnvId, ScopeId, Sym, normal};
use super::write_out::Writer;
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;
use crate::syntax::ast::{self, BlockBody, ExprKind, Name};

impl<'a> Writer<'a> {
    /// Binds an instance's arguments and ports, and writes out its inside.
    pub(super) fn instance(
        &mut self,
        (inside, define_id): (ScopeId, DefineId),
        block: &'a ast::Block,
        span: Span,
        ctx: Context,
    ) -> Result<(), LimitReached> {
        let loaded = self.loaded;
        let (BlockBody::Law(law), Some(define)) = (&block.body, loaded.define(define_id)) else { return Ok(()) };
        let ast::DefineBody::Composite { inputs, outputs, body } = &define.body else { return Ok(()) };
        let expr = loaded.files[ctx.file].tree.expr(*law);
        let ExprKind::Call(call) = expr.kind else { return Ok(()) };
        if self.circular_defines.contains(&define_id) {
            return Ok(());
        }
        self.count(body.len() as u64, span)?;
        if let Some(every) = block.every {
            let at = loaded.files[ctx.file].tree.expr(every).span;
            let d = Diagnostic::new(
                Code::Syntax,
                "`every` stands on a block with a transfer function (law), not on an instance of a composite",
            );
            self.tell(d.label(at, "here").help("hand the period to the composite as an argument"), ctx);
        }
        let ports = [(&block.inputs, inputs, "input"), (&block.outputs, outputs, "output")];
        for (given, needed, what) in ports {
            if given.len() != needed.len() {
                let name = loaded.files[define_id.file].text(define.name);
                let (need, has) = (super::bind::count(needed.len(), what), given.len());
                let d = Diagnostic::new(Code::Syntax, format!("`{name}` has {need}, and {has} given here"));
                let at = given.iter().map(|n| n.span).reduce(Span::to).unwrap_or(block.name.span);
                self.tell(d.label(at, "does not fit the ports").label(define.name, "defined here"), ctx);
                return Ok(());
            }
        }
        let Some(arguments) = self.arguments(define_id, call, expr.span, ctx)? else { return Ok(()) };
        for (given, needed, what) in ports {
            for (name, port) in given.iter().zip(needed.iter()) {
                self.port(*name, port, (define_id.file, inside), what == "input", ctx);
            }
        }
        self.argument_entities(&arguments, define, define_id, inside);
        let inner = Context { file: define_id.file, scope: inside, env: EnvId::EMPTY, frame: None, place: Place::Law };
        let items = self.expand(body, inner)?;
        self.scope(inside, define_id.file, &items)
    }

    /// Makes an argument known inside: a param of the instance, or a law where s is in it.
    pub(super) fn argument_entities(
        &mut self,
        arguments: &[(Sym, Bound)],
        define: &ast::Define,
        id: DefineId,
        inside: ScopeId,
    ) {
        for ((sym, bound), param) in arguments.iter().zip(&define.params) {
            if self.scopes.get(inside, *sym).is_some() {
                let ctx = Context { file: id.file, scope: inside, env: EnvId::EMPTY, frame: None, place: Place::Law };
                self.given_twice(*sym, param.name, ctx);
            } else if bound.s || bound.z {
                self.law_arguments.push(*bound);
                let place = self.law_arguments.len() as u32 - 1;
                self.scopes.put(inside, *sym, Entity::Law(place), param.name);
            } else {
                let new = self.new_param(inside, *sym, param.name);
                self.param_measures[new.index()] = (bound.measure, bound.broken);
                self.net.params[new.index()].value = Some(bound.id);
                self.net.params[new.index()].unit = self.argument_unit(bound, param, id);
                self.argument_params.push(new);
            }
        }
    }

    /// The unit in which a bare number for an argument is taken: the argument's own, else the define's.
    pub(super) fn argument_unit(&mut self, bound: &Bound, param: &ast::DefineParam, id: DefineId) -> Option<u32> {
        if bound.unit.is_some() {
            return bound.unit;
        }
        let place = param.unit?;
        let ctx = Context { file: id.file, scope: ScopeId(0), env: EnvId::EMPTY, frame: None, place: Place::Law };
        let unit = self.unit(id.file, place, ctx)?;
        Some(self.display_unit(id.file, place, &unit))
    }

    /// Makes a port another name of the outer signal.
    pub(super) fn port(
        &mut self,
        outer: Name,
        port: &ast::Port,
        (file, inside): (usize, ScopeId),
        reads: bool,
        ctx: Context,
    ) {
        let Some(signal) = self.signal(outer, ctx, ctx.env) else { return };
        if reads {
            self.read(signal, outer.span, ctx);
        }
        let text = normal(self.loaded.files[file].text(port.name)).into_owned();
        let sym = self.symbols.intern(&text);
        let inner = Context { file, scope: inside, ..ctx };
        if self.scopes.get(inside, sym).is_some() {
            return self.given_twice(sym, port.name, inner);
        }
        self.scopes.put(inside, sym, Entity::Signal(signal), port.name);
        let alias = self.full_name(inside, &text);
        self.net.aliases.push((alias, signal));
        let Some(unit) = port.unit.and_then(|u| self.unit(file, u, inner)) else { return };
        match self.notes[signal.index()].dimension {
            None => self.notes[signal.index()].dimension = Some(unit.dimension),
            Some(known) if known != unit.dimension => {
                let (has, needs) = (known.spell(), unit.dimension.spell());
                let d = Diagnostic::new(Code::UnitMismatch, format!("signal in [{has}] at a port in [{needs}]"));
                let d =
                    d.label(outer.span, format!("this is [{has}]")).label(port.name, format!("this port is [{needs}]"));
                self.tell(d, ctx);
            }
            Some(_) => {}
        }
    }
}
