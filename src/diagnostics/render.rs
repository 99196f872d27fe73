//! Diagnostics as reports for people. The only file that knows the library which draws them.
//!
//! Everything about the picture (colour, width) is decided by the caller, once for the whole run: the library's own
//! detection is left out of its build. Texts are read through our own line index, so that a report costs the lines
//! that it shows and not the length of the file.

use super::{Diagnostic, Severity};
use crate::source::{File, SourceMap, Span};
use miette::{GraphicalReportHandler, GraphicalTheme, LabeledSpan, MietteError, MietteSpanContents, SourceSpan};
use miette::{SourceCode, SpanContents, ThemeCharacters, ThemeStyles};
use std::borrow::Cow;
use std::fmt::{self, Write as _};
use std::sync::OnceLock;
use unicode_width::UnicodeWidthStr as _;

/// The most diagnostics drawn in full: nobody mends more than this in one go, and a file that is not in the language
/// at all has one for each of its lines.
const MAX_FULL_REPORTS: usize = 60;

/// The most places drawn for one diagnostic: a loop through a thousand blocks stays readable.
const MAX_LABELS_SHOWN: usize = 40;

/// The most bytes of text around one place: longer lines are shown as a window.
const MAX_EXCERPT_BYTES: usize = 1200;

/// The most bytes that one place marks, and half of what a window shows besides.
const MAX_MARKED_BYTES: usize = 160;

/// The narrowest and the widest report: below, nothing fits beside the line numbers; above, lines tire the eye.
const WIDTHS: (usize, usize) = (40, 120);

/// How reports look; decided once for a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Style {
    /// Whether to colour with ANSI escapes.
    pub color: bool,
    /// Columns to wrap at.
    pub width: usize,
}

/// Draws diagnostics, sorted by place: order of the files, then position; those without a place stand last.
///
/// Past a named number only the gravest are drawn, and the last line says how many there are besides. Gives the empty
/// text for no diagnostics.
pub fn render(diagnostics: &[Diagnostic], sources: &SourceMap, style: Style) -> String {
    let mut shown: Vec<&Diagnostic> = diagnostics.iter().collect();
    if shown.len() > MAX_FULL_REPORTS {
        shown.sort_by_key(|d| d.severity);
        shown.truncate(MAX_FULL_REPORTS);
    }
    shown.sort_by_key(|d| d.labels.first().map_or(Span::NONE, |l| l.span));
    let texts = Texts::new(sources);
    let handler = handler(style);
    let mut out = String::new();
    for diagnostic in &shown {
        header(&mut out, diagnostic, style);
        let report = Report::new(diagnostic, &texts, style.width);
        let body_start = out.len();
        if handler.render_report(&mut out, &report).is_err() {
            // The library could not draw it: the plain facts serve as well.
            out.truncate(body_start);
            let _ = writeln!(out, "  {report}");
        }
        out.push('\n');
    }
    let hidden = diagnostics.len() - shown.len();
    if hidden > 0 {
        let _ = writeln!(out, "… and {hidden} more; mend these first, or list all with --format json\n");
    }
    out
}

/// `2 errors, 1 warning`; empty for none.
pub fn summary<'a>(diagnostics: impl IntoIterator<Item = &'a Diagnostic>) -> String {
    let mut counts = [0usize; 3];
    for d in diagnostics {
        counts[d.severity as usize] += 1;
    }
    let words = [Severity::Error, Severity::Warning, Severity::Note].map(word);
    let told = counts.iter().zip(words).filter(|(n, _)| **n > 0);
    told.map(|(n, w)| format!("{n} {w}{}", if *n == 1 { "" } else { "s" })).collect::<Vec<_>>().join(", ")
}

/// Breaks a text into lines of at most `width` columns at its blanks; a longer word stands alone. Its own line breaks
/// stay.
pub fn wrap(text: &str, width: usize) -> Vec<String> {
    let mut lines = Vec::new();
    for paragraph in text.split('\n') {
        let mut line = String::new();
        for word in paragraph.split(' ').filter(|w| !w.is_empty()) {
            if !line.is_empty() && line.width() + 1 + word.width() > width {
                lines.push(std::mem::take(&mut line));
            }
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
        lines.push(line);
    }
    lines
}

/// The same text, each byte at its place, without characters that would steer a terminal: control characters, and
/// those that change the direction of writing.
pub fn clean(text: &str) -> Cow<'_, str> {
    // All of them are ASCII controls or begin with one of two bytes: most texts are done after one scan.
    let suspect = |b: u8| (b < 0x20 && !matches!(b, b'\n' | b'\r' | b'\t')) || matches!(b, 0x7f | 0xc2 | 0xe2);
    if !text.bytes().any(suspect) {
        return Cow::Borrowed(text);
    }
    let replaced = text.chars().map(|c| match c {
        '\n' | '\r' | '\t' => c,
        '\0'..='\u{1f}' | '\u{7f}' => '?',
        '\u{80}'..='\u{9f}' => '¿',
        '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' => '\u{fffd}',
        _ => c,
    });
    Cow::Owned(replaced.collect())
}

