//! Published and closed-form systems: each pair `NAME.loop` and `NAME.json` in `tests/published/` is a test of its own.
//!
//! The JSON says where the system is from (`source`, and `from_memory` where the figures were not looked up), how every
//! expected value was recomputed, what to run, and what must come out; `tests/published/README.md` has the keys. A new
//! case is a new pair, nothing else. `cargo test --test published NAME` runs the ones with NAME in their name.

mod compare;
mod exact;

use libtest_mimic::{Arguments, Failed, Trial};
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::{Command, ExitCode, Stdio};

fn main() -> ExitCode {
    let arguments = Arguments::from_args();
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published");
    let names = match case_names(&folder) {
        Ok(names) => names,
        Err(error) => {
            let why = format!("{}: {error}", folder.display());
            return libtest_mimic::run(&arguments, vec![Trial::test("cases", move || Err(Failed::from(why)))])
                .exit_code();
        }
    };
    let trials = names.into_iter().map(|name| {
        let folder = folder.clone();
        Trial::test(name.clone(), move || run(&folder, &name).map_err(Failed::from))
    });
    libtest_mimic::run(&arguments, trials.collect()).exit_code()
}

/// The stems of all JSON files, in their order.
fn case_names(folder: &Path) -> std::io::Result<Vec<String>> {
    let mut names = Vec::new();
    for entry in std::fs::read_dir(folder)? {
        let path: PathBuf = entry?.path();
        if path.extension().is_some_and(|e| e == "json") {
            names.extend(path.file_stem().map(|stem| stem.to_string_lossy().into_owned()));
        }
    }
    names.sort();
    Ok(names)
}

/// Runs one case and says how it differs from what is expected.
fn run(folder: &Path, name: &str) -> Result<(), String> {
    let text = std::fs::read_to_string(folder.join(name).with_extension("json")).map_err(|e| e.to_string())?;
    let case: Value = serde_json::from_str(&text).map_err(|e| e.to_string())?;
    for key in ["source", "kind", "from_memory", "command", "expect"] {
        if case.get(key).is_none() {
            return Err(format!("the case has no `{key}`"));
        }
    }
    compare::only_known_keys(&case["expect"])?;
    let command = case["command"].as_str().unwrap_or("");
    let mut process = Command::new(env!("CARGO_BIN_EXE_loopwright"));
    process.current_dir(folder).env("NO_COLOR", "1").stdin(Stdio::null());
    process.arg(command).arg(format!("{name}.loop"));
    for key in ["operands", "args"] {
        process.args(case.get(key).and_then(Value::as_array).into_iter().flatten().filter_map(Value::as_str));
    }
    let output = process.args(["--format", "json"]).output().map_err(|e| e.to_string())?;
    let told = String::from_utf8_lossy(&output.stderr);
    let expect = &case["expect"];
    let status = output.status.code().map(i64::from);
    if status.is_none() || status == Some(101) {
        return Err(format!("crashed: {told}"));
    }
    if let Some(wanted) = expect.get("exit").and_then(Value::as_i64)
        && status != Some(wanted)
    {
        return Err(format!("exit status {status:?}, expected {wanted}; {told}"));
    }
    let document: Value = serde_json::from_slice(&output.stdout).map_err(|e| format!("no JSON: {e}; {told}"))?;
    let schema = format!("loopwright.{command}.1");
    if document["schema"] != schema.as_str() {
        return Err(format!("schema {}, expected {schema}", document["schema"]));
    }
    if let Some(wanted) = expect.get("transfers") {
        compare::transfers(&document["transfers"], wanted)?;
    }
    if command == "check" {
        compare::diagnostics(&document, expect)?;
    }
    Ok(())
}
