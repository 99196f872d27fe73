//! What the documents and examples show is what the program does.
//!
//! In `README.md`, `DEVELOPERS.md` and `docs/**/*.md`:
//!
//! - a block of `loop` is a whole file and must check without any diagnostic;
//! - a block of `loop part` is a piece of one: what it needs stands in a comment `<!-- given … -->` just before it, which no
//!   reader sees. The two are joined (the order of lines means nothing) and must check without an error;
//! - a comment `<!-- file: NAME -->` before a block saves the block under that name for the commands of the same document;
//!   with `<!-- file: NAME, with mistakes -->` it is not checked;
//! - a block of `console` shows commands after `$ ` and what they print, standard output first; `$ echo $?` shows the exit
//!   status of the command before. Commands run in a copy of the project's examples. With `LOOPWRIGHT_REWRITE=1` in the
//!   environment the blocks are rewritten with what the program prints now, for reading through in the diff.
//!
//! The files in `examples/` must check without any diagnostic and derive.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// All documents: those at the root and those under `docs/`.
fn documents() -> Vec<PathBuf> {
    let mut found = vec![root().join("README.md"), root().join("DEVELOPERS.md")];
    let mut folders = vec![root().join("docs")];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).into_iter().flatten().flatten() {
            let path = entry.path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "md") {
                found.push(path);
            }
        }
    }
    found.sort();
    found
}

/// A fenced block of a document.
struct Block {
    /// What stands after the opening fence.
    info: String,
    /// The lines between the fences.
    text: String,
    /// Number of the first of these lines, from 0.
    line: usize,
    /// The comment just before it, without its marks.
    comment: Option<String>,
}

fn blocks(document: &str) -> Vec<Block> {
    let mut found = Vec::new();
    let mut comment: Option<String> = None;
    let mut lines = document.lines().enumerate();
    while let Some((_, line)) = lines.next() {
        if let Some(info) = line.strip_prefix("```") {
            let body: Vec<(usize, &str)> = lines.by_ref().take_while(|(_, line)| *line != "```").collect();
            let text: String = body.iter().flat_map(|(_, line)| [*line, "\n"]).collect();
            let line = body.first().map_or(0, |(i, _)| *i);
            found.push(Block { info: info.to_owned(), text, line, comment: comment.take() });
        } else if let Some(start) = line.strip_prefix("<!--") {
            let mut text = start.to_owned();
            while !text.contains("-->") {
                let Some((_, line)) = lines.next() else { break };
                let _ = write!(text, "\n{line}");
            }
            comment = Some(text.split("-->").next().unwrap_or("").trim().to_owned());
        } else if !line.trim().is_empty() {
            comment = None;
        }
    }
    found
}

/// The name after `file:` in a comment, and whether the block has mistakes on purpose.
fn file_named(block: &Block) -> Option<(&str, bool)> {
    let rest = block.comment.as_deref()?.strip_prefix("file:")?.trim();
    Some(rest.strip_suffix(", with mistakes").map_or((rest, false), |name| (name, true)))
}

fn loopwright(folder: &Path, arguments: &[String]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_loopwright"));
    command.args(arguments).current_dir(folder).env("NO_COLOR", "1").env("COLUMNS", "80").stdin(Stdio::null());
    command.output().unwrap_or_else(|e| panic!("cannot run the program: {e}"))
}

/// A folder for one test, with a copy of the examples in it.
fn workplace(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let examples = folder.join("examples");
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&examples).unwrap_or_else(|e| panic!("{}: {e}", examples.display()));
    for path in example_files() {
        let to = examples.join(path.file_name().unwrap_or_default());
        std::fs::copy(&path, &to).unwrap_or_else(|e| panic!("{}: {e}", to.display()));
    }
    folder
}

fn example_files() -> Vec<PathBuf> {
    let entries = std::fs::read_dir(root().join("examples")).into_iter().flatten().flatten();
    let mut files: Vec<PathBuf> =
        entries.map(|e| e.path()).filter(|p| p.extension().is_some_and(|e| e == "loop")).collect();
    files.sort();
    files
}

/// What `check` says of a text: whether there is no error, and all diagnostics.
fn check(folder: &Path, text: &str) -> (bool, String) {
    let file = folder.join("shown.loop");
    std::fs::write(&file, text).unwrap_or_else(|e| panic!("{}: {e}", file.display()));
    let output =
        loopwright(folder, &["check".to_owned(), "shown.loop".to_owned(), "--format".to_owned(), "json".to_owned()]);
    let told: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap_or_default();
    let diagnostics = told["diagnostics"].as_array().cloned().unwrap_or_default();
    let texts = diagnostics.iter().map(|d| format!("  {}: {}\n", d["code"], d["message"]));
    (told["ok"] == true, texts.collect())
}

