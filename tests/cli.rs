//! The program from outside: arguments, streams, files, exit statuses.

use std::io::{Read as _, Write as _};
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

const GOOD: &str = "model servo\ninput r\noutput y\nsum e = r - y\nblock C : e -> u = 24\nblock G : u -> y = 1/(s*(s + 10))\nfind y / r\n";
const BAD: &str = "model bad\ninput r\noutput y\nsum e = r - ym\nblock G : e -> y = Kx/(s + 1)\nfind y / r\n";

/// A folder of this test's own.
fn folder(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("cli").join(name);
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).expect("the folder can be made");
    folder
}

fn write(folder: &Path, name: &str, text: impl AsRef<[u8]>) {
    std::fs::write(folder.join(name), text).expect("the file can be written");
}

fn program(folder: &Path, arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_loopwright"));
    command.args(arguments).current_dir(folder).env_remove("NO_COLOR").env_remove("TERM").stdin(Stdio::null());
    command
}

fn run(folder: &Path, arguments: &[&str]) -> Output {
    program(folder, arguments).output().expect("the program runs")
}

fn status(output: &Output) -> i32 {
    output.status.code().unwrap_or(-1)
}

fn out(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).expect("results are UTF-8")
}

fn err(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).expect("diagnostics are UTF-8")
}

fn json(output: &Output) -> serde_json::Value {
    serde_json::from_slice(&output.stdout).expect("the document is JSON")
}

#[test]
fn check_says_one_quiet_line_or_tells_all_mistakes() {
    let f = folder("check");
    write(&f, "good.loop", GOOD);
    write(&f, "bad.loop", BAD);
    let good = run(&f, &["check", "good.loop"]);
    assert_eq!(
        (status(&good), out(&good), err(&good)),
        (0, "good.loop: 2 blocks, 1 sum, nothing to report\n".into(), String::new())
    );
    let bad = run(&f, &["check", "bad.loop"]);
    assert_eq!((status(&bad), out(&bad).as_str()), (2, ""));
    let told = err(&bad);
    for part in ["error: undriven-signal\n", "error: unknown-name\n", "bad.loop:4:13", "bad.loop:5:20", "\n2 errors\n"]
    {
        assert!(told.contains(part), "{part} is not in\n{told}");
    }
    let both = run(&f, &["check", "good.loop", "bad.loop", "none.loop", "--format", "json"]);
    assert_eq!((status(&both), err(&both).as_str()), (2, ""));
    let document = json(&both);
    assert_eq!((&document["schema"], &document["ok"]), (&"loopwright.check.1".into(), &false.into()));
    let codes: Vec<_> = document["diagnostics"].as_array().into_iter().flatten().map(|d| d["code"].clone()).collect();
    assert_eq!(codes, ["undriven-signal", "unknown-name", "use-not-found"]);
    let label = &document["diagnostics"][1]["labels"][0];
    assert_eq!(
        (&label["file"], &label["line"], &label["column"], &label["length"]),
        (&"bad.loop".into(), &5.into(), &20.into(), &2.into())
    );
}

#[test]
fn a_mistake_in_a_file_that_two_use_is_told_once() {
    let f = folder("shared");
    write(&f, "part.loop", "define lag(T) = 1/(T*s + Kx)\n");
    for name in ["a.loop", "b.loop"] {
        write(&f, name, "use \"part.loop\"\ninput r\noutput y\nblock G : r -> y = lag(2)\nfind y / r\n");
    }
    let output = run(&f, &["check", "a.loop", "b.loop"]);
    assert_eq!((status(&output), err(&output).matches("error: unknown-name").count()), (2, 1), "{}", err(&output));
    let document = json(&run(&f, &["check", "a.loop", "b.loop", "--format", "json"]));
    assert_eq!(document["diagnostics"].as_array().map(Vec::len), Some(1));
}

#[test]
fn derive_tells_what_a_reader_of_results_has_to_know() {
    let f = folder("warned");
    let text = "input r\noutput y\nsum e = r - y\nblock C : e -> u = 2*(s - 1)/(s + 3)\nblock G : u -> y = 1/(s - 1)\n";
    write(&f, "hidden.loop", format!("{text}find y / r\n"));
    let output = run(&f, &["derive", "hidden.loop"]);
    assert_eq!(status(&output), 0);
    assert!(err(&output).contains("warning: hidden-unstable-mode"), "{}", err(&output));
    assert!(out(&output).contains("cancelled"), "{}", out(&output));
}

