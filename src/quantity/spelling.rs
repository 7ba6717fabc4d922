//! The nearest known word to a misspelt one, for advice in error messages.

/// The candidate nearest to `word`, if any is near enough to be worth naming.
///
/// Distance: insertions, deletions, substitutions and swaps of neighbours (optimal string alignment),
/// letters compared without case. Near enough: at most a third of the longer word, and at least one.
/// Words beyond 64 characters are near to nothing.
pub(crate) fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    const LONGEST: usize = 64;
    let word: Vec<char> = word.chars().flat_map(char::to_lowercase).take(LONGEST + 1).collect();
    if word.is_empty() || word.len() > LONGEST {
        return None;
    }
    candidates
        .into_iter()
        .filter_map(|candidate| {
            let letters: Vec<char> = candidate.chars().flat_map(char::to_lowercase).collect();
            let distance = distance(&word, &letters);
            let bar = (word.len().max(letters.len()) / 3).max(1);
            (distance <= bar && distance < letters.len().max(1)).then_some((distance, candidate))
        })
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, candidate)| candidate)
}

/// Optimal string alignment distance by three rows of the usual table.
fn distance(a: &[char], b: &[char]) -> usize {
    let mut before: Vec<usize> = vec![0; b.len() + 1];
    let mut above: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let change = usize::from(a[i - 1] != b[j - 1]);
            row[j] = (above[j] + 1).min(row[j - 1] + 1).min(above[j - 1] + change);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut above, row);
    }
    above[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn misspelt_words_find_their_neighbour() {
        let keys = ["wavelength", "medium", "throw", "tilt", "seen_from"];
        assert_eq!(nearest("wavelenght", keys), Some("wavelength"));
        assert_eq!(nearest("Thrw", keys), Some("throw"));
        assert_eq!(nearest("seen-from", keys), Some("seen_from"));
        assert_eq!(nearest("colour", keys), None);
    }

    #[test]
    fn degenerate_words_find_nothing() {
        assert_eq!(nearest("", ["mm"]), None);
        assert_eq!(nearest("x", ["y"]), None);
        assert_eq!(nearest(&"a".repeat(1000), ["a"]), None);
        assert_eq!(nearest("mm", []), None);
    }
}
