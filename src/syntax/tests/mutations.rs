//! Texts that went wrong: whatever stands in them, there is a tree and no panic.

use super::super::parse;
use super::check_arena;

/// A text with every form of the language.
const SEED: &str = include_str!("seed.loop");

/// Numbers that look random, the same in each run (G. Marsaglia, Xorshift RNGs, 2003).
struct Numbers(u64);

impl Numbers {
    fn below(&mut self, bound: usize) -> usize {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 % bound.max(1) as u64) as usize
    }
}

/// Bytes that mean something to the splitter or to the grammar.
const TELLING: &[u8] = b"(){}[]\"#;\n\r\t =+-*/^,.:'%<>sz1e_\x00\xc3";

fn mutate(text: &[u8], numbers: &mut Numbers) -> Vec<u8> {
    let mut bytes = text.to_vec();
    let mut lines: Vec<Vec<u8>> = text.split(|&b| b == b'\n').map(<[u8]>::to_vec).collect();
    match numbers.below(6) {
        0 => {
            for _ in 0..=numbers.below(8) {
                let at = numbers.below(bytes.len());
                bytes[at] = (numbers.below(256)) as u8;
            }
            return bytes;
        }
        1 => {
            for _ in 0..=numbers.below(4) {
                let (at, byte) = (numbers.below(bytes.len()), TELLING[numbers.below(TELLING.len())]);
                bytes.insert(at, byte);
            }
            return bytes;
        }
        2 => {
            let at = numbers.below(bytes.len());
            let length = numbers.below(60).min(bytes.len() - at);
            bytes.drain(at..at + length);
            return bytes;
        }
        3 => {
            let (line, cut) = (numbers.below(lines.len()), numbers.below(30));
            lines[line].truncate(cut);
        }
        4 => {
            let line = lines[numbers.below(lines.len())].clone();
            lines.insert(numbers.below(lines.len()), line);
        }
        _ => {
            for _ in 0..numbers.below(20) {
                let (a, b) = (numbers.below(lines.len()), numbers.below(lines.len()));
                lines.swap(a, b);
            }
        }
    }
    lines.join(&b'\n')
}

/// Reads a text and checks what must hold of any.
fn try_text(bytes: &[u8]) {
    let text = String::from_utf8_lossy(bytes);
    let parsed = parse(&text, 7);
    check_arena(&parsed);
    let end = text.len() as u32 + 7;
    for diagnostic in &parsed.diagnostics {
        assert!(!diagnostic.labels.is_empty());
        for label in &diagnostic.labels {
            let span = label.span;
            assert!(7 <= span.start && span.start <= span.end && span.end <= end, "{diagnostic:?}\n{text}");
            assert!(text.get((span.start - 7) as usize..(span.end - 7) as usize).is_some(), "{diagnostic:?}\n{text}");
        }
    }
    for expr in &parsed.tree.exprs {
        let span = expr.span;
        assert!(text.get((span.start - 7) as usize..(span.end - 7) as usize).is_some(), "{span:?}\n{text}");
    }
}

#[test]
fn the_seed_is_sound() {
    assert_eq!(parse(SEED, 0).diagnostics, []);
}

#[test]
fn mutated_texts_give_diagnostics() {
    let mut numbers = Numbers(0x9e37_79b9_7f4a_7c15);
    for _ in 0..600 {
        let mut bytes = mutate(SEED.as_bytes(), &mut numbers);
        for _ in 0..numbers.below(3) {
            bytes = mutate(&bytes, &mut numbers);
        }
        try_text(&bytes);
    }
}

#[test]
fn deep_nesting_gives_diagnostics() {
    for opening in
        ["(", "[", "{", "x{", "x{(", "[[", "f(", "repeat k in 1..2 {", "define f() : a -> b {\n", "block R : a -> b {"]
    {
        for prefix in ["", "block G : u -> y = "] {
            for closing in ["", "}", ")]"] {
                let text = format!("{prefix}{}{}\nsum a = b\n", opening.repeat(100_000), closing.repeat(1_000));
                try_text(text.as_bytes());
            }
        }
    }
}

#[test]
fn runs_of_one_sign_give_diagnostics() {
    for sign in [
        "-", "^", "^-", "'", ".", "..", ",", ";", "\"", "#", "=", "->", ":", "\r", "\n", ")", "]", "}", "x ", "1 ",
        "1.", "x.", "\u{feff}", "é", "sum ", "sum\n", "find ", "x=", "x'", "}{", "){", "(;", "(}", "(\n",
    ] {
        for prefix in ["", "sum e = x", "find y / r", "case hot { a = "] {
            try_text(format!("{prefix}{}", sign.repeat(5_000)).as_bytes());
        }
    }
}