#[test]
fn derive_prints_the_fraction_and_json_is_the_same_each_time() {
    let f = folder("derive");
    write(&f, "servo.loop", GOOD);
    let text = run(&f, &["derive", "servo.loop"]);
    assert_eq!((status(&text), err(&text).as_str()), (0, ""));
    assert!(out(&text).starts_with("servo, nominal values\n"), "{}", out(&text));
    assert!(out(&text).contains("\ny / r = ───────"), "{}", out(&text));
    let first = run(&f, &["derive", "servo.loop", "--format", "json"]);
    let again = run(&f, &["derive", "servo.loop", "--format", "json"]);
    assert_eq!(first.stdout, again.stdout);
    let t = &json(&first)["transfers"][0];
    assert_eq!(t["denominator"][0], serde_json::json!({"power": 2, "delay": "0", "coefficient": "1"}));
    assert_eq!(t["converges_right_of"], -4.0);
    let asked = run(&f, &["derive", "servo.loop", "loop at u", "y/u with e open", "--format", "json"]);
    let names: Vec<_> = json(&asked)["transfers"].as_array().into_iter().flatten().map(|t| t["from"].clone()).collect();
    assert_eq!(names, ["loop at u", "u"]);
    for style in ["expanded", "factored", "time-constants"] {
        assert_eq!(status(&run(&f, &["derive", "servo.loop", "--fraction", style])), 0);
    }
}

#[test]
fn a_document_stands_on_standard_output_also_when_the_input_is_in_error() {
    let f = folder("error-json");
    write(&f, "bad.loop", BAD);
    for command in [vec!["derive", "bad.loop"], vec!["mason", "bad.loop", "y / r"], vec!["derive", "none.loop"]] {
        let output = run(&f, &[command.as_slice(), &["--format", "json"]].concat());
        assert_eq!((status(&output), &json(&output)["ok"]), (2, &false.into()), "{command:?}");
        assert!(!json(&output)["diagnostics"].as_array().expect("a list").is_empty());
        assert!(err(&output).contains("error: "), "{}", err(&output));
    }
}

#[test]
fn a_limit_has_its_own_status_and_wins() {
    let f = folder("limit");
    write(&f, "bad.loop", BAD);
    write(&f, "much.loop", "input x0\nrepeat k in 1..1000000000 {\n  block S{k} : x{k-1} -> x{k} = 1/(s + 1)\n}\n");
    assert_eq!(status(&run(&f, &["check", "much.loop"])), 3);
    assert_eq!(status(&run(&f, &["check", "much.loop", "bad.loop"])), 3);
    let output = run(&f, &["derive", "much.loop", "--format", "json"]);
    assert_eq!((status(&output), &json(&output)["diagnostics"][0]["code"]), (3, &"limit-reached".into()));
}

#[test]
fn mason_works_out_one_request() {
    let f = folder("mason");
    write(&f, "servo.loop", GOOD);
    let output = run(&f, &["mason", "servo.loop", "y / r"]);
    assert_eq!((status(&output), err(&output).as_str()), (0, ""));
    let text = out(&output);
    for part in ["Forward paths\n", "Loops\n", "Determinant\n", "Cofactors", "Gain\n", "P1 = C·G", "L1 = -C·G"] {
        assert!(text.contains(part), "{part} is not in\n{text}");
    }
    assert!(text.lines().all(|l| l.chars().count() <= 80), "{text}");
    assert_eq!(status(&run(&f, &["mason", "servo.loop", "y / r, e / r"])), 2);
}

