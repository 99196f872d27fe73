//! What to say where a text leaves the grammar: what was found, what could stand there, and the mend.

use super::grammar::{Failure, Rule};
use super::words::{WORDS_TOLD, Word, nearest, statement_word};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;

/// The diagnostic for a statement that begins with no word of the language. `start` and `length` say where in `text`.
pub(super) fn unknown_word(text: &str, base: u32, start: usize, length: usize) -> Diagnostic {
    let span = Span::new((start as u32).wrapping_add(base), ((start + length) as u32).wrapping_add(base));
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
        Rule::identifier | Rule::name | Rule::names | Rule::port | Rule::parameter => "a name",
        Rule::number | Rule::expression | Rule::group | Rule::argument => "a value",
        Rule::operator => "an operator",
        Rule::comma => "`,`",
        Rule::equals => "`=`",
        Rule::colon => "`:`",
        Rule::arrow => "`->`",
        Rule::dots => "`..`",
        Rule::slash => "`/`",
        Rule::percent => "`%`",
        Rule::open | Rule::arguments => "`(`",
        Rule::close => "`)`",
        Rule::row | Rule::matrix => "`[`",
        Rule::body => "`{`",
        Rule::comparison => "`>=`, `<=`, `>` or `<`",
        Rule::with_open => "`with`",
        Rule::keep => "`keep`",
        Rule::in_cases | Rule::in_word => "`in`",
        Rule::at => "`at`",
        Rule::over => "`over`",
        Rule::to => "`to`",
        Rule::stimulus => "`for`",
        Rule::open_word => "`open`",
        Rule::transfer => "a request such as `y / r`",
        Rule::EOI => "the end of the statement",
        _ => return None,
    })
}

/// Where a statement leaves the grammar.
struct Place<'t> {
    /// The statement, up to the `{` of its body.
    text: &'t str,
    /// Its first word.
    word: Option<Word>,
    /// What stands before the place, blanks at its end left out.
    before: &'t str,
    /// What can't stand where it does, and all after it.
    rest: &'t str,
    /// What could stand there.
    expected: Vec<&'static str>,
}

/// The diagnostic for a statement that leaves the grammar. `text` begins at `base`.
pub(super) fn failure(text: &str, base: u32, failure: &Failure) -> Diagnostic {
    let at = failure.at.min(text.len());
    let rest = text.get(at..).unwrap_or("");
    let span = Span::new((at as u32).wrapping_add(base), ((at + token_length(rest)) as u32).wrapping_add(base));
    if failure.stack_full {
        return stack_full(span);
    }
    let word = statement_word(&text[..token_length(text)]);
    let before = text.get(..at).unwrap_or("").trim_end();
    let mut place = Place { text, word, before, rest, expected: Vec::new() };
    if at == 0 {
        return place.nothing_after_word(base);
    }
    place.expect(&failure.expected);
    if let Some((message, label, help)) = place.special() {
        return Diagnostic::new(Code::Syntax, message).label(span, label).help(help);
    }
    let expected = match place.expected.as_slice() {
        [] => "something else".to_owned(),
        [one] => (*one).to_owned(),
        [many @ .., last] => format!("{} or {last}", many.join(", ")),
    };
    let diagnostic = Diagnostic::new(Code::Syntax, format!("expected {expected}, found {}", found(text, at)))
        .label(span, format!("expected {expected}"));
    match place.help() {
        Some(help) => diagnostic.help(help),
        None => diagnostic,
    }
}

/// The diagnostic for a statement that the parser had no room on the stack for.
fn stack_full(at: Span) -> Diagnostic {
    Diagnostic::new(Code::LimitReached, "a statement is nested too deep for the stack of this thread")
        .label(at, "here")
        .help("give inner parts names of their own: a `param`, a `define` or a signal")
}

/// Signs that look like those of the language, and what to write.
const LOOKALIKES: [(&[char], &str); 9] = [
    (&['·', '×', '∙', '⋅', '∗'], "`*`"),
    (&['÷', '∕', '⁄'], "`/`"),
    (&['−', '–', '—', '‐'], "`-`"),
    (&['“', '”', '„', '«', '»', '‘', '’', '`'], "`\"`"),
    (&['→', '⟶'], "`->`"),
    (&['≥'], "`>=`"),
    (&['≤'], "`<=`"),
    (&['²', '³', '¹', '⁰', '⁻'], "a power with `^`"),
    (
        &['\u{a0}', '\u{2002}', '\u{2003}', '\u{2009}', '\u{202f}', '\u{3000}', '\u{feff}', '\u{200b}'],
        "an ordinary space",
    ),
];

impl<'t> Place<'t> {
    /// Notes what could stand here, each once, the end of the statement last.
    fn expect(&mut self, rules: &[Rule]) {
        for told in rules.iter().filter_map(|&rule| told(rule)) {
            if !self.expected.contains(&told) {
                self.expected.push(told);
            }
        }
        if self.expects("a value") {
            self.expected.retain(|&told| told != "a name" && told != "`[`");
        }
        if self.expects("an operator") || self.expects("`,`") {
            if let Some(closing) = open_bracket(self.before) {
                self.expected.push(closing);
            }
        }
        if self.expected.is_empty() && self.word == Some(Word::Use) {
            self.expected.push("a path in `\"`");
        }
        if let Some(end) = self.expected.iter().position(|&told| told == told_end()) {
            self.expected.remove(end);
            self.expected.push(told_end());
        }
    }