const fn word(severity: Severity) -> &'static str {
    match severity {
        Severity::Error => "error",
        Severity::Warning => "warning",
        Severity::Note => "note",
    }
}

/// `error: unknown-name`, the line above each report.
fn header(out: &mut String, diagnostic: &Diagnostic, style: Style) {
    let text = format!("{}: {}", word(diagnostic.severity), diagnostic.code.word());
    let color = match diagnostic.severity {
        Severity::Error => 31,
        Severity::Warning => 33,
        Severity::Note => 36,
    };
    let _ = if style.color { writeln!(out, "\u{1b}[1;{color}m{text}\u{1b}[0m") } else { writeln!(out, "{text}") };
}

fn handler(style: Style) -> GraphicalReportHandler {
    let styles = if style.color { ThemeStyles::ansi() } else { ThemeStyles::none() };
    GraphicalReportHandler::new_themed(GraphicalTheme { characters: ThemeCharacters::unicode(), styles })
        .with_width(style.width.clamp(WIDTHS.0, WIDTHS.1))
        .with_urls(false)
        .without_syntax_highlighting()
        .with_context_lines(1)
}

/// One diagnostic in the form that the library draws.
#[derive(Debug)]
struct Report<'a> {
    message: Cow<'a, str>,
    help: Option<String>,
    severity: Severity,
    labels: Vec<LabeledSpan>,
    texts: &'a Texts<'a>,
}

impl<'a> Report<'a> {
    fn new(diagnostic: &'a Diagnostic, texts: &'a Texts<'a>, width: usize) -> Self {
        let labels = diagnostic.labels.iter().take(MAX_LABELS_SHOWN).enumerate();
        let labels: Vec<LabeledSpan> = labels.filter_map(|(i, l)| texts.label(l, i == 0, width)).collect();
        let mut help = diagnostic.help.as_deref().map(|h| clean(h).into_owned());
        if diagnostic.labels.len() > MAX_LABELS_SHOWN {
            let more = format!("{} more places are not drawn", diagnostic.labels.len() - MAX_LABELS_SHOWN);
            help = Some(help.map_or_else(|| more.clone(), |h| format!("{h}\n{more}")));
        }
        let message = clean(&diagnostic.message);
        Self { message, help, severity: diagnostic.severity, labels, texts }
    }
}

impl fmt::Display for Report<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.message)
    }
}

impl std::error::Error for Report<'_> {}

impl miette::Diagnostic for Report<'_> {
    fn severity(&self) -> Option<miette::Severity> {
        Some(match self.severity {
            Severity::Error => miette::Severity::Error,
            Severity::Warning => miette::Severity::Warning,
            Severity::Note => miette::Severity::Advice,
        })
    }

    fn help<'a>(&'a self) -> Option<Box<dyn fmt::Display + 'a>> {
        self.help.as_ref().map(|h| Box::new(h) as Box<dyn fmt::Display>)
    }

    fn source_code(&self) -> Option<&dyn SourceCode> {
        (!self.labels.is_empty()).then_some(self.texts as &dyn SourceCode)
    }

    fn labels(&self) -> Option<Box<dyn Iterator<Item = LabeledSpan> + '_>> {
        Some(Box::new(self.labels.iter().cloned()))
    }
}

/// All texts of a run as one source: positions are those of the [`SourceMap`], so that the places of one diagnostic
/// may lie in several files.
#[derive(Debug)]
struct Texts<'m> {
    sources: &'m SourceMap,
    /// The texts without characters that steer a terminal, each made when it is first shown.
    cleaned: Vec<OnceLock<Cow<'m, str>>>,
}

impl<'m> Texts<'m> {
    fn new(sources: &'m SourceMap) -> Self {
        Self { sources, cleaned: sources.files().iter().map(|_| OnceLock::new()).collect() }
    }

    /// The file in which a position lies, and its text as it may be shown.
    fn at(&self, position: u32) -> Option<(&'m File, &str)> {
        let place = self.sources.files().partition_point(|f| f.base <= position).checked_sub(1)?;
        let file = &self.sources.files()[place];
        Some((file, self.cleaned.get(place)?.get_or_init(|| clean(&file.text))))
    }

