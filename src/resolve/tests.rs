//! What a text comes to: codes with their lines, and exact values of laws.

use super::{CommandLine, Resolved, resolve};
use crate::diagnostics::Severity;
use crate::netlist::values::Values;
use crate::netlist::{Keep, Law, Netlist};
use crate::source::{Loader, SourceMap};
use std::path::Path;

/// Files by name.
struct Table(Vec<(&'static str, &'static str)>);

impl Loader for Table {
    fn load(&self, path: &Path) -> std::io::Result<Vec<u8>> {
        let found = self.0.iter().find(|(name, _)| Path::new(name) == path);
        found.map(|(_, text)| text.as_bytes().to_vec()).ok_or_else(|| std::io::ErrorKind::NotFound.into())
    }
}

fn run(text: &str, others: Vec<(&'static str, &'static str)>, line: &CommandLine) -> (SourceMap, Resolved) {
    let mut sources = SourceMap::new();
    let root = sources.add("test.loop", text).unwrap();
    let resolved = resolve(&mut sources, root, &Table(others), line);
    (sources, resolved)
}

/// Each diagnostic as `code line`, notes left out.
fn told_with(text: &str, others: Vec<(&'static str, &'static str)>) -> Vec<String> {
    let (sources, resolved) = run(text, others, &CommandLine::default());
    let told = resolved.diagnostics.iter().filter(|d| d.severity != Severity::Note);
    told.map(|d| {
        let line = d.labels.first().and_then(|l| sources.place(l.span)).map_or(0, |p| p.line);
        format!("{} {line}", d.code.word())
    })
    .collect()
}

fn told(text: &str) -> Vec<String> {
    told_with(text, Vec::new())
}

fn netlist(text: &str) -> Netlist {
    let (_, resolved) = run(text, Vec::new(), &CommandLine::default());
    let errors: Vec<_> = resolved.diagnostics.iter().filter(|d| d.is_error()).collect();
    assert!(errors.is_empty(), "{errors:#?}");
    resolved.netlist.unwrap()
}

/// The law of a block by name, as numerator and denominator.
fn law(net: &Netlist, block: &str, case: Option<usize>) -> String {
    let case = case.map(|c| crate::netlist::CaseId(c as u32));
    let values = Values::new(net, case, &Keep::Nothing).unwrap();
    let block = net.blocks.iter().find(|b| net.names.get(b.name) == block).unwrap();
    let Law::Scalar(expr) = block.law else { panic!("not a scalar law") };
    let fraction = values.evaluate(expr).unwrap().fraction;
    let side = |p: &crate::algebra::Poly| {
        let term = |(powers, c): (Vec<(crate::algebra::Var, u32)>, crate::algebra::IBig)| {
            let powers: Vec<String> = powers.iter().map(|&(v, e)| format!("{}^{e}", values.name(v))).collect();
            format!("{c} {}", powers.join(" ")).trim().to_owned()
        };
        p.terms().map(term).collect::<Vec<_>>().join(" + ")
    };
    format!("({}) / ({})", side(fraction.numerator()), side(fraction.denominator()))
}

/// A model with one block of this law, from r to y, after these lines.
fn one_block(lines: &str, law: &str) -> String {
    format!("{lines}\ninput r\noutput y\nblock G : r -> y = {law}\nfind y / r\n")
}

#[test]
fn laws_follow_the_trades_precedence() {
    for (text, value) in [
        ("2^3^2/(s + 1)", "(512) / (1 s^1 + 1)"),
        ("-s^2/(s + 1)", "(-1 s^2) / (1 s^1 + 1)"),
        ("2/-s", "(-2) / (1 s^1)"),
        ("1 - 2 - 3", "(-4) / (1)"),
        ("8/4/2", "(1) / (1)"),
        ("s^-1", "(1) / (1 s^1)"),
        ("0.35*1.5e-3", "(21) / (40000)"),
        ("(s + 1)^2/(s + 1)", "(1 s^1 + 1) / (1)"),
        ("1/(2 [ms]*s + 1)", "(500) / (1 s^1 + 500)"),
        ("1/50 [s]", "(1) / (50)"),
        ("(1/50) [s]", "(1) / (50)"),
        ("sum(k in 0..2, s^k)", "(1 s^2 + 1 s^1 + 1) / (1)"),
        ("product(k in 1..3, 1/(k*s + 1))", "(1) / (6 s^3 + 11 s^2 + 6 s^1 + 1)"),
        ("sum(k in 2..1, s)", "() / (1)"),
        ("product(k in 2..1, s)", "(1) / (1)"),
        ("sqrt(0.1225)", "(7) / (20)"),
        ("cos(pi/3)", "(1) / (2)"),
        ("atan(1)", "(1 pi^1) / (4)"),
        ("max(2, 3)*min(5, 1, 4)*abs(-2)", "(6) / (1)"),
        ("exp(-0.3*s) + exp(-0.2*s)", "(1 exp(-1/10*s)^3 + 1 exp(-1/10*s)^2) / (1)"),
        ("exp(-s)/exp(-s)", "(1) / (1)"),
    ] {
        let net = netlist(&one_block("", text));
        let got = law(&net, "G", None).replace("(1/10)", "1/10");
        assert_eq!(got, value, "{text}");
    }
}

