//! Near names: what a person probably meant.

/// The candidate nearest to `name`, if one is near enough to be meant; the first of equally near ones.
///
/// Upper and lower case count as the same, swapped neighbours as one slip; near enough is a slip in three letters.
pub fn suggest<'a>(name: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    near(name, candidates).into_iter().next()
}

/// All candidates near enough to be meant, nearest first.
pub fn near<'a>(name: &str, candidates: impl IntoIterator<Item = &'a str>) -> Vec<&'a str> {
    let wanted = name.to_lowercase();
    let allowed = (wanted.chars().count() / 3).max(1);
    let mut found: Vec<(usize, &str)> = candidates
        .into_iter()
        .filter(|candidate| *candidate != name)
        .filter_map(|candidate| {
            let lower = candidate.to_lowercase();
            let slips = strsim::damerau_levenshtein(&wanted, &lower);
            if slips <= allowed && slips < wanted.chars().count() {
                return Some((slips, candidate));
            }
            // the beginning or the end of a longer name, or a name in which one word is missing
            let part = wanted.chars().count() >= 4
                && (lower.contains(&wanted) || wanted.contains(&lower) && lower.len() >= 4);
            part.then_some((allowed + 1, candidate))
        })
        .collect();
    found.sort_by_key(|&(slips, _)| slips);
    found.into_iter().map(|(_, candidate)| candidate).collect()
}
