//! The reader: pieces of a text, each through the grammar, into one tree.
//!
//! What the grammar gives is a row of events, the beginnings and ends of its rules; the functions here walk along that
//! row and may rely on its order, since no other order gets through the grammar.

use super::ast::{Equation, Expr, ExprId, ExprKind, Name, Piece, Setting, Statement, StatementKind, TemplateId, Tree};
use super::explain;
use super::expression::{Operator, Value};
use super::grammar::{self, Event, Events, Extent, Rule};
use super::split::{Item, ItemKind};
use super::words::{Word, is_reserved};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;
use rustc_hash::FxHashSet;
use std::borrow::Cow;

/// How many items the grammar reads at once: enough that setting it up costs little, few enough that reading them again
/// singly after a mistake costs little too.
const ITEMS_A_RUN: usize = 32;

/// What is wrong has been told; the statement is lost.
#[derive(Debug)]
pub(super) struct Told;

/// What a part of a statement gives.
pub(super) type Outcome<T> = Result<T, Told>;

/// A statement with a body that is still open.
struct Frame {
    /// `None` where it is lost: then what stands in it is read for its mistakes only.
    head: Option<Statement>,
    /// Position of its first byte.
    start: u32,
    statements: Vec<Statement>,
    equations: Vec<Equation>,
    settings: Vec<Setting>,
}

/// Reads a row of items.
pub(super) struct Reader<'t> {
    pub(super) text: &'t str,
    pub(super) base: u32,
    pub(super) tree: Tree,
    pub(super) diagnostics: Vec<Diagnostic>,
    /// Names in statements that are lost.
    pub(super) lost_names: Vec<Span>,
    frames: Vec<Frame>,
    events: Events,
    next: usize,
    /// What to add to an event's position to have its place in the address space.
    offset: u32,
    /// Whether names may be paths here.
    pub(super) paths: bool,
    /// Whether `x'` may stand here.
    pub(super) derivatives: bool,
    pub(super) values: Vec<Value>,
    pub(super) operators: Vec<Operator>,
    names: Vec<Name>,
    known_units: FxHashSet<&'t str>,
}

/// What marks the end of the events; the grammar never gives it there.
const NO_EVENT: Event = Event { rule: Rule::EOI, begins: false, at: 0 };

impl<'t> Reader<'t> {
    /// A reader for pieces of `text`, which begins at `base`.
    pub(super) fn new(text: &'t str, base: u32) -> Self {
        Self {
            text,
            base,
            tree: Tree::default(),
            diagnostics: Vec::new(),
            lost_names: Vec::new(),
            frames: Vec::new(),
            events: Events::default(),
            next: 0,
            offset: base,
            paths: false,
            derivatives: false,
            values: Vec::new(),
            operators: Vec::new(),
            names: Vec::new(),
            known_units: FxHashSet::default(),
        }
    }

    /// Reads all of `items`, in which every head has its close. `comments` are those of the whole text.
    pub(super) fn read(&mut self, items: &[Item], comments: &[Span]) {
        let mut rest = items;
        while !rest.is_empty() {
            let length = rest.iter().take(ITEMS_A_RUN).take_while(|item| item.sound).count();
            let (run, after) = rest.split_at(length.max(1));
            if length == 0 || !self.run(run, comments) {
                for item in run {
                    self.single(item, comments);
                }
            }
            rest = after;
        }
    }

    /// Reads a run of sound items at once; `false`, with nothing read, where that fails.
    fn run(&mut self, run: &[Item], comments: &[Span]) -> bool {
        let (Some(first), Some(last)) = (run.first(), run.last()) else { return true };
        let text = self.without_comments(first.start, last.end, comments);
        if grammar::read(Rule::part, &text, &mut self.events).is_err() || !fits(&self.events.lines, run) {
            return false;
        }
        self.offset = self.base + first.start;
        for (i, item) in run.iter().enumerate() {
            self.next = self.events.lines[i].first as usize + 1;
            self.item(item);
        }
        true
    }

