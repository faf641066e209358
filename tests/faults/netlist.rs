//! A reader of its own for the netlists of this folder, one statement a line: enough to change them and to judge the
//! change. It shares nothing with kneewise.

use std::collections::BTreeMap;

/// One element line, taken apart.
#[derive(Debug, Clone, PartialEq)]
pub struct Card {
    /// Number of the line.
    pub line: usize,
    /// Its name.
    pub name: String,
    /// Upper-case first letter.
    pub letter: char,
    /// Its nodes, ground as `0`.
    pub nodes: Vec<String>,
    /// What follows the nodes.
    pub rest: Vec<String>,
    /// The subcircuit that it stands in; empty for the root.
    pub inside: String,
}

/// How many nodes follow the name; instances say it themselves.
pub fn node_count(letter: char, words: &[&str]) -> usize {
    match letter {
        'R' | 'C' | 'L' | 'V' | 'I' | 'D' | 'F' | 'H' | 'W' => 2,
        'Q' | 'J' => 3,
        'M' | 'E' | 'G' | 'S' => 4,
        'X' => words.iter().skip(1).filter(|w| !w.contains('=')).count().saturating_sub(1),
        _ => 0,
    }
}

/// Whether a line is an element's.
pub fn is_element(line: &str) -> bool {
    line.chars().next().is_some_and(|c| c.is_ascii_alphabetic())
}

/// The element lines of a text.
pub fn cards(text: &str) -> Vec<Card> {
    let mut inside = String::new();
    let mut cards = Vec::new();
    for (number, line) in text.lines().enumerate().skip(1) {
        let words: Vec<&str> = line.split_whitespace().collect();
        match words.first().map(|w| w.to_lowercase()).as_deref() {
            Some(".subckt") => inside = words.get(1).unwrap_or(&"").to_lowercase(),
            Some(".ends") => inside.clear(),
            _ => {}
        }
        if !is_element(line) {
            continue;
        }
        let letter = line.chars().next().unwrap_or(' ').to_ascii_uppercase();
        let count = node_count(letter, &words).min(words.len() - 1);
        cards.push(Card {
            line: number,
            name: words[0].to_owned(),
            letter,
            nodes: words[1..=count].iter().map(|n| node(n)).collect(),
            rest: words[count + 1..].iter().map(|&w| w.to_owned()).collect(),
            inside: inside.clone(),
        });
    }
    cards
}

/// A node's name in one case; ground has one name.
pub fn node(name: &str) -> String {
    let name = name.to_lowercase();
    if name == "gnd" { "0".into() } else { name }
}

/// A diode's, switch's or transistor's model.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Model {
    /// Lower-case kind.
    pub kind: String,
    /// Lower-case parameters.
    pub parameters: BTreeMap<String, f64>,
}

/// One element of the flat circuit.
#[derive(Debug, Clone, PartialEq)]
pub struct Part {
    /// Its name with the path.
    pub name: String,
    /// Upper-case letter.
    pub letter: char,
    /// Its nodes with their path.
    pub nodes: Vec<String>,
    /// Value or gain, where it has one.
    pub value: Option<f64>,
    /// Model, control source or coils: lower-case words.
    pub words: Vec<String>,
    /// Area of a diode.
    pub area: f64,
    /// A source that moves: `sin` or `pulse` and its numbers.
    pub shape: Option<(String, Vec<f64>)>,
}

/// A flat circuit and what its notes say.
#[derive(Debug, Clone, Default)]
pub struct Flat {
    pub parts: Vec<Part>,
    pub models: BTreeMap<String, Model>,
    /// Notes, by words.
    pub notes: Vec<Vec<String>>,
    /// Why it is no legal text, where so.
    pub broken: Option<String>,
}

