//! Arguments to library calls to exit status.

mod arguments;
mod commands;
mod files;
mod terminal;

use crate::diagnostics::Code;
use arguments::{Arguments, Command};
use clap::{CommandFactory as _, FromArgMatches as _};
use std::ffi::OsString;
use std::io::{self, Write};
use std::process::ExitCode;
use terminal::Looks;

/// Stack of the thread that works: what is recursive has bounded depth, and this is ample for it on every system.
const STACK_BYTES: usize = 64 << 20;

/// Everything asked was done.
const DONE: u8 = 0;
/// A requirement fails.
const REQUIREMENT_FAILS: u8 = 1;
/// The input, or the command line, is in error.
const IN_ERROR: u8 = 2;
/// A named limit was reached.
const LIMIT_REACHED: u8 = 3;

/// Runs the command line and gives its exit status.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let arguments: Vec<OsString> = arguments.into_iter().collect();
    let copy = arguments.clone();
    let worker = std::thread::Builder::new().stack_size(STACK_BYTES).spawn(move || work(&copy));
    let status = match worker {
        Ok(thread) => thread.join().unwrap_or_else(|_| {
            tell("error: this is a defect of the program; please report it with the input\n");
            IN_ERROR
        }),
        // A system that gives no further thread: the one at hand will do.
        Err(_) => work(&arguments),
    };
    ExitCode::from(status)
}

/// Why a command ended before its end.
enum Failure {
    /// To be told; the status is 2.
    Told(String),
    /// What the system says about writing results.
    Writing(io::Error),
}

impl From<String> for Failure {
    fn from(text: String) -> Self {
        Self::Told(text)
    }
}

impl From<io::Error> for Failure {
    fn from(error: io::Error) -> Self {
        Self::Writing(error)
    }
}

fn work(arguments: &[OsString]) -> u8 {
    let looks = Looks::new(terminal::wish(arguments));
    let parsed = command(looks).try_get_matches_from(arguments).and_then(|m| Arguments::from_arg_matches(&m));
    let arguments = match parsed {
        Ok(arguments) => arguments,
        Err(error) => return usage(&error, looks),
    };
    let looks = Looks::new(arguments.color);
    let mut status = DONE;
    let outcome = match arguments.command {
        Command::Check(a) => commands::check(&a, looks, &mut status),
        Command::Derive(a) => commands::derive(&a, looks, &mut status),
        Command::Mason(a) => commands::mason(&a, looks, &mut status),
        Command::Assess(a) => commands::assess(&a, looks, &mut status),
        Command::Explain(a) => explain(&a, looks),
        Command::Completions(a) => {
            let mut out = io::stdout().lock();
            let mut text = Vec::new();
            clap_complete::generate(a.shell, &mut command(looks), "loopwright", &mut text);
            out.write_all(&text).map_err(Failure::from)
        }
        Command::Manual(a) => manual(&a, looks),
    };
    match outcome {
        Ok(()) => status,
        // Whoever reads has enough: no reason to complain.
        Err(Failure::Writing(e)) if e.kind() == io::ErrorKind::BrokenPipe => status,
        Err(Failure::Writing(e)) => {
            tell(&format!("error: can't write the results: {e}\n"));
            status.max(IN_ERROR)
        }
        Err(Failure::Told(text)) => {
            tell(&format!("error: {text}\n"));
            status.max(IN_ERROR)
        }
    }
}

/// The commands in the looks of this run.
fn command(looks: Looks) -> clap::Command {
    let choice = if looks.output.color { clap::ColorChoice::Always } else { clap::ColorChoice::Never };
    Arguments::command().color(choice).term_width(looks.output.width)
}

/// Help and version to standard output; a mistake to standard error, with the status 2.
fn usage(error: &clap::Error, looks: Looks) -> u8 {
    let text = error.render();
    let told = |color: bool| if color { text.ansi().to_string() } else { text.to_string() };
    if error.use_stderr() {
        tell(&told(looks.errors.color));
        return IN_ERROR;
    }
    // A reader that has gone does not mind.
    let _ = io::stdout().lock().write_all(told(looks.output.color).as_bytes());
    DONE
}

/// Words to standard error; if even that is gone there is nobody to tell.
fn tell(text: &str) {
    let _ = io::stderr().lock().write_all(text.as_bytes());
}

/// Prints the page of a code.
fn explain(arguments: &arguments::Explain, looks: Looks) -> Result<(), Failure> {
    // The arguments' parser takes no other word.
    let Some(code) = Code::from_word(&arguments.code) else { return Ok(()) };
    let mut out = io::stdout().lock();
    for line in code.page().lines() {
        if looks.output.color && line.starts_with('#') {
            writeln!(out, "\u{1b}[1m{line}\u{1b}[0m")?;
        } else {
            writeln!(out, "{line}")?;
        }
    }
    Ok(())
}

/// Prints a man page.
fn manual(arguments: &arguments::Manual, looks: Looks) -> Result<(), Failure> {
    let mut all = command(looks);
    all.build();
    let page = match &arguments.command {
        None => all,
        Some(name) => {
            let names: Vec<&str> = all.get_subcommands().map(clap::Command::get_name).collect();
            let unknown = || format!("there is no command `{name}`; there are {}", names.join(", "));
            let found = all.get_subcommands().find(|c| c.get_name() == name).ok_or_else(unknown)?;
            found.clone().name(format!("loopwright-{name}"))
        }
    };
    let mut text = Vec::new();
    clap_mangen::Man::new(page).render(&mut text)?;
    io::stdout().lock().write_all(&text)?;
    Ok(())
}
