//! Lines, blanks, comments, names and numbers.

use super::{law, mistakes, one, shown};
use crate::syntax::parse;

#[test]
fn marks_and_line_ends() {
    let text = "\u{feff}input r\r\nsum e = r -\r\n  y # why\r\n";
    assert_eq!(shown(text), ["input r", "sum e = (r - y)"]);
    assert_eq!(one("\tinput\t r\t[ rad ] \t"), "input r [ rad ]");
    assert_eq!(shown(""), [""; 0]);
    assert_eq!(shown("\n\r\n  # only a comment"), [""; 0]);
}

#[test]
fn comments_are_kept() {
    let text = "# first\nmodel a \"no # comment\" # second\r\nsum e = (a + # third\n b)\n";
    let parsed = parse(text, 0);
    assert_eq!(parsed.diagnostics, []);
    let comments: Vec<&str> =
        parsed.tree.comments.iter().map(|span| &text[span.start as usize..span.end as usize]).collect();
    assert_eq!(comments, ["# first", "# second", "# third"]);
    assert_eq!(shown(text), ["model a \"no # comment\"", "sum e = (a + b)"]);
}

#[test]
fn lines_go_on() {
    assert_eq!(one("block G2 : r ->\n  y2 = a/(s +\n  a)"), "block G2 : r -> y2 = (a / (s + a))");
    assert_eq!(one("find y1 / r,\n\n  # between\n     y2 / r, y3 /\nr"), "find y1 / r, y2 / r, y3 / r");
    assert_eq!(one("sum Q =\nsum(k in 1..\n8, q{k})"), "sum Q = SUM(k in 1..8, q{k})");
    assert_eq!(one("require peak y/r <=\n 2"), "require peak y/r <= 2");
    assert_eq!(one("block G : u -> y = [[1,\n2],\n[3, 4]\n]"), "block G : u -> y = [[1, 2], [3, 4]]");
    assert_eq!(one("param x = f(a\n\n,b # text\n)"), "param x = f(a, b)");
    assert_eq!(shown("sum a = b\nsum c = d"), ["sum a = b", "sum c = d"]);
}

#[test]
fn semicolons_separate_in_bodies() {
    assert_eq!(
        one("repeat k in 1..2 { ; input p{k} ; output q{k}; \n;; sum q{k} = p{k}\n ; }"),
        "repeat k in 1..2 { input p{k}; output q{k}; sum q{k} = p{k} }"
    );
    assert_eq!(
        mistakes("sum a = b; sum c = d"),
        [("`;` separates statements only inside `{ }`".to_owned(), ";".to_owned())]
    );
    assert_eq!(parse("sum a = b; sum c = d", 0).tree.statements.len(), 2);
}

#[test]
fn names_are_unicode() {
    assert_eq!(one("param ω_n = ζ*2 [µm]"), "param ω_n = (ζ * 2 [µm])");
    assert_eq!(one("sum _ = _1 + été"), "sum _ = (_1 + été)");
    assert_eq!(one("sum T{i}{j} = a{ k - 1 }b{2}"), "sum T{i}{j} = a{(k - 1)}b{2}");
    assert_eq!(one("sum x{2^k} = x{min(a, b)}"), "sum x{(2 ^ k)} = x{min(a, b)}");
}

#[test]
fn numbers_are_plain() {
    assert_eq!(law("1.5e-3 + 12 + 0.35 + 2E+6 + 1e9"), "((((1.5e-3 + 12) + 0.35) + 2E+6) + 1e9)");
    for (text, message) in [
        ("5e", "an exponent has no digits"),
        ("5e+", "an exponent has no digits"),
        ("1.", "a point has digits on both sides"),
        (".5", "a point has digits on both sides"),
        ("1.5.2", "a point has digits on both sides"),
        ("2x", "expected an operator or the end of the statement, found `x`"),
        ("0x10", "expected an operator or the end of the statement, found `x10`"),
    ] {
        let found = mistakes(&format!("sum e = {text}"));
        assert_eq!(found.len(), 1, "{text}");
        assert_eq!(found[0].0, message, "{text}");
    }
}

#[test]
fn a_long_sum_needs_no_stack() {
    let terms: Vec<String> = (0..100_000).map(|i| format!("x{i}")).collect();
    let parsed = parse(&format!("sum e = {}", terms.join(" + ")), 0);
    assert_eq!(parsed.diagnostics, []);
    assert_eq!(parsed.tree.exprs.len(), 199_999);
    let parsed = parse(&format!("sum e = {}", terms.join("*")), 0);
    assert_eq!((parsed.tree.exprs.len(), parsed.diagnostics.len()), (199_999, 0));
}

#[test]
fn parts_are_joined_in_order() {
    // Enough lines for several tasks, with every kind of number that moves.
    let block = |i: usize| {
        format!(
            "param K{i} [1/s] = a*2 [V] within 1..b [A]\nrepeat k in 1..{i} {{\n  sum x{{k}} = sum(j in 1..k, f(y{{j}}))\n}}\n"
        )
    };
    let text: String = (0..2_000).map(block).collect();
    let joined = shown(&text);
    assert_eq!(joined.len(), 4_000);
    for i in [0, 1, 777, 1_999] {
        assert_eq!(joined[2 * i..2 * i + 2], shown(&block(i))[..]);
    }
}
