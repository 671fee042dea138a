//! The nearest valid word to a misspelt one.

/// Similarity (Jaro-Winkler, 0 to 1, upper and lower case alike) from which a word is worth suggesting.
const WORTH_SUGGESTING: f64 = 0.8;

/// Longer words are not compared.
const MAX_COMPARED_BYTES: usize = 64;

/// The candidate most like `word`, if any is like it at all.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    if word.len() > MAX_COMPARED_BYTES {
        return None;
    }
    let word = word.to_lowercase();
    candidates
        .into_iter()
        .map(|candidate| (similarity(&word, candidate), candidate))
        .filter(|(similarity, _)| *similarity >= WORTH_SUGGESTING)
        .max_by(|one, other| one.0.total_cmp(&other.0))
        .map(|(_, candidate)| candidate)
}

fn similarity(lowercase_word: &str, candidate: &str) -> f64 {
    strsim::jaro_winkler(lowercase_word, &candidate.to_lowercase())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn finds_the_likely_word_and_only_that() {
        let keys = [
            "kind",
            "temperature_GeV",
            "length_fm",
            "qhat_GeV2_per_fm",
            "effects",
        ];
        assert_eq!(nearest("temperature_gev", keys), Some("temperature_GeV"));
        assert_eq!(nearest("temprature_GeV", keys), Some("temperature_GeV"));
        assert_eq!(nearest("qhat", keys), Some("qhat_GeV2_per_fm"));
        assert_eq!(nearest("lenght_fm", keys), Some("length_fm"));
        assert_eq!(nearest("effect", keys), Some("effects"));
        assert_eq!(nearest("bogus", keys), None);
        assert_eq!(nearest(&"k".repeat(1_000_000), keys), None);
    }
}
