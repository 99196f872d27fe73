//! The file with what it uses: trees, definitions and units, each file's own view of them.

use super::scope::normal;
use super::units::UnitTable;
use super::{CommandLine, MAX_USE_DEPTH};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::{FileId, Loader, SourceMap, Span};
use crate::syntax::ast::{Define, StatementKind, Tree};
use crate::syntax::{self, Parsed};
use rustc_hash::FxHashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// A define: the file that it stands in and its statement there.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) struct DefineId {
    /// Index in [`Loaded::files`].
    pub file: usize,
    /// Index of its statement.
    pub statement: usize,
}

/// One file that was read.
#[derive(Debug)]
pub(super) struct LoadedFile {
    /// Its whole text.
    pub text: Arc<str>,
    /// Where the text begins in the address space.
    pub base: u32,
    /// Its tree.
    pub tree: Tree,
    /// The defines that it can call: its own and those of the files that it uses.
    pub defines: FxHashMap<String, DefineId>,
    /// Where each of those came into this file: its own line, or the `use`.
    define_places: FxHashMap<String, Span>,
    /// The units that it can write.
    pub units: UnitTable,
    /// Its own units by their statements, for those that use this file.
    own_units: Vec<usize>,
    /// Whether something that it uses could not be read: then what is missing is not told again.
    pub incomplete: bool,
    /// Names in statements that could not be read.
    pub lost_names: Vec<Span>,
}

impl LoadedFile {
    /// The text that a span of this file covers.
    pub(super) fn text(&self, span: Span) -> &str {
        self.text.get((span.start - self.base) as usize..(span.end - self.base) as usize).unwrap_or("")
    }
}

/// All files of a run.
#[derive(Debug, Default)]
pub(super) struct Loaded {
    /// The root first.
    pub files: Vec<LoadedFile>,
    /// The standing laws' file, where any file calls what it does not define itself.
    pub standard: Option<usize>,
    /// The command line's requests, settings and kept params, each as a file of one statement.
    pub line: Vec<usize>,
    /// What was told while reading.
    pub diagnostics: Vec<Diagnostic>,
}

impl Loaded {
    /// A define's tree.
    pub(super) fn define(&self, id: DefineId) -> Option<&Define> {
        match &self.files[id.file].tree.statements.get(id.statement)?.kind {
            StatementKind::Define(define) => Some(define),
            _ => None,
        }
    }

    /// The define that a name stands for in a file: its own and used ones win over the standing laws.
    pub(super) fn find_define(&self, file: usize, name: &str) -> Option<DefineId> {
        let name = normal(name);
        let own = self.files[file].defines.get(name.as_ref());
        own.or_else(|| self.files[self.standard?].defines.get(name.as_ref())).copied()
    }

    /// All names that a file can call, for suggestions.
    pub(super) fn callable(&self, file: usize) -> impl Iterator<Item = &str> {
        let standard = self.standard.map(|s| &self.files[s]);
        let mut names: Vec<&str> = [Some(&self.files[file]), standard]
            .into_iter()
            .flatten()
            .flat_map(|f| f.defines.keys())
            .map(String::as_str)
            .collect();
        names.sort_unstable();
        names.into_iter()
    }
}

/// The standing set of the trade's usual laws.
const STANDARD: &str = include_str!("standard.loop");

/// Reads `root` and all that it uses, and what the command line adds.
pub(super) fn load(sources: &mut SourceMap, root: FileId, loader: &dyn Loader, line: &CommandLine) -> Loaded {
    let mut loading = Loading { sources, loader, loaded: Loaded::default(), known: FxHashMap::default() };
    let path = PathBuf::from(loading.sources.file(root).name.clone());
    loading.read(root, loader.identity(&path), &mut Vec::new());
    let texts = line.requests.iter().map(|r| format!("find {r}"));
    let settings = line.settings.iter().map(|s| format!("case set {{ {s} }}"));
    let keep = (!line.keep.is_empty()).then(|| format!("find all keep {}", line.keep.join(", ")));
    for text in texts.chain(settings).chain(keep) {
        if let Some(id) = loading.sources.add("command line", text) {
            let file = loading.parse(id);
            loading.loaded.line.push(loading.loaded.files.len());
            loading.loaded.files.push(file);
        }
    }
    if loading.needs_standard()
        && let Some(id) = loading.sources.add("standing laws", STANDARD)
    {
        let file = loading.parse(id);
        loading.loaded.standard = Some(loading.loaded.files.len());
        loading.loaded.files.push(file);
        loading.own(loading.loaded.files.len() - 1);
    }
    loading.loaded
}