#[test]
fn units_are_exact() {
    for (lines, text, value) in [
        ("param n = 1500 [rpm]", "n", "(50 pi^1) / (1)"),
        ("param a = 30 [deg]", "a", "(1 pi^1) / (6)"),
        ("param v = 90 [km/h]", "v", "(25) / (1)"),
        ("param A = 3 [cm^2]", "A", "(3) / (10000)"),
        ("param p = 35 [%]", "p", "(7) / (20)"),
        ("unit turn = 360 [deg]\nparam n = 0.5 [turn]", "n", "(1 pi^1) / (1)"),
    ] {
        let net = netlist(&one_block(lines, text));
        assert_eq!(law(&net, "G", None), value, "{lines}");
    }
}

#[test]
fn cases_take_the_params_own_unit_and_work_derived_ones_out_anew() {
    let net = netlist(&one_block("param C = 220 [uF]\nparam D = 2*C\ncase aged { C = 150 }", "D*s"));
    assert_eq!(law(&net, "G", None), "(11 s^1) / (25000)");
    assert_eq!(law(&net, "G", Some(0)), "(3 s^1) / (10000)");
}

#[test]
fn defines_nest_and_take_laws_and_defaults() {
    let lines = "define par(Z1, Z2) = Z1*Z2/(Z1 + Z2)\ndefine cap(C) = 1/(C*s)\ndefine twice(T = 2, n = 2) = cap(T)^n";
    let net = netlist(&one_block(lines, "par(cap(2), 3)*twice()"));
    assert_eq!(law(&net, "G", None), "(3) / (24 s^3 + 4 s^2)");
    let net = netlist(&one_block(lines, "twice(n = 1, T = 5)"));
    assert_eq!(law(&net, "G", None), "(1) / (5 s^1)");
}

#[test]
fn standing_laws_are_there_and_a_users_own_wins() {
    let net = netlist(&one_block("", "lag(T = 0.5)"));
    assert_eq!(law(&net, "G", None), "(2) / (1 s^1 + 2)");
    let net = netlist(&one_block("define lag(T) = 7", "lag(T = 0.5)"));
    assert_eq!(law(&net, "G", None), "(7) / (1)");
}

