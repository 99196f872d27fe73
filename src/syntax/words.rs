//! The words that nobody may take for a name, and the nearest of them to a word that is none.

use super::grammar::Rule;

/// A word that begins statements.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Word {
    Model,
    Use,
    Param,
    Input,
    Output,
    Signal,
    Sum,
    Block,
    Define,
    Repeat,
    Case,
    Find,
    Require,
    /// Not reserved: `unit` begins a statement and is an ordinary name elsewhere.
    Unit,
}

impl Word {
    /// The word as it is written.
    pub(super) fn text(self) -> &'static str {
        WORDS.iter().find(|entry| entry.1 == self).map_or("", |entry| entry.0)
    }

    /// The grammar's rule for its statements.
    pub(super) fn rule(self) -> Rule {
        match self {
            Self::Model => Rule::model,
            Self::Use => Rule::use_file,
            Self::Param => Rule::param,
            Self::Input | Self::Output | Self::Signal => Rule::signal,
            Self::Sum => Rule::sum,
            Self::Block => Rule::block,
            Self::Define => Rule::define,
            Self::Repeat => Rule::repeat,
            Self::Case => Rule::case,
            Self::Find => Rule::find,
            Self::Require => Rule::require,
            Self::Unit => Rule::unit_of_own,
        }
    }
}

/// All of them; the thirteen reserved ones first.
const WORDS: [(&str, Word); 14] = [
    ("model", Word::Model),
    ("use", Word::Use),
    ("param", Word::Param),
    ("input", Word::Input),
    ("output", Word::Output),
    ("signal", Word::Signal),
    ("sum", Word::Sum),
    ("block", Word::Block),
    ("define", Word::Define),
    ("repeat", Word::Repeat),
    ("case", Word::Case),
    ("find", Word::Find),
    ("require", Word::Require),
    ("unit", Word::Unit),
];

/// The words as they are told to people.
pub(super) const WORDS_TOLD: &str =
    "model, use, unit, param, input, output, signal, sum, block, define, repeat, case, find or require";

/// The statement that begins with `word`.
pub(super) fn statement_word(word: &str) -> Option<Word> {
    Some(match word.as_bytes() {
        b"model" => Word::Model,
        b"use" => Word::Use,
        b"param" => Word::Param,
        b"input" => Word::Input,
        b"output" => Word::Output,
        b"signal" => Word::Signal,
        b"sum" => Word::Sum,
        b"block" => Word::Block,
        b"define" => Word::Define,
        b"repeat" => Word::Repeat,
        b"case" => Word::Case,
        b"find" => Word::Find,
        b"require" => Word::Require,
        b"unit" => Word::Unit,
        _ => return None,
    })
}

/// Whether nothing may be called `name`: `s`, `z`, `pi` and the thirteen words that begin statements.
pub(super) fn is_reserved(name: &str) -> bool {
    match name.len() {
        1 => name == "s" || name == "z",
        2 => name == "pi",
        3..=7 => statement_word(name).is_some_and(|word| word != Word::Unit),
        _ => false,
    }
}

/// The statement word that was meant by `word`, if one is near enough: one slip in short words, two in longer ones.
pub(super) fn nearest(word: &str) -> Option<(&'static str, Word)> {
    let word = word.to_lowercase();
    if word.chars().count() > 10 {
        return None;
    }
    let distance = |&(known, _): &(&'static str, Word)| slips(&word, known);
    let &(known, found) = WORDS.iter().min_by_key(|entry| distance(entry))?;
    let allowed = if known.len() <= 4 { 1 } else { 2 };
    (slips(&word, known) <= allowed && word.chars().count() >= 2).then_some((known, found))
}

/// How many letters must be put in, taken out, changed or swapped with their neighbour to make `b` of `a` (optimal
/// string alignment; F. J. Damerau, A technique for computer detection and correction of spelling errors, 1964).
fn slips(a: &str, b: &str) -> usize {
    let a: Vec<char> = a.chars().collect();
    let b: Vec<char> = b.chars().collect();
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let change = last[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            row[j] = change.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_words_are_found() {
        assert_eq!(nearest("bloc").map(|n| n.0), Some("block"));
        assert_eq!(nearest("Block").map(|n| n.0), Some("block"));
        assert_eq!(nearest("ouptut").map(|n| n.0), Some("output"));
        assert_eq!(nearest("params").map(|n| n.0), Some("param"));
        assert_eq!(nearest("fnid").map(|n| n.0), Some("find"));
        assert_eq!(nearest("velocity"), None);
        assert_eq!(nearest("x"), None);
    }

    #[test]
    fn unit_is_a_word_and_may_be_a_name() {
        assert_eq!(statement_word("unit"), Some(Word::Unit));
        assert!(!is_reserved("unit") && !is_reserved("open") && is_reserved("require") && is_reserved("pi"));
    }
}
