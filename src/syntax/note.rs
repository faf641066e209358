//! The grammar of notes, `*@ …`: words and places only; names are resolved and numbers judged by `circuit`.

use super::unit::sound_number;

/// A word of a note: its bytes counted from the start of the note.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct NoteWord<'t> {
    /// First byte, counted from the note's start.
    pub start: usize,
    /// The word.
    pub text: &'t str,
}

/// What a note says, as written.
#[derive(Debug, Clone, PartialEq)]
pub enum NoteText<'t> {
    /// `drop NAME NUMBER`
    Drop(NoteWord<'t>, NoteWord<'t>, f64),
    /// `made-of NAME MATERIAL`
    MadeOf(NoteWord<'t>, NoteWord<'t>),
    /// `supply NODE NUMBER [RANGE]`
    Supply(NoteWord<'t>, NoteWord<'t>, f64, Option<(f64, f64)>),
    /// `range NAME NUMBER NUMBER` or `range NAME NUMBER PERCENT`, as two ends
    Range(NoteWord<'t>, f64, f64),
    /// `hold NAME on|off|both`
    Hold(NoteWord<'t>, HoldWord),
    /// `expect …`
    Expect(NoteWord<'t>, ExpectText<'t>),
    /// `watch NODE [NODE] [ripple < VOLTS]`
    Watch(NoteWord<'t>, Option<NoteWord<'t>>, Option<(NoteWord<'t>, f64)>),
    /// `matched NAME 1*NAME`
    Matched(NoteWord<'t>, Vec<NoteWord<'t>>),
    /// `rating NAME 1*KEY=NUMBER`
    Rating(NoteWord<'t>, Vec<(String, f64)>),
    /// `accept RULE [SUBJECT] [because …]`
    Accept(NoteWord<'t>, Option<NoteWord<'t>>, Option<String>),
}

/// How a `hold` note holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum HoldWord {
    /// `on`
    On,
    /// `off`
    Off,
    /// `both`
    Both,
}

/// What an `expect` note expects.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct ExpectText<'t> {
    /// `conducting`, `blocking` or `breakdown`, in lower case.
    pub state: Option<&'static str>,
    /// Whether the name stands in `v(…)`.
    pub is_voltage: bool,
    /// `2m..5m`
    pub range: Option<(f64, f64)>,
    /// `at CONDITION`
    pub at: Option<&'t str>,
    /// `in some condition`
    pub some: bool,
    /// `over time`
    pub over_time: bool,
}

/// Where and why a note could not be read.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NoteProblem {
    /// First byte, counted from the note's start.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
    /// What is wrong, in a sentence.
    pub message: String,
    /// The word that was probably meant.
    pub nearest: Option<&'static str>,
}

/// The words that begin a note.
pub const NOTE_WORDS: [&str; 10] =
    ["drop", "made-of", "supply", "range", "hold", "expect", "watch", "matched", "rating", "accept"];

/// The shape of each, to show where one could not be read.
const SHAPES: [&str; 10] = [
    "drop NAME VOLTS",
    "made-of NAME MATERIAL",
    "supply NODE VOLTS [LOW..HIGH]",
    "range NAME LOW HIGH, or range NAME VALUE PERCENT%",
    "hold NAME on, off or both",
    "expect NAME STATE [LOW..HIGH], or expect v(NODE) LOW..HIGH",
    "watch NODE [NODE] [ripple < VOLTS]",
    "matched NAME NAME …",
    "rating NAME i=… vr=… p=…",
    "accept RULE [SUBJECT] because REASON",
];

/// `note = "*@" word *word`
///
/// # Errors
/// [`NoteProblem`] says which word is wrong and what shape the note should have.
pub fn note(text: &str) -> Result<NoteText<'_>, NoteProblem> {
    let words = words(text);
    let Some((head, rest)) = words.split_first() else {
        return Err(NoteProblem {
            start: 0,
            end: text.len(),
            message: "this note is empty".into(),
            nearest: None,
        });
    };
    let Some(kind) = NOTE_WORDS.iter().position(|w| head.text.eq_ignore_ascii_case(w)) else {
        return Err(NoteProblem {
            start: head.start,
            end: head.start + head.text.len(),
            message: format!("no note begins with {}", head.text),
            nearest: crate::text::nearest(head.text, NOTE_WORDS),
        });
    };
    let read = match kind {
        0 => drop_note(rest),
        1 => made_of_note(rest),
        2 => supply_note(rest),
        3 => range_note(rest),
        4 => hold_note(rest),
        5 => expect_note(rest),
        6 => watch_note(rest),
        7 => matched_note(rest),
        8 => rating_note(rest),
        _ => accept_note(rest),
    };
    read.map_err(|at| {
        let word = rest.get(at);
        let (start, end) =
            word.map_or((head.start, head.start + head.text.len()), |w| (w.start, w.start + w.text.len()));
        let found = word.map_or_else(|| "ends too early".to_owned(), |w| format!("goes wrong at {}", w.text));
        NoteProblem {
            start,
            end,
            message: format!("this note {found}; its shape is: {}", SHAPES[kind]),
            nearest: word.and_then(|w| crate::text::nearest(w.text, inner_words(kind).iter().copied())),
        }
    })
}

