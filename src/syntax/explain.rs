//! What to say where a text leaves the grammar: what was found, what could stand there, and the mend.

use super::grammar::{Failure, Rule};
use super::words::{WORDS_TOLD, nearest};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;

/// The diagnostic for a statement that begins with no word of the language. `start` and `length` say where in `text`.
pub(super) fn unknown_word(text: &str, base: u32, start: usize, length: usize) -> Diagnostic {
    let span = Span::new(start as u32 + base, (start + length) as u32 + base);
    let written = text.get(start..start + length).unwrap_or("");
    if let Some((meant, _)) = nearest(written) {
        return Diagnostic::new(Code::Syntax, format!("no statement begins with `{written}`"))
            .label(span, format!("`{meant}` is meant?"))
            .help(format!("write `{meant}`"));
    }
    let rest = text.get(start + length..).unwrap_or("").trim_start_matches([' ', '\t']);
    let diagnostic = Diagnostic::new(Code::Syntax, format!("no statement begins with {}", found(text, start)))
        .label(span, "a statement word is expected");
    let is_name = written.starts_with(|c: char| c == '_' || unicode_ident::is_xid_start(c));
    if is_name && rest.starts_with('=') {
        return diagnostic.help(format!("for a value write `param {written} = …`, for a signal `sum {written} = …`"));
    }
    if matches!(written, "+" | "-" | "*" | "/" | "^" | "=" | ",") {
        return diagnostic.help(
            "a line goes on in the next only where it ends in `,`, `=`, `->` or an operator, or inside brackets: \
             move the sign to the end of the line before",
        );
    }
    diagnostic.help(format!("a statement begins with {WORDS_TOLD}"))
}

/// What stands at `at`, as it is told to people.
pub(super) fn found(text: &str, at: usize) -> String {
    let rest = text.get(at..).unwrap_or("");
    let Some(first) = rest.chars().next() else { return "the end".to_owned() };
    match first {
        '\n' | '\r' => return "the end of the line".to_owned(),
        '"' => return "a text".to_owned(),
        _ => {}
    }
    let length = token_length(rest);
    let shown: String = rest[..length].chars().take(40).collect();
    format!("`{shown}`")
}

/// Length in bytes of the name, number or sign with which `rest` begins.
pub(super) fn token_length(rest: &str) -> usize {
    let Some(first) = rest.chars().next() else { return 0 };
    if first == '_' || unicode_ident::is_xid_start(first) || first.is_ascii_digit() {
        rest.find(|c: char| !unicode_ident::is_xid_continue(c)).unwrap_or(rest.len())
    } else if ["->", "..", ">=", "<=", "**", "=="].iter().any(|sign| rest.starts_with(sign)) {
        2
    } else {
        first.len_utf8()
    }
}

/// A rule's name for people; `None` for what goes without saying.
fn told(rule: Rule) -> Option<&'static str> {
    Some(match rule {
        Rule::identifier | Rule::name | Rule::names | Rule::ports | Rule::port | Rule::define_param => "a name",
        Rule::number | Rule::expression | Rule::group | Rule::argument => "a value",
        Rule::minus => return None,
        Rule::operator => "an operator",
        Rule::text => "a text in `\"`",
        Rule::comma => "`,`",
        Rule::equals => "`=`",
        Rule::colon => "`:`",
        Rule::arrow => "`->`",
        Rule::dots => "`..`",
        Rule::slash => "`/`",
        Rule::percent => "`%`",
        Rule::prime => return None,
        Rule::open | Rule::arguments => "`(`",
        Rule::close => "`)`",
        Rule::row_open | Rule::row | Rule::matrix => "`[`",
        Rule::row_close | Rule::unit_end => "`]`",
        Rule::index_end => "`}`",
        Rule::body => "`{`",
        Rule::unit => "a unit in `[ ]`",
        Rule::index => return None,
        Rule::EOI => "the end of the statement",
        Rule::comparison => "`>=`, `<=`, `>` or `<`",
        Rule::within | Rule::within_word => "`within`",
        Rule::every | Rule::every_word => "`every`",
        Rule::with_open | Rule::with_word => "`with`",
        Rule::keep | Rule::keep_word => "`keep`",
        Rule::in_cases => "`in`",
        Rule::at | Rule::at_word => "`at`",
        Rule::over | Rule::over_word => "`over`",
        Rule::to | Rule::to_word => "`to`",
        Rule::stimulus | Rule::for_word => "`for`",
        Rule::open_word => "`open`",
        Rule::transfer => "a request such as `y / r`",
        Rule::find_all | Rule::find_loop | Rule::find_zeros => return None,
        _ => return None,
    })
}

/// The diagnostic for a text that leaves the grammar. `text` begins at `base`.
pub(super) fn failure(text: &str, base: u32, failure: &Failure) -> Diagnostic {
    let at = failure.at.min(text.len());
    let rest = text.get(at..).unwrap_or("");
    let span = Span::new(at as u32 + base, (at + token_length(rest)) as u32 + base);
    let mut expected: Vec<&str> = Vec::new();
    for word in failure.expected.iter().filter_map(|&rule| told(rule)) {
        if !expected.contains(&word) {
            expected.push(word);
        }
    }
    let expected = match expected.as_slice() {
        [] => "something else".to_owned(),
        [one] => (*one).to_owned(),
        [many @ .., last] => format!("{} or {last}", many.join(", ")),
    };
    Diagnostic::new(Code::Syntax, format!("expected {expected}, found {}", found(text, at)))
        .label(span, format!("expected {expected}"))
}

/// The diagnostic for a unit whose text leaves the grammar; `inside` is the place of that text.
pub(super) fn unit_failure(text: &str, inside: Span, failure: &Failure) -> Diagnostic {
    let at = failure.at.min(text.len()) as u32 + inside.start;
    let length = text.get(failure.at..).map_or(0, token_length) as u32;
    Diagnostic::new(Code::Syntax, format!("`[{text}]` is no unit"))
        .label(Span::new(at, at + length), "not understood")
        .help("a unit is made of symbols, `*`, `/`, parentheses and whole powers, such as `[N*m/rad]`; `[1]` is none")
}
