//! The splitter: from a text to its statements, by hand and in one pass, before the grammar sees any of them.
//!
//! It knows what ends a statement: the end of its line, unless the line ends in `,` `=` `->` or an operator or a
//! bracket is open; a `;` inside `{ }`; the `{` of a body and its `}`. It counts brackets, so that the grammar, which is
//! recursive, never sees more than [`MAX_NESTING`] of them.
//!
//! How it finds its way after a mistake:
//!
//! - A line that begins with a statement word and then a name begins a statement, even where a bracket is open or the
//!   line before ends in an operator: the thirteen words are no names, so nothing else can be meant.
//! - Such a line also ends a body of state equations or of a `case` whose `}` is missing.
//! - Where the end of the text finds a body open, the text from there is split again, and now a statement word in
//!   column 0 closes every body whose first line was indented.

use super::words::{Word, nearest, statement_word};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;

/// The deepest nesting of brackets in a statement, and of bodies in a text.
///
/// The grammar and the passes after it are recursive over brackets; some thousand levels would overflow the stack.
pub const MAX_NESTING: usize = 256;

/// What an [`Item`] is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum ItemKind {
    /// A whole statement.
    Line(Word),
    /// A statement up to and with the `{` of its body.
    Head(Word),
    /// A `{` whose statement is not known: what stands in the body is not read.
    LostHead,
    /// A line in a body of state equations.
    Equation,
    /// A line in the body of a `case`.
    Setting,
    /// The `}` of the innermost open body.
    Close,
    /// A statement of which the splitter has told what is wrong.
    Lost,
}

/// A piece of the text for the grammar.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Item {
    /// What it is.
    pub(super) kind: ItemKind,
    /// Byte position of its start in the text.
    pub(super) start: u32,
    /// Byte position after its last byte.
    pub(super) end: u32,
    /// Whether the grammar may read it among others: nothing is wrong with it so far.
    pub(super) sound: bool,
}

/// A text in pieces.
#[derive(Debug, Default)]
pub(super) struct Split {
    /// The pieces in their order.
    pub(super) items: Vec<Item>,
    /// The comments, from `#` to the end of the line.
    pub(super) comments: Vec<Span>,
    /// What is wrong already here.
    pub(super) diagnostics: Vec<Diagnostic>,
}

/// What the lines in a body are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Body {
    Define,
    Repeat,
    Equations,
    Settings,
    Unknown,
}

/// A body whose `}` has not come yet.
#[derive(Clone, Copy, Debug)]
struct OpenBody {
    kind: Body,
    /// Position of its `{`.
    brace: usize,
    /// Whether its first line is indented; `None` before that line.
    indented: Option<bool>,
    /// The state before its statement, to come back to.
    before: Mark,
}

/// A state of the splitter to come back to.
#[derive(Clone, Copy, Debug)]
struct Mark {
    position: usize,
    items: usize,
    comments: usize,
    diagnostics: usize,
}

/// How a statement ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Ending {
    Line,
    Semicolon,
    Body,
    CloseBrace,
}

/// What a byte means to the splitter.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Class {
    Blank,
    LineEnd,
    Name,
    Digit,
    Quote,
    Hash,
    Control,
    Open,
    Close,
    BraceOpen,
    BraceClose,
    Semicolon,
    Other,
}

/// The class of each byte; bytes of longer characters count as letters, the grammar looks closer.
const CLASSES: [Class; 256] = {
    let mut table = [Class::Other; 256];
    let mut byte = 0;
    while byte < 256 {
        table[byte] = match byte as u8 {
            b' ' | b'\t' | b'\r' => Class::Blank,
            b'\n' => Class::LineEnd,
            b'a'..=b'z' | b'A'..=b'Z' | b'_' | 128..=255 => Class::Name,
            b'0'..=b'9' => Class::Digit,
            0..=31 | 127 => Class::Control,
            b'"' => Class::Quote,
            b'#' => Class::Hash,
            b'(' | b'[' => Class::Open,
            b')' | b']' => Class::Close,
            b'{' => Class::BraceOpen,
            b'}' => Class::BraceClose,
            b';' => Class::Semicolon,
            _ => Class::Other,
        };
        byte += 1;
    }
    table
};