/// Digits with a scale, `4k7` included; nothing for a word.
pub fn number(text: &str) -> Option<f64> {
    let text = text.trim_start_matches('{').trim_end_matches('}').to_lowercase();
    let end = text
        .char_indices()
        .find(|&(at, c)| {
            !(c.is_ascii_digit()
                || c == '.'
                || (at == 0 && (c == '-' || c == '+'))
                || (c == 'e'
                    && text[at + 1..].starts_with(|d: char| d.is_ascii_digit() || d == '-')
                    && at > 0)
                || (c == '-' && text[..at].ends_with('e')))
        })
        .map_or(text.len(), |(at, _)| at);
    let (digits, rest) = text.split_at(end);
    let base: f64 = digits.parse().ok()?;
    let scales = [
        ("meg", "e6"),
        ("t", "e12"),
        ("g", "e9"),
        ("k", "e3"),
        ("m", "e-3"),
        ("u", "e-6"),
        ("n", "e-9"),
        ("p", "e-12"),
        ("f", "e-15"),
    ];
    let Some((word, power)) = scales.iter().find(|(word, _)| rest.starts_with(word)) else {
        return Some(base);
    };
    let behind = &rest[word.len()..];
    let joined = if !behind.is_empty() && behind.chars().all(|c| c.is_ascii_digit()) {
        format!("{digits}.{behind}{power}")
    } else {
        format!("{digits}{power}")
    };
    joined.parse().ok()
}

impl Flat {
    /// Reads a text; `set` overrides parameters of the root.
    pub fn read(text: &str, set: &[(String, f64)]) -> Flat {
        let mut flat = Flat::default();
        let mut parameters = BTreeMap::new();
        let mut ports: BTreeMap<String, (Vec<String>, BTreeMap<String, f64>)> = BTreeMap::new();
        let mut depth = 0i32;
        for line in text.lines().skip(1) {
            let line = line.trim();
            if let Some(note) = line.strip_prefix("*@") {
                flat.notes.push(note.split_whitespace().map(str::to_lowercase).collect());
                continue;
            }
            let words: Vec<String> = line.split_whitespace().map(str::to_lowercase).collect();
            match words.first().map(String::as_str) {
                Some(".param") => parameters.extend(words[1..].iter().filter_map(|w| setting(w))),
                Some(".model") => flat.model(line),
                Some(".subckt") => {
                    depth += 1;
                    let names = words[2..].iter().filter(|w| !w.contains('=')).map(|n| node(n)).collect();
                    let defaults = words.iter().filter_map(|w| setting(w)).collect();
                    ports.insert(words[1].clone(), (names, defaults));
                }
                Some(".ends") => depth -= 1,
                _ => {}
            }
            if !(0..=1).contains(&depth) {
                flat.broken = Some("subcircuits out of order".into());
            }
        }
        if depth != 0 {
            flat.broken = Some("a subcircuit never ends".into());
        }
        for (name, value) in set {
            parameters.insert(name.clone(), *value);
        }
        let cards = cards(text);
        flat.expand(&cards, &ports, "", "", &BTreeMap::new(), &parameters);
        flat.complaints();
        flat
    }

    fn model(&mut self, line: &str) {
        let line = line.to_lowercase();
        let mut words = line.split_whitespace().skip(1);
        let name = words.next().unwrap_or("").to_owned();
        let rest: String = words.collect::<Vec<_>>().join(" ");
        let (kind, inside) = rest.split_once('(').unwrap_or((&rest, ""));
        let parameters = inside.trim_end_matches(')').split_whitespace().filter_map(setting).collect();
        self.models.insert(name, Model { kind: kind.trim().to_owned(), parameters });
    }

    #[allow(clippy::too_many_arguments)]
    fn expand(
        &mut self,
        cards: &[Card],
        ports: &BTreeMap<String, (Vec<String>, BTreeMap<String, f64>)>,
        inside: &str,
        path: &str,
        outer: &BTreeMap<String, String>,
        parameters: &BTreeMap<String, f64>,
    ) {
        for card in cards.iter().filter(|c| c.inside == inside) {
            let place = |n: &String| match (n.as_str(), outer.get(n)) {
                ("0", _) => n.clone(),
                (_, Some(outside)) => outside.clone(),
                _ => format!("{path}{n}"),
            };
            let name = format!("{path}{}", card.name.to_lowercase());
            let nodes: Vec<String> = card.nodes.iter().map(place).collect();
            if card.letter == 'X' {
                let called = card.rest.first().map(|w| w.to_lowercase()).unwrap_or_default();
                let Some((names, defaults)) = ports.get(&called) else {
                    self.broken = Some(format!("no subcircuit {called}"));
                    continue;
                };
                if names.len() != nodes.len() || path.matches(':').count() > 8 {
                    self.broken = Some(format!("ports of {called}"));
                    continue;
                }
                let mut own = parameters.clone();
                own.extend(defaults.clone());
                own.extend(card.rest.iter().filter_map(|w| {
                    let (key, value) = w.split_once('=')?;
                    Some((key.to_lowercase(), evaluate(value, parameters)?))
                }));
                let inner = names.iter().cloned().zip(nodes).collect();
                self.expand(cards, ports, &called, &format!("{name}:"), &inner, &own);
                continue;
            }
            self.parts.push(part(card, name, nodes, path, parameters));
        }
    }

