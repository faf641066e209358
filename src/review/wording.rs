//! Which words are a mark's. What a person wrote behind the same sign must never be taken for one: it would be
//! overwritten. The grammar stands in `grammar/notes.abnf`; what writes marks is `mark`.

use super::figures::is_span;

/// Whether the words behind `;@` are those of a mark.
pub(super) fn is_mark(said: &str) -> bool {
    let words: Vec<&str> = said.split_ascii_whitespace().collect();
    let many = match words.as_slice() {
        ["in", count, "instances:", rest @ ..] if is_count(count) => Some(rest),
        _ => None,
    };
    let body = many.unwrap_or(&words);
    let mut pieces = body.split(|word| *word == "|");
    match many {
        Some(_) => pieces.all(is_kind),
        None => {
            let first = pieces.next().and_then(after_state);
            first.is_some_and(<[&str]>::is_empty) && pieces.all(|p| after_state(p).is_some_and(is_place))
        }
    }
}

/// `8 conducting 4.31mA`, `4 blocking or conducting`
fn is_kind(words: &[&str]) -> bool {
    let words = match words {
        [count, rest @ ..] if is_count(count) => rest,
        _ => words,
    };
    words.split(|word| *word == "or").all(|state| after_state(state).is_some_and(<[&str]>::is_empty))
}

/// What follows a state with its current and voltage; `None` where there is no state.
fn after_state<'w, 't>(words: &'w [&'t str]) -> Option<&'w [&'t str]> {
    let (rest, has_current, has_voltage) = match words {
        ["conducting" | "breakdown", rest @ ..] => (rest, true, true),
        ["blocking", rest @ ..] => (rest, false, true),
        ["open", rest @ ..] | ["not", "evaluated", rest @ ..] => (rest, false, false),
        _ => return None,
    };
    let skip = |words: &'w [&'t str], unit: char| match words {
        [first, rest @ ..] if is_span(first, unit) => rest,
        _ => words,
    };
    let rest = if has_current { skip(rest, 'A') } else { rest };
    Some(if has_voltage { skip(rest, 'V') } else { rest })
}

/// `at VIN=9 VIN=16 and 6 more`, `over time`, `at V1=max and over time`
fn is_place(words: &[&str]) -> bool {
    if words == ["over", "time"] {
        return true;
    }
    let words = words.strip_suffix(&["and", "over", "time"]).unwrap_or(words);
    let words = match words {
        [rest @ .., "and", count, "more"] if is_count(count) => rest,
        _ => words,
    };
    match words {
        ["at", conditions @ ..] => !conditions.is_empty() && conditions.iter().all(|c| is_condition(c)),
        _ => false,
    }
}

/// `nominal`, `VIN=9,temp=-40`, `V1=max#2`
fn is_condition(word: &str) -> bool {
    let name = word.rsplit_once('#').filter(|(_, count)| is_count(count)).map_or(word, |(name, _)| name);
    let is_change =
        |part: &str| part.split_once('=').is_some_and(|(of, to)| !of.is_empty() && !to.is_empty());
    name == "nominal" || name.split(',').all(is_change)
}

fn is_count(word: &str) -> bool {
    !word.is_empty() && word.bytes().all(|b| b.is_ascii_digit())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn marks_of_every_form_are_known() {
        for said in [
            "conducting 4.31mA 0.652V",
            "conducting 4.30mA..inf -1.00V..0.700V",
            "conducting 0A 10.0uV",
            "conducting",
            "breakdown 2.00mA -3.00V",
            "breakdown 3.00MegA",
            "blocking -inf..-3V",
            "blocking -12.4V",
            "open",
            "not evaluated",
            "conducting 4.30mA..8.30mA | blocking at V1=-9",
            "blocking | conducting over time",
            "blocking | conducting 19.3mA at V1=max and over time",
            "blocking | conducting at VIN=9 VIN=9,temp=-40 and 6 more | not evaluated at nominal#2 Q1=on",
            "in 3 instances: conducting 4.30mA 0.700V",
            "in 3 instances: 2 conducting 4.30mA | 1 blocking",
            "in 12 instances: 8 blocking or conducting | 4 not evaluated",
        ] {
            assert!(is_mark(said), "{said}");
        }
    }

    #[test]
    fn words_of_people_are_no_marks() {
        for said in [
            "",
            "todo: check",
            "blocking at night",
            "blocking | conducting",
            "blocking | conducting at",
            "blocking 4.3mA",
            "open 3V",
            "conducting 0.7V 4mA",
            "conducting infA",
            "conducting nanV",
            "conducting -inf..infV",
            "not",
            "in 3 instances:",
            "in few instances: blocking",
            "in 3 instances: 2",
            "| blocking",
            "Blocking",
        ] {
            assert!(!is_mark(said), "{said}");
        }
    }
}
