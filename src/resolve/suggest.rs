//! Names that are close to one that is not there.

/// How many edits (insert, leave out, replace, swap neighbours) lead from one name to the other, at most `limit`;
/// the restricted distance of Damerau, A technique for computer detection and correction of spelling errors, 1964.
fn distance(a: &[char], b: &[char], limit: usize) -> Option<usize> {
    if a.len().abs_diff(b.len()) > limit {
        return None;
    }
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for (i, &x) in a.iter().enumerate() {
        let mut row = vec![i + 1];
        for (j, &y) in b.iter().enumerate() {
            let mut best = (last[j] + usize::from(x != y)).min(last[j + 1] + 1).min(row[j] + 1);
            if i > 0 && j > 0 && x == b[j - 1] && a[i - 1] == y {
                best = best.min(before[j - 1] + 1);
            }
            row.push(best);
        }
        before = std::mem::replace(&mut last, row);
    }
    last.last().copied().filter(|&d| d <= limit)
}

/// The closest of `names` to one that is not among them, if any is close enough; among equally close ones the first.
pub(super) fn closest<'a>(wrong: &str, names: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let letters: Vec<char> = wrong.chars().collect();
    let lower = |c: &[char]| c.iter().flat_map(|c| c.to_lowercase()).collect::<Vec<_>>();
    let limit = match letters.len() {
        0 => return None,
        1 => 0,
        2..=4 => 1,
        5..=8 => 2,
        _ => 3,
    };
    let mut best: Option<(usize, &str)> = None;
    for name in names {
        let other: Vec<char> = name.chars().collect();
        if other.len().abs_diff(letters.len()) > limit.max(1) {
            continue;
        }
        // Another case of the same letters is the nearest of all.
        let found = if lower(&letters) == lower(&other) { Some(0) } else { distance(&letters, &other, limit) };
        if let Some(d) = found.filter(|d| best.is_none_or(|(b, _)| *d < b)) {
            best = Some((d, name));
        }
    }
    best.map(|b| b.1)
}

/// "did you mean `…`?", where a name is close enough.
pub(super) fn did_you_mean<'a>(wrong: &str, names: impl IntoIterator<Item = &'a str>) -> Option<String> {
    closest(wrong, names).map(|name| format!("did you mean `{name}`?"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn close_names_are_found_and_far_ones_not() {
        let names = ["Kp", "Ti", "inertia", "damping"];
        assert_eq!(closest("Kq", names), Some("Kp"));
        assert_eq!(closest("kp", names), Some("Kp"));
        assert_eq!(closest("intertia", names), Some("inertia"));
        assert_eq!(closest("dmaping", names), Some("damping"));
        assert_eq!(closest("x", names), None);
        assert_eq!(closest("gain", names), None);
    }
}
