//! The commands that read a model: each joins the rooms, writes its document and says how it went.

use super::arguments::{self, AssessFormat, Format, Fraction, Values};
use super::files::{self, Destination, FileSystem};
use super::terminal::Looks;
use super::{Failure, IN_ERROR, LIMIT_REACHED, REQUIREMENT_FAILS, tell};
use crate::analysis;
use crate::diagnostics::{self, Code, Diagnostic, Severity};
use crate::flow::{self, DeriveOptions, Method};
use crate::netlist::{Netlist, RequestKind};
use crate::report::{self, TextOptions};
use crate::resolve::{self, CommandLine};
use crate::results::{Derive, ToldDiagnostic};
use crate::source::{SourceMap, Span};
use std::collections::HashSet;
use std::path::Path;

/// A model as far as it could be read.
struct Model {
    sources: SourceMap,
    /// None where the file could not be read, or a named limit ended the reading.
    netlist: Option<Netlist>,
    diagnostics: Vec<Diagnostic>,
}

impl Model {
    /// Reads and resolves one file.
    fn read(path: &str, line: &CommandLine) -> Self {
        let mut sources = SourceMap::new();
        let input = match files::read(path, &mut sources) {
            Ok(input) => input,
            Err(diagnostic) => return Self { sources, netlist: None, diagnostics: vec![diagnostic] },
        };
        let resolved = resolve::resolve(&mut sources, input.id, &FileSystem, line);
        let mut diagnostics = resolved.diagnostics;
        if !input.unreadable.is_empty() {
            // What is no UTF-8 is no syntax either: each line is told once.
            let line_of = |d: &Diagnostic| {
                d.labels.first().and_then(|l| sources.place(l.span)).map(|p| (p.file.to_owned(), p.line))
            };
            let bad: Vec<_> = input.unreadable.iter().map(line_of).collect();
            diagnostics.retain(|d| d.code != Code::Syntax || !bad.contains(&line_of(d)));
            diagnostics.extend(input.unreadable);
            sort(&mut diagnostics);
        }
        Self { sources, netlist: resolved.netlist, diagnostics }
    }

    /// The netlist, where it is fit to be worked with.
    fn sound(&self) -> Option<&Netlist> {
        self.netlist.as_ref().filter(|_| !self.diagnostics.iter().any(Diagnostic::is_error))
    }

    /// More to tell of it, each thing once.
    fn add(&mut self, diagnostics: Vec<Diagnostic>) {
        self.diagnostics.extend(diagnostics);
        sort(&mut self.diagnostics);
    }

    /// Its name: the model's own, or else the file's stem.
    fn name(&self, path: &str) -> String {
        let stem = || Path::new(path).file_stem().map_or_else(|| path.to_owned(), |s| s.to_string_lossy().into_owned());
        self.netlist.as_ref().map_or_else(stem, |n| n.model.clone())
    }

    fn told(&self) -> Vec<ToldDiagnostic> {
        report::told(&self.diagnostics, &self.sources)
    }

    /// The exit status so far: a limit wins over an error.
    fn status(&self, before: u8) -> u8 {
        let limit = self.diagnostics.iter().any(|d| d.code == Code::LimitReached && d.is_error());
        let error = self.diagnostics.iter().any(Diagnostic::is_error);
        before.max(if limit {
            LIMIT_REACHED
        } else if error {
            IN_ERROR
        } else {
            0
        })
    }

    /// Draws all diagnostics on standard error, with a line that counts them.
    fn tell(&self, looks: Looks) {
        if !self.diagnostics.is_empty() {
            let drawn = diagnostics::render(&self.diagnostics, &self.sources, looks.errors);
            tell(&format!("{drawn}{}\n", diagnostics::summary(&self.diagnostics)));
        }
    }
}

/// In the order of the text, each thing once; what stands in none comes last.
fn sort(diagnostics: &mut Vec<Diagnostic>) {
    let place = |d: &Diagnostic| d.labels.first().map_or(Span::NONE, |l| l.span);
    diagnostics.sort_by(|a, b| (place(a), a.code, &a.message).cmp(&(place(b), b.code, &b.message)));
    diagnostics.dedup();
}

fn command_line(values: &Values, requests: Vec<String>) -> CommandLine {
    CommandLine { requests, settings: values.set.clone(), case: values.case.clone(), keep: values.keep.clone() }
}

