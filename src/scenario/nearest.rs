//! Which of the words that would have worked was meant.

/// The candidates nearest to `word`, best first, at most `most`; none that is not at all alike.
pub(super) fn nearest<'a>(
    word: &str,
    candidates: impl Iterator<Item = &'a str>,
    most: usize,
) -> Vec<&'a str> {
    let word = fold(word);
    let mut scored: Vec<(usize, &str)> = candidates
        .filter_map(|candidate| {
            let folded = fold(candidate);
            let last_part = folded.rsplit('/').next().unwrap_or(&folded);
            let distance = edit_distance(&word, &folded).min(edit_distance(&word, last_part) + 1);
            // A third of the letters may be wrong; more is another word.
            (3 * distance <= word.chars().count().max(4)).then_some((distance, candidate))
        })
        .collect();
    scored.sort_unstable();
    // The runners-up only where they are nearly as near.
    let nearest = scored.first().map_or(0, |(distance, _)| *distance);
    scored.retain(|(distance, _)| *distance <= nearest + 1);
    scored.truncate(most);
    scored.into_iter().map(|(_, candidate)| candidate).collect()
}

/// Long words are cut off: no name here has more letters, and the work stays bounded.
fn fold(word: &str) -> String {
    word.chars()
        .take(64)
        .map(|letter| match letter {
            ' ' | '-' => '_',
            _ => letter.to_ascii_lowercase(),
        })
        .collect()
}

/// Insertions, deletions and replacements from one word to the other (Levenshtein 1966).
fn edit_distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, letter) in a.chars().enumerate() {
        let mut diagonal = i;
        let mut left = i + 1;
        for (cell, other) in row.iter_mut().skip(1).zip(&b) {
            let replaced = diagonal + usize::from(letter != *other);
            diagonal = *cell;
            left = replaced.min(left + 1).min(*cell + 1);
            *cell = left;
        }
        if let Some(first) = row.first_mut() {
            *first = i + 1;
        }
    }
    row.last().copied().unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn edit_distance_agrees_with_counts_by_hand() {
        for (a, b, distance) in [
            ("", "", 0),
            ("", "abc", 3),
            ("abc", "", 3),
            ("kitten", "sitting", 3),
            ("berln", "berlin", 1),
            ("zone", "zone", 0),
        ] {
            assert_eq!(edit_distance(a, b), distance, "{a} {b}");
        }
    }

    #[test]
    fn a_word_unlike_all_suggests_nothing() {
        assert!(nearest("xyzzy", ["title", "site"].into_iter(), 3).is_empty());
    }
}