    /// What every reader of netlists must refuse.
    fn complaints(&mut self) {
        let mut seen = std::collections::BTreeSet::new();
        for part in &self.parts {
            if !seen.insert(part.name.clone()) {
                self.broken = Some(format!("{} twice", part.name));
            }
            let needs_model = "DQMJSW".contains(part.letter);
            let model = part.words.last().cloned().unwrap_or_default();
            if needs_model && !self.models.contains_key(&model) {
                self.broken = Some(format!("no model {model}"));
            }
            if "RCL".contains(part.letter) && part.value.is_none() {
                self.broken = Some(format!("{} has no value", part.name));
            }
        }
        for part in self.parts.iter().filter(|p| "KFHW".contains(p.letter)) {
            let wanted =
                if part.letter == 'K' { &part.words[..] } else { &part.words[..1.min(part.words.len())] };
            if !wanted.iter().all(|w| seen.contains(w)) {
                self.broken = Some(format!("{} names nothing", part.name));
            }
        }
    }

    /// All nodes but ground.
    pub fn nodes(&self) -> Vec<String> {
        let all: std::collections::BTreeSet<&String> = self.parts.iter().flat_map(|p| &p.nodes).collect();
        all.into_iter().filter(|n| n.as_str() != "0").cloned().collect()
    }

    /// The notes that begin with a word.
    pub fn notes(&self, word: &str) -> impl Iterator<Item = &Vec<String>> {
        self.notes.iter().filter(move |n| n.first().is_some_and(|w| w == word))
    }
}

fn setting(word: &str) -> Option<(String, f64)> {
    let (key, value) = word.split_once('=')?;
    Some((key.trim_start_matches('(').to_owned(), number(value)?))
}

/// A number, or one parameter in braces.
fn evaluate(text: &str, parameters: &BTreeMap<String, f64>) -> Option<f64> {
    let inner = text.trim_start_matches('{').trim_end_matches('}').to_lowercase();
    parameters.get(&inner).copied().or_else(|| number(&inner))
}

fn part(
    card: &Card,
    name: String,
    nodes: Vec<String>,
    path: &str,
    parameters: &BTreeMap<String, f64>,
) -> Part {
    let joined = card.rest.join(" ").to_lowercase();
    let shape = ["sin", "pulse"].iter().find_map(|kind| {
        let inside = joined.strip_prefix(&format!("{kind}("))?.trim_end_matches(')');
        Some(((*kind).to_owned(), inside.split_whitespace().filter_map(number).collect()))
    });
    let mut words: Vec<String> = Vec::new();
    let mut value = None;
    let mut area = 1.0;
    match card.letter {
        'D' => {
            words.extend(card.rest.first().map(|w| w.to_lowercase()));
            area = card.rest.get(1).and_then(|w| number(w)).unwrap_or(1.0);
        }
        'K' => {
            let (coils, factor) = card.rest.split_at(card.rest.len().saturating_sub(1));
            words.extend(coils.iter().map(|c| format!("{path}{}", c.to_lowercase())));
            value = factor.first().and_then(|w| number(w));
        }
        'F' | 'H' => {
            words.extend(card.rest.first().map(|w| format!("{path}{}", w.to_lowercase())));
            value = card.rest.get(1).and_then(|w| number(w));
        }
        'Q' | 'M' | 'J' | 'S' | 'W' => words.extend(card.rest.iter().map(|w| w.to_lowercase())),
        _ if shape.is_some() => {}
        _ => value = card.rest.first().and_then(|w| evaluate(w, parameters)),
    }
    Part { name, letter: card.letter, nodes, value, words, area, shape }
}
