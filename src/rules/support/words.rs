//! Words that several rules share: lists of names, counts.

/// `R1`, `R1 and R2`, `R1, R2 and C1`, `R1, R2, C1 and 4 more`.
pub fn list(names: &[String]) -> String {
    const MOST: usize = 4;
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [start @ .., last] if names.len() <= MOST => format!("{} and {last}", start.join(", ")),
        _ => format!("{} and {} more", names[..MOST - 1].join(", "), names.len() - (MOST - 1)),
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
        assert_eq!(list(&names(1)), "R1");
        assert_eq!(list(&names(2)), "R1 and R2");
        assert_eq!(list(&names(4)), "R1, R2, R3 and R4");
        assert_eq!(list(&names(9)), "R1, R2, R3 and 6 more");
        assert_eq!(count(1, "element"), "1 element");
        assert_eq!(count(0, "element"), "0 elements");
    }
}
