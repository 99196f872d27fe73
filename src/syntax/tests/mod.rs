//! Tests of the whole room: texts in, trees and diagnostics out.

mod forms;
mod lexical;
mod mistakes;
mod mutations;
mod show;

use super::{Parsed, parse};
use crate::diagnostics::Diagnostic;

/// The tree of a text that has no mistakes, one statement a line, in the notation of [`show`].
fn shown(text: &str) -> Vec<String> {
    let parsed = parse(text, 0);
    assert_eq!(parsed.diagnostics, [], "{text}");
    check_arena(&parsed);
    show::statements(&parsed.tree, text, &parsed.tree.statements)
}

/// The tree of one statement without mistakes.
fn one(text: &str) -> String {
    let all = shown(text);
    assert_eq!(all.len(), 1, "{text}");
    all.into_iter().next().unwrap_or_default()
}

/// An expression as `sum x = …` has it.
fn law(text: &str) -> String {
    let shown = one(&format!("sum x = {text}"));
    shown.strip_prefix("sum x = ").map(str::to_owned).unwrap_or_default()
}

/// The mistakes of a text: the message, and what the primary label covers.
fn mistakes(text: &str) -> Vec<(String, String)> {
    let parsed = parse(text, 0);
    check_arena(&parsed);
    parsed.diagnostics.iter().map(|d| (d.message.clone(), labelled(text, d))).collect()
}

fn labelled(text: &str, diagnostic: &Diagnostic) -> String {
    let span = diagnostic.labels[0].span;
    text[span.start as usize..span.end as usize].to_owned()
}

/// Children stand before their parents in the arena.
fn check_arena(parsed: &Parsed) {
    use super::ast::ExprKind;
    let tree = &parsed.tree;
    for (at, expr) in tree.exprs.iter().enumerate() {
        let before = |id: super::ast::ExprId| assert!((id.0 as usize) < at, "node {at} has the later child {}", id.0);
        match expr.kind {
            ExprKind::Number | ExprKind::Name(_) | ExprKind::Derivative(_) => {}
            ExprKind::Neg(a) | ExprKind::WithUnit(a, _) => before(a),
            ExprKind::Binary(_, a, b) => {
                before(a);
                before(b);
            }
            ExprKind::Call(call) => tree.calls[call as usize].arguments.iter().for_each(|a| before(a.value)),
            ExprKind::Repeated(repeated) => {
                let r = tree.repeated[repeated as usize];
                [r.from, r.to, r.body].into_iter().for_each(before);
            }
        }
    }
}