/// The words that a kind of note takes besides names and numbers.
fn inner_words(kind: usize) -> &'static [&'static str] {
    match kind {
        4 => &["on", "off", "both"],
        5 => &["conducting", "blocking", "breakdown"],
        6 => &["ripple"],
        _ => &[],
    }
}

/// The words behind `*@`, up to a `;` (which stands in no name, and begins a trailing comment everywhere).
fn words(text: &str) -> Vec<NoteWord<'_>> {
    let body = text.strip_prefix("*@").unwrap_or(text);
    let offset = text.len() - body.len();
    let body = body.split(';').next().unwrap_or(body);
    let mut out = Vec::new();
    let mut at = 0;
    for part in body.split(|c: char| c.is_ascii_whitespace() || c.is_ascii_control()) {
        if !part.is_empty() {
            out.push(NoteWord { start: offset + at, text: part });
        }
        at += part.len() + 1;
    }
    out
}

/// A production's answer: the note, or the number of the word that it could not take.
type Taken<'t> = Result<NoteText<'t>, usize>;

/// `drop-note = "drop" name number`
fn drop_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let volts = number_at(words, 1)?;
    end(words, 2)?;
    Ok(NoteText::Drop(words[0], words[1], volts))
}

/// `made-of-note = "made-of" name material`
fn made_of_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let material = word(words, 1)?;
    end(words, 2)?;
    Ok(NoteText::MadeOf(words[0], material))
}

/// `supply-note = "supply" node number [span]`
fn supply_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let volts = number_at(words, 1)?;
    let range = words.get(2).map(|w| span(w.text).ok_or(2usize)).transpose()?;
    end(words, 3)?;
    Ok(NoteText::Supply(words[0], words[1], volts, range))
}

/// `range-note = "range" name ( number number / number percent / span )`
fn range_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let name = word(words, 0)?;
    if let Some((from, to)) = words.get(1).and_then(|w| span(w.text)) {
        end(words, 2)?;
        return Ok(NoteText::Range(name, from, to));
    }
    let first = number_at(words, 1)?;
    let second = word(words, 2)?;
    end(words, 3)?;
    if let Some(share) = percent(second.text) {
        let half = first.abs() * share / 100.0;
        return Ok(NoteText::Range(name, first - half, first + half));
    }
    Ok(NoteText::Range(name, first, number_at(words, 2)?))
}

/// `hold-note = "hold" name ( "on" / "off" / "both" )`
fn hold_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let how = match word(words, 1)?.text.to_ascii_lowercase().as_str() {
        "on" => HoldWord::On,
        "off" => HoldWord::Off,
        "both" => HoldWord::Both,
        _ => return Err(1),
    };
    end(words, 2)?;
    Ok(NoteText::Hold(words[0], how))
}