    fn expects(&self, what: &str) -> bool {
        self.expected.contains(&what)
    }

    /// The name or number with which `before` ends.
    fn last_token(&self) -> &'t str {
        let start = self.before.rfind(|c: char| !unicode_ident::is_xid_continue(c));
        let start = start.map_or(0, |at| at + self.before[at..].chars().next().map_or(1, char::len_utf8));
        &self.before[start..]
    }

    /// The statement whose word has nothing behind it.
    fn nothing_after_word(&self, base: u32) -> Diagnostic {
        let length = token_length(self.text);
        let word = &self.text[..length];
        let expected = match self.word {
            Some(Word::Use) => "a path in `\"`",
            Some(Word::Find) => "a request such as `y / r`",
            Some(Word::Require) => "a metric",
            _ => "a name",
        };
        let span = Span::new(base, base.wrapping_add(length as u32));
        Diagnostic::new(Code::Syntax, format!("expected {expected} after `{word}`"))
            .label(span, "begins a statement")
            .help(format!("`{word}`, a space, then {expected}"))
    }

    /// Message, label and help for what has a better explanation than what could stand there.
    fn special(&self) -> Option<(String, String, String)> {
        let first = self.rest.chars().next()?;
        let owned = |message: &str, label: &str, help: String| Some((message.to_owned(), label.to_owned(), help));
        if let Some((_, instead)) = LOOKALIKES.iter().find(|(signs, _)| signs.contains(&first)) {
            let shown = if first.is_whitespace() || matches!(first, '\u{feff}' | '\u{200b}') {
                format!("the blank U+{:04X}", u32::from(first))
            } else {
                format!("`{first}`")
            };
            let label = "not a sign of the language".to_owned();
            return Some((format!("{shown} can't stand here"), label, format!("write {instead}")));
        }
        let after = &self.rest[first.len_utf8()..];
        if first == '"' && !after.contains('"') {
            return owned(
                "a text is not closed",
                "this `\"` has no other on its line",
                "close the text with `\"`".to_owned(),
            );
        }
        let touches = self.text.len() - self.rest.len() == self.before.len();
        let digits = self.last_token();
        let after_number = digits.starts_with(|c: char| c.is_ascii_digit());
        if touches && after_number && matches!(first, 'e' | 'E') {
            return owned(
                "an exponent has no digits",
                "digits expected after this",
                format!("such as `{digits}{first}3`"),
            );
        }
        let digit_after = after.starts_with(|c: char| c.is_ascii_digit());
        if first == '.' && (after_number || digit_after) {
            return owned(
                "a point has digits on both sides",
                "digits expected on both sides",
                format!("such as `{}`", if after_number { format!("{digits}.0") } else { "0.5".to_owned() }),
            );
        }
        None
    }

    /// Whether the place is in an index.
    fn in_index(&self) -> bool {
        open_bracket(self.before) == Some("`}`")
    }

    /// How to mend it, where that can be guessed.
    fn help(&self) -> Option<String> {
        let next = &self.rest[..token_length(self.rest)];
        let first = next.chars().next();
        let is_name = first.is_some_and(|c| c == '_' || unicode_ident::is_xid_start(c));
        let last = self.last_token();
        let number_before = last.starts_with(|c: char| c.is_ascii_digit());
        if self.expects("an operator") && !self.expects("`%`") {
            if is_name && number_before && self.before.len() + self.rest.len() == self.text.len() {
                return Some(format!("there is no multiplication without `*`: write `{last}*{next}`"));
            }
            if is_name && (number_before || self.before.ends_with(')')) {
                return Some(format!("a unit stands in brackets, such as `[{next}]`; a product has a `*`"));
            }
            if is_name || first == Some('(') || first.is_some_and(|c| c.is_ascii_digit()) {
                return Some("there is no multiplication without `*`".to_owned());
            }
            if first == Some('[') {
                return Some(
                    "a unit stands after a number or a closing parenthesis; a name has the unit that it was declared with"
                        .to_owned(),
                );
            }
        }
        let help = match (next, self.word) {
            ("'", _) if self.expects(told_end()) => "a text stands between `\"`",
            ("=" | ";" | "", Some(Word::Block | Word::Define | Word::Repeat)) if self.in_index() => {
                "a `{` that touches a name is an index: put a space before the `{` of a body"
            }
            ("=", Some(Word::Block)) if self.rest.starts_with("=>") => "the arrow is `->`",
            ("..", _) if self.before.contains("sum(") || self.before.contains("product(") => {
                "a range of an index is written `sum(k in 1..3, …)`"
            }
            ("*", _) if self.before.ends_with('*') => "a power is written with `^`",
            ("=", _) if self.before.ends_with('=') => "write one `=`",
            ("=", Some(Word::Require)) => "a comparison is `>=`, `<=`, `>` or `<`",
            ("==", Some(Word::Require)) => "a comparison is `>=`, `<=`, `>` or `<`",
            (":", _) if self.rest.starts_with(":=") => "write `=`",
            ("+", _) if self.expects("a value") => "leave the `+` out",
            ("[", Some(Word::Define)) if self.expects("a value") => "a matrix stands only as the law of a `block`",
            ("[", _) if self.expects("a value") => "a unit stands after its value, such as `3 [N*m]`",
            (",", _) if number_before && self.decimal_comma() => "a decimal has a point, such as `0.5`",
            (",", Some(Word::Input | Word::Output | Word::Signal | Word::Param)) => "declare one name a line",
            ("/", Some(Word::Find)) if self.text.contains("loop") || self.text.contains("zeros") => {
                "`find loop` and `find zeros` stand alone on their line"
            }
            (_, Some(Word::Find)) if self.before.ends_with("loop") => "a return ratio is `find loop at u`",
            ("", Some(Word::Find)) if self.text.contains("zeros") => {
                "transmission zeros are `find zeros y1, y2 / u1, u2`"
            }
            ("", Some(Word::Find)) if self.expects("`/`") => "a request names two signals: `y / r` is y's answer to r",
            (_, Some(Word::Require)) if self.expects("`/`") => "what a metric is asked of is `at u` or `y/r`",
            (_, Some(Word::Param)) if self.expects("`%`") => "a tolerance is `within 5%` or `within 3.0 .. 3.4 [unit]`",
            ("=", Some(Word::Define)) if self.expects("`(`") => {
                "a `define` has parameters: `define f(T) = …`; a value is a `param`"
            }
            ("=", Some(Word::Repeat)) => "such as `repeat k in 1..8 {`",
            ("", Some(Word::Define | Word::Repeat | Word::Case | Word::Block)) if self.expects("`{`") => {
                "the `{` of a body stands on the line of its statement, after a space"
            }
            (_, Some(Word::Model)) if self.expects(told_end()) => "a description stands between `\"`",
            _ => return self.form().map(|form| format!("its form is {form}")),
        };
        Some(help.to_owned())
    }

    /// Whether digits follow a comma at once: `0,5`.
    fn decimal_comma(&self) -> bool {
        self.rest.get(1..).is_some_and(|after| after.starts_with(|c: char| c.is_ascii_digit()))
    }

    /// How a statement of this kind is written.
    fn form(&self) -> Option<&'static str> {
        Some(match self.word? {
            Word::Model => "`model NAME \"description\"`",
            Word::Use => "`use \"path/to/file.loop\"`",
            Word::Unit => "`unit NAME = NUMBER [UNIT]`",
            Word::Param => "`param NAME = VALUE [UNIT]`",
            Word::Input => "`input NAME [UNIT] \"description\"`",
            Word::Output => "`output NAME [UNIT] \"description\"`",
            Word::Signal => "`signal NAME [UNIT] \"description\"`",
            Word::Sum => "`sum NAME = a - b + 0.5*c`",
            Word::Block => "`block NAME : INPUT -> OUTPUT = LAW`",
            Word::Define => "`define NAME(PARAMETERS) = LAW`, or with `: INPUTS -> OUTPUTS { … }`",
            Word::Repeat => "`repeat k in 1..8 {`",
            Word::Case => "`case NAME { PARAM = VALUE }`",
            Word::Find => "`find y / r`, `find loop at u` or `find all`",
            Word::Require => "`require FIGURE at u >= VALUE`, or with `y/r` in place of `at u`",
        })
    }
}

