//! State equations: states and helper lines become signals of the block, each line one linear equation.

use super::LimitReached;
use super::bind::{Context, Place};
use super::linear::{LinearTerm, Reader};
use super::scope::{Entity, ScopeId};
use super::units::Dimension;
use super::write_out::{Claim, Writer};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::Expr as Node;
use crate::netlist::{BlockId, Driver, Equation, EquationTerm, Law, SignalId};
use crate::source::Span;
use crate::syntax::ast;

impl<'a> Writer<'a> {
    /// Binds the state equations of a block.
    pub(super) fn bind_states(
        &mut self,
        id: BlockId,
        block: &'a ast::Block,
        lines: &'a [ast::Equation],
        ctx: Context,
    ) -> Result<(), LimitReached> {
        if let Some(every) = block.every {
            let at = self.loaded.files[ctx.file].tree.expr(every).span;
            let d = Diagnostic::new(
                Code::Syntax,
                "`every` stands on a block with a transfer function (law), not on state equations",
            );
            self.tell(d.label(at, "here").help("write a sampled block's law in z"), ctx);
            self.net.blocks[id.index()].every = None;
        }
        let told = self.told_count();
        let inside = self.open_states(id, block, ctx);
        let lefts = self.left_sides(id, lines, inside, ctx);
        self.every_output_has_a_line(block, id, &lefts, ctx);
        self.states = lefts.iter().flatten().filter(|(_, line)| line.derivative).map(|(s, _)| *s).collect();
        let place = Place::Parameters;
        let mut equations = Vec::with_capacity(lines.len());
        for (left, line) in lefts.into_iter().flatten() {
            self.count(1, line.span)?;
            let (terms, _) = self.linear_terms(line.right, Reader::States(inside), Context { place, ..ctx })?;
            self.check_line(left, line, &terms, ctx);
            let terms = terms.into_iter().map(|t| self.equation_term(&t, ctx)).collect();
            equations.push(Equation { left, derivative: line.derivative, terms, span: line.span });
        }
        self.states.clear();
        if self.told_count() > told && self.told[told..].iter().any(Diagnostic::is_error) {
            self.unknown_law(id, block.name.span);
        } else {
            self.net.blocks[id.index()].law = Law::States(equations.into());
        }
        Ok(())
    }

    /// Whether a name in state equations is a state of the block being bound.
    pub(super) fn is_state(&self, signal: SignalId, reader: Reader) -> bool {
        matches!(reader, Reader::States(_)) && self.states.contains(&signal)
    }

    /// The scope of the equations, with the block's ports in it.
    fn open_states(&mut self, id: BlockId, block: &'a ast::Block, ctx: Context) -> ScopeId {
        let outer = &self.scopes.list[ctx.scope.0 as usize];
        let (instance, depth) = (outer.instance, outer.depth);
        let prefix = format!("{}.", self.net.block_name(id));
        let inside = self.scopes.inside(id, prefix, instance, depth);
        for name in block.inputs.iter().chain(&block.outputs) {
            let Some(text) = self.name_text(ctx.file, *name, ctx.env) else { continue };
            let sym = self.symbols.intern(&text);
            if let Some(Entity::Signal(signal)) = self.scopes.get(ctx.scope, sym)
                && self.scopes.get(inside, sym).is_none()
            {
                self.scopes.put(inside, sym, Entity::Signal(signal), name.span);
            }
        }
        inside
    }

    /// The signal of each line's left side; none for a line whose name is told to be in error.
    fn left_sides(
        &mut self,
        id: BlockId,
        lines: &'a [ast::Equation],
        inside: ScopeId,
        ctx: Context,
    ) -> Vec<Option<(SignalId, &'a ast::Equation)>> {
        let mut given: Vec<(SignalId, Span)> = Vec::new();
        let mut lefts = Vec::with_capacity(lines.len());
        for line in lines {
            lefts.push(self.left_side(id, line, inside, &mut given, ctx).map(|s| (s, line)));
        }
        lefts
    }

