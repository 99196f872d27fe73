//! The house rules that a compiler does not hold: who imports whom, and a few words that have one place only.
//!
//! The rooms and their order stand in `DEVELOPERS.md`; the table below is the same one.

use std::path::{Path, PathBuf};

/// Each room with the rooms that it may use. What stands before a room in the data flow may be used, what stands after
/// may not; `algebra` knows no netlists, only `cli` knows everybody.
const ALLOWED: &[(&str, &[&str])] = &[
    ("source", &[]),
    ("diagnostics", &["source"]),
    ("algebra", &[]),
    ("syntax", &["source", "diagnostics"]),
    ("netlist", &["source", "diagnostics", "syntax", "algebra"]),
    ("resolve", &["source", "diagnostics", "syntax", "netlist", "algebra"]),
    ("results", &["source", "diagnostics", "algebra"]),
    ("flow", &["source", "diagnostics", "netlist", "algebra", "results"]),
    ("analysis", &["source", "diagnostics", "netlist", "algebra", "flow", "results"]),
    ("report", &["source", "diagnostics", "algebra", "results"]),
    (
        "cli",
        &["source", "diagnostics", "syntax", "netlist", "resolve", "algebra", "flow", "analysis", "results", "report"],
    ),
];

/// Rooms without floating point, but for the files that find roots, round to decimals, or (`modular`) carry residues
/// below 2^50 in doubles, where the vector units multiply fastest and every result is a whole number, exact.
const EXACT: &[&str] = &["source", "syntax", "netlist", "resolve", "flow", "algebra"];
const DECIMALS: &[&str] = &["src/algebra/roots", "src/algebra/decimal.rs", "src/algebra/modular"];

struct Source {
    /// Path from the root of the project, with `/`.
    path: String,
    text: String,
}

/// All Rust files of a folder, in the order of their names.
fn sources(folder: &str) -> Vec<Source> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let mut folders = vec![root.join(folder)];
    let mut files: Vec<PathBuf> = Vec::new();
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).into_iter().flatten().flatten() {
            let path = entry.path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                files.push(path);
            }
        }
    }
    files.sort();
    let source = |path: PathBuf| {
        let text = std::fs::read_to_string(&path).unwrap_or_default();
        let path = path.strip_prefix(root).unwrap_or(&path).to_string_lossy().replace('\\', "/");
        Source { path, text }
    };
    files.into_iter().map(source).collect()
}

impl Source {
    /// The room that the file stands in; none for `lib.rs` and `main.rs`.
    fn room(&self) -> Option<&str> {
        let rest = self.path.strip_prefix("src/")?;
        rest.split_once('/').map(|(room, _)| room)
    }

    /// The lines of code, comments left out, up to the file's own tests; none of a file of tests.
    fn code(&self) -> impl Iterator<Item = (usize, &str)> {
        let text = if self.path.ends_with("/tests.rs") { "" } else { &self.text };
        let lines = text.lines().enumerate().map(|(i, line)| (i + 1, line));
        let before_tests = lines.take_while(|(_, line)| line.trim() != "#[cfg(test)]");
        before_tests.map(|(i, line)| (i, line.split("//").next().unwrap_or("")))
    }
}

/// The rooms named after `crate::` in a line: `crate::room` and `crate::{a, b::c}`.
fn rooms_in(line: &str) -> Vec<&str> {
    let mut rooms = Vec::new();
    for rest in line.split("crate::").skip(1) {
        let list = rest.strip_prefix('{').and_then(|list| list.split_once('}')).map_or(rest, |(list, _)| list);
        let items = if rest.starts_with('{') { list.split(',').collect() } else { vec![list] };
        for item in items {
            let item = item.trim();
            let end = item.find(|c: char| !c.is_alphanumeric() && c != '_').unwrap_or(item.len());
            rooms.push(&item[..end]);
        }
    }
    rooms
}

fn assert_none(found: &[String], rule: &str) {
    assert!(found.is_empty(), "{rule}:\n{}", found.join("\n"));
}

#[test]
fn a_room_uses_what_stands_before_it() {
    let mut found = Vec::new();
    for source in sources("src") {
        let Some(room) = source.room() else { continue };
        let Some((_, allowed)) = ALLOWED.iter().find(|row| row.0 == room) else {
            found.push(format!("{}: no row for the room `{room}`", source.path));
            continue;
        };
        for (number, line) in source.code() {
            let rooms = rooms_in(line).into_iter().filter(|r| ALLOWED.iter().any(|row| row.0 == *r));
            let wrong = rooms.filter(|r| *r != room && !allowed.contains(r));
            found.extend(wrong.map(|r| format!("{}:{number}: `{room}` uses `{r}`", source.path)));
        }
    }
    assert_none(&found, "a room uses what stands before it in the data flow");
}

#[test]
fn every_file_says_what_it_is_for() {
    let all = ["src", "tests", "benches"].into_iter().flat_map(sources);
    let silent: Vec<String> = all.filter(|s| !s.text.starts_with("//!")).map(|s| s.path).collect();
    assert_none(&silent, "every file opens with `//!`");
}

#[test]
fn only_diagnostics_knows_what_draws_reports() {
    let others = sources("src").into_iter().filter(|s| s.room() != Some("diagnostics"));
    let knows = |s: &Source| s.code().any(|(_, line)| line.contains("miette"));
    let found: Vec<String> = others.filter(knows).map(|s| s.path).collect();
    assert_none(&found, "only `diagnostics` names miette");
}

#[test]
fn exact_rooms_hold_no_floating_point() {
    let mut found = Vec::new();
    for source in sources("src") {
        let exact = source.room().is_some_and(|room| EXACT.contains(&room));
        if !exact || DECIMALS.iter().any(|path| source.path.starts_with(path)) {
            continue;
        }
        for (number, line) in source.code() {
            let mut words = line.split(|c: char| !c.is_alphanumeric() && c != '_');
            if words.any(|w| w == "f64" || w == "f32") {
                found.push(format!("{}:{number}: {}", source.path, line.trim()));
            }
        }
    }
    assert_none(&found, "exact rooms hold no floating point");
}

#[test]
fn only_cli_prints() {
    let mut found = Vec::new();
    for source in sources("src").into_iter().filter(|s| s.room() != Some("cli")) {
        for (number, line) in source.code() {
            if ["println!", "print!(", "eprintln!", "eprint!("].iter().any(|word| line.contains(word)) {
                found.push(format!("{}:{number}: {}", source.path, line.trim()));
            }
        }
    }
    assert_none(&found, "only `cli` prints");
}

#[test]
fn the_rules_can_be_broken() {
    // Each rule is tried on a line that breaks it, so that none passes because it looks at nothing.
    assert_eq!(rooms_in("use crate::netlist::{Netlist, values};"), ["netlist"]);
    assert_eq!(rooms_in("use crate::{algebra::Poly, flow};"), ["algebra", "flow"]);
    assert_eq!(rooms_in("let x = crate::report::text(crate::results::Check)"), ["report", "results"]);
    let all = sources("src");
    assert!(all.iter().any(|s| s.room() == Some("algebra")) && all.iter().any(|s| s.room().is_none()));
    let source = Source { path: "src/flow/x.rs".to_owned(), text: "let a: f64; // f32\n#[cfg(test)]\nf64".to_owned() };
    assert_eq!(source.code().map(|(_, line)| line).collect::<Vec<_>>(), ["let a: f64; "]);
}
