//! The published cases of `assess`: each pair `NAME.loop`, `NAME.json` of this folder, run as the user runs it.
//!
//! Expected values come from closed forms, published tables, or
//! mpmath at 40 digits, as each pair says.

use libtest_mimic::{Arguments, Failed, Trial};
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::Command;

/// Relative tolerances by what is compared; 1e-9 absolute is added to each.
const MODE: f64 = 1e-6;
const MARGIN: f64 = 1e-5;
const FREQUENCY: f64 = 1e-3;
const STEP: f64 = 1e-3;

fn main() {
    let arguments = Arguments::from_args();
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/assess");
    let mut pairs: Vec<PathBuf> = std::fs::read_dir(&folder)
        .into_iter()
        .flatten()
        .filter_map(|e| e.ok().map(|e| e.path()))
        .filter(|p| p.extension().is_some_and(|e| e == "json"))
        .collect();
    pairs.sort();
    let mut trials = Vec::new();
    for path in pairs {
        let pair = std::fs::read(&path).ok().and_then(|text| serde_json::from_slice::<Value>(&text).ok());
        let Some(pair) = pair.filter(|p| p["command"] == "assess") else { continue };
        let name = path.file_stem().map(|s| s.to_string_lossy().into_owned()).unwrap_or_default();
        trials.push(Trial::test(name, move || run(&path, &pair)));
    }
    libtest_mimic::run(&arguments, trials).exit();
}

fn run(path: &Path, pair: &Value) -> Result<(), Failed> {
    let output = Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .arg("assess")
        .arg(path.with_extension("loop"))
        .args(["--format", "json"])
        .output()
        .map_err(|e| e.to_string())?;
    let expect = &pair["expect"];
    if let Some(status) = expect["exit"].as_i64() {
        check(output.status.code() == Some(status as i32), || {
            format!("status {:?}, not {status}", output.status.code())
        })?;
    }
    let document: Value = serde_json::from_slice(&output.stdout).map_err(|e| e.to_string())?;
    for wanted in list(&expect["cases"]) {
        let case = find(&document["cases"], &["name"], wanted)?;
        for (key, value) in wanted["stability"].as_object().into_iter().flatten() {
            check(case["stability"][key] == *value, || format!("{key} is {}", case["stability"][key]))?;
        }
        for mode in list(&wanted["modes"]) {
            one_mode(&case["modes"], mode)?;
        }
        check(wanted["modes"].is_null() || list(&wanted["modes"]).len() == list(&case["modes"]).len(), || {
            format!("other modes than expected: {}", case["modes"])
        })?;
        for hidden in list(&wanted["hidden"]) {
            let hit = list(&case["modes"])
                .iter()
                .find(|m| near(&m["re"], &hidden["re"], MODE) && near(&m["im"], &hidden["im"], MODE));
            let from = hit.map_or(&Value::Null, |m| &m["hidden_from"]);
            check(list(from).contains(&hidden["from"]), || format!("{hidden} is hidden from {from}"))?;
        }
        for wanted in list(&wanted["loops"]) {
            one_loop(find(&case["loops"], &["at"], wanted)?, wanted)?;
        }
        for wanted in list(&wanted["transfers"]) {
            one_transfer(find(&case["transfers"], &["to", "from"], wanted)?, wanted)?;
        }
        for wanted in list(&wanted["requirements"]) {
            let found = find(&case["requirements"], &["line"], wanted)?;
            check(found["holds"] == wanted["holds"], || format!("{found}"))?;
            check(wanted["value"].is_null() || near(&found["value"], &wanted["value"], 1e-3), || format!("{found}"))?;
            check(wanted["unit"].is_null() || found["unit"] == wanted["unit"], || format!("{found}"))?;
        }
    }
    Ok(())
}

fn check(fine: bool, what: impl FnOnce() -> String) -> Result<(), Failed> {
    if fine { Ok(()) } else { Err(what().into()) }
}

fn list(value: &Value) -> &[Value] {
    value.as_array().map_or(&[], Vec::as_slice)
}

fn find<'v>(all: &'v Value, keys: &[&str], wanted: &Value) -> Result<&'v Value, Failed> {
    let same = |v: &&Value| keys.iter().all(|k| v[*k] == wanted[*k]);
    list(all).iter().find(same).ok_or_else(|| format!("none like {wanted}").into())
}

fn near(found: &Value, wanted: &Value, relative: f64) -> bool {
    match (found.as_f64(), wanted.as_f64()) {
        (Some(a), Some(b)) => (a - b).abs() <= relative * b.abs() + 1e-9,
        _ => found.is_null() && wanted.is_null(),
    }
}

fn one_mode(modes: &Value, wanted: &Value) -> Result<(), Failed> {
    let number = |v: &Value| v.as_f64().unwrap_or(f64::NAN);
    let (re, im) = (number(&wanted["re"]), number(&wanted["im"]));
    let size = re.hypot(im).max(1e-9);
    let close = |m: &&Value| (number(&m["re"]) - re).hypot(number(&m["im"]) - im) <= MODE * size;
    let mode = list(modes).iter().find(close);
    check(mode.is_some(), || format!("no mode {wanted} in {modes}"))?;
    for key in ["damping_ratio", "frequency"] {
        let fine = wanted[key].is_null() || mode.is_some_and(|m| near(&m[key], &wanted[key], MODE));
        check(fine, || format!("{key} of {wanted}"))?;
    }
    Ok(())
}

fn one_loop(found: &Value, wanted: &Value) -> Result<(), Failed> {
    for (key, field) in [("gain_margins", "factor"), ("phase_margins", "degrees")] {
        for m in list(&wanted[key]) {
            let same = |f: &Value| near(&f[field], &m[field], MARGIN) && near(&f["frequency"], &m["frequency"], MARGIN);
            check(list(&found[key]).iter().any(same), || format!("{key} {m} not in {}", found[key]))?;
        }
    }
    for (key, field, tolerance) in [("delay_margin", "seconds", MARGIN), ("modulus_margin", "value", FREQUENCY)] {
        let (f, w) = (&found[key], &wanted[key]);
        if w.is_object() {
            let at = w["frequency"].is_null() || near(&f["frequency"], &w["frequency"], tolerance);
            check(near(&f[field], &w[field], MARGIN) && at, || format!("{key} {f}, not {w}"))?;
        }
    }
    Ok(())
}

fn one_transfer(found: &Value, wanted: &Value) -> Result<(), Failed> {
    for (key, tolerance) in [("dc_gain", MODE), ("bandwidth", FREQUENCY)] {
        let fine = wanted.get(key).is_none_or(|w| near(&found[key], w, tolerance));
        check(fine, || format!("{key} is {}", found[key]))?;
    }
    if let Some(peak) = wanted.get("peak") {
        let at = peak["frequency"].is_null() || near(&found["peak"]["frequency"], &peak["frequency"], FREQUENCY);
        check(at && near(&found["peak"]["value"], &peak["value"], MARGIN), || format!("peak is {}", found["peak"]))?;
    }
    for (key, value) in wanted["step"].as_object().into_iter().flatten() {
        check(near(&found["step"][key], value, STEP), || format!("{key} is {}", found["step"][key]))?;
    }
    Ok(())
}
