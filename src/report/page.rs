//! Lines on a page of a given width: built-up fractions, wrapped sums, and facts in two columns.

use super::sum::{Joint, Words};
use crate::diagnostics::wrap;
use std::io::{self, Write};
use unicode_width::UnicodeWidthStr as _;

/// Blanks before what belongs to a heading.
pub(super) const INDENT: usize = 2;

/// Blanks before the second and later lines of a long sum.
const HANGING: usize = 4;

/// The widest name before a fraction that stands beside it and not above it.
const WIDEST_LABEL: usize = 36;

/// Makes the words of one side of a fraction, as often as it is asked to.
pub(super) type Side<'a> = dyn Fn(&mut Words<'_>) + 'a;

/// A page that is written as it is made.
pub(super) struct Page<'w> {
    out: &'w mut dyn Write,
    width: usize,
}

impl<'w> Page<'w> {
    /// A page of `width` columns on `out`.
    pub(super) fn new(out: &'w mut dyn Write, width: usize) -> Self {
        Self { out, width: width.max(40) }
    }

    /// Columns of the page.
    pub(super) const fn width(&self) -> usize {
        self.width
    }

    /// An empty line.
    pub(super) fn gap(&mut self) -> io::Result<()> {
        writeln!(self.out)
    }

    /// A line as it stands.
    pub(super) fn line(&mut self, text: &str) -> io::Result<()> {
        writeln!(self.out, "{text}")
    }

    /// A sentence, wrapped, all its lines set in by `indent`.
    pub(super) fn sentence(&mut self, indent: usize, text: &str) -> io::Result<()> {
        for line in wrap(text, self.width - indent) {
            writeln!(self.out, "{:indent$}{line}", "")?;
        }
        Ok(())
    }

    /// `label = numerator / denominator`, built up with a drawn rule where there is a denominator.
    ///
    /// What fits on a line is centred over and under the rule; longer sums are wrapped, flush left.
    pub(super) fn fraction(&mut self, label: &str, above: &Side<'_>, below: Option<&Side<'_>>) -> io::Result<()> {
        let label_width = label.width() + 3;
        let beside = label_width <= WIDEST_LABEL;
        let room = self.width.saturating_sub(if beside { label_width } else { HANGING } + 2);
        let Some(below) = below else {
            return match one_line(above, room) {
                Some(text) if beside => writeln!(self.out, "{label} = {text}"),
                _ => {
                    writeln!(self.out, "{label} =")?;
                    self.wrapped(HANGING, above)
                }
            };
        };
        let lines = one_line(above, room).zip(one_line(below, room));
        if let Some((above, below)) = lines {
            let inner = above.width().max(below.width()) + 2;
            let start = if beside { label_width } else { HANGING };
            if !beside {
                writeln!(self.out, "{label} =")?;
            }
            let centred = |text: &str| " ".repeat(start + (inner - text.width()) / 2) + text;
            writeln!(self.out, "{}", centred(&above))?;
            let rule = "─".repeat(inner);
            if beside {
                writeln!(self.out, "{label} = {rule}")?;
            } else {
                writeln!(self.out, "{:start$}{rule}", "")?;
            }
            return writeln!(self.out, "{}", centred(&below));
        }
        writeln!(self.out, "{label} =")?;
        self.over_the_rule(above)?;
        writeln!(self.out, "{:HANGING$}{}", "", "─".repeat(self.width - HANGING))?;
        self.over_the_rule(below)
    }

    /// One side of a fraction whose rule is as wide as the page: centred where it fits on a line.
    fn over_the_rule(&mut self, side: &Side<'_>) -> io::Result<()> {
        let room = self.width - HANGING;
        match one_line(side, room) {
            Some(text) => writeln!(self.out, "{:pad$}{text}", "", pad = HANGING + (room - text.width()) / 2),
            None => self.wrapped(HANGING, side),
        }
    }

    /// A sum or a product over as many lines as it needs, the later ones set in further.
    pub(super) fn wrapped(&mut self, indent: usize, side: &Side<'_>) -> io::Result<()> {
        self.hanging(&" ".repeat(indent), indent + 2, side)
    }

    /// The same behind a first word that stands in place of the first line's blanks.
    pub(super) fn hanging(&mut self, first: &str, indent: usize, side: &Side<'_>) -> io::Result<()> {
        let (width, out) = (self.width, &mut *self.out);
        let mut failed = out.write_all(first.as_bytes());
        let (mut column, mut fresh) = (first.width(), true);
        let mut sink = |joint: Joint, word: &str| {
            let space = usize::from(joint == Joint::Space && !fresh);
            let size = word.width();
            let text = if column + space + size > width && !fresh {
                column = indent + size;
                write!(out, "\n{:indent$}{word}", "")
            } else {
                column += space + size;
                write!(out, "{}{word}", if space == 1 { " " } else { "" })
            };
            fresh = false;
            failed = std::mem::replace(&mut failed, Ok(())).and(text);
            failed.is_ok()
        };
        let mut words = Words::new(&mut sink);
        side(&mut words);
        words.end(Joint::Tight);
        failed?;
        writeln!(self.out)
    }

    /// Facts in two columns, each value wrapped in its own.
    pub(super) fn facts(&mut self, facts: &[(String, Vec<String>)]) -> io::Result<()> {
        let column = facts.iter().map(|f| f.0.width()).max().unwrap_or(0) + INDENT + 3;
        for (name, values) in facts {
            let mut first = true;
            for line in values.iter().flat_map(|v| wrap_hanging(v, self.width.saturating_sub(column).max(20))) {
                let (lead, blanks) =
                    if first { (name.as_str(), column - INDENT - name.width()) } else { ("", column - INDENT) };
                writeln!(self.out, "{:INDENT$}{lead}{:blanks$}{line}", "", "")?;
                first = false;
            }
        }
        Ok(())
    }
}

/// A text in lines of at most `width` columns, the second and later ones set in by two.
fn wrap_hanging(text: &str, width: usize) -> Vec<String> {
    if text.width() <= width {
        return vec![text.to_owned()];
    }
    let set_in = |(i, line): (usize, String)| if i == 0 { line } else { format!("  {line}") };
    wrap(text, width - 2).into_iter().enumerate().map(set_in).collect()
}

/// A side on one line, where it has at most `width` columns.
pub(super) fn one_line(side: &Side<'_>, width: usize) -> Option<String> {
    let mut text = String::new();
    let mut fits = true;
    let mut sink = |joint: Joint, word: &str| {
        if joint == Joint::Space && !text.is_empty() {
            text.push(' ');
        }
        text.push_str(word);
        fits = text.width() <= width;
        fits
    };
    let mut words = Words::new(&mut sink);
    side(&mut words);
    words.end(Joint::Tight);
    fits.then_some(text)
}
