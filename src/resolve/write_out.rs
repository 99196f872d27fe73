//! Statements to the netlist, scope by scope: first every name of a scope is declared, then its expressions are bound,
//! so that the order of the lines means nothing.

use super::bind::{Bound, Context, Measure, Place};
use super::files::{DefineId, Loaded};
use super::scope::{Entity, EnvId, Frame, Indices, ScopeId, Scopes, Sym, Symbols, normal};
use super::units::{Dimension, Unit};
use super::{CommandLine, LimitReached, MAX_WRITTEN_OUT};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::{Expr as Node, ExprId as NodeId, Exprs};
use crate::netlist::{
    self, BlockId, Driver, InstanceId, Names, Netlist, Origin, ParamId, Signal, SignalId, SumId, TimeBase,
};
use crate::source::{SourceMap, Span};
use crate::syntax::ast::{Name, Piece, Statement, StatementKind, TemplateId};
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

    pub(super) fn scale_value(&mut self, scale: &super::units::Scale, span: Span) -> NodeId {
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
    pub(super) fn expand(&mut self, statements: &'a [Statement], ctx: Context) -> Result<Vec<Item<'a>>, LimitReached> {
        let mut items = Vec::with_capacity(statements.len());
        self.expand_into(statements, ctx, &mut items)?;
        Ok(items)
    }

    pub(super) fn expand_into(
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
    pub(super) fn head(&mut self, items: &[Item<'a>]) {
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
    pub(super) fn scope(&mut self, scope: ScopeId, file: usize, items: &[Item<'a>]) -> Result<(), LimitReached> {
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
    pub(super) fn full_name(&mut self, scope: ScopeId, name: &str) -> netlist::NameId {
        let prefix = &self.scopes.list[scope.0 as usize].prefix;
        if prefix.is_empty() { self.net.names.push(name) } else { self.net.names.push(&format!("{prefix}{name}")) }
    }

    pub(super) fn origin(&self, scope: ScopeId, span: Span) -> Origin {
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
    pub(super) fn given_twice(&mut self, sym: Sym, span: Span, ctx: Context) {
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
}

/// What a statement that drives something became.
#[derive(Clone, Copy)]
pub(super) enum Target {
    Sum(SumId),
    Block(BlockId),
    Instance(ScopeId, DefineId),
}
