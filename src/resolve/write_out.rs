//! Statements to the netlist, scope by scope: first every name of a scope is declared, then its expressions are bound,
//! so that the order of the lines means nothing.

use super::bind::{Bound, Context, Measure, Place};
use super::files::{DefineId, Loaded};
use super::linear::{LinearTerm, Reader, Variable};
use super::scope::{Entity, EnvId, Frame, Indices, ScopeId, Scopes, Sym, Symbols, normal};
use super::units::{Dimension, Unit};
use super::{CommandLine, LimitReached, MAX_WRITTEN_OUT};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId, Exprs};
use crate::netlist::{
    self, Block, BlockId, Driver, Instance, InstanceId, Law, Names, Netlist, Origin, Param, ParamId, Signal, SignalId,
    Sum, SumId, Term, TimeBase,
};
use crate::source::{SourceMap, Span};
use crate::syntax::ast::{self, BlockBody, ExprKind, Name, Piece, SignalKind, Statement, StatementKind, TemplateId};
use rustc_hash::{FxHashMap, FxHashSet};
use std::borrow::Cow;

/// One statement with the indices that it is written out for.
#[derive(Clone, Copy)]
pub(super) struct Item<'a> {
    /// The statement.
    pub statement: &'a Statement,
    /// Its indices.
    pub env: EnvId,
}

/// Who has taken a signal to drive.
#[derive(Clone, Copy, Debug)]
pub(super) struct Claim {
    /// The line that drives it.
    pub span: Span,
    /// The instance whose inside will drive it, while nothing in there has.
    pub by: Option<InstanceId>,
}

/// What is remembered of a signal beside the netlist.
#[derive(Clone, Copy, Debug)]
pub(super) struct SignalNote {
    /// Who drives it.
    pub claim: Option<Claim>,
    /// Where it is first read.
    pub read: Option<Span>,
    /// The instance in which it is first read.
    pub reader: Option<InstanceId>,
    /// Whether a line declares it.
    pub declared: bool,
    /// What is known of its unit.
    pub dimension: Option<Dimension>,
    /// Whether it was declared in a unit that is not coherent SI.
    pub scaled: bool,
}

/// Writes out all statements into one netlist.
pub(super) struct Writer<'a> {
    pub(super) loaded: &'a Loaded,
    pub(super) net: Netlist,
    pub(super) told: Vec<Diagnostic>,
    pub(super) symbols: Symbols,
    pub(super) scopes: Scopes,
    pub(super) indices: Indices,
    pub(super) frames: Vec<Frame>,
    /// Arguments of composites with s in them.
    pub(super) law_arguments: Vec<Bound>,
    /// Params that are arguments of instances, numbers rising.
    pub(super) argument_params: Vec<ParamId>,
    /// Unit of each param, and whether its line is in error.
    pub(super) param_measures: Vec<(Measure, bool)>,
    pub(super) notes: Vec<SignalNote>,
    /// Unit of each term of each sum, with its place; only where any unit is declared.
    pub(super) term_notes: Vec<(Measure, Span)>,
    /// Unit of each law's entries, with their places, block by block; only where any unit is declared.
    pub(super) law_notes: Vec<(BlockId, Vec<(Measure, Span)>)>,
    /// States of the block whose equations are being bound.
    pub(super) states: FxHashSet<SignalId>,
    pub(super) circular_defines: FxHashSet<DefineId>,
    pub(super) nameless: Option<ParamId>,
    pub(super) written: u64,
    pub(super) has_units: bool,
    unit_cache: FxHashMap<(usize, u32), Option<Unit>>,
    display_units: FxHashMap<String, u32>,
    excused: FxHashSet<String>,
}

impl<'a> Writer<'a> {
    /// A writer for these files.
    pub(super) fn new(sources: &SourceMap, loaded: &'a Loaded) -> Self {
        let root = &loaded.files[0];
        let stem =
            sources.files()[0].name.rsplit(['/', '\\']).next().unwrap_or("").trim_end_matches(".loop").to_owned();
        let net = Netlist {
            model: if stem == "-" { "input".to_owned() } else { stem },
            description: None,
            names: Names::default(),
            exprs: Exprs::default(),
            params: Vec::new(),
            signals: Vec::new(),
            sums: Vec::new(),
            terms: Vec::new(),
            blocks: Vec::new(),
            instances: Vec::new(),
            aliases: Vec::new(),
            units: Vec::new(),
            cases: Vec::new(),
            requests: Vec::new(),
            requirements: Vec::new(),
            time_base: TimeBase::Continuous,
            nominal: None,
        };
        // What stands in a statement that could not be read is not told to be missing elsewhere.
        let excused = root.lost_names.iter().map(|s| normal(root.text(*s)).into_owned()).collect();
        Self {
            loaded,
            net,
            told: Vec::new(),
            symbols: Symbols::default(),
            scopes: Scopes::default(),
            indices: Indices::default(),
            frames: Vec::new(),
            law_arguments: Vec::new(),
            argument_params: Vec::new(),
            param_measures: Vec::new(),
            notes: Vec::new(),
            term_notes: Vec::new(),
            law_notes: Vec::new(),
            states: FxHashSet::default(),
            circular_defines: FxHashSet::default(),
            nameless: None,
            written: 0,
            has_units: loaded.files.iter().any(|f| !f.tree.units.is_empty()),
            unit_cache: FxHashMap::default(),
            display_units: FxHashMap::default(),
            excused,
        }
    }