fn class(byte: u8) -> Class {
    CLASSES[byte as usize]
}

/// Splits `text`; positions in items count from its start, spans have `base` added.
pub(super) fn split(text: &str, base: u32) -> Split {
    let start = if text.starts_with('\u{feff}') { '\u{feff}'.len_utf8() } else { 0 };
    let mut splitter = Splitter {
        text,
        bytes: text.as_bytes(),
        base,
        position: start,
        out: Split::default(),
        bodies: Vec::new(),
        brackets: Vec::new(),
        strict: false,
        after_body: false,
        sound: true,
        lost: false,
        quiet: false,
    };
    splitter.run();
    splitter.out
}

struct Splitter<'t> {
    text: &'t str,
    bytes: &'t [u8],
    base: u32,
    position: usize,
    out: Split,
    bodies: Vec<OpenBody>,
    /// The brackets open in the current statement: position and byte. An index's `{` is one of them.
    brackets: Vec<(usize, u8)>,
    /// Whether a statement word in column 0 closes bodies.
    strict: bool,
    /// Whether a body has been closed on this line.
    after_body: bool,
    /// Whether the current item stands in the text as it should.
    sound: bool,
    /// Whether the grammar can't read the current statement, for a mistake that has been told.
    lost: bool,
    /// Whether enough has been told of the current statement: nobody knows what it is.
    quiet: bool,
}

