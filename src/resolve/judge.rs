//! What only the whole shows: signals that nothing drives or reads, units of signals across sums and blocks, sampling.

use super::bind::{Context, Measure, Place};
use super::scope::{EnvId, ScopeId};
use super::units::Dimension;
use super::write_out::Writer;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId};
use crate::netlist::probe::{Probe, Room};
use crate::netlist::values::Values;
use crate::netlist::{CaseId, Driver, InstanceId, Keep, Law, Netlist, SignalId, TimeBase};
use crate::source::Span;
use rayon::prelude::*;

/// How many expressions one task probes: enough that starting it costs nothing.
const MIN_PROBES: usize = 1_000;

/// How many rounds of finding units of undeclared signals there are: each carries a unit on through at least one sum
/// or block, and the rest stay unchecked.
const MAX_UNIT_ROUNDS: usize = 12;

impl Writer<'_> {
    /// Judges the whole netlist.
    pub(super) fn judge(&mut self) {
        self.judge_signals();
        if self.has_units {
            self.spread_units();
            self.judge_sums();
            self.judge_laws();
        }
        self.find_time_base();
    }

    fn judge_signals(&mut self) {
        for i in 0..self.net.signals.len() {
            let (signal, note) = (self.net.signals[i], self.notes[i]);
            if signal.driver != Driver::Nothing {
                continue;
            }
            let name = self.net.signal_name(SignalId(i as u32)).to_owned();
            if self.is_excused(&name) {
                continue;
            }
            let driven = note.claim.map(|c| c.span);
            match (note.read, driven) {
                // The instance that should drive it has told its own error, or has a port without a driver.
                (_, Some(span)) => {
                    let told = self.told.iter().any(Diagnostic::is_error);
                    if !told || note.claim.and_then(|c| c.by).is_some_and(|by| self.is_written_out(by)) {
                        let d = Diagnostic::new(
                            Code::UndrivenSignal,
                            format!("nothing inside the instance drives `{name}`"),
                        );
                        let d = d.label(span, "this port is left undriven inside");
                        self.told.push(d.help("drive the port in the define, with a `sum` or a `block`"));
                    }
                }
                (Some(span), None) => self.undriven(&name, span, note.reader),
                (None, None) if signal.output => {
                    let d = Diagnostic::new(Code::UndrivenSignal, format!("nothing drives the output `{name}`"));
                    let near = self.near_signal(&name);
                    let help = near.unwrap_or_else(|| "name it as the output of a `block` or a `sum`".to_owned());
                    self.told.push(d.label(signal.origin.span, "declared here").help(help));
                }
                (None, None) => {
                    let d = Diagnostic::new(Code::UnusedSignal, format!("signal `{name}` is neither driven nor read"));
                    self.told.push(
                        d.label(signal.origin.span, "declared here").help("leave the line out, or wire the signal"),
                    );
                }
            }
        }
    }

    /// Whether the inside of an instance was written out without being cut short.
    fn is_written_out(&self, id: InstanceId) -> bool {
        self.net.signals.iter().any(|s| s.origin.instance == Some(id))
            || self.net.blocks.iter().any(|b| b.origin.instance == Some(id))
    }

    fn undriven(&mut self, name: &str, span: Span, reader: Option<InstanceId>) {
        let d = Diagnostic::new(Code::UndrivenSignal, format!("nothing drives the signal `{name}`"));
        let near = self.near_signal(name);
        let help =
            near.unwrap_or_else(|| format!("declare it (`input {name}`), or drive it with a `sum` or a `block`"));
        let mut d = d.label(span, format!("`{name}` is read here")).help(help);
        if let Some(id) = reader {
            let instance = self.net.instances[id.index()];
            let outer = self.net.names.get(instance.name).to_owned();
            d = d.label(instance.origin.span, format!("written out for `{outer}`"));
        }
        self.told.push(d);
    }

    /// The closest driven signal of the same scope, under the name that it has there.
    fn near_signal(&self, name: &str) -> Option<String> {
        let (prefix, own) = name.rfind('.').map_or(("", name), |dot| name.split_at(dot + 1));
        let driven = (0..self.net.signals.len())
            .filter(|&i| self.net.signals[i].driver != Driver::Nothing)
            .filter_map(|i| self.net.signal_name(SignalId(i as u32)).strip_prefix(prefix))
            .filter(|other| !other.contains('.'));
        super::suggest::did_you_mean(own, driven.take(20_000))
    }

    /// Finds units of undeclared signals from what drives them, where all of it is known.
    fn spread_units(&mut self) {
        for _ in 0..MAX_UNIT_ROUNDS {
            let mut changed = false;
            for i in 0..self.net.sums.len() {
                let sum = &self.net.sums[i];
                if self.notes[sum.output.index()].dimension.is_some() {
                    continue;
                }
                let mut range = sum.first_term as usize..(sum.first_term + sum.term_count) as usize;
                let found = range.find_map(|t| self.term_dimension(t));
                if found.is_some() {
                    self.notes[sum.output.index()].dimension = found;
                    changed = true;
                }
            }
            for i in 0..self.law_notes.len() {
                let (id, entries) = &self.law_notes[i];
                let block = &self.net.blocks[id.index()];
                for (row, &output) in block.outputs.iter().enumerate() {
                    if self.notes[output.index()].dimension.is_some() {
                        continue;
                    }
                    let found = block.inputs.iter().enumerate().find_map(|(column, input)| {
                        let law = entries.get(row * block.inputs.len() + column)?.0.known?;
                        Some(self.notes[input.index()].dimension?.mul(law))
                    });
                    if found.is_some() {
                        self.notes[output.index()].dimension = found;
                        changed = true;
                    }
                }
            }
            if !changed {
                break;
            }
        }
    }

    fn term_dimension(&self, term: usize) -> Option<Dimension> {
        let factor = self.term_notes[term].0.known?;
        Some(self.notes[self.net.terms[term].signal.index()].dimension?.mul(factor))
    }

    /// Each term of a sum has the unit of the others and of what it drives.
    fn judge_sums(&mut self) {
        for i in 0..self.net.sums.len() {
            let sum = self.net.sums[i].clone();
            let range = sum.first_term as usize..(sum.first_term + sum.term_count) as usize;
            let driven = self.notes[sum.output.index()];
            let declared = driven.declared.then_some(driven.dimension).flatten();
            let output_name = self.net.signal_name(sum.output).to_owned();
            let mut first: Option<(Dimension, String, Span)> = None;
            for t in range {
                let Some(dimension) = self.term_dimension(t) else {
                    self.note_bare_term(t, driven.dimension, sum.output);
                    continue;
                };
                let name = self.net.signal_name(self.net.terms[t].signal).to_owned();
                let sign = self.term_notes[t].1;
                let here = format!("the term with `{name}`");
                let clash = match &first {
                    Some((other, what, at)) if *other != dimension => Some((*other, what.clone(), *at)),
                    None => {
                        declared.filter(|d| *d != dimension).map(|d| (d, format!("`{output_name}`"), sum.origin.span))
                    }
                    Some(_) => None,
                };
                if let Some((other, what, at)) = clash {
                    let (x, y) = (dimension.spell(), other.spell());
                    let message = format!("{here} is in [{x}], {what} in [{y}]: they can't be in one sum");
                    let d = Diagnostic::new(Code::UnitMismatch, message)
                        .label(sign, format!("this term is [{x}]"))
                        .label(at, format!("{what} is [{y}]"))
                        .help("convert one of them with a factor that has a unit, or check the declared units");
                    self.tell(d, self.at(sum.origin.instance));
                    break;
                }
                first.get_or_insert((dimension, here, sign));
            }
        }
    }

    /// The context for telling something of an instance's inside.
    fn at(&self, instance: Option<InstanceId>) -> Context {
        let scope = instance.and_then(|id| self.scopes.list.iter().position(|s| s.instance == Some(id))).unwrap_or(0);
        Context { file: 0, scope: ScopeId(scope as u32), env: EnvId::EMPTY, frame: None, place: Place::Law }
    }

    /// A bare factor that carries a unit beside a signal declared in a scaled one.
    fn note_bare_term(&mut self, t: usize, needed: Option<Dimension>, output: SignalId) {
        let signal = self.net.terms[t].signal;
        let (measure, _) = self.term_notes[t];
        let Some((needed, has)) = needed.zip(self.notes[signal.index()].dimension) else { return };
        let scaled = self.notes[signal.index()].scaled || self.notes[output.index()].scaled;
        self.note_bare(measure, needed.div(has), scaled);
    }

    fn note_bare(&mut self, measure: Measure, needed: Dimension, scaled: bool) {
        let Some(span) = measure.bare else { return };
        if !scaled || measure.known.is_some() || measure.strict == needed {
            return;
        }
        let unit = needed.div(measure.strict).spell();
        let d =
            Diagnostic::new(Code::BareNumber, format!("a bare number carries a unit here, in coherent SI: [{unit}]"));
        let d = d.label(span, "this number, beside a signal declared in a scaled unit");
        self.told.push(d.help("write the unit after the number, so that its scale is seen"));
    }

    /// Each block's output is in the unit of its input times that of its law.
    fn judge_laws(&mut self) {
        for (id, entries) in std::mem::take(&mut self.law_notes) {
            let block = self.net.blocks[id.index()].clone();
            'rows: for (row, output) in block.outputs.iter().enumerate() {
                for (column, input) in block.inputs.iter().enumerate() {
                    let Some(&(measure, span)) = entries.get(row * block.inputs.len() + column) else { continue };
                    let (x, y) = (self.notes[input.index()], self.notes[output.index()]);
                    let Some((has, needed)) = x.dimension.zip(y.dimension) else { continue };
                    let law = needed.div(has);
                    match measure.known {
                        None => self.note_bare(measure, law, x.scaled || y.scaled),
                        // A law of 0 has any unit.
                        Some(known) if known != law => {
                            self.law_mismatch((*input, has), (*output, needed), known, span, block.origin.instance);
                            continue 'rows;
                        }
                        Some(_) => {}
                    }
                }
            }
        }
    }

    fn law_mismatch(
        &mut self,
        (input, has): (SignalId, Dimension),
        (output, needed): (SignalId, Dimension),
        known: Dimension,
        span: Span,
        instance: Option<InstanceId>,
    ) {
        let (from, to) = (self.net.signal_name(input).to_owned(), self.net.signal_name(output).to_owned());
        let (law, should) = (known.spell(), needed.div(has).spell());
        let message =
            format!("the transfer function (law) from `{from}` to `{to}` is in [{law}] and should be in [{should}]");
        let d = Diagnostic::new(Code::UnitMismatch, message).label(span, format!("this is [{law}] (s counts as 1/s)"));
        let d = d.label(self.net.signals[output.index()].origin.span, format!("`{to}` is [{}]", needed.spell()));
        let d = d.label(self.net.signals[input.index()].origin.span, format!("`{from}` is [{}]", has.spell()));
        self.tell(
            d.help("check the units of the params in it, or the declared units of the signals"),
            self.at(instance),
        );
    }

    /// In what the laws are written.
    fn find_time_base(&mut self) {
        let sampled = self.net.blocks.iter().any(|b| b.every.is_some());
        if !sampled {
            return;
        }
        let continuous = self.net.blocks.iter().filter(|b| b.every.is_none()).any(|b| match &b.law {
            Law::Scalar(e) => self.has_s(*e),
            Law::Matrix(rows) => rows.iter().flatten().any(|e| self.has_s(*e)),
            Law::States(lines) => lines.iter().any(|l| l.derivative || l.terms.iter().any(|t| t.derivative)),
        });
        self.net.time_base = if continuous { TimeBase::Mixed } else { TimeBase::Sampled };
    }

    fn has_s(&self, root: NodeId) -> bool {
        let (mut open, mut seen) = (vec![root], rustc_hash::FxHashSet::default());
        while let Some(id) = open.pop() {
            if self.net.exprs.get(id) == Node::S {
                return true;
            }
            open.extend(self.net.exprs.children(id).filter(|c| seen.insert(*c)));
        }
        false
    }
}

