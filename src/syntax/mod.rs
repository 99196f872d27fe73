//! Text to syntax tree.
//!
//! [`parse`] splits a text into statements by hand (`split`), reads each by the grammar in `grammar/loop.pest`
//! (`grammar`, `reader`) and joins what comes of it. It always gives a tree: a statement that can't be read costs one
//! diagnostic (`explain`) and is left out, the rest is read.

pub mod ast;
mod explain;
mod expression;
mod grammar;
mod reader;
mod relocate;
mod request;
mod split;
mod statement;
mod unit;
mod words;

pub use expression::MAX_DEPTH;
pub use split::MAX_NESTING;
pub use unit::parse_unit;

use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;
use ast::Tree;
use rayon::prelude::*;
use reader::Reader;
use relocate::{Offsets, relocate};
use split::{Item, ItemKind};

/// What a text says, and what is wrong with it.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Parsed {
    /// The statements that could be read.
    pub tree: Tree,
    /// The mistakes, in the order of the text.
    pub diagnostics: Vec<Diagnostic>,
    /// Every name that stands in a statement that could not be read: it may be declared or driven there, so that nobody
    /// should complain that it is not.
    pub lost_names: Vec<Span>,
}

/// How many statements one task reads: enough that starting it costs nothing, few enough to keep all threads busy.
const ITEMS_A_TASK: usize = 1_000;

/// The most mistakes of one text that are told. Past it the text is hardly one in this language, and each mistake takes
/// some hundred bytes.
pub const MAX_MISTAKES: usize = 10_000;

/// Reads a text. Spans are byte offsets in it, with `base` added.
///
/// Large texts are read by several threads; the result does not depend on their number.
pub fn parse(text: &str, base: u32) -> Parsed {
    let split = split::split(text, base);
    let parts: Vec<&[Item]> = tasks(&split.items);
    let read = |items: &&[Item]| {
        let mut reader = Reader::new(text, base);
        reader.read(items, &split.comments);
        (reader.tree, reader.diagnostics, reader.lost_names)
    };
    let parts: Vec<_> =
        if parts.len() == 1 { parts.iter().map(read).collect() } else { parts.par_iter().map(read).collect() };
    let mut diagnostics = split.diagnostics;
    let mut lost_names = Vec::new();
    let mut trees = Vec::with_capacity(parts.len());
    for (tree, mistakes, lost) in parts {
        trees.push(tree);
        diagnostics.extend(mistakes);
        lost_names.extend(lost);
    }
    let mut tree = join(trees);
    tree.comments = split.comments;
    diagnostics.sort_by_key(|d| d.labels.first().map_or(u32::MAX, |label| label.span.start));
    if diagnostics.len() > MAX_MISTAKES {
        diagnostics.truncate(MAX_MISTAKES);
        diagnostics.push(
            Diagnostic::new(Code::LimitReached, format!("the text has more than {MAX_MISTAKES} mistakes"))
                .label(Span::new(base, base), "in this text")
                .help("mend the first ones; is it a text in the loop language?"),
        );
    }
    Parsed { tree, diagnostics, lost_names }
}

/// Parts of about [`ITEMS_A_TASK`] items, each of which ends where no body is open.
fn tasks(items: &[Item]) -> Vec<&[Item]> {
    let mut parts = Vec::with_capacity(items.len() / ITEMS_A_TASK + 1);
    let (mut start, mut depth) = (0, 0_usize);
    for (i, item) in items.iter().enumerate() {
        match item.kind {
            ItemKind::Head(_) | ItemKind::LostHead => depth += 1,
            ItemKind::Close => depth = depth.saturating_sub(1),
            _ => {}
        }
        if depth == 0 && i + 1 - start >= ITEMS_A_TASK {
            parts.push(&items[start..=i]);
            start = i + 1;
        }
    }
    parts.push(&items[start..]);
    parts
}

/// One tree of the trees of a text's parts.
fn join(mut trees: Vec<Tree>) -> Tree {
    if trees.len() == 1 {
        return trees.pop().unwrap_or_default();
    }
    let mut offsets = vec![Offsets::default()];
    for tree in &trees {
        offsets.push(offsets[offsets.len() - 1].after(tree));
    }
    trees.par_iter_mut().zip(&offsets).for_each(|(tree, &by)| relocate(tree, by));
    let mut joined = Tree {
        statements: Vec::with_capacity(trees.iter().map(|t| t.statements.len()).sum()),
        exprs: Vec::with_capacity(trees.iter().map(|t| t.exprs.len()).sum()),
        ..Tree::default()
    };
    for mut tree in trees {
        joined.statements.append(&mut tree.statements);
        joined.exprs.append(&mut tree.exprs);
        joined.templates.append(&mut tree.templates);
        joined.calls.append(&mut tree.calls);
        joined.repeated.append(&mut tree.repeated);
        joined.units.append(&mut tree.units);
    }
    joined
}

#[cfg(test)]
mod tests;