fn text_options(fraction: Option<Fraction>, looks: Looks) -> TextOptions {
    TextOptions { width: looks.output.width, fraction: Fraction::style(fraction) }
}

/// `check`: each file on its own, one document for all. In JSON the diagnostics stand in the document only.
pub(super) fn check(arguments: &arguments::Check, looks: Looks, status: &mut u8) -> Result<(), Failure> {
    let line = command_line(&arguments.values, Vec::new());
    let json = arguments.output.format == Format::Json;
    let mut all: Vec<ToldDiagnostic> = Vec::new();
    let (mut lines, mut seen) = (String::new(), HashSet::new());
    for path in &arguments.files {
        let mut model = Model::read(path, &line);
        if let Some(netlist) = &model.netlist {
            let mut told = flow::check(netlist);
            if model.diagnostics.iter().any(breaks_the_wiring) {
                told.retain(|d| !matches!(d.code, Code::UnusedBlock | Code::HiddenUnstableMode));
            }
            model.add(told);
        }
        *status = model.status(*status);
        // A mistake in a file that several use is told once.
        let mut told = model.told().into_iter();
        model.diagnostics.retain(|_| {
            let Some(d) = told.next() else { return true };
            let fresh = seen.insert(identity(&d)) || d.labels.is_empty();
            if fresh {
                all.push(d);
            }
            fresh
        });
        if !json {
            model.tell(looks);
            lines += &summary(path, &model);
        }
    }
    let mut out = Destination::open(arguments.output.output.as_deref())?;
    if json {
        report::json(&report::check(all), &mut out)?;
    } else {
        std::io::Write::write_all(&mut out, lines.as_bytes())?;
    }
    Ok(out.finish()?)
}

/// What a reader of results has to know of the netlist behind them.
fn warnings(netlist: &Netlist) -> Vec<Diagnostic> {
    let mut told = flow::check(netlist);
    told.retain(|d| matches!(d.code, Code::AlgebraicLoop | Code::HiddenUnstableMode));
    told
}

/// What makes two diagnostics the same to a reader.
fn identity(d: &ToldDiagnostic) -> (Option<(String, usize, usize)>, Code, String) {
    let place = d.labels.first().map(|l| (l.file.clone(), l.line, l.column));
    (place, d.code, d.message.clone())
}

/// Whether a mistake leaves signals apart that may belong together: what seems unused then may well be used.
fn breaks_the_wiring(d: &Diagnostic) -> bool {
    let wiring = matches!(
        d.code,
        Code::Syntax
            | Code::UnknownName
            | Code::DuplicateName
            | Code::DrivenTwice
            | Code::UndrivenSignal
            | Code::UseNotFound
            | Code::UseCycle
    );
    d.is_error() && wiring
}

/// `heliostat.loop: 12 blocks, 5 sums, nothing to report`
fn summary(path: &str, model: &Model) -> String {
    let Some(netlist) = model.sound() else { return String::new() };
    let count = |n: usize, word: &str| format!("{n} {word}{}", if n == 1 { "" } else { "s" });
    let told = diagnostics::summary(&model.diagnostics);
    format!(
        "{}: {}, {}, {}\n",
        diagnostics::clean(path),
        count(netlist.blocks.len(), "block"),
        count(netlist.sums.len(), "sum"),
        if told.is_empty() { "nothing to report" } else { &told }
    )
}