#[test]
fn standard_input_is_a_file_too() {
    let f = folder("stdin");
    let mut child = program(&f, &["derive", "-", "--format", "json"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .expect("the program runs");
    child.stdin.take().expect("a pipe").write_all(GOOD.as_bytes()).expect("the program reads");
    let output = child.wait_with_output().expect("the program ends");
    assert_eq!((status(&output), &json(&output)["model"]), (0, &"servo".into()));
}

#[test]
fn output_goes_into_a_file_whole_or_not_at_all() {
    let f = folder("output");
    write(&f, "servo.loop", GOOD);
    write(&f, "bad.loop", BAD);
    write(&f, "result.txt", "older");
    let output = run(&f, &["derive", "servo.loop", "-o", "result.txt"]);
    assert_eq!((status(&output), out(&output).as_str()), (0, ""));
    let written = std::fs::read_to_string(f.join("result.txt")).expect("it is there");
    assert_eq!(written, out(&run(&f, &["derive", "servo.loop", "-o", "-"])));
    assert_eq!(status(&run(&f, &["derive", "bad.loop", "-o", "result.txt"])), 2);
    assert_eq!(std::fs::read_to_string(f.join("result.txt")).expect("it is there"), written);
    let nowhere = run(&f, &["derive", "servo.loop", "-o", "no/such/folder.txt"]);
    assert_eq!(status(&nowhere), 2);
    assert!(err(&nowhere).starts_with("error: can't write `no/such/folder.txt`: no such file"), "{}", err(&nowhere));
    let left = std::fs::read_dir(&f).expect("the folder is there").flatten().count();
    assert_eq!(left, 3, "no temporary file stays");
}

#[test]
fn a_reader_that_goes_early_is_no_error() {
    let f = folder("pipe");
    let block = |k: i32| format!("output y{k}\nblock G{k} : r -> y{k} = 1/(s + {k})\n");
    let blocks = (0..400).map(block).collect::<Vec<_>>().concat();
    write(&f, "many.loop", format!("input r\n{blocks}find all\n"));
    for format in ["text", "json"] {
        let mut child = program(&f, &["derive", "many.loop", "--format", format])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program runs");
        let mut some = [0; 10];
        let mut pipe = child.stdout.take().expect("a pipe");
        pipe.read_exact(&mut some).expect("it prints");
        drop(pipe);
        let output = child.wait_with_output().expect("the program ends");
        assert_eq!((status(&output), err(&output).as_str()), (0, ""), "{format}");
    }
}

#[test]
fn colour_is_one_decision() {
    let f = folder("color");
    write(&f, "bad.loop", BAD);
    let escape = |output: &Output| err(output).contains('\u{1b}') || out(output).contains('\u{1b}');
    assert!(!escape(&run(&f, &["check", "bad.loop"])), "a pipe is no terminal");
    assert!(escape(&run(&f, &["check", "bad.loop", "--color", "always"])));
    assert!(!escape(&run(&f, &["check", "bad.loop", "--color", "never"])));
    let wish_wins = program(&f, &["check", "bad.loop", "--color=always"]).env("NO_COLOR", "1").output();
    assert!(escape(&wish_wins.expect("the program runs")));
    assert!(!escape(&run(&f, &["--help"])));
    assert!(!escape(&run(&f, &["nonsense"])));
    assert!(escape(&run(&f, &["nonsense", "--color=always"])));
    assert!(!escape(&run(&f, &["explain", "syntax"])));
}

#[test]
fn mistakes_on_the_command_line_have_status_two() {
    let f = folder("usage");
    write(&f, "servo.loop", GOOD);
    for arguments in [
        &["frobnicate"][..],
        &[],
        &["check"],
        &["derive", "servo.loop", "--format", "xml"],
        &["derive", "servo.loop", "y / nothing"],
        &["derive", "servo.loop", "--set", "K=3"],
        &["derive", "servo.loop", "--case", "cold"],
        &["derive", "servo.loop", "--keep", "Kq"],
        &["derive", "."],
        &["explain", "no-such-code"],
        &["manual", "nothing"],
    ] {
        let output = run(&f, arguments);
        assert_eq!(status(&output), 2, "{arguments:?}: {}", err(&output));
        assert!(!output.stderr.is_empty() && output.stdout.is_empty(), "{arguments:?}");
    }
    assert!(err(&run(&f, &["explain", "sintax"])).contains("'syntax'"));
    for arguments in [&["--help"][..], &["--version"], &["derive", "--help"]] {
        let output = run(&f, arguments);
        assert_eq!((status(&output), err(&output).as_str()), (0, ""), "{arguments:?}");
    }
}

#[test]
fn text_that_is_no_utf8_is_told_with_its_place() {
    let f = folder("utf8");
    write(&f, "latin.loop", b"model a # gr\xfcn\ninput r\noutput y\nblock G : r -> y = 2\xb7s\nfind y / r\n");
    let output = run(&f, &["check", "latin.loop", "--format", "json"]);
    assert_eq!(status(&output), 2);
    let document = json(&output);
    let places: Vec<_> = document["diagnostics"]
        .as_array()
        .into_iter()
        .flatten()
        .filter(|d| d["code"] == "syntax")
        .map(|d| (d["labels"][0]["line"].clone(), d["labels"][0]["column"].clone()))
        .collect();
    assert_eq!(places, [(1.into(), 13.into()), (4.into(), 21.into())]);
}

#[test]
fn completions_and_man_pages_come_from_the_commands() {
    let f = folder("companions");
    for shell in ["bash", "zsh", "fish", "elvish", "powershell"] {
        assert!(out(&run(&f, &["completions", shell])).contains("characteristic"), "{shell}");
    }
    assert!(out(&run(&f, &["manual"])).contains("loopwright\\-derive"));
    assert!(out(&run(&f, &["manual", "derive"])).contains("\\-\\-fraction"));
}

/// The two blocks of a page of `docs/diagnostics`: the one with the mistake, and the mended one.
fn example<'a>(page: &'a str, kind: &str) -> &'a str {
    let start =
        page.split_once(&format!("```loop {kind}\n")).unwrap_or_else(|| panic!("no {kind} example in\n{page}")).1;
    start.split_once("```").expect("the block ends").0
}

