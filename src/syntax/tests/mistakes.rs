//! What a mistake costs, and what is said of it.

use super::super::{MAX_NESTING, parse};
use super::mistakes;
use crate::diagnostics::Code;

/// The only mistake of a text, its place, and how many statements were read.
fn only(text: &str) -> (String, String, usize) {
    let found = mistakes(text);
    assert_eq!(found.len(), 1, "{text}\n{found:?}");
    let (message, place) = found.into_iter().next().unwrap_or_default();
    (message, place, parse(text, 0).tree.statements.len())
}

fn help(text: &str) -> String {
    parse(text, 0).diagnostics[0].help.clone().unwrap_or_default()
}

#[test]
fn a_mistake_costs_one_statement() {
    let text = "input r\nsum e r - y\nblock C : e -> u = 3\nsum y = u +\nfind y / r";
    let found = mistakes(text);
    assert_eq!(found[0], ("expected `=`, found `r`".to_owned(), "r".to_owned()));
    assert_eq!(found[1], ("expected a value, found the end".to_owned(), String::new()));
    assert_eq!((found.len(), parse(text, 0).tree.statements.len()), (2, 3));
}

#[test]
fn a_mistake_in_a_body_costs_one_line() {
    let text = "define f(K) : a -> b {\n  sum e a\n  sum c = a\n}\nblock R : a -> b {\n  x' = )\n  b = x\n}\n\
                case hot { J = = 2; K = 3 }\nrepeat k in 1..2 { sum x{k = 1; sum y{k} = 2 }";
    assert_eq!(mistakes(text).len(), 4);
    let shown = super::show::statements(&parse(text, 0).tree, text, &parse(text, 0).tree.statements);
    assert_eq!(
        shown,
        [
            "define f(K) : a -> b { sum c = a }",
            "block R : a -> b { b = x }",
            "case hot { K = 3 }",
            "repeat k in 1..2 { sum y{k} = 2 }"
        ]
    );
}

#[test]
fn a_missing_bracket_ends_with_its_statement() {
    let (message, place, statements) = only("block C : e -> u = 3*(s + 1\nblock G : u -> y = 1\nfind y / r\n");
    assert_eq!((message.as_str(), place.as_str(), statements), ("a parenthesis is not closed", "(", 2));
    // A line that begins with a statement word, a call of `sum( )` apart, ends it also in a body.
    let (message, _, _) = only("repeat k in 1..2 {\n  sum a{k} = f(b,\n  sum(j in 1..2,\n  c\n  sum b{k} = 1\n}\n");
    assert_eq!(message, "a parenthesis is not closed");
    assert_eq!(only("sum e = (a + b]\nsum f = 1").0, "`]` does not close `(`");
    assert_eq!(only("block G : a -> b = [[1, 2], [3, 4]\nsum f = 1").0, "a bracket is not closed");
}

#[test]
fn a_missing_brace_does_not_swallow_the_file() {
    let text =
        "define f(K) : a -> b {\n  repeat k in 1..2 {\n    sum c{k} = a\n  }\n  sum b = c1\n\nfind y / r\nfind e / r\n";
    let (message, place, statements) = only(text);
    assert_eq!((message.as_str(), place.as_str(), statements), ("a body is not closed", "{", 3));
    // State equations end at a statement word in any column.
    let (message, _, statements) =
        only("repeat k in 1..2 {\n  block R{k} : a -> b{k} {\n    b{k} = a\n  sum c{k} = a\n}\nfind y / r");
    assert_eq!((message.as_str(), statements), ("a body is not closed", 2));
    // At the end of the text.
    assert_eq!(only("case hot {\n  J = 3").0, "a body is not closed");
    let (message, _, statements) = only("}\nsum a = b");
    assert_eq!((message.as_str(), statements), ("a `}` without its `{`", 1));
}