/// `derive`: diagnostics go to standard error in either format, and stand in the JSON document too.
pub(super) fn derive(arguments: &arguments::Derive, looks: Looks, status: &mut u8) -> Result<(), Failure> {
    let line = command_line(&arguments.values, arguments.requests.clone());
    let mut model = Model::read(&arguments.file, &line);
    let options = DeriveOptions {
        roots: arguments.roots,
        method: match arguments.method {
            arguments::Method::Elimination => Method::Elimination,
            arguments::Method::Mason => Method::Mason,
        },
        verify: arguments.verify,
        characteristic: arguments.characteristic,
    };
    let (mut transfers, mut characteristic) = (Vec::new(), Vec::new());
    if let Some(netlist) = model.sound() {
        if netlist.requests.is_empty() && !arguments.characteristic {
            tell("nothing is asked for: add a line such as `find y / r` to the file, or name it on the command line\n");
        }
        let mut derived = flow::derive(netlist, &options);
        (transfers, characteristic) = (derived.transfers, derived.characteristic);
        derived.diagnostics.extend(warnings(netlist));
        model.add(derived.diagnostics);
    }
    *status = model.status(*status);
    model.tell(looks);
    let diagnostics = model.told();
    let ok = diagnostics.iter().all(|d| d.severity != Severity::Error);
    let name = model.name(&arguments.file);
    let document = Derive { schema: "loopwright.derive.1", model: name, ok, diagnostics, transfers, characteristic };
    let json = arguments.output.format == Format::Json;
    if !json && document.transfers.is_empty() && document.characteristic.is_empty() {
        // Nothing to be written: a file that is there keeps what it has.
        return Ok(());
    }
    let mut out = Destination::open(arguments.output.output.as_deref())?;
    if json {
        report::json(&document, &mut out)?;
    } else {
        report::derive(&document, text_options(arguments.fraction, looks), &mut out)?;
    }
    Ok(out.finish()?)
}

/// `mason`: one request, worked out.
pub(super) fn mason(arguments: &arguments::Mason, looks: Looks, status: &mut u8) -> Result<(), Failure> {
    let line = command_line(&arguments.values, vec![arguments.request.clone()]);
    let mut model = Model::read(&arguments.file, &line);
    let mut document = None;
    if let Some(netlist) = model.sound() {
        let single = |kind: &RequestKind| !matches!(kind, RequestKind::All | RequestKind::Zeros { .. });
        match netlist.requests.as_slice() {
            [request] if single(&request.kind) => match flow::mason(netlist, request) {
                Ok(worked) => {
                    document = Some(worked);
                    let told = warnings(netlist);
                    model.add(told);
                }
                Err(told) => model.add(told),
            },
            _ => return Err("mason works out one request, such as `y / r` or `loop at u`".to_owned().into()),
        }
    }
    *status = model.status(*status);
    model.tell(looks);
    let diagnostics = model.told();
    let ok = diagnostics.iter().all(|d| d.severity != Severity::Error);
    let json = arguments.output.format == Format::Json;
    let Some(mut document) = document else {
        if json {
            let mut out = Destination::open(arguments.output.output.as_deref())?;
            let name = model.name(&arguments.file);
            report::json(&report::nothing("loopwright.mason.1", name, diagnostics), &mut out)?;
            out.finish()?;
        }
        return Ok(());
    };
    (document.ok, document.diagnostics) = (ok, diagnostics);
    let mut out = Destination::open(arguments.output.output.as_deref())?;
    if json {
        report::json(&document, &mut out)?;
    } else {
        report::mason(&document, text_options(arguments.fraction, looks), &mut out)?;
    }
    Ok(out.finish()?)
}

/// `assess`: the figures of the closed loop; a requirement that fails makes the status 1.
pub(super) fn assess(arguments: &arguments::Assess, looks: Looks, status: &mut u8) -> Result<(), Failure> {
    let line = CommandLine { settings: arguments.set.clone(), case: arguments.case.clone(), ..CommandLine::default() };
    let mut model = Model::read(&arguments.file, &line);
    let mut cases = Vec::new();
    if let Some(netlist) = model.sound() {
        let assessed = analysis::assess(netlist);
        let mut told = flow::check(netlist);
        told.extend(assessed.diagnostics.into_iter().filter(|d| !told.contains(d)).collect::<Vec<_>>());
        cases = assessed.cases;
        model.add(told);
    }
    *status = model.status(*status);
    if *status == 0 && cases.iter().flat_map(|c| &c.requirements).any(|r| !r.holds) {
        *status = REQUIREMENT_FAILS;
    }
    model.tell(looks);
    let document = report::assess_document(model.name(&arguments.file), cases, model.told(), &model.sources);
    if arguments.format == AssessFormat::Text && document.cases.is_empty() {
        return Ok(());
    }
    let mut out = Destination::open(arguments.output.as_deref())?;
    match arguments.format {
        AssessFormat::Text => report::assess(&document, arguments.verbose, text_options(None, looks), &mut out)?,
        AssessFormat::Json => report::json(&document, &mut out)?,
        AssessFormat::Sarif => report::json(&report::sarif(&document), &mut out)?,
        AssessFormat::Junit => report::junit(&document, &mut out)?,
    }
    Ok(out.finish()?)
}