    /// Writes out the root file, its cases, requests and requirements, and judges the whole.
    pub(super) fn write_out(&mut self, line: &CommandLine) -> Result<(), LimitReached> {
        self.circular_defines();
        let root = self.scopes.open(String::new(), None, 0);
        let statements = &self.loaded.files[0].tree.statements;
        let items = self
            .expand(statements, Context { file: 0, scope: root, env: EnvId::EMPTY, frame: None, place: Place::Law })?;
        self.head(&items);
        self.scope(root, 0, &items)?;
        self.cases(&items)?;
        self.asked(&items)?;
        self.command_line(line)?;
        self.judge();
        Ok(())
    }

    /// The netlist and what was told.
    pub(super) fn finish(self) -> (Netlist, Vec<Diagnostic>) {
        (self.net, self.told)
    }

    /// Tells something, with the instance that it was written out for.
    pub(super) fn tell(&mut self, mut diagnostic: Diagnostic, ctx: Context) {
        if let Some(id) = self.scopes.list[ctx.scope.0 as usize].instance {
            let instance = self.net.instances[id.index()];
            let name = self.net.names.get(instance.name);
            diagnostic = diagnostic.label(instance.origin.span, format!("written out for `{name}`"));
        }
        self.told.push(diagnostic);
    }

    /// How much was told so far.
    pub(super) fn told_count(&self) -> usize {
        self.told.len()
    }

    /// Tells that a named limit was reached, which ends the reading.
    pub(super) fn limit<T>(&mut self, diagnostic: Diagnostic) -> Result<T, LimitReached> {
        self.told.push(diagnostic);
        Err(LimitReached)
    }

    /// Counts what is written out against [`MAX_WRITTEN_OUT`].
    pub(super) fn count(&mut self, how_many: u64, span: Span) -> Result<(), LimitReached> {
        self.written = self.written.saturating_add(how_many);
        if self.written <= MAX_WRITTEN_OUT {
            return Ok(());
        }
        let message = format!("more than {MAX_WRITTEN_OUT} statements, calls and terms would be written out");
        self.limit(
            Diagnostic::new(Code::LimitReached, message)
                .label(span, "the limit is passed here")
                .help("make the range shorter, or split the model into several files"),
        )
    }

    /// Whether a name stands in a statement that could not be read, so that nothing more is told of it.
    pub(super) fn is_excused(&self, name: &str) -> bool {
        !self.excused.is_empty() && self.excused.contains(normal(name).as_ref())
    }