    /// A label in the library's form; none for what stands in no text or in an empty one.
    ///
    /// A place beyond the end is moved to the last character, and one that runs over several lines, or very far, is
    /// marked on its first line only: so the library always finds it.
    fn label(&self, label: &super::Label, primary: bool, width: usize) -> Option<LabeledSpan> {
        if label.span == Span::NONE {
            return None;
        }
        let (file, text) = self.at(label.span.start)?;
        let mut start = ((label.span.start - file.base) as usize).min(text.len());
        let used = text.trim_end().len();
        if start > used {
            start = used;
        }
        if start == text.len() {
            start = text.char_indices().next_back()?.0;
        }
        let start = floor(text, start.max(bom(text)));
        let line = file.line_index(start as u32);
        let line_start = file.line_start(line) as usize;
        let line_end = line_start + file.line_text(line).len();
        let end = ((label.span.end - file.base) as usize).min(line_end).min(start + MAX_MARKED_BYTES);
        let end = floor(text, end.max(start));
        // What is left beside the line numbers and the mark, which hangs from the middle of the place.
        let before = text.get(line_start..usize::midpoint(start, end)).map_or(0, |t| t.chars().count());
        let room = width.clamp(WIDTHS.0, WIDTHS.1).saturating_sub(12 + before.min(MAX_MARKED_BYTES)).max(24);
        let told = wrap(&clean(&label.text), room).join("\n");
        let (offset, length) = (file.base as usize + start, end - start);
        let told = (!told.is_empty()).then_some(told);
        Some(if primary {
            LabeledSpan::new_primary_with_span(told, (offset, length))
        } else {
            LabeledSpan::new_with_span(told, (offset, length))
        })
    }
}

impl SourceCode for Texts<'_> {
    fn read_span<'a>(
        &'a self,
        span: &SourceSpan,
        lines_before: usize,
        lines_after: usize,
    ) -> Result<Box<dyn SpanContents<'a> + 'a>, MietteError> {
        let (file, text) = self.at(span.offset() as u32).ok_or(MietteError::OutOfBounds)?;
        let start = span.offset() - file.base as usize;
        let end = start + span.len();
        if end > text.len() {
            return Err(MietteError::OutOfBounds);
        }
        let first = file.line_index(start as u32);
        let last = file.line_index(end.saturating_sub(1).max(start) as u32);
        let from_line = first.saturating_sub(lines_before);
        let mut from = (file.line_start(from_line) as usize).max(bom(text));
        let mut to = file.line_start(last + lines_after + 1) as usize;
        let mut shown_line = from_line;
        if to - from > MAX_EXCERPT_BYTES {
            // Long lines: a window of the place's own line. Two places too far apart are drawn one after the other.
            if last > first || span.len() > MAX_EXCERPT_BYTES / 2 {
                return Err(MietteError::OutOfBounds);
            }
            let line_start = file.line_start(first) as usize;
            let line_end = line_start + file.line_text(first).len();
            from = floor(text, start.saturating_sub(MAX_MARKED_BYTES / 2).max(line_start));
            to = floor(text, (end + MAX_MARKED_BYTES / 2).min(line_end));
            shown_line = first;
        }
        let line_start = (file.line_start(first) as usize).max(bom(text));
        let column = if lines_before == 0 { text[line_start..start].chars().count() } else { 0 };
        let data = &text.as_bytes()[from..to];
        let covered = (file.base as usize + from, to - from).into();
        let name = clean(&file.name).into_owned();
        Ok(Box::new(MietteSpanContents::new_named(name, data, covered, shown_line, column, last + 1 - shown_line)))
    }
}

/// The nearest character boundary at or before a position.
fn floor(text: &str, position: usize) -> usize {
    (0..=position.min(text.len())).rev().find(|&i| text.is_char_boundary(i)).unwrap_or(0)
}