/// `expect-note = "expect" ( name state [span] / "v(" node ")" span ) [restriction]`
fn expect_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let mut subject = word(words, 0)?;
    let mut text = ExpectText::default();
    let mut at = 1;
    if let Some(node) = voltage_of(subject.text) {
        subject = NoteWord { start: subject.start + 2, text: node };
        text.is_voltage = true;
        text.range = Some(word(words, 1).and_then(|w| span(w.text).ok_or(1))?);
        at = 2;
    } else {
        let state = word(words, 1)?.text;
        let known =
            ["conducting", "blocking", "breakdown"].into_iter().find(|s| state.eq_ignore_ascii_case(s));
        text.state = Some(known.ok_or(1usize)?);
        at += 1;
        if let Some(range) = words.get(2).and_then(|w| span(w.text)) {
            text.range = Some(range);
            at += 1;
        }
    }
    restriction(words, at, &mut text)?;
    Ok(NoteText::Expect(subject, text))
}

/// `voltage-of = "v(" node ")"`
fn voltage_of(text: &str) -> Option<&str> {
    let (head, node) = text.strip_suffix(')')?.split_at_checked(2)?;
    (head.eq_ignore_ascii_case("v(") && !node.is_empty()).then_some(node)
}

/// `restriction = "at" condition / "in some condition" / "over time"`
fn restriction<'t>(words: &[NoteWord<'t>], at: usize, text: &mut ExpectText<'t>) -> Result<(), usize> {
    let is = |n: usize, w: &str| words.get(n).is_some_and(|x| x.text.eq_ignore_ascii_case(w));
    if at >= words.len() {
        return Ok(());
    }
    if is(at, "at") {
        text.at = Some(word(words, at + 1)?.text);
        return end(words, at + 2);
    }
    if is(at, "in") && is(at + 1, "some") && is(at + 2, "condition") {
        text.some = true;
        return end(words, at + 3);
    }
    if is(at, "over") && is(at + 1, "time") {
        text.over_time = true;
        return end(words, at + 2);
    }
    Err(at)
}

/// `watch-note = "watch" node [node] ["ripple" "<" number]`
fn watch_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let node = plain_or_voltage(word(words, 0)?);
    let is = |at: usize, w: &str| words.get(at).is_some_and(|x| x.text.eq_ignore_ascii_case(w));
    // a node may be called `ripple`; only one that `<` follows is the word
    let limit_at = (1..=2).find(|&at| is(at, "ripple") && is(at + 1, "<"));
    let other = if limit_at == Some(1) { None } else { words.get(1).map(|w| plain_or_voltage(*w)) };
    let Some(at) = limit_at else {
        end(words, 2)?;
        return Ok(NoteText::Watch(node, other, None));
    };
    let volts = number_at(words, at + 2)?;
    end(words, at + 3)?;
    Ok(NoteText::Watch(node, other, Some((words[at + 2], volts))))
}

fn plain_or_voltage(word: NoteWord<'_>) -> NoteWord<'_> {
    match voltage_of(word.text) {
        Some(node) => NoteWord { start: word.start + 2, text: node },
        None => word,
    }
}

/// `matched-note = "matched" name 1*name`
fn matched_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    word(words, 1)?;
    Ok(NoteText::Matched(words[0], words[1..].to_vec()))
}

/// `rating-note = "rating" name 1*( key "=" number )`
fn rating_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let name = word(words, 0)?;
    word(words, 1)?;
    let mut ratings = Vec::new();
    for (n, word) in words.iter().enumerate().skip(1) {
        let (key, value) = word.text.split_once('=').ok_or(n)?;
        let value = sound_number(value).ok_or(n)?.value;
        if !["i", "vr", "p"].iter().any(|k| key.eq_ignore_ascii_case(k)) {
            return Err(n);
        }
        ratings.push((key.to_ascii_lowercase(), value));
    }
    Ok(NoteText::Rating(name, ratings))
}