    /// A name as it is for these indices; `None` where an index was told to be in error.
    pub(super) fn name_text(&mut self, file: usize, name: Name, env: EnvId) -> Option<Cow<'a, str>> {
        let loaded = self.loaded;
        let own = &loaded.files[file];
        if name.template == TemplateId::NONE {
            return Some(normal(own.text(name.span)));
        }
        let mut text = String::new();
        let scope = ScopeId(0);
        for piece in &own.tree.templates[name.template.0 as usize] {
            match *piece {
                Piece::Text(span) => text.push_str(&normal(own.text(span))),
                Piece::Index(expr) => {
                    let ctx = Context { file, scope, env, frame: None, place: Place::Parameters };
                    let at = own.tree.expr(expr).span;
                    match self.whole(expr, ctx) {
                        Ok(Some(k)) if k >= 0 => text.push_str(&k.to_string()),
                        Ok(Some(k)) => {
                            let d =
                                Diagnostic::new(Code::Syntax, format!("an index can't be negative, this one is {k}"));
                            self.tell(d.label(at, "negative for some index").help("begin the range later"), ctx);
                            return None;
                        }
                        _ => {
                            let d = Diagnostic::new(Code::Syntax, "an index must be a whole number");
                            let d = d.label(at, "not a whole number, or an index that is not there");
                            self.tell(d.help("use whole numbers and the indices of the `repeat` around it"), ctx);
                            return None;
                        }
                    }
                }
            }
        }
        Some(Cow::Owned(text))
    }

    /// A unit of a file, each read once; `None` where it was told to be in error.
    pub(super) fn unit(&mut self, file: usize, place: u32, ctx: Context) -> Option<Unit> {
        if let Some(known) = self.unit_cache.get(&(file, place)) {
            return known.clone();
        }
        let own = &self.loaded.files[file];
        let span = own.tree.units[place as usize];
        let result = super::unit_text::read(own, span);
        let unit = match result {
            Ok(unit) => Some(unit),
            Err(d) => {
                self.tell(d, ctx);
                None
            }
        };
        self.unit_cache.insert((file, place), unit.clone());
        unit
    }

    /// A value times a scale, as an expression.
    pub(super) fn scaled(&mut self, value: NodeId, scale: &super::units::Scale, span: Span) -> NodeId {
        if *scale == super::units::Scale::one() {
            return value;
        }
        let factor = self.scale_value(scale, span);
        self.net.exprs.push(Node::Mul(value, factor), span)
    }

    fn scale_value(&mut self, scale: &super::units::Scale, span: Span) -> NodeId {
        let ratio = self.net.exprs.push_number(scale.ratio.clone(), span);
        if scale.pi == 0 {
            return ratio;
        }
        let pi = self.net.exprs.push(Node::Pi, span);
        let power = self.net.exprs.push(Node::Pow(pi, scale.pi), span);
        self.net.exprs.push(Node::Mul(ratio, power), span)
    }

    /// A unit's place in the netlist's list for display.
    pub(super) fn display_unit(&mut self, file: usize, place: u32, unit: &Unit) -> u32 {
        let span = self.loaded.files[file].tree.units[place as usize];
        let text: String = self.loaded.files[file].text(span).split_whitespace().collect();
        if let Some(&known) = self.display_units.get(&text) {
            return known;
        }
        let scale = self.scale_value(&unit.scale, span);
        let id = self.net.units.len() as u32;
        self.net.units.push(netlist::DisplayUnit { text: text.clone(), scale });
        self.display_units.insert(text, id);
        id
    }

    /// All statements of a body, `repeat` written out, in the order of the text.
    fn expand(&mut self, statements: &'a [Statement], ctx: Context) -> Result<Vec<Item<'a>>, LimitReached> {
        let mut items = Vec::with_capacity(statements.len());
        self.expand_into(statements, ctx, &mut items)?;
        Ok(items)
    }

    fn expand_into(
        &mut self,
        statements: &'a [Statement],
        ctx: Context,
        items: &mut Vec<Item<'a>>,
    ) -> Result<(), LimitReached> {
        for statement in statements {
            let StatementKind::Repeat(repeat) = &statement.kind else {
                items.push(Item { statement, env: ctx.env });
                continue;
            };
            let Some((from, to)) = self.range(repeat.from, repeat.to, ctx)? else { continue };
            let times = u64::try_from(i128::from(to) - i128::from(from) + 1).unwrap_or(0);
            self.count(times.saturating_mul(repeat.body.len().max(1) as u64), statement.span)?;
            let name = self.symbols.intern(self.loaded.files[ctx.file].text(repeat.index));
            for k in from..=to {
                let env = self.indices.with(ctx.env, name, k);
                self.expand_into(&repeat.body, Context { env, ..ctx }, items)?;
            }
        }
        Ok(())
    }

    /// The model's own name and description.
    fn head(&mut self, items: &[Item<'a>]) {
        let file = &self.loaded.files[0];
        let mut first: Option<Span> = None;
        for item in items {
            let StatementKind::Model { name, description } = item.statement.kind else { continue };
            if let Some(first) = first {
                let d = Diagnostic::new(Code::DuplicateName, "a file has one model").label(name, "named again here");
                self.told.push(d.label(first, "first named here").help("leave one of the lines out"));
                continue;
            }
            first = Some(name);
            normal(file.text(name)).as_ref().clone_into(&mut self.net.model);
            self.net.description = description.map(|d| file.text(d).to_owned());
        }
    }

    /// Declares and binds all statements of one scope.
    fn scope(&mut self, scope: ScopeId, file: usize, items: &[Item<'a>]) -> Result<(), LimitReached> {
        let ctx = Context { file, scope, env: EnvId::EMPTY, frame: None, place: Place::Law };
        let mut params = Vec::new();
        for item in items {
            self.declare_signals_and_params(*item, ctx, &mut params);
        }
        let mut work = Vec::new();
        for item in items {
            self.declare_drivers(*item, ctx, &mut work)?;
        }
        self.bind_params(&params, ctx)?;
        for (item, target) in work {
            let ctx = Context { env: item.env, ..ctx };
            match (&item.statement.kind, target) {
                (StatementKind::Sum { value, .. }, Target::Sum(id)) => self.bind_sum(id, *value, ctx)?,
                (StatementKind::Block(block), Target::Block(id)) => self.bind_block(id, block, ctx)?,
                (StatementKind::Block(block), Target::Instance(inside, define)) => {
                    self.instance((inside, define), block, item.statement.span, ctx)?;
                }
                _ => {}
            }
        }
        Ok(())
    }

    /// The full name of something in a scope.
    fn full_name(&mut self, scope: ScopeId, name: &str) -> netlist::NameId {
        let prefix = &self.scopes.list[scope.0 as usize].prefix;
        if prefix.is_empty() { self.net.names.push(name) } else { self.net.names.push(&format!("{prefix}{name}")) }
    }

    fn origin(&self, scope: ScopeId, span: Span) -> Origin {
        Origin { span, instance: self.scopes.list[scope.0 as usize].instance }
    }

    /// A new signal.
    pub(super) fn new_signal(&mut self, scope: ScopeId, sym: Sym, span: Span) -> SignalId {
        let text = self.symbols.name(sym).to_owned();
        let name = self.full_name(scope, &text);
        let origin = self.origin(scope, span);
        let id = SignalId(self.net.signals.len() as u32);
        self.net.signals.push(Signal { name, driver: Driver::Nothing, output: false, origin, unit: None });
        let note =
            SignalNote { claim: None, read: None, reader: None, declared: false, dimension: None, scaled: false };
        self.notes.push(note);
        self.scopes.put(scope, sym, Entity::Signal(id), span);
        id
    }

    /// Tells that a name is given twice.
    fn given_twice(&mut self, sym: Sym, span: Span, ctx: Context) {
        let name = self.symbols.name(sym).to_owned();
        let first = self.scopes.list[ctx.scope.0 as usize].names.iter().find(|(n, _)| *n == sym).map(|n| n.1);
        let d = Diagnostic::new(Code::DuplicateName, format!("the name `{name}` is given twice"));
        let mut d = d.label(span, "given again here");
        if let Some(first) = first {
            d = d.label(first, "first given here");
        }
        let help = "one name means one thing: signals, blocks and params share one name space; rename one of them";
        self.tell(d.help(help), ctx);
    }

    fn declare_signals_and_params(
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
    fn new_param(&mut self, scope: ScopeId, sym: Sym, span: Span) -> ParamId {
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
    fn signal(&mut self, name: Name, ctx: Context, env: EnvId) -> Option<SignalId> {
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
    fn drive(&mut self, id: SignalId, driver: Driver, claim: Claim, ctx: Context) {
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

    fn declare_drivers(
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

    fn declare_block(
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
    fn composite_of(&self, block: &ast::Block, ctx: Context) -> Option<DefineId> {
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

    fn bind_sum(&mut self, id: SumId, value: ast::ExprId, ctx: Context) -> Result<(), LimitReached> {
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

    fn bind_block(&mut self, id: BlockId, block: &'a ast::Block, ctx: Context) -> Result<(), LimitReached> {
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

    fn note_law(&mut self, id: BlockId, notes: Vec<(Measure, Span)>) {
        if self.has_units {
            self.law_notes.push((id, notes));
        }
    }

    fn bind_matrix(
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
    fn shape(&mut self, columns: usize, rows: usize, block: &ast::Block, span: Span, ctx: Context) -> bool {
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
    fn entry(&mut self, bound: Bound, id: BlockId, span: Span, ctx: Context) -> NodeId {
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
    fn strictly_proper(&mut self, span: Span, sampled: bool) -> NodeId {
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

    /// Binds an instance's arguments and ports, and writes out its inside.
    fn instance(
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
    fn argument_entities(&mut self, arguments: &[(Sym, Bound)], define: &ast::Define, id: DefineId, inside: ScopeId) {
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
    fn argument_unit(&mut self, bound: &Bound, param: &ast::DefineParam, id: DefineId) -> Option<u32> {
        if bound.unit.is_some() {
            return bound.unit;
        }
        let place = param.unit?;
        let ctx = Context { file: id.file, scope: ScopeId(0), env: EnvId::EMPTY, frame: None, place: Place::Law };
        let unit = self.unit(id.file, place, ctx)?;
        Some(self.display_unit(id.file, place, &unit))
    }

    /// Makes a port another name of the outer signal.
    fn port(&mut self, outer: Name, port: &ast::Port, (file, inside): (usize, ScopeId), reads: bool, ctx: Context) {
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

/// What a statement that drives something became.
#[derive(Clone, Copy)]
enum Target {
    Sum(SumId),
    Block(BlockId),
    Instance(ScopeId, DefineId),
}

/// The unit of a law's entry; one of s and 1 alone has a coefficient 1 that takes the unit its place needs.
fn law_measure(entry: Bound) -> Measure {
    if entry.pure { Measure::FREE } else { entry.measure }
}
