//! Lists of names and counts in running text, the same in every message. Only words: what is listed and why is
//! the caller's.

/// `R1`, `R1 and R2`, `R1, R2 and C1`; where there are more than `most`, the last is how many are left out:
/// `R1, R2, C1 and 4 more`. No names are `nothing`.
pub fn list<Name: AsRef<str>>(names: &[Name], most: usize) -> String {
    let shown = if names.len() > most { most.saturating_sub(1) } else { names.len() };
    let mut words: Vec<String> = names.iter().take(shown).map(|name| name.as_ref().to_owned()).collect();
    if shown < names.len() {
        words.push(format!("{} more", names.len() - shown));
    }
    match words.split_last() {
        None => "nothing".into(),
        Some((only, [])) => only.clone(),
        Some((last, others)) => format!("{} and {last}", others.join(", ")),
    }
}

/// `1 element`, `3 elements`.
pub fn count(number: usize, what: &str) -> String {
    if number == 1 { format!("1 {what}") } else { format!("{number} {what}s") }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lists_read_as_sentences() {
        let names = |n: usize| (1..=n).map(|k| format!("R{k}")).collect::<Vec<_>>();
        assert_eq!(list(&names(0), 4), "nothing");
        assert_eq!(list(&names(1), 4), "R1");
        assert_eq!(list(&names(2), 4), "R1 and R2");
        assert_eq!(list(&names(4), 4), "R1, R2, R3 and R4");
        assert_eq!(list(&names(5), 4), "R1, R2, R3 and 2 more");
        assert_eq!(list(&names(9), 4), "R1, R2, R3 and 6 more");
    }

    #[test]
    fn counts_agree_with_their_noun() {
        assert_eq!(count(1, "element"), "1 element");
        assert_eq!(count(0, "element"), "0 elements");
    }
}