/// What is told of the end of a statement.
fn told_end() -> &'static str {
    told(Rule::EOI).unwrap_or_default()
}

/// The sign that closes the innermost bracket that is open at the end of `text`.
fn open_bracket(text: &str) -> Option<&'static str> {
    let mut open = Vec::new();
    let mut in_text = false;
    for byte in text.bytes() {
        match byte {
            b'"' => in_text = !in_text,
            _ if in_text => {}
            b'(' => open.push("`)`"),
            b'[' => open.push("`]`"),
            b'{' => open.push("`}`"),
            b')' | b']' | b'}' => {
                open.pop();
            }
            _ => {}
        }
    }
    open.pop()
}

/// The diagnostic for a unit whose text leaves the grammar; `inside` is the place of that text.
pub(super) fn unit_failure(text: &str, inside: Span, failure: &Failure) -> Diagnostic {
    let at = failure.at.min(text.len()) as u32 + inside.start;
    let length = text.get(failure.at..).map_or(0, token_length) as u32;
    Diagnostic::new(Code::Syntax, format!("`[{text}]` is no unit"))
        .label(Span::new(at, at + length), "not understood")
        .help("a unit is made of symbols, `*`, `/`, parentheses and whole powers, such as `[N*m/rad]`; `[1]` is none")
}