    /// Reads an item by itself, and tells what is wrong where that fails.
    fn single(&mut self, item: &Item, comments: &[Span]) {
        let rule = match item.kind {
            ItemKind::Lost => return self.lose(item.start, item.end),
            ItemKind::LostHead => return self.open_frame(None, item),
            ItemKind::Close => return self.close_frame(item),
            ItemKind::Equation | ItemKind::Setting => Rule::one_assignment,
            ItemKind::Line(_) | ItemKind::Head(_) => Rule::one,
        };
        let text = self.without_comments(item.start, item.end, comments);
        self.offset = self.base + item.start;
        self.next = 1;
        let (text, shift) = corrected(item, text);
        self.offset = self.offset.wrapping_add_signed(shift);
        let Err(failure) = grammar::read(rule, &text, &mut self.events) else { return self.item(item) };
        self.diagnostics.push(explain::failure(&text, self.offset, &failure));
        self.lose(item.start, item.end);
        if let ItemKind::Head(_) = item.kind {
            self.open_frame(None, item);
        }
    }

    /// A stretch of the text, its comments overwritten with blanks.
    fn without_comments(&self, start: u32, end: u32, comments: &[Span]) -> Cow<'t, str> {
        let text = self.text.get(start as usize..end as usize).unwrap_or("");
        let first = comments.partition_point(|comment| comment.start - self.base < start);
        let inside = comments[first..].iter().take_while(|comment| comment.start - self.base < end);
        if inside.clone().next().is_none() {
            return Cow::Borrowed(text);
        }
        let mut copy = String::with_capacity(text.len());
        for comment in inside {
            let (from, to) = (comment.start - self.base - start, comment.end - self.base - start);
            copy.push_str(text.get(copy.len()..from as usize).unwrap_or(""));
            copy.extend(std::iter::repeat_n(' ', (to - from) as usize));
        }
        copy.push_str(text.get(copy.len()..).unwrap_or(""));
        Cow::Owned(copy)
    }

    /// Takes an item whose events come next.
    fn item(&mut self, item: &Item) {
        match item.kind {
            ItemKind::Line(word) => {
                if let Some(statement) = self.statement(word, item) {
                    self.keep(statement);
                }
            }
            ItemKind::Head(word) => {
                let head = self.statement(word, item);
                self.open_frame(head, item);
            }
            ItemKind::Equation => {
                let equation = self.part(item, |reader| reader.equation(item));
                if let (Some(equation), Some(frame)) = (equation, self.frames.last_mut()) {
                    frame.equations.push(equation);
                }
            }
            ItemKind::Setting => {
                let setting = self.part(item, Self::setting);
                if let (Some(setting), Some(frame)) = (setting, self.frames.last_mut()) {
                    frame.settings.push(setting);
                }
            }
            ItemKind::Close => self.close_frame(item),
            ItemKind::Lost | ItemKind::LostHead => {}
        }
    }

    fn keep(&mut self, statement: Statement) {
        match self.frames.last_mut() {
            Some(frame) => frame.statements.push(statement),
            None => self.tree.statements.push(statement),
        }
    }

    fn open_frame(&mut self, head: Option<Statement>, item: &Item) {
        let (statements, equations, settings) = (Vec::new(), Vec::new(), Vec::new());
        self.frames.push(Frame { head, start: item.start, statements, equations, settings });
    }

    fn close_frame(&mut self, item: &Item) {
        let Some(frame) = self.frames.pop() else { return };
        let Some(mut head) = frame.head else {
            if self.frames.iter().all(|outer| outer.head.is_some()) {
                self.lose(frame.start, item.end);
            }
            return;
        };
        head.span.end = item.end + self.base;
        super::statement::fill(&mut head, frame.statements, frame.equations, frame.settings);
        self.keep(head);
    }

    /// Notes the names in a stretch of text that is lost.
    fn lose(&mut self, start: u32, end: u32) {
        let stretch = self.text.get(start as usize..end as usize).unwrap_or("");
        let mut at = 0;
        while at < stretch.len() {
            let length = explain::token_length(&stretch[at..]).max(1);
            let word = stretch.get(at..at + length).unwrap_or("");
            let is_name = word.starts_with(|c: char| c == '_' || unicode_ident::is_xid_start(c));
            if is_name && !is_reserved(word) {
                let from = start + at as u32 + self.base;
                self.lost_names.push(Span::new(from, from + length as u32));
            }
            at += length;
        }
    }

    /// Takes a statement; `None`, told, where it can't be kept.
    fn statement(&mut self, word: Word, item: &Item) -> Option<Statement> {
        if let Some(diagnostic) = self.misplaced(word, item) {
            self.diagnostics.push(diagnostic);
            self.lose(item.start, item.end);
            return None;
        }
        let kind = self.part(item, |reader| reader.statement_kind(word))?;
        let span = Span::new(item.start + self.base, item.end + self.base);
        Some(Statement { span, kind })
    }

    /// Walks along the events of an item; `None`, told, with nothing left in the tree, where something is wrong.
    fn part<T>(&mut self, item: &Item, walk: impl FnOnce(&mut Self) -> Outcome<T>) -> Option<T> {
        let marks = (self.tree.exprs.len(), self.tree.templates.len(), self.tree.calls.len());
        let more = (self.tree.repeated.len(), self.tree.units.len());
        self.paths = false;
        self.derivatives = false;
        if let Ok(part) = walk(self) {
            return Some(part);
        }
        self.tree.exprs.truncate(marks.0);
        self.tree.templates.truncate(marks.1);
        self.tree.calls.truncate(marks.2);
        self.tree.repeated.truncate(more.0);
        self.tree.units.truncate(more.1);
        self.values.clear();
        self.operators.clear();
        self.names.clear();
        self.lose(item.start, item.end);
        None
    }

    fn equation(&mut self, item: &Item) -> Outcome<Equation> {
        self.derivatives = true;
        let (left, derivative) = self.any_name()?;
        self.check_name(left, false)?;
        self.accept(Rule::equals);
        let right = self.expression()?.id;
        let span = Span::new(item.start + self.base, item.end + self.base);
        Ok(Equation { left, derivative, right, span })
    }

    fn setting(&mut self) -> Outcome<Setting> {
        self.paths = true;
        let name = self.name()?;
        self.accept(Rule::equals);
        let value = self.expression()?.id;
        Ok(Setting { name, value })
    }

    // ---- the row of events ----

    /// The next event.
    pub(super) fn event(&self) -> Event {
        self.events.row.get(self.next).copied().unwrap_or(NO_EVENT)
    }

    /// Takes the next event.
    pub(super) fn take(&mut self) -> Event {
        let event = self.event();
        self.next += 1;
        event
    }

    /// Goes back to before the event that was taken last.
    pub(super) fn step_back(&mut self) {
        self.next -= 1;
    }

    /// The place of the event that was taken last.
    pub(super) fn last_end(&self) -> u32 {
        let event = self.events.row.get(self.next - 1).copied().unwrap_or(NO_EVENT);
        event.at.wrapping_add(self.offset)
    }

    /// Whether `rule` begins next.
    pub(super) fn begins(&self, rule: Rule) -> bool {
        let event = self.event();
        event.begins && event.rule == rule
    }

    /// Takes the beginning and the end of a rule that has no rules in it.
    pub(super) fn leaf(&mut self) -> Span {
        let (from, to) = (self.take(), self.take());
        self.span(from.at, to.at)
    }

    /// [`Self::leaf`] where that rule begins next.
    pub(super) fn accept(&mut self, rule: Rule) -> Option<Span> {
        if self.begins(rule) { Some(self.leaf()) } else { None }
    }

    /// Takes the beginning of `rule` where it is next.
    pub(super) fn enter(&mut self, rule: Rule) -> bool {
        let begins = self.begins(rule);
        self.next += usize::from(begins);
        begins
    }

    /// The place in the address space of a stretch of the statement.
    pub(super) fn span(&self, from: u32, to: u32) -> Span {
        Span::new(from.wrapping_add(self.offset), to.wrapping_add(self.offset))
    }

    /// The text at a span.
    pub(super) fn slice(&self, span: Span) -> &'t str {
        self.text.get((span.start - self.base) as usize..(span.end - self.base) as usize).unwrap_or("")
    }

    /// Tells a mistake; the statement is lost.
    pub(super) fn fail<T>(&mut self, diagnostic: Diagnostic) -> Outcome<T> {
        self.diagnostics.push(diagnostic);
        Err(Told)
    }

    // ---- parts that many statements have ----

    pub(super) fn expr(&self, id: ExprId) -> Expr {
        self.tree.expr(id)
    }

    /// The text that begins next, if one does, without its quotation marks.
    pub(super) fn description(&mut self) -> Option<Span> {
        self.accept(Rule::text)
    }

    /// The name that begins next, and whether it is a derivative `x'`, its prime left out.
    pub(super) fn any_name(&mut self) -> Outcome<(Name, bool)> {
        let begin = self.take();
        let mut name = if self.begins(Rule::index) {
            self.template(begin.at)?
        } else {
            Name { span: self.span(begin.at, self.event().at), template: TemplateId::NONE }
        };
        self.take();
        let prime = self.slice(name.span).ends_with('\'');
        if prime {
            if !self.derivatives {
                return self.fail(no_derivative(name.span));
            }
            name.span.end -= 1;
        }
        Ok((name, prime))
    }

    /// A name that is looked up, or one that is declared.
    pub(super) fn name(&mut self) -> Outcome<Name> {
        let (name, prime) = self.any_name()?;
        if prime {
            return self.fail(no_derivative(name.span));
        }
        self.check_name(name, false)?;
        Ok(name)
    }

    /// A declared name, which is no path.
    pub(super) fn declared(&mut self) -> Outcome<Name> {
        let paths = std::mem::replace(&mut self.paths, false);
        let name = self.name();
        self.paths = paths;
        name
    }

    /// Tells a path or a reserved name where none may stand; with `in_law`, `s`, `z` and `pi` may.
    pub(super) fn check_name(&mut self, name: Name, in_law: bool) -> Outcome<()> {
        let text = self.slice(name.span);
        if !self.paths && text.contains('.') {
            return self.fail(no_path(name.span, text));
        }
        if is_reserved(text) && !(in_law && matches!(text, "s" | "z" | "pi")) {
            return self.fail(reserved(name.span, text));
        }
        Ok(())
    }

    /// The pieces of a name with indices, up to the end of the name.
    fn template(&mut self, start: u32) -> Outcome<Name> {
        let mut pieces = Vec::new();
        let mut from = start;
        while self.begins(Rule::index) {
            // The index begins after its `{` and ends before its `}`.
            let brace = self.take().at - 1;
            if from < brace {
                pieces.push(Piece::Text(self.span(from, brace)));
            }
            pieces.push(Piece::Index(self.expression()?.id));
            self.take();
            let end = self.last_end();
            let blanks = self.text.get((end - self.base) as usize..).map_or(0, |t| t.find('}').unwrap_or(0));
            from = (end - self.offset) + blanks as u32 + 1;
        }
        let end = self.event().at;
        // A prime is no part of the name.
        let prime = u32::from(self.slice(self.span(from, end)).ends_with('\''));
        if from + prime < end {
            pieces.push(Piece::Text(self.span(from, end - prime)));
        }
        let template = TemplateId(self.tree.templates.len() as u32);
        self.tree.templates.push(pieces.into());
        Ok(Name { span: self.span(start, end), template })
    }

    /// A declared name without indices.
    pub(super) fn identifier(&mut self) -> Outcome<Span> {
        let span = self.leaf();
        if is_reserved(self.slice(span)) {
            return self.fail(reserved(span, self.slice(span)));
        }
        Ok(span)
    }

    /// The names, separated by commas, that begin next.
    pub(super) fn names(&mut self) -> Outcome<Box<[Name]>> {
        let first = self.names.len();
        while self.begins(Rule::name) {
            let name = self.name()?;
            self.names.push(name);
            self.accept(Rule::comma);
        }
        let names = self.names[first..].into();
        self.names.truncate(first);
        Ok(names)
    }

    /// The unit in brackets that begins next, if one does: its place in [`Tree::units`].
    pub(super) fn unit(&mut self) -> Outcome<Option<u32>> {
        let Some(inside) = self.accept(Rule::unit) else { return Ok(None) };
        let text = self.slice(inside);
        if !self.known_units.contains(text) {
            if let Err(failure) = super::unit::read_unit(text) {
                return self.fail(explain::unit_failure(text, inside, &failure));
            }
            self.known_units.insert(text);
        }
        self.tree.units.push(inside);
        Ok(Some(self.tree.units.len() as u32 - 1))
    }

    /// Puts a node into the arena.
    pub(super) fn push_expr(&mut self, kind: ExprKind, span: Span) -> ExprId {
        self.tree.exprs.push(Expr { kind, span });
        ExprId(self.tree.exprs.len() as u32 - 1)
    }

    /// What is wrong with the place of a statement, if anything is.
    fn misplaced(&self, word: Word, item: &Item) -> Option<Diagnostic> {
        if self.frames.is_empty() {
            return None;
        }
        let heads = || self.frames.iter().filter_map(|frame| frame.head.as_ref());
        let in_define = heads().any(|head| matches!(head.kind, StatementKind::Define(_)));
        let inner = matches!(word, Word::Param | Word::Signal | Word::Sum | Word::Block | Word::Repeat);
        let repeated = matches!(word, Word::Input | Word::Output | Word::Find | Word::Require);
        if inner || (repeated && !in_define) {
            return None;
        }
        let word = word.text();
        let (place, help) = if in_define {
            (
                "define",
                "a composite holds `param`, `signal`, `sum`, `block` and `repeat`; its ports are its inputs and outputs",
            )
        } else {
            (
                "repeat",
                "a `repeat` holds `param`, `input`, `output`, `signal`, `sum`, `block`, `repeat`, `find` and `require`",
            )
        };
        let span = Span::new(item.start + self.base, item.start + word.len() as u32 + self.base);
        let message = format!("`{word}` can't stand in the body of a `{place}`");
        Some(Diagnostic::new(Code::Syntax, message).label(span, "not here").help(help))
    }
}