#[test]
fn every_loop_block_checks() {
    let mut wrong = String::new();
    let mut count = 0;
    let folder = workplace("docs-loop");
    for document in documents() {
        let text = std::fs::read_to_string(&document).unwrap_or_default();
        for block in blocks(&text) {
            let whole = block.info == "loop";
            if !(whole || block.info == "loop part") || file_named(&block).is_some_and(|(_, mistakes)| mistakes) {
                continue;
            }
            count += 1;
            let given = block.comment.as_deref().and_then(|c| c.strip_prefix("given")).unwrap_or("");
            let (ok, told) = check(&folder, &format!("{}\n{given}\n", block.text));
            if !ok || (whole && !told.is_empty()) {
                let _ = writeln!(wrong, "{}:{}:\n{told}", document.display(), block.line + 1);
            }
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
    assert!(count > 15, "only {count} blocks were found");
}

/// A command line cut at blanks, quotation marks honoured.
fn words(line: &str) -> Vec<String> {
    let (mut words, mut word, mut quote) = (Vec::new(), None::<String>, None);
    for c in line.chars() {
        match (c, quote) {
            (c, Some(q)) if c == q => quote = None,
            ('\'' | '"', None) => {
                quote = Some(c);
                word.get_or_insert_default();
            }
            (' ', None) => words.extend(word.take()),
            (c, _) => word.get_or_insert_default().push(c),
        }
    }
    words.extend(word);
    words
}

/// Runs the commands of a console block and gives the block as it ought to be.
fn run_console(folder: &Path, block: &str) -> Result<String, String> {
    let mut shown = String::new();
    let mut status = 0;
    for line in block.lines().filter_map(|line| line.strip_prefix("$ ")) {
        let _ = writeln!(shown, "$ {line}");
        if line == "echo $?" {
            let _ = writeln!(shown, "{status}");
            continue;
        }
        let own = line.strip_prefix("loopwright ").or_else(|| line.strip_prefix("cargo run --release -- "));
        let Some(own) = own else { return Err(format!("cannot run `{line}`")) };
        let output = loopwright(folder, &words(own));
        status = output.status.code().unwrap_or(-1);
        if status == 101 || status == -1 {
            return Err(format!("`{line}` crashed"));
        }
        for part in [output.stdout, output.stderr] {
            let text = String::from_utf8_lossy(&part).into_owned();
            shown.push_str(&text);
            if !text.is_empty() && !text.ends_with('\n') {
                shown.push('\n');
            }
        }
    }
    Ok(shown)
}

/// Trailing blanks are no part of what is shown.
fn trimmed(text: &str) -> String {
    text.lines().flat_map(|line| [line.trim_end(), "\n"]).collect()
}

#[test]
fn every_command_shown_prints_what_is_shown() {
    let rewrite = std::env::var_os("LOOPWRIGHT_REWRITE").is_some();
    let mut wrong = String::new();
    let mut count = 0;
    for document in documents() {
        let text = std::fs::read_to_string(&document).unwrap_or_default();
        let all = blocks(&text);
        if !all.iter().any(|b| b.info == "console") {
            continue;
        }
        let folder = workplace("docs-console");
        for (name, block) in all.iter().filter_map(|b| file_named(b).map(|(name, _)| (name, b))) {
            let file = folder.join(name);
            std::fs::write(&file, &block.text).unwrap_or_else(|e| panic!("{}: {e}", file.display()));
        }
        let mut lines: Vec<String> = text.lines().map(str::to_owned).collect();
        // From the last to the first, so that a rewritten block does not move those before it.
        for block in all.iter().filter(|b| b.info == "console").rev() {
            count += 1;
            let place = format!("{}:{}", document.display(), block.line + 1);
            match run_console(&folder, &block.text) {
                Err(why) => wrong = format!("{place}: {why}\n{wrong}"),
                Ok(shown) if trimmed(&shown) == trimmed(&block.text) => {}
                Ok(shown) if rewrite => {
                    let end = block.line + block.text.lines().count();
                    lines.splice(block.line..end, trimmed(&shown).lines().map(str::to_owned));
                }
                Ok(shown) => wrong = format!("{place}: shown\n{}\nbut printed\n{shown}\n{wrong}", block.text),
            }
        }
        let after = lines.join("\n") + "\n";
        if rewrite && after != text {
            std::fs::write(&document, after).unwrap_or_else(|e| panic!("{}: {e}", document.display()));
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
    assert!(count > 3, "only {count} blocks were found");
}

#[test]
fn every_example_checks_and_derives() {
    let files = example_files();
    assert!(files.len() >= 5, "only {} examples", files.len());
    let folder = root().join("examples");
    for file in files {
        let name = file.file_name().unwrap_or_default().to_string_lossy().into_owned();
        // A file of parts asks for nothing.
        let asks = std::fs::read_to_string(&file).unwrap_or_default().contains("\nfind ");
        for command in if asks { ["check", "derive"].as_slice() } else { &["check"] } {
            let output = loopwright(&folder, &[(*command).to_owned(), name.clone()]);
            let told = String::from_utf8_lossy(&output.stderr);
            assert!(output.status.success() && told.is_empty(), "{command} {name}:\n{told}");
            assert!(!output.stdout.is_empty(), "{command} {name} prints nothing");
        }
    }
}

#[test]
fn the_table_of_standing_laws_is_the_file() {
    let file = std::fs::read_to_string(root().join("src/resolve/standard.loop")).unwrap_or_default();
    let page = std::fs::read_to_string(root().join("docs/language.md")).unwrap_or_default();
    let heads = file.lines().filter_map(|line| line.strip_prefix("define "));
    let heads: Vec<String> =
        heads.filter_map(|line| line.split_once(") =")).map(|(head, _)| format!("{head})")).collect();
    assert!(heads.len() > 30, "only {} laws", heads.len());
    for head in heads {
        // The table leaves the units out: `lag(T [s], K = 1)` is `lag(T, K = 1)` there.
        let mut plain = String::new();
        for part in head.split(" [") {
            plain.push_str(part.split_once(']').map_or(part, |(_, after)| after));
        }
        assert!(page.contains(&format!("`{plain}`")), "docs/language.md has no `{plain}`");
    }
}

#[test]
fn words_are_cut_at_blanks() {
    assert_eq!(words("derive a.loop 'y / r keep K' --set K=2"), ["derive", "a.loop", "y / r keep K", "--set", "K=2"]);
}