    fn left_side(
        &mut self,
        id: BlockId,
        line: &ast::Equation,
        inside: ScopeId,
        given: &mut Vec<(SignalId, Span)>,
        ctx: Context,
    ) -> Option<SignalId> {
        let text = self.name_text(ctx.file, line.left, ctx.env)?;
        let sym = self.symbols.intern(&text);
        let clash = |what: &str| {
            Diagnostic::new(Code::DuplicateName, format!("`{text}` is {what} already"))
                .label(line.left.span, "and a line of the equations here")
                .help("give the state or the helper another name")
        };
        if matches!(self.scopes.get(ctx.scope, sym), Some(Entity::Param(_) | Entity::Law(_))) {
            let d = clash("a param");
            self.tell(d, ctx);
            return None;
        }
        let signal = match self.scopes.get(inside, sym) {
            Some(Entity::Signal(signal)) => {
                if self.net.blocks[id.index()].inputs.contains(&signal) {
                    let d = clash("an input of this block");
                    self.tell(d, ctx);
                    return None;
                }
                signal
            }
            _ => {
                let signal = self.new_signal(inside, sym, line.left.span);
                self.net.signals[signal.index()].driver = Driver::Block(id);
                self.notes[signal.index()].claim = Some(Claim { span: line.span, by: None });
                signal
            }
        };
        if let Some((_, first)) = given.iter().find(|(s, _)| *s == signal) {
            let d = Diagnostic::new(Code::DuplicateName, format!("`{text}` has two lines in these equations"));
            let d = d.label(line.left.span, "given again here").label(*first, "first given here");
            self.tell(d.help("one line for each state, helper and output; join the two right sides"), ctx);
            return None;
        }
        given.push((signal, line.left.span));
        Some(signal)
    }

    fn every_output_has_a_line(
        &mut self,
        block: &ast::Block,
        id: BlockId,
        lefts: &[Option<(SignalId, &ast::Equation)>],
        ctx: Context,
    ) {
        if lefts.iter().any(Option::is_none) {
            return;
        }
        let outputs = self.net.blocks[id.index()].outputs.clone();
        for (signal, name) in outputs.iter().zip(&block.outputs) {
            if !lefts.iter().flatten().any(|(s, _)| s == signal) {
                let text = self.net.signal_name(*signal).to_owned();
                let d = Diagnostic::new(Code::Syntax, format!("output `{text}` has no line in the state equations"));
                self.tell(d.label(name.span, "nothing gives it").help(format!("add a line `{text} = …`")), ctx);
            }
        }
    }

    fn equation_term(&mut self, term: &LinearTerm, ctx: Context) -> EquationTerm {
        let variable = self.variable(term, ctx);
        let factor = term.factor.map_or_else(|| self.net.exprs.push(Node::Ratio(1, 1), term.span), |f| f.id);
        let coefficient = if term.negative { self.net.exprs.push(Node::Neg(factor), term.span) } else { factor };
        EquationTerm { coefficient, derivative: term.derivative, variable }
    }

    /// Checks the units of one line, as far as they are known.
    fn check_line(&mut self, left: SignalId, line: &ast::Equation, terms: &[LinearTerm], ctx: Context) {
        let per_second = |d: Dimension, derivative: bool| if derivative { d.div(Dimension::SECOND) } else { d };
        let mut known: Option<(Dimension, Span)> =
            self.notes[left.index()].dimension.map(|d| (per_second(d, line.derivative), line.left.span));
        for term in terms {
            let super::linear::Variable::Known(signal) = term.variable else { continue };
            let factor = term.factor.map_or(Some(Dimension::ONE), |f| f.measure.known);
            let Some(dimension) = self.notes[signal.index()].dimension.zip(factor) else { continue };
            let dimension = per_second(dimension.0, term.derivative).mul(dimension.1);
            match known {
                None => known = Some((dimension, term.span)),
                Some((other, first)) if other != dimension => {
                    let (x, y) = (dimension.spell(), other.spell());
                    let d = Diagnostic::new(Code::UnitMismatch, format!("this term is in [{x}], the line in [{y}]"));
                    let d = d.label(term.sign, format!("this term is [{x}]")).label(first, format!("this gives [{y}]"));
                    self.tell(
                        d.help("check the units of signals and params in this line (x' counts as x per second)"),
                        ctx,
                    );
                    return;
                }
                Some(_) => {}
            }
        }
    }
}