/// Whether the lines that were read are the items of a run, each within its own bounds.
fn fits(lines: &[Extent], run: &[Item]) -> bool {
    let Some(first) = run.first() else { return lines.is_empty() };
    let after = run.iter().skip(1).map(|item| item.start).chain(std::iter::once(u32::MAX));
    lines.len() == run.len()
        && lines.iter().zip(run).zip(after).all(|((line, item), next)| {
            let (start, end) = (line.start + first.start, line.end + first.start);
            let rule = match item.kind {
                ItemKind::Line(word) | ItemKind::Head(word) => word.rule(),
                ItemKind::Close => Rule::body_end,
                _ => Rule::assignment,
            };
            line.rule == rule && item.start <= start && start <= item.end && item.end <= end && end <= next
        })
}

/// The text of an item, a misspelt first word replaced by the word that was meant, and by how much what follows has to be
/// moved to be in its place again.
fn corrected<'t>(item: &Item, text: Cow<'t, str>) -> (Cow<'t, str>, i32) {
    let (ItemKind::Line(word) | ItemKind::Head(word)) = item.kind else { return (text, 0) };
    let word = word.text();
    let written = explain::token_length(&text);
    if text.get(..written) == Some(word) {
        return (text, 0);
    }
    let corrected = format!("{word}{}", text.get(written..).unwrap_or(""));
    (Cow::Owned(corrected), written as i32 - word.len() as i32)
}

/// The diagnostic for a reserved word in a name's place.
pub(super) fn reserved(span: Span, name: &str) -> Diagnostic {
    let why = match name {
        "s" => "`s` is the variable of the Laplace transform",
        "z" => "`z` is the variable of the z-transform",
        "pi" => "`pi` is the number",
        _ => "the word begins statements",
    };
    Diagnostic::new(Code::Syntax, format!("`{name}` is reserved and can't be a name here"))
        .label(span, why)
        .help(format!("choose another name, such as `{name}_1`"))
}

fn no_derivative(span: Span) -> Diagnostic {
    Diagnostic::new(Code::Syntax, "a derivative can't stand here")
        .label(span, "`'` is for state equations")
        .help("in a law, the derivative of a signal is `s` times it")
}

fn no_path(span: Span, path: &str) -> Diagnostic {
    Diagnostic::new(Code::Syntax, format!("the path `{path}` can't stand here"))
        .label(span, "a name without a point is expected")
        .help("paths into an instance are for requests, requirements, `case` and `keep`; wiring goes through ports")
}