#[test]
fn each_code_has_a_page_whose_example_has_it_and_whose_mend_has_no_error() {
    let f = folder("explain");
    let mut wrong = Vec::new();
    for code in loopwright::diagnostics::Code::ALL {
        let word = code.word();
        let page = run(&f, &["explain", word]);
        let file = format!("{}/docs/diagnostics/{word}.md", env!("CARGO_MANIFEST_DIR"));
        assert_eq!((status(&page), out(&page)), (0, std::fs::read_to_string(file).expect("the page is there")));
        assert!(out(&page).starts_with(&format!("# {word}\n")));
        for kind in ["bad", "good"] {
            write(&f, "example.loop", example(&out(&page), kind));
            let document = json(&run(&f, &["check", "example.loop", "--format", "json"]));
            let told = document["diagnostics"].as_array().cloned().unwrap_or_default();
            let has = told.iter().any(|d| d["code"] == word);
            let alone = told.iter().all(|d| d["code"] == word);
            if if kind == "bad" { !has || !alone } else { has || document["ok"] != true } {
                wrong.push(format!("{word}, {kind}: {document:#}\n"));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.concat());
}

#[test]
fn assess_says_what_fails_by_its_status() {
    let f = folder("assess");
    write(&f, "good.loop", format!("{GOOD}require stable\nrequire phase_margin at u >= 60 [deg]\n"));
    write(&f, "slow.loop", format!("{GOOD}require settling_time y/r <= 100 [ms]\n"));
    write(&f, "open.loop", GOOD.replace("24", "Kx").replace("sum", "param Kx\nparam Ky\nsum"));
    let good = run(&f, &["assess", "good.loop"]);
    assert!(out(&good).starts_with("servo: stable; all 2 requirements hold\n"), "{}", out(&good));
    assert_eq!((status(&good), err(&good)), (0, String::new()));
    let slow = run(&f, &["assess", "slow.loop", "--format", "json"]);
    assert_eq!(status(&slow), 1);
    let requirement = &json(&slow)["cases"][0]["requirements"][0];
    assert_eq!((&requirement["holds"], &requirement["unit"]), (&false.into(), &"ms".into()));
    assert_eq!((requirement["line"].as_i64(), requirement["required"].as_f64()), (Some(8), Some(100.0)));
    // Only what has no value and matters is told, once; nothing is worked out.
    let open = run(&f, &["assess", "open.loop"]);
    assert_eq!((status(&open), out(&open).as_str()), (2, ""));
    assert_eq!(err(&open).matches("parameter-without-value").count(), 1, "{}", err(&open));
    assert_eq!(status(&run(&f, &["assess", "open.loop", "--set", "Kx=24"])), 0);
    let sarif = run(&f, &["assess", "slow.loop", "--format", "sarif"]);
    assert_eq!((status(&sarif), &json(&sarif)["runs"][0]["results"][0]["level"]), (1, &"error".into()));
    assert!(out(&run(&f, &["assess", "slow.loop", "--format", "junit"])).contains("<failure"));
}
