//! What the terminal takes: the one decision on colour and width of a run.

use super::arguments::When;
use crate::diagnostics::Style;
use std::ffi::OsString;
use std::io::IsTerminal as _;

/// Columns where there is no terminal to ask.
const WIDTH_WITHOUT_TERMINAL: usize = 80;

/// The most columns that text is set in: longer lines tire the eye.
const WIDEST: usize = 120;

/// The looks of standard output and standard error.
#[derive(Clone, Copy, Debug)]
pub(super) struct Looks {
    pub(super) output: Style,
    pub(super) errors: Style,
}

impl Looks {
    /// Decides for both streams.
    pub(super) fn new(when: When) -> Self {
        let no_color = std::env::var_os("NO_COLOR");
        let term = std::env::var_os("TERM");
        let color = |terminal| colored(when, terminal, no_color.as_ref(), term.as_ref());
        let (out, err) = (std::io::stdout(), std::io::stderr());
        let out_width = terminal_size::terminal_size_of(&out).map(|(w, _)| w.0);
        let err_width = terminal_size::terminal_size_of(&err).map(|(w, _)| w.0);
        Self {
            output: Style { color: color(out.is_terminal()), width: width(out_width) },
            errors: Style { color: color(err.is_terminal()), width: width(err_width) },
        }
    }
}

/// Whether to colour one stream. `NO_COLOR` counts when it is set and not empty, whatever its value.
fn colored(when: When, terminal: bool, no_color: Option<&OsString>, term: Option<&OsString>) -> bool {
    match when {
        When::Always => true,
        When::Never => false,
        When::Auto => {
            terminal && no_color.is_none_or(|value| value.is_empty()) && term.is_none_or(|term| term != "dumb")
        }
    }
}

fn width(columns: Option<u16>) -> usize {
    // A terminal of no columns is one that does not know its size.
    columns.filter(|&c| c > 0).map_or(WIDTH_WITHOUT_TERMINAL, |c| usize::from(c).min(WIDEST))
}

/// What `--color` says, before the arguments are read: their own mistakes are told in the same looks.
pub(super) fn wish(arguments: &[OsString]) -> When {
    let mut wish = When::Auto;
    let mut words = arguments.iter().skip(1).map(|a| a.to_string_lossy());
    while let Some(word) = words.next() {
        let value = match word.as_ref() {
            "--" => break,
            "--color" => words.next(),
            other => other.strip_prefix("--color=").map(|v| v.to_owned().into()),
        };
        match value.as_deref() {
            Some("always") => wish = When::Always,
            Some("never") => wish = When::Never,
            Some("auto") => wish = When::Auto,
            _ => {}
        }
    }
    wish
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_wish_wins_then_no_color_then_the_terminal() {
        let (set, empty, dumb) = (OsString::from("0"), OsString::new(), OsString::from("dumb"));
        assert!(colored(When::Auto, true, None, None));
        assert!(colored(When::Auto, true, Some(&empty), None));
        assert!(!colored(When::Auto, true, Some(&set), None));
        assert!(!colored(When::Auto, true, None, Some(&dumb)));
        assert!(!colored(When::Auto, false, None, None));
        assert!(colored(When::Always, false, Some(&set), Some(&dumb)));
        assert!(!colored(When::Never, true, None, None));
    }

    #[test]
    fn the_wish_is_found_before_the_arguments_are_read() {
        let words = |text: &str| text.split(' ').map(OsString::from).collect::<Vec<_>>();
        assert_eq!(wish(&words("x check --color never a")), When::Never);
        assert_eq!(wish(&words("x --color=always check a")), When::Always);
        assert_eq!(wish(&words("x check -- --color=always")), When::Auto);
        assert_eq!(width(Some(0)), 80);
        assert_eq!(width(Some(300)), 120);
    }
}