#[test]
fn every_mistake_has_its_code_and_line() {
    let cases: &[(&str, &[&str])] = &[
        ("input r\noutput y\nblock G : r -> y = Kx/(s + tau)", &["unknown-name 3", "unknown-name 3"]),
        ("input r\noutput y\nsum y = Kq*r", &["unknown-name 3"]),
        ("input r\noutput y\nsum y = r/T", &["unknown-name 3"]),
        ("input r\noutput y\nsum y = r - q", &["undriven-signal 3"]),
        ("input r\noutput y", &["undriven-signal 2"]),
        ("input r\noutput y\nsum y = r\nsignal w", &["unused-signal 4"]),
        ("input r\noutput y\nsum y = r\nsum y = 2*r", &["driven-twice 4"]),
        ("input r\noutput y\nsum y = r\nblock G : y -> r = 1/s", &["driven-twice 4"]),
        ("input r\ninput r\noutput y\nsum y = r", &["duplicate-name 2"]),
        ("param r = 1\ninput r\noutput y\nsum y = 2*r", &["duplicate-name 2", "not-linear 4"]),
        ("input r\noutput y\nblock y : r -> y = 2", &["duplicate-name 3"]),
        ("input r\noutput y\nsum y = r + 1", &["not-linear 3"]),
        ("input r\ninput q\noutput y\nsum y = r*q", &["not-linear 4"]),
        ("param a = 2*b\nparam b = a + 1\ninput r\noutput y\nblock G : r -> y = a", &["circular-definition 1"]),
        (
            "define f(T) = g(T)\ndefine g(T) = f(T)\ninput r\noutput y\nblock G : r -> y = f(1)",
            &["circular-definition 1"],
        ),
        ("param a = 3\nparam b = 1/(a - 3)\ninput r\noutput y\nblock G : r -> y = b", &["division-by-zero 2"]),
        ("input r\noutput y\nblock G : r -> y = 1/(s - s)", &["division-by-zero 3"]),
        ("param a = 1\ncase c { a = 0 }\ninput r\noutput y\nblock G : r -> y = 1/a", &["division-by-zero 5"]),
        (
            "input r\noutput y\nblock G : r -> y = 1/s\nfind y / q\nrequire stable in hot",
            &["unknown-name 4", "unknown-name 5"],
        ),
        ("input r\noutput y\nblock G : r -> y = 1/s\nrequire phase_marign at y >= 3", &["unknown-name 4"]),
        ("input r\noutput y\nblock G : r -> y = lag(2, 3, 4, 5)", &["syntax 3"]),
        ("define f(a, b) = a/b\ninput r\noutput y\nblock G : r -> y = f(1)", &["syntax 4"]),
        ("define f(a, b) = a/b\ninput r\noutput y\nblock G : r -> y = f(1, c = 2)", &["unknown-name 4"]),
        ("input r\noutput y\nblock G : r -> y = [[1, 2]]", &["syntax 3"]),
        ("input r\noutput y\nblock G : r -> y = [[1], [2]]", &["syntax 3"]),
        ("input r\noutput y\nblock G : r -> y = s^1.5", &["syntax 3"]),
        ("input r\noutput y\nblock G : r -> y = 1/z", &["syntax 3"]),
        ("input r\noutput y\nblock G : r -> y = 1/s every 1 [s]", &["syntax 3"]),
        ("param a = 2*s\ninput r\noutput y\nblock G : r -> y = a", &["syntax 1"]),
        ("input r\noutput y\nblock G : r -> y = exp(-2*s^2)", &["syntax 3"]),
        ("input r\noutput y\nblock G : r -> y = exp(2*s)", &["improper-law 3"]),
        ("input r\noutput y\nrepeat k in 0..2 {\n  sum e{k-1} = r\n}\nsum y = r", &["syntax 4"]),
        ("input r\noutput y\nrepeat k in 1..2 {\n  sum e = r\n}\nsum y = r", &["driven-twice 4"]),
        ("input u\noutput w\nblock R : u -> w {\n  v' = u - v*v\n  w = v\n}", &["not-linear 4"]),
        ("input u\noutput w\nblock R : u -> w {\n  v' = u - b*v\n  w = v\n}", &["unknown-name 4"]),
        ("input u\noutput w\nblock R : u -> w {\n  v' = u - v\n}", &["syntax 3"]),
        ("input u\noutput w\nblock R : u -> w {\n  v' = u - v\n  v' = u\n  w = v\n}", &["duplicate-name 5"]),
        ("input u\noutput w\nblock R : u -> w {\n  v' = u - v + 1\n  w = v\n}", &["not-linear 4"]),
        ("case all { a = 1 }\nparam a = 2\ninput r\noutput y\nblock G : r -> y = a", &["syntax 1"]),
        ("param a = 2\ncase c { b = 1 }\ninput r\noutput y\nblock G : r -> y = a", &["unknown-name 2"]),
        ("input r [foo]\noutput y\nsum y = r", &["unknown-name 1"]),
    ];
    for (text, want) in cases {
        assert_eq!(told(text), *want, "\n{text}");
    }
}

#[test]
fn units_that_do_not_agree_are_told_at_the_operator() {
    let cases: &[(&str, &[&str])] = &[
        (
            "param J = 1 [kg*m^2]\nparam m = 2 [kg]\nparam x = J + m\ninput r\noutput y\nblock G : r -> y = x",
            &["unit-mismatch 3"],
        ),
        ("param T = 3 [m]\ninput r\noutput y\nblock G : r -> y = 1/(T*s + 1)", &["unit-mismatch 4"]),
        ("param T = 3 [ms]\ninput r\noutput y\nblock G : r -> y = 1/(T*s + 1)/(s + 1)", &[]),
        ("input t [N*m]\nsignal w [rad/s]\noutput y\nblock I : t -> w = 1/s\nsum y = t - w", &["unit-mismatch 5"]),
        ("input t [N*m]\ninput w [rad/s]\noutput y [N*m]\nsum y = 2*w", &[]),
        ("param K = 2 [V]\ninput t [m]\noutput y [m]\nblock G : t -> y = K", &["unit-mismatch 4"]),
        ("param T = 3 [m]\ninput r\noutput y\nblock G : r -> y = exp(-T*s)", &["unit-mismatch 4"]),
        (
            "param K = 2 [V/m]\ninput t [m]\nsignal u\noutput y [m]\nblock G : t -> u = K\nsum y = t - u",
            &["unit-mismatch 6"],
        ),
    ];
    for (text, want) in cases {
        assert_eq!(told(text), *want, "\n{text}");
    }
}

