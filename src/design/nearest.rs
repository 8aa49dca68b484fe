//! The name that a person probably meant.

/// The most similar of `names` to `name`, capital letters apart, where one is similar enough:
/// at most a third of its letters changed, and at least one letter allowed to be.
pub(super) fn nearest<'a>(name: &str, names: impl IntoIterator<Item = &'a str>) -> Option<String> {
    let wanted = name.to_lowercase();
    let allowed = (wanted.chars().count() / 3).max(1);
    let distance = |candidate: &str| strsim::damerau_levenshtein(&wanted, &candidate.to_lowercase());
    names
        .into_iter()
        .map(|candidate| (distance(candidate), candidate))
        .filter(|(distance, _)| *distance <= allowed)
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, candidate)| candidate.to_owned())
}

#[cfg(test)]
mod tests {
    use super::nearest;

    #[test]
    fn a_slip_of_the_hand_is_recognised_and_another_word_is_not() {
        let names = ["decking", "slope_deg", "falls"];
        assert_eq!(nearest("Decking", names).as_deref(), Some("decking"));
        assert_eq!(nearest("slope-deg", names).as_deref(), Some("slope_deg"));
        assert_eq!(nearest("flals", names).as_deref(), Some("falls"));
        assert_eq!(nearest("boardings", names), None);
    }
}
