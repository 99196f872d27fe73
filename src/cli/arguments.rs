//! The command line in its own words.

use crate::diagnostics::Code;
use crate::report::FractionStyle;
use clap::builder::PossibleValuesParser;
use clap::{Args, Parser, Subcommand, ValueEnum};
use clap_complete::Shell;
use std::path::PathBuf;

/// Exact transfer functions from the text of a feedback loop.
///
/// A `.loop` file states blocks, summing junctions and params, one fact a line; `-` reads it from standard input.
/// Results go to standard output, diagnostics to standard error.
#[derive(Debug, Parser)]
#[command(name = "loopwright", version, propagate_version = true, subcommand_required = true)]
#[command(after_help = STATUS)]
pub(super) struct Arguments {
    /// When to colour
    #[arg(long, global = true, value_enum, value_name = "WHEN", default_value_t = When::Auto)]
    pub(super) color: When,
    #[command(subcommand)]
    pub(super) command: Command,
}

const STATUS: &str = "\
Exit status: 0 done; 1 a requirement fails; 2 the input is in error (diagnostics say where); 3 a named limit was reached.
NO_COLOR is honoured; --color always wins over it.";

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Read and check files: names, drivers, units, algebraic loops, unused parts
    Check(Check),
    /// Give the requested transfer functions, exact
    Derive(Derive),
    /// Work out Mason's gain rule for one request
    Mason(Mason),
    /// Judge the closed loop: stability, modes, margins, responses, and every requirement
    Assess(Assess),
    /// Tell a diagnostic at length, with an example and its mend
    Explain(Explain),
    /// Print the completions for a shell
    Completions(Completions),
    /// Print a man page: of the program, or of one of its commands
    Manual(Manual),
}

/// When to colour.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum When {
    /// On a terminal that takes it, unless `NO_COLOR` says otherwise
    Auto,
    /// Always
    Always,
    /// Never
    Never,
}

/// The form of results.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum Format {
    /// For people
    #[default]
    Text,
    /// For programs
    Json,
}

/// Where results go, and in which form.
#[derive(Debug, Args)]
pub(super) struct Output {
    /// Form of the results
    #[arg(long, value_enum, default_value_t)]
    pub(super) format: Format,
    /// Write results to this file, whole or not at all; `-` is standard output
    #[arg(short, long, value_name = "FILE")]
    pub(super) output: Option<PathBuf>,
}

/// What changes params.
#[derive(Debug, Args)]
pub(super) struct Values {
    /// Let this case stand in nominal's place
    #[arg(long, value_name = "NAME")]
    pub(super) case: Option<String>,
    /// Give a param another value, such as `J=2.2` or `az.K=2.6[N*m/rad]`; may be repeated
    #[arg(long, value_name = "NAME=VALUE")]
    pub(super) set: Vec<String>,
    /// Keep these params as symbols; `all` keeps every one that is given as a number
    #[arg(long, value_name = "NAME,…", value_delimiter = ',')]
    pub(super) keep: Vec<String>,
}

/// How a fraction is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum Fraction {
    /// Sums of powers
    Expanded,
    /// Products of factors such as (s + 2)
    Factored,
    /// Products of factors such as (0.5·s + 1), times in seconds
    TimeConstants,
}

impl Fraction {
    /// The style of the report; automatic without a wish.
    pub(super) fn style(wish: Option<Self>) -> FractionStyle {
        match wish {
            None => FractionStyle::Automatic,
            Some(Self::Expanded) => FractionStyle::Expanded,
            Some(Self::Factored) => FractionStyle::Factored,
            Some(Self::TimeConstants) => FractionStyle::TimeConstants,
        }
    }
}

/// How transfer functions are found.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum Method {
    /// Elimination in the signal equations
    #[default]
    Elimination,
    /// Mason's gain rule, which lists paths and loops
    Mason,
}

#[derive(Debug, Args)]
pub(super) struct Check {
    /// Files to check, each on its own; `-` is standard input
    #[arg(required = true, value_name = "FILE")]
    pub(super) files: Vec<String>,
    #[command(flatten)]
    pub(super) values: Values,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Derive {
    /// The file; `-` is standard input
    #[arg(value_name = "FILE")]
    pub(super) file: String,
    /// Requests in place of those of the file, such as `y / r` or `loop at u`
    #[arg(value_name = "REQUEST")]
    pub(super) requests: Vec<String>,
    #[command(flatten)]
    pub(super) values: Values,
    /// How fractions are written in text; in factors where they are nice, unless told
    #[arg(long, value_enum)]
    pub(super) fraction: Option<Fraction>,
    /// Work out poles and zeros whatever the degree
    #[arg(long)]
    pub(super) roots: bool,
    /// Add the characteristic polynomial of the whole netlist
    #[arg(long)]
    pub(super) characteristic: bool,
    /// How results are found; both ways give the same
    #[arg(long, value_enum, default_value_t)]
    pub(super) method: Method,
    /// Put each result back into the signal equations, and say so
    #[arg(long)]
    pub(super) verify: bool,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Mason {
    /// The file; `-` is standard input
    #[arg(value_name = "FILE")]
    pub(super) file: String,
    /// One request, such as `y / r` or `loop at u`
    #[arg(value_name = "REQUEST")]
    pub(super) request: String,
    #[command(flatten)]
    pub(super) values: Values,
    /// How the gain is written in text; in factors where they are nice, unless told
    #[arg(long, value_enum)]
    pub(super) fraction: Option<Fraction>,
    #[command(flatten)]
    pub(super) output: Output,
}

/// The form of an assessment.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum AssessFormat {
    /// For people
    #[default]
    Text,
    /// For programs
    Json,
    /// SARIF 2.1.0, for code hosts that annotate lines
    Sarif,
    /// JUnit XML, for build servers
    Junit,
}

#[derive(Debug, Args)]
pub(super) struct Assess {
    /// The file; `-` is standard input
    #[arg(value_name = "FILE")]
    pub(super) file: String,
    /// Let this case stand in nominal's place
    #[arg(long, value_name = "NAME")]
    pub(super) case: Option<String>,
    /// Give a param another value, such as `J=2.2` or `az.K=2.6[N*m/rad]`; may be repeated
    #[arg(long, value_name = "NAME=VALUE")]
    pub(super) set: Vec<String>,
    /// List every mode and margin, and say of each figure that is absent why
    #[arg(short, long)]
    pub(super) verbose: bool,
    /// Form of the results
    #[arg(long, value_enum, default_value_t)]
    pub(super) format: AssessFormat,
    /// Write results to this file, whole or not at all; `-` is standard output
    #[arg(short, long, value_name = "FILE")]
    pub(super) output: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub(super) struct Explain {
    /// The code, as a diagnostic names it
    #[arg(value_name = "CODE", value_parser = PossibleValuesParser::new(Code::ALL.iter().map(|c| c.word())))]
    pub(super) code: String,
}

#[derive(Debug, Args)]
pub(super) struct Completions {
    /// The shell
    #[arg(value_enum)]
    pub(super) shell: Shell,
}

#[derive(Debug, Args)]
pub(super) struct Manual {
    /// The command; the whole program without one
    #[arg(value_name = "COMMAND")]
    pub(super) command: Option<String>,
}
