//! The nearest known word to a mistyped one, for "did you mean" advice.

/// The candidate nearest to `found` in edit distance, if it is near enough to
/// be a slip: at most a third of the letters (but always one) changed.
pub(super) fn nearest<'a>(
    found: &str,
    candidates: impl IntoIterator<Item = &'a str>,
) -> Option<&'a str> {
    const LONGEST: usize = 64;
    if found.len() > LONGEST {
        return None;
    }
    let allowed = (found.chars().count() / 3).max(1);
    candidates
        .into_iter()
        .filter(|candidate| candidate.len() <= LONGEST)
        .map(|candidate| (distance(&spelling(found), &spelling(candidate)), candidate))
        .filter(|&(distance, _)| distance <= allowed)
        .min_by_key(|&(distance, _)| distance)
        .map(|(_, candidate)| candidate)
}

/// Letters that matter: case, `_` for `-` and `s` for `z` are no difference.
fn spelling(word: &str) -> Vec<char> {
    word.chars()
        .map(|letter| match letter.to_ascii_lowercase() {
            '_' => '-',
            's' => 'z',
            other => other,
        })
        .collect()
}

/// Edit distance: insertions, deletions, replacements and exchanges of two
/// neighbours (the Levenshtein distance with transpositions).
fn distance(from: &[char], to: &[char]) -> usize {
    let mut before: Vec<usize> = Vec::new();
    let mut row: Vec<usize> = (0..=to.len()).collect();
    for i in 0..from.len() {
        let mut next = vec![i + 1; to.len() + 1];
        for j in 0..to.len() {
            let replaced = row[j] + usize::from(from[i] != to[j]);
            next[j + 1] = replaced.min(row[j + 1] + 1).min(next[j] + 1);
            if i > 0 && j > 0 && from[i] == to[j - 1] && from[i - 1] == to[j] {
                next[j + 1] = next[j + 1].min(before[j - 1] + 1);
            }
        }
        before = std::mem::replace(&mut row, next);
    }
    row[to.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn finds_slips_and_leaves_strangers_alone() {
        let words = ["depolarizing", "dephasing", "bit-flip"];
        assert_eq!(nearest("depolarising", words), Some("depolarizing"));
        assert_eq!(nearest("bit_flip", words), Some("bit-flip"));
        assert_eq!(nearest("dephasig", words), Some("dephasing"));
        assert_eq!(nearest("thermal", words), None);
        assert_eq!(nearest("", words), None);
    }

    #[test]
    fn distance_is_the_edit_distance() {
        let chars = |word: &str| word.chars().collect::<Vec<_>>();
        assert_eq!(distance(&chars("kitten"), &chars("sitting")), 3);
        assert_eq!(distance(&chars(""), &chars("abc")), 3);
        assert_eq!(distance(&chars("titel"), &chars("title")), 1);
    }
}
