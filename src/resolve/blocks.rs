//! Sums and blocks: terms, laws, matrices, and what stands in for a law in error.

use super::LimitReached;
use super::bind::{Bound, Context, Measure, Place};
use super::linear::{LinearTerm, Reader, Variable};
use super::scope::Entity;
use super::units::Dimension;
use super::write_out::Writer;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId};
use crate::netlist::{BlockId, Law, SignalId, SumId, Term};
use crate::source::Span;
use crate::syntax::ast::{self, BlockBody};

impl<'a> Writer<'a> {
    pub(super) fn bind_sum(&mut self, id: SumId, value: ast::ExprId, ctx: Context) -> Result<(), LimitReached> {
        let ctx = Context { place: Place::Parameters, ..ctx };
        let (terms, _) = self.linear_terms(value, Reader::Sum, ctx)?;
        let first_term = self.net.terms.len() as u32;
        for term in terms {
            let signal = self.variable(&term, ctx);
            self.read(signal, term.span, ctx);
            let factor = term.factor.map(|f| f.id);
            self.net.terms.push(Term { negative: term.negative, factor, signal });
            if self.has_units {
                let measure = term.factor.map_or(Measure::of(Dimension::ONE), |f| f.measure);
                self.term_notes.push((measure, term.sign));
            }
        }
        let sum = &mut self.net.sums[id.index()];
        sum.first_term = first_term;
        sum.term_count = self.net.terms.len() as u32 - first_term;
        Ok(())
    }

    /// The signal of a term, a new one where nothing of that name is there.
    pub(super) fn variable(&mut self, term: &LinearTerm, ctx: Context) -> SignalId {
        match term.variable {
            Variable::Known(id) => id,
            Variable::Unknown(sym) => match self.scopes.get(ctx.scope, sym) {
                Some(Entity::Signal(id)) => id,
                _ => self.new_signal(ctx.scope, sym, term.span),
            },
        }
    }

    pub(super) fn bind_block(&mut self, id: BlockId, block: &'a ast::Block, ctx: Context) -> Result<(), LimitReached> {
        let mut inputs = Vec::with_capacity(block.inputs.len());
        for input in &block.inputs {
            if let Some(signal) = self.signal(*input, ctx, ctx.env) {
                self.read(signal, input.span, ctx);
                inputs.push(signal);
            }
        }
        let whole =
            inputs.len() == block.inputs.len() && self.net.blocks[id.index()].outputs.len() == block.outputs.len();
        self.net.blocks[id.index()].inputs = inputs.into();
        if let Some(every) = block.every {
            let place = Place::Parameters;
            let period = self.bind(every, Context { place, ..ctx })?;
            self.expect(period, Dimension::SECOND, "a sampling period", ctx);
            self.net.blocks[id.index()].every = Some(period.id);
        }
        match &block.body {
            BlockBody::Law(law) => {
                let bound = self.bind(*law, ctx)?;
                let span = self.loaded.files[ctx.file].tree.expr(*law).span;
                if whole && self.shape(1, 1, block, span, ctx) {
                    let entry = self.entry(bound, id, span, ctx);
                    self.net.blocks[id.index()].law = Law::Scalar(entry);
                    self.note_law(id, vec![(law_measure(bound), span)]);
                } else {
                    self.unknown_law(id, span);
                }
            }
            BlockBody::Matrix(rows) => self.bind_matrix(id, block, rows, whole, ctx)?,
            BlockBody::Equations(lines) => self.bind_states(id, block, lines, ctx)?,
        }
        Ok(())
    }

    pub(super) fn note_law(&mut self, id: BlockId, notes: Vec<(Measure, Span)>) {
        if self.has_units {
            self.law_notes.push((id, notes));
        }
    }

