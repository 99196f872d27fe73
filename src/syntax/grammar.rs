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

/// Where and why a text does not follow a rule.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Failure {
    /// Byte position of the first thing that can't stand there.
    pub(super) at: usize,
    /// What could stand there instead.
    pub(super) expected: Vec<Rule>,
}

/// Reads `text` by `rule` and puts what it found into `events`, which it empties first.
///
/// # Errors
///
/// The first place at which the text leaves the rule.
pub(super) fn read(rule: Rule, text: &str, events: &mut Vec<Event>) -> Result<(), Failure> {
    events.clear();
    let pairs = LoopParser::parse(rule, text).map_err(|error| {
        let at = match error.location {
            InputLocation::Pos(at) | InputLocation::Span((at, _)) => at,
        };
        let expected = match error.variant {
            ErrorVariant::ParsingError { positives, .. } => positives,
            ErrorVariant::CustomError { .. } => Vec::new(),
        };
        Failure { at, expected }
    })?;
    events.extend(pairs.tokens().map(|token| match token {
        pest::Token::Start { rule, pos } => Event { rule, begins: true, at: pos.pos() as u32 },
        pest::Token::End { rule, pos } => Event { rule, begins: false, at: pos.pos() as u32 },
    }));
    Ok(())
}