#[test]
fn a_misspelt_word_is_read_as_what_was_meant() {
    let (message, place, statements) = only("bloc C : e -> u = 3*(s + 1)");
    assert_eq!((message.as_str(), place.as_str(), statements), ("no statement begins with `bloc`", "bloc", 1));
    assert_eq!(help("bloc C : e -> u = 3"), "write `block`");
    let text = "Repeatt k in 1..2 {\n  sum a{k} = 1\n}";
    let parsed = parse(text, 0);
    let shown = super::show::statements(&parsed.tree, text, &parsed.tree.statements);
    assert_eq!((shown, parsed.diagnostics.len()), (vec!["repeat k in 1..2 { sum a{k} = 1 }".to_owned()], 1));
    assert_eq!(only("velocity = 3").0, "no statement begins with `velocity`");
    assert_eq!(help("gain = 3"), "for a value write `param gain = …`, for a signal `sum gain = …`");
    // What is wrong behind a misspelt word is told at its own place.
    assert_eq!(mistakes("bloc C : e -> u 3")[1], ("expected `,`, `=` or `{`, found `3`".to_owned(), "3".to_owned()));
}

#[test]
fn mends_are_told() {
    for (text, place, mend) in [
        ("sum e = 2x", "x", "there is no multiplication without `*`: write `2*x`"),
        ("sum e = 2(s + 1)", "(", "there is no multiplication without `*`"),
        ("sum e = s**2", "*", "a power is written with `^`"),
        ("sum e == r", "=", "write one `=`"),
        ("param K := 3", ":", "write `=`"),
        ("sum e = + r", "+", "leave the `+` out"),
        ("sum e = 3 · r", "·", "write `*`"),
        ("sum e = a − b", "−", "write `-`"),
        ("model a “text”", "“", "write `\"`"),
        ("input r \"text", "\"", "close the text with `\"`"),
        ("input r\u{a0}[m]", "\u{a0}", "write an ordinary space"),
        ("param m = 3 kg", "kg", "a unit stands in brackets, such as `[kg]`; a product has a `*`"),
        ("param m = [kg] 3", "[", "a unit stands after its value, such as `3 [N*m]`"),
        ("input r, d", ",", "declare one name a line"),
        ("param T = 0,5 [s]", ",", "a decimal has a point, such as `0.5`"),
        ("block G : r => y = 1", "=", "the arrow is `->`"),
        ("block G r -> y = 1", "r", "its form is `block NAME : INPUT -> OUTPUT = LAW`"),
        ("sum e r - y", "r", "its form is `sum NAME = a - b + 0.5*c`"),
        ("find y r", "r", "its form is `find y / r`, `find loop at u` or `find all`"),
        ("define f(T) = [[1]]", "[", "a matrix stands only as the law of a `block`"),
        ("require peak y/r => 3", "=", "a comparison is `>=`, `<=`, `>` or `<`"),
        ("require peak u >= 3", ">=", "what a metric is asked of is `at u` or `y/r`"),
        ("param K = 3 within 5", "", "a tolerance is `within 5%` or `within 3.0 .. 3.4 [unit]`"),
        ("find loop at u, y / r", "/", "`find loop` and `find zeros` stand alone on their line"),
        ("find y / r, zeros a / b", "zeros a / b", "write a `find` of its own for it"),
        ("case cold{ J = 3 }", "{", "put a space before the `{` of a body"),
        ("define f(T) : a -> b{\n sum b = a\n}", "{", "put a space before the `{` of a body"),
        ("find y / r keep a keep b", "keep b", "put all names into one clause, separated by commas"),
        (
            "+ 3",
            "+",
            "a line goes on in the next only where it ends in `,`, `=`, `->` or an operator, or inside brackets: \
                      move the sign to the end of the line before",
        ),
    ] {
        let parsed = parse(text, 0);
        assert_eq!(parsed.diagnostics.len(), 1, "{text}: {:?}", parsed.diagnostics);
        assert_eq!(super::labelled(text, &parsed.diagnostics[0]), place, "{text}");
        assert_eq!(parsed.diagnostics[0].help.as_deref(), Some(mend), "{text}");
    }
}

#[test]
fn reserved_names_are_told() {
    for text in [
        "sum s = r",
        "param block = 3",
        "input z",
        "block find : a -> b = 1",
        "block G : a -> pi = 1",
        "block G : s -> b = 1",
        "define use(T) = 1",
        "define f(s) = 1",
        "define f() : z -> b {\n sum b = 1\n}",
        "repeat s in 1..2 {\n}",
        "case model { }",
        "model s",
        "sum e = sum(z in 1..2, 1)",
        "sum e = f(s = 1)",
        "sum e = block",
        "find y / s",
        "find y / r keep pi",
        "block R : a -> b { s' = a }",
    ] {
        let found = mistakes(text);
        assert_eq!(found.len(), 1, "{text}: {found:?}");
        assert!(found[0].0.ends_with("is reserved and can't be a name here"), "{text}: {found:?}");
    }
}