#[test]
fn a_bare_number_beside_a_scaled_unit_gets_a_note() {
    let notes = |text: &str| {
        let (_, resolved) = run(text, Vec::new(), &CommandLine::default());
        resolved.diagnostics.iter().map(|d| d.code.word()).collect::<Vec<_>>()
    };
    assert_eq!(notes("input x [mm]\noutput u [V]\nblock K : x -> u = 3"), ["bare-number"]);
    assert_eq!(notes("input x [m]\noutput u [V]\nblock K : x -> u = 3"), [""; 0]);
    assert_eq!(notes("input x [mm]\noutput y [mm]\nblock K : x -> y = 3"), [""; 0]);
}

#[test]
fn used_files_bring_in_defines_and_units_only() {
    let parts = "define gain(k) = k\nunit turn = 360 [deg]\ninput q\nparam p = 3\n";
    let text = "use \"parts.loop\"\nparam n = 1 [turn]\ninput r\noutput y\nblock G : r -> y = gain(n)";
    assert_eq!(told_with(text, vec![("parts.loop", parts)]), [""; 0]);
    let text = "use \"parts.loop\"\ninput r\noutput y\nblock G : r -> y = p";
    assert_eq!(told_with(text, vec![("parts.loop", parts)]), ["unknown-name 4"]);
    assert_eq!(told("use \"parts.loop\"\ninput r\noutput y\nblock G : r -> y = gain(3)"), ["use-not-found 1"]);
    let text = "use \"a.loop\"\nuse \"b.loop\"\ninput r\noutput y\nblock G : r -> y = f(3)";
    assert_eq!(
        told_with(text, vec![("a.loop", "define f(k) = k"), ("b.loop", "define f(k) = 2*k")]),
        ["duplicate-name 2"]
    );
    let text = "use \"a.loop\"\ninput r\noutput y\nblock G : r -> y = 2";
    assert_eq!(told_with(text, vec![("a.loop", "use \"test.loop\"")]), ["use-cycle 1"]);
}

#[test]
fn composites_are_written_out_with_their_ports_and_params() {
    let text = "define servo(K, T [s] = 0.5) : ref, load -> pos {\n  param J = 2*T\n  sum e = ref - pos\n  \
                block C : e -> u = K\n  sum v = u - load\n  block P : v -> pos = 1/(J*s + 1)\n}\ninput r\ninput d\noutput y\n\
                block az : r, d -> y = servo(K = 3)\ncase hot { az.K = 4 }\nfind y / r, az.e / az.ref, az.u / d\n";
    let net = netlist(text);
    let names: Vec<&str> =
        (0..net.signals.len()).map(|i| net.signal_name(crate::netlist::SignalId(i as u32))).collect();
    assert_eq!(names, ["r", "d", "y", "az.e", "az.u", "az.v"]);
    assert_eq!(law(&net, "az.P", None), "(1) / (1 s^1 + 1)");
    assert_eq!(law(&net, "az.C", Some(0)), "(4) / (1)");
    assert_eq!(net.requests.len(), 3);
}

#[test]
fn too_much_to_write_out_is_a_limit() {
    assert_eq!(told("repeat k in 1..1000000000 {\n  sum e{k} = r\n}"), ["limit-reached 1"]);
    assert_eq!(told("input r\noutput y\nblock G : r -> y = s^1000000000"), ["limit-reached 3"]);
    assert_eq!(told("input r\noutput y\nblock G : r -> y = 1e999999"), ["limit-reached 3"]);
}

#[test]
fn the_command_line_sets_keeps_and_asks() {
    let text = one_block("param K = 2 [ms]\nparam L = 3\ncase c { K = 5 }", "K/(s + L)");
    let line = CommandLine {
        requests: vec!["r / r".to_owned(), "loop at y".to_owned()],
        settings: vec!["K=7".to_owned()],
        case: Some("c".to_owned()),
        keep: vec!["L".to_owned()],
    };
    let (_, resolved) = run(&text, Vec::new(), &line);
    let net = resolved.netlist.unwrap();
    assert_eq!(net.requests.len(), 2);
    assert_eq!(net.nominal, Some(crate::netlist::CaseId(0)));
    assert!(matches!(&net.requests[1].clauses.keep, Keep::Params(p) if p.len() == 1));
    assert_eq!(law(&net, "G", None), "(7) / (1000 s^1 + 3000)");
}