/// Length of a byte-order mark at the beginning of a text.
fn bom(text: &str) -> usize {
    if text.starts_with('\u{feff}') { '\u{feff}'.len_utf8() } else { 0 }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostics::Code;

    const PLAIN: Style = Style { color: false, width: 80 };

    fn place(sources: &SourceMap, file: usize, what: &str) -> Span {
        let file = &sources.files()[file];
        let start = file.base + file.text.find(what).expect("the text has it") as u32;
        Span::new(start, start + what.len() as u32)
    }

    #[test]
    fn a_report_names_code_place_and_mend() {
        let mut sources = SourceMap::new();
        sources.add("drive.loop", "input r\nblock C : e -> u = Kx # ω\nfind u / r\n");
        let d = Diagnostic::new(Code::UnknownName, "there is no param `Kx`")
            .label(place(&sources, 0, "Kx"), "not known here")
            .help("did you mean `Kv`?");
        assert_eq!(
            render(&[d], &sources, PLAIN),
            "error: unknown-name
  × there is no param `Kx`
   ╭─[drive.loop:2:20]
 1 │ input r
 2 │ block C : e -> u = Kx # ω
   ·                    ─┬
   ·                     ╰── not known here
 3 │ find u / r
   ╰────
  help: did you mean `Kv`?

"
        );
    }

    #[test]
    fn places_in_two_files_are_drawn_each_in_its_own() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", "use \"b.loop\"\n");
        sources.add("b.loop", "\u{feff}use \"a.loop\"\r\n");
        let d = Diagnostic::new(Code::UseCycle, "these files use each other")
            .label(place(&sources, 0, "use \"b.loop\""), "first this one")
            .label(place(&sources, 1, "use \"a.loop\""), "then this one");
        assert_eq!(
            render(&[d], &sources, PLAIN),
            "error: use-cycle
  × these files use each other
   ╭─[a.loop:1:1]
 1 │ use \"b.loop\"
   · ──────┬─────
   ·       ╰── first this one
   ╰────
   ╭─[b.loop:1:1]
 1 │ use \"a.loop\"
   · ──────┬─────
   ·       ╰── then this one
   ╰────

"
        );
    }

    #[test]
    fn places_at_the_end_or_in_no_text_are_told_all_the_same() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", "repeat k in 1..3 {\n\n\n");
        let end = sources.files()[0].text.len() as u32;
        let at_end = Diagnostic::new(Code::Syntax, "a `}` is missing").label(Span::new(end, end + 7), "here");
        let nowhere = Diagnostic::new(Code::LimitReached, "too much text").label(Span::NONE, "all of it");
        let told = render(&[nowhere, at_end], &sources, PLAIN);
        assert!(told.starts_with("error: syntax\n"), "{told}");
        assert!(told.contains("╰── here"), "{told}");
        assert!(told.contains("error: limit-reached\n  × too much text\n"), "{told}");

        let mut empty = SourceMap::new();
        empty.add("-", "");
        let told = render(&[Diagnostic::new(Code::Syntax, "nothing").label(Span::new(0, 0), "x")], &empty, PLAIN);
        assert_eq!(told, "error: syntax\n  × nothing\n\n");
    }

    #[test]
    fn long_lines_are_shown_as_a_window() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", format!("{}Kx{}\n", "(".repeat(100_000), ")".repeat(100_000)));
        let d = Diagnostic::new(Code::UnknownName, "no `Kx`")
            .label(place(&sources, 0, "Kx"), "here")
            .label(Span::new(0, 5), "far away");
        let told = render(&[d], &sources, PLAIN);
        assert!(told.len() < 1500, "{}", told.len());
        assert!(told.contains("╰── here") && told.contains("╰── far away"), "{told}");
        assert!(told.contains("a.loop:1:100001"), "{told}");
    }

    #[test]
    fn the_gravest_stay_when_there_are_too_many() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", "x\n".repeat(500));
        let at = |k: u32| Span::new(2 * k, 2 * k + 1);
        let mut all: Vec<_> = (0..499).map(|k| Diagnostic::new(Code::UnusedBlock, "unused").label(at(k), "")).collect();
        all.push(Diagnostic::new(Code::Syntax, "the one error").label(at(499), ""));
        let told = render(&all, &sources, PLAIN);
        assert!(told.contains("the one error"));
        assert!(told.ends_with("… and 440 more; mend these first, or list all with --format json\n\n"));
        assert_eq!(summary(&all), "1 error, 499 warnings");
    }

    #[test]
    fn nothing_in_a_text_steers_the_terminal() {
        let mut sources = SourceMap::new();
        sources.add("a\u{1b}.loop", "input r\u{1b}[2J\u{9b}\u{202e}x\n");
        let d = Diagnostic::new(Code::Syntax, "what is \u{1b}?").label(Span::new(0, 5), "this \u{7}");
        let told = render(&[d], &sources, PLAIN);
        assert!(!told.contains(['\u{1b}', '\u{9b}', '\u{202e}', '\u{7}']), "{told:?}");
        assert!(render(&[], &sources, PLAIN).is_empty());
    }

    #[test]
    fn long_labels_are_wrapped() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", "sum e = r - y\n");
        let text = "the direct gain from `e` to `y` is 4, so that the loop would answer before it is asked at all";
        let d = Diagnostic::new(Code::AlgebraicLoop, "a loop").label(place(&sources, 0, "e = r - y"), text);
        let told = render(&[d], &sources, PLAIN);
        assert!(told.lines().all(|l| l.width() <= 80), "{told}");
    }
}