    pub(super) fn bind_matrix(
        &mut self,
        id: BlockId,
        block: &'a ast::Block,
        rows: &'a [Box<[ast::ExprId]>],
        whole: bool,
        ctx: Context,
    ) -> Result<(), LimitReached> {
        let tree = &self.loaded.files[ctx.file].tree;
        let spans = rows.iter().flatten().map(|e| tree.expr(*e).span);
        let span = spans.reduce(Span::to).unwrap_or(block.name.span);
        let (mut bound, mut notes) = (Vec::with_capacity(rows.len()), Vec::new());
        for row in rows {
            let mut entries = Vec::with_capacity(row.len());
            for entry in row {
                let at = tree.expr(*entry).span;
                let value = self.bind(*entry, ctx)?;
                notes.push((law_measure(value), at));
                entries.push(self.entry(value, id, at, ctx));
            }
            bound.push(entries.into_boxed_slice());
        }
        if !whole {
            self.unknown_law(id, span);
            return Ok(());
        }
        if let Some(odd) = rows.iter().find(|r| r.len() != block.inputs.len()) {
            let at = odd.iter().map(|e| tree.expr(*e).span).reduce(Span::to).unwrap_or(span);
            let (need, has) = (super::bind::count(block.inputs.len(), "column"), odd.len());
            let d = Diagnostic::new(Code::Syntax, format!("each row needs {need}, one an input; this one has {has}"));
            self.tell(d.label(at, "this row").help("a row stands for an output, a column for an input"), ctx);
            self.unknown_law(id, span);
            return Ok(());
        }
        if self.shape(block.inputs.len(), rows.len(), block, span, ctx) {
            self.net.blocks[id.index()].law = Law::Matrix(bound.into());
            self.note_law(id, notes);
        } else {
            self.unknown_law(id, span);
        }
        Ok(())
    }

    /// Whether a law of so many columns and rows fits the block's ports.
    pub(super) fn shape(&mut self, columns: usize, rows: usize, block: &ast::Block, span: Span, ctx: Context) -> bool {
        let (inputs, outputs) = (block.inputs.len(), block.outputs.len());
        if columns == inputs && rows == outputs {
            return true;
        }
        let count = super::bind::count;
        let message = format!("the block has {} and {}", count(inputs, "input"), count(outputs, "output"));
        let message = if columns == 1 && rows == 1 {
            format!("{message}, and one transfer function (law) is for one of each")
        } else {
            format!("{message}, its matrix {} and {}", count(columns, "column"), count(rows, "row"))
        };
        let d = Diagnostic::new(Code::Syntax, message).label(span, "the law does not fit the ports");
        self.tell(d.help("write a matrix `[[…], […]]` with a row for each output and a column for each input"), ctx);
        false
    }

    /// A law's entry: s in a continuous block, z in a sampled one.
    pub(super) fn entry(&mut self, bound: Bound, id: BlockId, span: Span, ctx: Context) -> NodeId {
        let every = self.net.blocks[id.index()].every.is_some();
        let (message, help) = match (bound.s, bound.z, every) {
            _ if bound.broken => return self.strictly_proper(span, every),
            (true, true, _) => ("a transfer function (law) has s and z in it", "use s alone, or z with `every`"),
            (true, _, true) => (
                "a sampled block's transfer function (law) is written in z",
                "leave `every` out, or write the law in z",
            ),
            (_, true, false) => (
                "a transfer function (law) in z needs its sampling period",
                "add `every T` with the period, such as `every 1 [ms]`",
            ),
            _ => return bound.id,
        };
        let d = Diagnostic::new(Code::Syntax, message).label(span, "here").help(help);
        self.tell(d, ctx);
        self.strictly_proper(span, every)
    }

    /// The stand-in for a law in error: of no direct gain, so that no loop is told through it.
    pub(super) fn strictly_proper(&mut self, span: Span, sampled: bool) -> NodeId {
        let gain = self.unknown_value(span).id;
        let s = self.net.exprs.push(if sampled { Node::Z } else { Node::S }, span);
        self.net.exprs.push(Node::Div(gain, s), span)
    }

    /// Gives a block whose own text is in error a law from which nothing follows.
    pub(super) fn unknown_law(&mut self, id: BlockId, span: Span) {
        let block = &self.net.blocks[id.index()];
        let (rows, columns, sampled) = (block.outputs.len(), block.inputs.len(), block.every.is_some());
        let entry = self.strictly_proper(span, sampled);
        let row = vec![entry; columns].into_boxed_slice();
        self.net.blocks[id.index()].law = Law::Matrix(vec![row; rows].into());
    }

    /// Tells where a value has another unit than its place needs.
    pub(super) fn expect(&mut self, value: Bound, needed: Dimension, what: &str, ctx: Context) {
        if let Some(known) = value.measure.known
            && known != needed
            && !value.broken
        {
            let (has, needs) = (known.spell(), needed.spell());
            let d = Diagnostic::new(Code::UnitMismatch, format!("{what} is in [{needs}], this is in [{has}]"));
            let at = self.net.exprs.span(value.id);
            self.tell(d.label(at, format!("this is [{has}]")), ctx);
        }
    }
}

/// The unit of a law's entry; one of s and 1 alone has a coefficient 1 that takes the unit its place needs.
fn law_measure(entry: Bound) -> Measure {
    if entry.pure { Measure::FREE } else { entry.measure }
}
