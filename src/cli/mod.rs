//! Arguments to library calls to exit status.

use std::ffi::OsString;
use std::process::ExitCode;

/// Runs the command line and gives its exit status.
pub fn run(_arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    ExitCode::SUCCESS
}