impl Splitter<'_> {
    fn run(&mut self) {
        loop {
            self.skip_between();
            let Some(&byte) = self.bytes.get(self.position) else {
                if self.bodies.is_empty() || !self.split_again() {
                    return;
                }
                continue;
            };
            if byte == b'}' {
                self.close_brace();
            } else {
                self.statement();
            }
        }
    }

    fn span(&self, start: usize, end: usize) -> Span {
        Span::new(start as u32 + self.base, end as u32 + self.base)
    }

    fn push(&mut self, kind: ItemKind, start: usize, end: usize) {
        let sound = self.sound && !matches!(kind, ItemKind::Lost | ItemKind::LostHead);
        self.out.items.push(Item { kind, start: start as u32, end: end as u32, sound });
    }

    fn tell(&mut self, diagnostic: Diagnostic) {
        self.out.diagnostics.push(diagnostic);
    }

    /// Tells a mistake after which the grammar can't read the statement.
    fn lose(&mut self, diagnostic: Diagnostic) {
        self.lost = true;
        if !self.quiet {
            self.tell(diagnostic);
        }
    }

    fn mark(&self) -> Mark {
        Mark {
            position: self.position,
            items: self.out.items.len(),
            comments: self.out.comments.len(),
            diagnostics: self.out.diagnostics.len(),
        }
    }

    /// Goes over all that may stand between statements.
    fn skip_between(&mut self) {
        while let Some(&byte) = self.bytes.get(self.position) {
            match class(byte) {
                Class::Blank => self.position += 1,
                Class::LineEnd => {
                    self.position += 1;
                    self.after_body = false;
                }
                Class::Hash => self.comment(),
                Class::Semicolon => {
                    if self.bodies.is_empty() {
                        self.tell_semicolon();
                    }
                    self.position += 1;
                    self.after_body = false;
                }
                _ => return,
            }
        }
    }

    /// Takes the comment that begins here, its line end excluded.
    fn comment(&mut self) {
        let rest = &self.bytes[self.position..];
        let mut length = rest.iter().position(|&b| b == b'\n').unwrap_or(rest.len());
        if length > 0 && rest[length - 1] == b'\r' {
            length -= 1;
        }
        self.out.comments.push(self.span(self.position, self.position + length));
        self.position += length;
    }

    fn tell_semicolon(&mut self) {
        let at = self.span(self.position, self.position + 1);
        self.tell(
            Diagnostic::new(Code::Syntax, "`;` separates statements only inside `{ }`")
                .label(at, "not inside a body")
                .help("begin a new line instead"),
        );
    }

    /// The first word at `start`, empty where none begins there.
    fn word_at(&self, start: usize) -> &str {
        let length =
            self.bytes[start..].iter().take_while(|&&b| matches!(class(b), Class::Name | Class::Digit)).count();
        self.text.get(start..start + length).unwrap_or("")
    }

    /// Whether a statement begins at `start` beyond doubt: one of the thirteen words, a blank, and what begins a name or
    /// a text.
    fn statement_begins(&self, start: usize) -> bool {
        let word = self.word_at(start);
        if !statement_word(word).is_some_and(|w| w != Word::Unit) {
            return false;
        }
        let after = &self.bytes[start + word.len()..];
        let blanks = after.iter().take_while(|&&b| b == b' ' || b == b'\t').count();
        blanks > 0 && after.get(blanks).is_some_and(|&b| matches!(class(b), Class::Name | Class::Quote))
    }

    /// Whether `position` is the first place of its line that is no blank; and whether it is in column 0.
    fn line_place(&self, position: usize) -> (bool, bool) {
        let before = self.bytes[..position].iter().rev();
        let blanks = before.take_while(|&&b| b == b' ' || b == b'\t').count();
        let first = position == blanks
            || self.bytes[position - blanks - 1] == b'\n'
            || self.bytes[..position - blanks] == *"\u{feff}".as_bytes();
        (first, first && blanks == 0)
    }

    /// Takes a `}` that stands where a statement could begin.
    fn close_brace(&mut self) {
        let at = self.position;
        self.position += 1;
        if self.bodies.pop().is_some() {
            self.push(ItemKind::Close, at, at + 1);
            self.after_body = true;
        } else {
            let span = self.span(at, at + 1);
            self.tell(
                Diagnostic::new(Code::Syntax, "a `}` without its `{`")
                    .label(span, "no body is open here")
                    .help("take it out, or begin the body with ` {` at the end of its first line"),
            );
        }
    }

    /// Takes the statement that begins here, or closes bodies that it shows to be unclosed.
    fn statement(&mut self) {
        let start = self.position;
        if !self.bodies.is_empty() && self.closes_bodies(start) {
            return;
        }
        let mark = self.mark();
        self.note_indentation(start);
        let context = self.bodies.last().map(|b| b.kind);
        let told_before = self.out.diagnostics.len();
        if self.after_body {
            let at = self.span(start, start + self.word_at(start).len().max(1));
            self.tell(
                Diagnostic::new(Code::Syntax, "a new statement begins on the line on which a body ends")
                    .label(at, "belongs on a line of its own")
                    .help("begin a new line after `}`"),
            );
            self.after_body = false;
        }
        let word = match context {
            None | Some(Body::Define | Body::Repeat) => self.first_word(start),
            Some(_) => None,
        };
        self.lost = false;
        self.quiet = word.is_none() && !matches!(context, Some(Body::Equations | Body::Settings));
        let (end, ending) = self.find_end(start, word);
        let kind = match (ending, context, word) {
            (Ending::Body, _, Some(word)) if !self.lost => ItemKind::Head(word),
            (Ending::Body, ..) => ItemKind::LostHead,
            (_, Some(Body::Unknown), _) => ItemKind::Lost,
            _ if self.lost => ItemKind::Lost,
            (_, Some(Body::Equations), _) => ItemKind::Equation,
            (_, Some(Body::Settings), _) => ItemKind::Setting,
            (_, _, Some(word)) => ItemKind::Line(word),
            (_, _, None) => ItemKind::Lost,
        };
        if ending == Ending::Body && matches!(context, Some(Body::Equations | Body::Settings)) {
            let brace = self.span(end - 1, end);
            self.tell(
                Diagnostic::new(Code::Syntax, "a body can't begin here")
                    .label(brace, "inside another body without statements")
                    .help("lines here are `NAME = VALUE`"),
            );
        }
        self.sound = self.out.diagnostics.len() == told_before;
        self.push(kind, start, end);
        self.sound = true;
        if ending == Ending::Body {
            self.open_body(word, context, end - 1, mark);
        }
    }

    fn open_body(&mut self, word: Option<Word>, context: Option<Body>, brace: usize, before: Mark) {
        let kind = match (context, word) {
            (Some(Body::Unknown), _) => Body::Unknown,
            (_, Some(Word::Define)) => Body::Define,
            (_, Some(Word::Repeat)) => Body::Repeat,
            (_, Some(Word::Block)) => Body::Equations,
            (_, Some(Word::Case)) => Body::Settings,
            _ => Body::Unknown,
        };
        if self.bodies.len() == MAX_NESTING {
            let at = self.span(brace, brace + 1);
            self.tell(too_deep(at));
        }
        let kind = if self.bodies.len() >= MAX_NESTING { Body::Unknown } else { kind };
        self.bodies.push(OpenBody { kind, brace, indented: None, before });
    }

    /// Notes for the innermost body whether its first line is indented.
    fn note_indentation(&mut self, start: usize) {
        if self.bodies.last().is_some_and(|body| body.indented.is_none()) {
            let (first, column_0) = self.line_place(start);
            if let Some(body) = self.bodies.last_mut() {
                body.indented = Some(!(first && column_0));
            }
        }
    }

    /// Closes the bodies that the statement at `start` shows to be unclosed, and tells it; whether there were any.
    fn closes_bodies(&mut self, start: usize) -> bool {
        if !self.statement_begins(start) {
            return false;
        }
        let (first, column_0) = self.line_place(start);
        let inner = self.bodies.last().map(|b| b.kind);
        if first && matches!(inner, Some(Body::Equations | Body::Settings)) {
            self.close_unclosed(start);
            return true;
        }
        let outermost_indented = self.bodies.first().is_some_and(|b| b.indented == Some(true));
        if self.strict && column_0 && outermost_indented {
            while !self.bodies.is_empty() {
                self.close_unclosed(start);
            }
            return true;
        }
        false
    }

    /// Closes the innermost body, whose `}` should stand before `place`.
    fn close_unclosed(&mut self, place: usize) {
        let Some(body) = self.bodies.pop() else { return };
        let (brace, here) = (self.span(body.brace, body.brace + 1), self.span(place, place));
        self.sound = false;
        self.push(ItemKind::Close, place, place);
        self.sound = true;
        // Where too many are open, that has been told; one more diagnostic for each would drown it.
        if self.bodies.len() < MAX_NESTING {
            self.tell(
                Diagnostic::new(Code::Syntax, "a body is not closed")
                    .label(brace, "this `{` has no `}`")
                    .label(here, "`}` expected before this")
                    .help("close the body with `}` on a line of its own"),
            );
        }
    }

    /// At the end of the text with bodies open: goes back and closes them where they should end. `false` when done.
    fn split_again(&mut self) -> bool {
        if self.strict {
            while !self.bodies.is_empty() {
                self.close_unclosed(self.bytes.len());
            }
            return false;
        }
        self.strict = true;
        let before = self.bodies[0].before;
        self.bodies.clear();
        self.position = before.position;
        self.out.items.truncate(before.items);
        self.out.comments.truncate(before.comments);
        self.out.diagnostics.truncate(before.diagnostics);
        self.after_body = false;
        true
    }

    /// The word with which the statement at `start` begins; the nearest one, told, where it is misspelt; `None`, told,
    /// where it is none at all.
    fn first_word(&mut self, start: usize) -> Option<Word> {
        let written = self.word_at(start);
        if let Some(word) = statement_word(written) {
            return Some(word);
        }
        let length = if written.is_empty() {
            self.text.get(start..).and_then(|t| t.chars().next()).map_or(1, char::len_utf8)
        } else {
            written.len()
        };
        let diagnostic = super::explain::unknown_word(self.text, self.base, start, length);
        let meant = nearest(written).map(|(_, word)| word);
        self.tell(diagnostic);
        meant
    }
}

