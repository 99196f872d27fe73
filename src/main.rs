//! The `loopwright` command: a thin shell around [`loopwright::cli::run`].

fn main() -> std::process::ExitCode {
    loopwright::cli::run(std::env::args_os())
}