#[test]
fn forms_in_the_wrong_place_are_told() {
    for (text, message) in [
        ("sum e = x'", "a derivative can't stand here"),
        ("block R : a -> b { x'' = a }", "expected `=`, found `'`"),
        ("block R : a -> b { x { y = a } }", "a body can't begin here"),
        ("sum e = az.e", "the path `az.e` can't stand here"),
        ("block az.C : a -> b = 1", "the path `az.C` can't stand here"),
        ("sum e = sum(a, b)", "`sum( )` takes a range and what is written out"),
        ("sum e = sum(k in 1..2)", "`sum( )` takes a range and what is written out"),
        ("sum e = product(k in 1..2, a, b)", "`product( )` takes a range and what is written out"),
        ("sum e = f(k in 1..2, a)", "a range can't stand here"),
        ("sum e = f(a + b = 2)", "an argument's name is expected"),
        ("sum e = s(1)", "`s` can't be called"),
        ("sum e = f{k}(1)", "`f{k}` can't be called"),
        ("sum e = 3 [N*m/]", "`[N*m/]` is no unit"),
        ("define f() : a -> b {\n  find b / a\n}", "`find` can't stand in the body of a `define`"),
        ("repeat k in 1..2 {\n  case c { }\n}", "`case` can't stand in the body of a `repeat`"),
        ("find y / r in a.b", "a case has a plain name"),
        ("output", "expected a name after `output`"),
        ("sum e = a\u{1}", "a control character can't stand in a statement"),
    ] {
        let found = mistakes(text);
        assert_eq!(found.len(), 1, "{text}: {found:?}");
        assert_eq!(found[0].0, message, "{text}");
    }
}

#[test]
fn names_of_lost_statements_are_known() {
    let text = "block C : e -> u1 = 3*\nrepeat k in 1..2 )\nsum y = u1\ncase hot ( { J = 2 }";
    let parsed = parse(text, 0);
    let names: Vec<&str> = parsed.lost_names.iter().map(|span| &text[span.start as usize..span.end as usize]).collect();
    assert_eq!(names, ["C", "e", "u1", "k", "in", "hot", "J"]);
}

#[test]
fn nesting_is_bounded() {
    let nested = |n: usize| format!("sum e = {}x{}\nsum f = 1", "(".repeat(n), ")".repeat(n));
    assert_eq!(parse(&nested(MAX_NESTING), 0).diagnostics, []);
    let parsed = parse(&nested(MAX_NESTING + 1), 0);
    assert_eq!((parsed.diagnostics.len(), parsed.diagnostics[0].code), (1, Code::LimitReached));
    assert_eq!(parsed.tree.statements.len(), 1);
    let bodies = |n: usize| format!("{}{}", "repeat k in 1..2 {\n".repeat(n), "}\n".repeat(n));
    assert_eq!(parse(&bodies(MAX_NESTING), 0).diagnostics, []);
    let parsed = parse(&bodies(MAX_NESTING + 1), 0);
    assert_eq!((parsed.diagnostics.len(), parsed.diagnostics[0].code), (1, Code::LimitReached));
}

#[test]
fn every_bracket_may_carry_operators() {
    let nested = format!("sum e = {}x{}", "-1 + 2*f(".repeat(MAX_NESTING), ")".repeat(MAX_NESTING));
    assert_eq!(parse(&nested, 0).diagnostics, []);
}

#[test]
fn runs_of_signs_are_bounded() {
    for text in [format!("sum e = {}x", "-".repeat(100_000)), format!("sum e = x{}", "^x".repeat(100_000))] {
        let parsed = parse(&text, 0);
        assert_eq!((parsed.diagnostics.len(), parsed.diagnostics[0].code), (1, Code::LimitReached));
        assert_eq!((parsed.tree.statements.len(), parsed.tree.exprs.len()), (0, 0));
    }
}