/// What ends a row of bytes in the inner loop of the splitter.
#[derive(Clone, Copy)]
struct Progress {
    /// Position after the last byte that is neither blank nor comment.
    end: usize,
    /// The first bracket that is nested too deep.
    too_deep: Option<usize>,
}

impl Splitter<'_> {
    /// Goes from `start` to the end of the statement; gives the position after its last byte and how it ended. What
    /// is wrong with its brackets is told.
    fn find_end(&mut self, start: usize, word: Option<Word>) -> (usize, Ending) {
        self.brackets.clear();
        let mut progress = Progress { end: start, too_deep: None };
        let ending = loop {
            let Some(&byte) = self.bytes.get(self.position) else { break Ending::Line };
            match class(byte) {
                Class::Blank => {
                    self.position += 1;
                    continue;
                }
                Class::Hash => {
                    self.comment();
                    continue;
                }
                Class::LineEnd => {
                    if self.line_ends_statement(start, progress.end, word) {
                        break Ending::Line;
                    }
                    // An index left open at the end of its line was the `{` of a body.
                    if self.bytes[progress.end - 1] == b'{' && self.brackets.is_empty() {
                        break Ending::Body;
                    }
                    self.position += 1;
                    continue;
                }
                Class::Name => self.name(word),
                Class::Digit => self.number(),
                Class::Quote => self.text_in_quotes(),
                Class::Open => {
                    self.brackets.push((self.position, byte));
                    self.position += 1;
                }
                Class::Close => {
                    self.close_bracket(byte);
                    self.position += 1;
                }
                Class::BraceOpen => {
                    self.position += 1;
                    progress.end = self.position;
                    break Ending::Body;
                }
                Class::BraceClose => {
                    if !self.brackets.iter().rev().any(|&(_, b)| b == b'{') {
                        break Ending::CloseBrace;
                    }
                    self.close_bracket(byte);
                    self.position += 1;
                    // `T{i}{j}`
                    if self.bytes.get(self.position) == Some(&b'{') {
                        self.brackets.push((self.position, b'{'));
                        self.position += 1;
                    }
                }
                Class::Semicolon => break Ending::Semicolon,
                Class::Control => self.control(),
                Class::Other => self.position += 1,
            }
            progress.end = self.position;
            if self.brackets.len() > MAX_NESTING && progress.too_deep.is_none() {
                progress.too_deep = self.brackets.last().map(|&(at, _)| at);
            }
        };
        if let Some(at) = progress.too_deep {
            let at = self.span(at, at + 1);
            self.lose(too_deep(at));
        } else {
            self.tell_unclosed(progress.end);
        }
        (progress.end, ending)
    }

    /// Takes a control character, which stands nowhere.
    fn control(&mut self) {
        let span = self.span(self.position, self.position + 1);
        let code = self.bytes[self.position];
        self.lose(
            Diagnostic::new(Code::Syntax, "a control character can't stand in a statement")
                .label(span, format!("the character with the number {code}"))
                .help("take it out, or put a space in its place"),
        );
        self.position += 1;
    }

    /// Takes a name; a `{` that touches it opens an index.
    fn name(&mut self, word: Option<Word>) {
        let rest = &self.bytes[self.position..];
        self.position += rest.iter().take_while(|&&b| matches!(class(b), Class::Name | Class::Digit)).count();
        if self.bytes.get(self.position) == Some(&b'{') {
            if word == Some(Word::Case) {
                // A case's name has no index, so a body is meant; it is read as one.
                self.tell_touching(self.position);
            } else {
                self.brackets.push((self.position, b'{'));
                self.position += 1;
            }
        }
    }

    /// Tells that the `{` at `at` should begin a body.
    fn tell_touching(&mut self, at: usize) {
        let span = self.span(at, at + 1);
        self.tell(
            Diagnostic::new(Code::Syntax, "a `{` that touches a name is an index")
                .label(span, "a body is meant")
                .help("put a space before the `{` of a body"),
        );
    }

    /// Takes a number with its exponent, so that the `{` after `1..1e3{` touches no name.
    fn number(&mut self) {
        let digits = |from: usize| self.bytes[from..].iter().take_while(|b| b.is_ascii_digit()).count();
        self.position += digits(self.position);
        if matches!(self.bytes.get(self.position), Some(b'e' | b'E')) {
            let sign = usize::from(matches!(self.bytes.get(self.position + 1), Some(b'+' | b'-')));
            let exponent = self.position + 1 + sign;
            let length = if exponent <= self.bytes.len() { digits(exponent) } else { 0 };
            if length > 0 {
                self.position = exponent + length;
            }
        }
    }

    /// Takes a text; one that is not closed ends with its line.
    fn text_in_quotes(&mut self) {
        self.position += 1;
        let rest = &self.bytes[self.position..];
        match rest.iter().position(|&b| b == b'"' || b == b'\n') {
            Some(length) => self.position += length + usize::from(rest[length] == b'"'),
            None => self.position = self.bytes.len(),
        }
    }

    /// Takes a closing bracket off the open ones; the first that does not fit is told.
    fn close_bracket(&mut self, byte: u8) {
        let opener = match byte {
            b')' => b'(',
            b']' => b'[',
            _ => b'{',
        };
        match self.brackets.last() {
            Some(&(_, open)) if open == opener => {
                self.brackets.pop();
            }
            // One without an opener is the grammar's to tell.
            None => {}
            Some(&(at, open)) => {
                if self.brackets.len() <= MAX_NESTING {
                    let (here, there) = (self.span(self.position, self.position + 1), self.span(at, at + 1));
                    let (byte, open) = (char::from(byte), char::from(open));
                    let wanted = closing(open);
                    self.lose(
                        Diagnostic::new(Code::Syntax, format!("`{byte}` does not close `{open}`"))
                            .label(here, format!("`{wanted}` expected"))
                            .label(there, "opened here")
                            .help(format!("close `{open}` with `{wanted}` first")),
                    );
                }
                self.brackets.clear();
            }
        }
    }

    /// Whether the statement ends with the line that ends here. `end` is the position after its last byte so far.
    fn line_ends_statement(&mut self, start: usize, end: usize, word: Option<Word>) -> bool {
        if let Some(&(at, b'{')) = self.brackets.first() {
            // An index stands on one line. A lone `{` at the end of a first line was meant to begin a body.
            let takes_body = matches!(word, Some(Word::Block | Word::Define | Word::Repeat | Word::Case));
            if at + 1 == end && self.brackets.len() == 1 && takes_body {
                self.tell_touching(at);
                // The grammar takes it for an index after the name of an output.
                self.lost = word == Some(Word::Block);
                self.brackets.clear();
                return false;
            }
            return true;
        }
        let goes_on = !self.brackets.is_empty() || line_goes_on(&self.bytes[start..end]);
        if !goes_on {
            return true;
        }
        // Blank lines and lines with a comment alone may stand between; a new statement may not.
        let next = self.position + 1;
        let blanks = self.bytes[next..].iter().take_while(|&&b| class(b) == Class::Blank).count();
        self.statement_begins(next + blanks)
    }

    /// Tells the innermost bracket that is still open at the end of the statement.
    fn tell_unclosed(&mut self, end: usize) {
        let Some(&(at, open)) = self.brackets.last() else { return };
        let open = char::from(open);
        let wanted = closing(open);
        let (message, help) = match open {
            '(' => ("a parenthesis is not closed", "close it with `)`"),
            '[' => ("a bracket is not closed", "close it with `]`"),
            _ => (
                "an index is not closed",
                "close it with `}` on the same line; the `{` of a body has a space before it",
            ),
        };
        let (here, there) = (self.span(at, at + 1), self.span(end, end));
        self.lose(
            Diagnostic::new(Code::Syntax, message)
                .label(here, format!("this `{open}` has no `{wanted}`"))
                .label(there, format!("`{wanted}` expected here at the latest"))
                .help(help),
        );
        self.brackets.clear();
    }
}

fn closing(open: char) -> char {
    match open {
        '(' => ')',
        '[' => ']',
        _ => '}',
    }
}

/// Whether a line that ends in this text goes on in the next: after `,` `=` `->`, an operator, a comparison or `..`.
fn line_goes_on(line: &[u8]) -> bool {
    matches!(line, [.., b',' | b'=' | b'+' | b'-' | b'*' | b'/' | b'^' | b'<' | b'>'] | [.., b'.', b'.'])
}

/// The diagnostic for more than [`MAX_NESTING`] levels.
pub(super) fn too_deep(at: Span) -> Diagnostic {
    Diagnostic::new(Code::LimitReached, format!("brackets are nested more than {MAX_NESTING} deep"))
        .label(at, "here")
        .help("give inner parts names of their own: a `param`, a `define` or a signal")
}