struct Loading<'a> {
    sources: &'a mut SourceMap,
    loader: &'a dyn Loader,
    loaded: Loaded,
    /// Files that were read, by their identity; none where reading failed.
    known: FxHashMap<PathBuf, Option<usize>>,
}

impl Loading<'_> {
    fn parse(&mut self, id: FileId) -> LoadedFile {
        let file = self.sources.file(id);
        let (text, base) = (file.text.clone(), file.base);
        let Parsed { tree, diagnostics, lost_names } = syntax::parse(&text, base);
        self.loaded.diagnostics.extend(diagnostics);
        LoadedFile {
            text,
            base,
            tree,
            defines: FxHashMap::default(),
            define_places: FxHashMap::default(),
            units: UnitTable::new(),
            own_units: Vec::new(),
            incomplete: false,
            lost_names,
        }
    }

    /// Reads one file and what it uses; `open` lists the files being read, for circles.
    fn read(&mut self, id: FileId, identity: PathBuf, open: &mut Vec<(PathBuf, Span)>) -> usize {
        let file = self.parse(id);
        let place = self.loaded.files.len();
        self.known.insert(identity.clone(), Some(place));
        self.loaded.files.push(file);
        let uses: Vec<Span> = self.loaded.files[place]
            .tree
            .statements
            .iter()
            .filter_map(|s| if let StatementKind::Use { path } = s.kind { Some(path) } else { None })
            .collect();
        self.own(place);
        open.push((identity, Span::NONE));
        for span in uses {
            if let Some(last) = open.last_mut() {
                last.1 = span;
            }
            match self.used(id, span, open) {
                Some(used) => self.bring_in(place, used, span),
                None => self.loaded.files[place].incomplete = true,
            }
        }
        open.pop();
        place
    }

    /// The place of a used file, read at its first use.
    fn used(&mut self, by: FileId, span: Span, open: &mut Vec<(PathBuf, Span)>) -> Option<usize> {
        let written = self.sources.text(span).to_owned();
        let folder = Path::new(&self.sources.file(by).name).parent().map(Path::to_path_buf).unwrap_or_default();
        let path = folder.join(&written);
        let identity = self.loader.identity(&path);
        if let Some(first) = open.iter().position(|o| o.0 == identity) {
            self.circle(&open[first..], span);
            return None;
        }
        if let Some(&known) = self.known.get(&identity) {
            return known;
        }
        if open.len() >= MAX_USE_DEPTH {
            let message = format!("files use each other more than {MAX_USE_DEPTH} deep");
            self.tell(
                Diagnostic::new(Code::LimitReached, message)
                    .label(span, "here")
                    .help("use the innermost file directly"),
            );
            return None;
        }
        self.known.insert(identity.clone(), None);
        let text = match self.loader.load(&path).map(String::from_utf8) {
            Ok(Ok(text)) => text,
            Ok(Err(_)) => {
                let d = Diagnostic::new(Code::UseNotFound, format!("`{written}` is no text in UTF-8"));
                self.tell(d.label(span, "used here").help("save the file as UTF-8"));
                return None;
            }
            Err(error) => {
                let d = Diagnostic::new(Code::UseNotFound, format!("`{written}` can't be read: {error}"));
                let help =
                    "the path is relative to the file that uses it; check its spelling and that the file is there";
                self.tell(d.label(span, format!("looked for at `{}`", path.display())).help(help));
                return None;
            }
        };
        let id = self.sources.add(path.to_string_lossy().into_owned(), text)?;
        Some(self.read(id, identity, open))
    }

    fn circle(&mut self, circle: &[(PathBuf, Span)], span: Span) {
        let names: Vec<String> = circle.iter().map(|(p, _)| format!("`{}`", p.display())).collect();
        let message = if names.len() == 1 {
            format!("{} uses itself", names[0])
        } else {
            format!("files use each other in a circle: {} and back", names.join(" uses "))
        };
        let mut d = Diagnostic::new(Code::UseCycle, message).label(span, "this closes the circle");
        for (_, place) in circle.iter().filter(|(_, place)| *place != span && *place != Span::NONE) {
            d = d.label(*place, "by way of this");
        }
        self.tell(d.help("move the definitions that both need into a third file, and use that one"));
    }

    /// Makes a file's own defines and units known in it.
    fn own(&mut self, place: usize) {
        let file = &mut self.loaded.files[place];
        let mut told = Vec::new();
        for (statement, s) in file.tree.statements.iter().enumerate() {
            match &s.kind {
                StatementKind::Define(define) => {
                    let text =
                        &file.text[(define.name.start - file.base) as usize..(define.name.end - file.base) as usize];
                    let name = normal(text).into_owned();
                    if let Some(&first) = file.define_places.get(&name) {
                        told.push(given_twice(&name, define.name, first));
                        continue;
                    }
                    file.define_places.insert(name.clone(), define.name);
                    file.defines.insert(name, DefineId { file: place, statement });
                }
                StatementKind::Unit { .. } => file.own_units.push(statement),
                _ => {}
            }
        }
        self.loaded.diagnostics.append(&mut told);
        for statement in self.loaded.files[place].own_units.clone() {
            self.define_unit(place, place, statement, None);
        }
    }

    /// Makes the defines and units of a used file known in the file that uses it.
    fn bring_in(&mut self, place: usize, used: usize, span: Span) {
        let mut own: Vec<(String, DefineId)> = self.loaded.files[used]
            .defines
            .iter()
            .filter(|(_, id)| id.file == used)
            .map(|(name, &id)| (name.clone(), id))
            .collect();
        own.sort_unstable_by_key(|(_, id)| *id);
        for (name, id) in own {
            let file = &mut self.loaded.files[place];
            match file.defines.get(&name) {
                Some(known) if *known == id => {}
                Some(_) => {
                    let first = file.define_places[&name];
                    self.tell(given_twice(&name, span, first));
                }
                None => {
                    file.defines.insert(name.clone(), id);
                    file.define_places.insert(name, span);
                }
            }
        }
        for statement in self.loaded.files[used].own_units.clone() {
            self.define_unit(place, used, statement, Some(span));
        }
    }

    /// Adds one declared unit to a file's table.
    fn define_unit(&mut self, place: usize, from: usize, statement: usize, by_use: Option<Span>) {
        let source = &self.loaded.files[from];
        let StatementKind::Unit { name, value } = source.tree.statements[statement].kind else { return };
        let text = normal(source.text(name)).into_owned();
        let made = super::unit_text::declared(source, value);
        match made {
            Ok(unit) => {
                let table = &mut self.loaded.files[place].units;
                let known = table.is_built_in(&text).then(|| None);
                let known = known.unwrap_or_else(|| table.define(&text, unit.clone()));
                if known.is_none_or(|k| k == unit) && !table.is_built_in(&text) {
                    return;
                }
                let d = Diagnostic::new(Code::DuplicateName, format!("the unit `{text}` is there already"));
                let d = d.label(by_use.unwrap_or(name), "given again here");
                self.tell(d.help("give the unit another name"));
            }
            // The used file's own reading has told it.
            Err(d) if by_use.is_none() => self.tell(d),
            Err(_) => {}
        }
    }

    /// Whether any file calls what neither it nor what it uses defines.
    fn needs_standard(&self) -> bool {
        self.loaded.files.iter().any(|f| {
            f.tree.calls.iter().any(|c| {
                let name = f.text(c.callee);
                super::bind::function(name).is_none() && !f.defines.contains_key(normal(name).as_ref())
            })
        })
    }

    fn tell(&mut self, diagnostic: Diagnostic) {
        self.loaded.diagnostics.push(diagnostic);
    }
}

fn given_twice(name: &str, again: Span, first: Span) -> Diagnostic {
    Diagnostic::new(Code::DuplicateName, format!("`{name}` is defined twice"))
        .label(again, "defined again by this")
        .label(first, "first defined by this")
        .help("rename one of the two")
}
