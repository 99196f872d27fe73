//! The parser that is made of `grammar/loop.pest`, and its result as a plain row of events.

/// What the derive makes; it can't carry documentation.
#[allow(missing_docs, unreachable_pub, clippy::all, clippy::pedantic)]
mod generated {
    #[derive(pest_derive::Parser)]
    #[grammar = "grammar/loop.pest"]
    pub struct LoopParser;
}

pub(super) use generated::Rule;

use generated::LoopParser;
use pest::Parser;
use pest::error::{ErrorVariant, InputLocation};

/// A rule begins or ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Event {
    /// Which rule.
    pub(super) rule: Rule,
    /// Whether it begins here.
    pub(super) begins: bool,
    /// Byte position in the text that was read.
    pub(super) at: u32,
}

/// A line that was read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Extent {
    /// The rule that it follows.
    pub(super) rule: Rule,
    /// Byte position at which that rule begins in the text.
    pub(super) start: u32,
    /// Byte position after its last byte, blanks included.
    pub(super) end: u32,
    /// The place of the rule's beginning in [`Events::row`].
    pub(super) first: u32,
}

/// What the grammar found in a text.
#[derive(Debug, Default)]
pub(super) struct Events {
    /// The beginnings and ends of all rules in the lines. An end has no blanks before it.
    pub(super) row: Vec<Event>,
    /// The lines.
    pub(super) lines: Vec<Extent>,
}

/// Where and why a text does not follow a rule.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Failure {
    /// Byte position of the first thing that can't stand there.
    pub(super) at: usize,
    /// What could stand there instead.
    pub(super) expected: Vec<Rule>,
    /// Whether the parser stopped there because it had no more room on the stack.
    pub(super) stack_full: bool,
}

/// Reads `text` by `rule`, one of those that end with the text, and puts what it found into `events`.
///
/// # Errors
///
/// The first place at which the text leaves the rule.
pub(super) fn read(rule: Rule, text: &str, events: &mut Events) -> Result<(), Failure> {
    events.row.clear();
    events.lines.clear();
    let whole = LoopParser::parse(rule, text).map_err(|error| {
        let at = match error.location {
            InputLocation::Pos(at) | InputLocation::Span((at, _)) => at,
        };
        let (expected, stack_full) = match error.variant {
            ErrorVariant::ParsingError { positives, .. } => (positives, false),
            ErrorVariant::CustomError { .. } => (Vec::new(), true),
        };
        Failure { at, expected, stack_full }
    })?;
    for line in whole.flat_map(pest::iterators::Pair::into_inner) {
        let rule = line.as_rule();
        if rule == Rule::EOI {
            continue;
        }
        let span = line.as_span();
        let first = events.row.len() as u32;
        events.lines.push(Extent { rule, start: span.start() as u32, end: span.end() as u32, first });
        events.row.extend(line.tokens().map(|token| match token {
            pest::Token::Start { rule, pos } => Event { rule, begins: true, at: pos.pos() as u32 },
            pest::Token::End { rule, pos } => Event { rule, begins: false, at: trimmed(text, rule, pos.pos()) as u32 },
        }));
    }
    Ok(())
}

/// An end without the blanks before it. What stands between marks of its own keeps them: its end says where the mark is.
fn trimmed(text: &str, rule: Rule, end: usize) -> usize {
    if matches!(rule, Rule::text | Rule::unit) {
        return end;
    }
    let mut end = end;
    while end > 0 && text.as_bytes()[end - 1] <= b' ' {
        end -= 1;
    }
    end
}