/// `accept-note = "accept" rule [subject] ["because" *word]`
fn accept_note<'t>(words: &[NoteWord<'t>]) -> Taken<'t> {
    let rule = word(words, 0)?;
    let because = words.iter().position(|w| w.text.eq_ignore_ascii_case("because"));
    let names_end = because.unwrap_or(words.len());
    if names_end > 2 || names_end == 0 {
        return Err(if names_end > 2 { 2 } else { 0 });
    }
    let subject = (names_end == 2).then(|| words[1]);
    let reason = because.map(|at| words[at + 1..].iter().map(|w| w.text).collect::<Vec<_>>().join(" "));
    Ok(NoteText::Accept(rule, subject, reason.filter(|r| !r.is_empty())))
}

fn word<'t>(words: &[NoteWord<'t>], at: usize) -> Result<NoteWord<'t>, usize> {
    words.get(at).copied().ok_or(at)
}

fn number_at(words: &[NoteWord<'_>], at: usize) -> Result<f64, usize> {
    sound_number(word(words, at)?.text).map(|n| n.value).ok_or(at)
}

fn end(words: &[NoteWord<'_>], at: usize) -> Result<(), usize> {
    if words.len() > at { Err(at) } else { Ok(()) }
}

/// `span = number ".." number`
fn span(text: &str) -> Option<(f64, f64)> {
    let (low, high) = text.split_once("..")?;
    Some((sound_number(low)?.value, sound_number(high)?.value))
}

/// `percent = number "%"`
fn percent(text: &str) -> Option<f64> {
    sound_number(text.strip_suffix('%')?).map(|n| n.value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_kind_is_read() {
        for text in [
            "*@ drop D1 0.65",
            "*@drop DX 0",
            "*@ made-of DRED red-led",
            "*@ supply +12V 12",
            "*@ supply +12V 12 9..16",
            "*@ range VIN 9 16",
            "*@ range VIN 12 5%",
            "*@ hold Q1 on",
            "*@ expect D1 conducting 2m..5m",
            "*@ expect D2 blocking at VIN=9",
            "*@ expect v(out) 4.2..4.5 in some condition",
            "*@ expect D2 conducting over time",
            "*@ watch out",
            "*@ watch out ;trailing comment",
            "*@ watch a b",
            "*@ watch out ripple < 0.5",
            "*@ watch a b ripple < 500m",
            "*@ watch out ripple",
            "*@ matched D1 D2",
            "*@ rating D1 i=200m vr=75 p=500m",
            "*@ accept dangling-node tp1 because it is a test pad",
        ] {
            assert!(note(text).is_ok(), "{text}: {:?}", note(text));
        }
    }

    #[test]
    fn a_misspelt_note_names_the_nearest() {
        let problem = note("*@ drpo D1 0.65").unwrap_err();
        assert_eq!(problem.nearest, Some("drop"));
        assert_eq!((problem.start, problem.end), (3, 7));
        assert!(note("*@ drop D1").is_err());
        assert!(note("*@ hold Q1 perhaps").is_err());
        assert_eq!(note("*@ expect D1 conductng").unwrap_err().nearest, Some("conducting"));
        assert!(note("*@").is_err());
    }

    #[test]
    fn a_node_with_parentheses_is_whole_in_a_voltage() {
        let NoteText::Expect(name, text) = note("*@ expect v(Net-(D1-A)) 1..2").unwrap() else { panic!() };
        assert_eq!((name.text, name.start, text.is_voltage), ("Net-(D1-A)", 12, true));
    }

    #[test]
    fn a_percentage_makes_two_ends() {
        let NoteText::Range(name, from, to) = note("*@ range VIN 12 5%").unwrap() else { panic!() };
        assert_eq!((name.text, name.start), ("VIN", 9));
        assert!((from - 11.4).abs() < 1e-12 && (to - 12.6).abs() < 1e-12);
    }
}