/// Works out all values, for nominal and for each case: divisions by zero, circles of a case, limits.
pub(super) fn values(net: &Netlist) -> Vec<Diagnostic> {
    let mut told = Vec::new();
    let cases = std::iter::once(None).chain((0..net.cases.len()).map(|i| Some(CaseId(i as u32))));
    for case in cases {
        let name = case.map(|c| net.cases[c.index()].name.as_str());
        let in_case = |d: Diagnostic| match name {
            Some(name) => Diagnostic { message: format!("{} (in case `{name}`)", d.message), ..d },
            None => d,
        };
        let values = match Values::new(net, case, &Keep::Nothing) {
            Ok(values) => values,
            Err(errors) => {
                told.extend(errors.into_iter().map(in_case));
                continue;
            }
        };
        let probe = Probe::new(net, &values);
        let all: Vec<NodeId> = expressions(net).collect();
        let proven = |room: &mut Room, e: &NodeId| (!probe.surely_has_value(*e, room)).then_some(*e);
        let open: Vec<Option<NodeId>> =
            all.par_iter().with_min_len(MIN_PROBES).map_init(Room::default, proven).collect();
        told.extend(open.into_iter().flatten().filter_map(|e| values.evaluate(e).err()).map(|d| in_case(*d)));
    }
    told
}

/// All expressions whose values laws and sums need.
fn expressions(net: &Netlist) -> impl Iterator<Item = NodeId> + '_ {
    let laws = net.blocks.iter().flat_map(|b| {
        let scalar = if let Law::Scalar(e) = b.law { Some(e) } else { None };
        let several: Vec<NodeId> = match &b.law {
            Law::Scalar(_) => Vec::new(),
            Law::Matrix(rows) => rows.iter().flatten().copied().collect(),
            Law::States(lines) => lines.iter().flat_map(|l| l.terms.iter().map(|t| t.coefficient)).collect(),
        };
        scalar.into_iter().chain(several).chain(b.every)
    });
    laws.chain(net.terms.iter().filter_map(|t| t.factor))
}
