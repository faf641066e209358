//! Makes sentences from a grammar: seeded, bounded in depth and length. Knows the few things that the grammar says in
//! comments only: words with a meaning of their own, times that do not fall, names that stand twice.

use crate::abnf::{Grammar, Part};
use crate::seed::Seed;
use std::collections::BTreeMap;

/// Rules within rules; beyond it only the shortest way is taken.
const DEEPEST: usize = 34;
/// Bytes; beyond it likewise.
const LONGEST: usize = 1500;
/// Repetitions beyond the least.
const MOST_TIMES: usize = 9;

/// Words that are no names where they mean something else.
const RESERVED: [&str; 43] = [
    "dc",
    "ac",
    "sin",
    "pulse",
    "pwl",
    "exp",
    "sffm",
    "poly",
    "value",
    "table",
    "laplace",
    "freq",
    "vol",
    "cur",
    "and",
    "nand",
    "or",
    "nor",
    "off",
    "on",
    "uic",
    "r",
    "c",
    "l",
    "m",
    "ic",
    "gain",
    "area",
    "temp",
    "tnom",
    "params:",
    "optional:",
    "text:",
    "because",
    "if",
    "limit",
    "min",
    "max",
    "u",
    "v",
    "i",
    "db",
    "ln",
];
/// Rules whose words must not be one of them.
const NAMES: [&str; 7] = ["word", "parameter", "key", "element-name", "passive-model", "name", "rule"];

/// A sentence and what belongs to it.
#[derive(Debug, Default)]
pub struct Sentence {
    pub text: String,
    /// Parameters that it uses without braces: something must give them.
    pub parameters: Vec<String>,
}

pub struct Maker<'g> {
    grammar: &'g Grammar,
    /// How deep the shortest sentence of each rule is.
    depths: BTreeMap<&'g str, usize>,
    /// How often each rule was used.
    pub uses: BTreeMap<&'g str, usize>,
    seed: Seed,
    sentence: Sentence,
    /// Names of the definitions that are open.
    open: Vec<String>,
    time: usize,
}

impl<'g> Maker<'g> {
    pub fn new(grammar: &'g Grammar, seed: u64) -> Self {
        let mut maker = Maker {
            grammar,
            depths: BTreeMap::new(),
            uses: BTreeMap::new(),
            seed: Seed(seed),
            sentence: Sentence::default(),
            open: Vec::new(),
            time: 0,
        };
        while maker.deepen() {}
        maker
    }

    /// One round of finding the shortest sentences; false when nothing changes.
    fn deepen(&mut self) -> bool {
        let mut changed = false;
        for (name, part) in &self.grammar.rules {
            let Some(depth) = self.depth(part) else { continue };
            if self.depths.get(name.as_str()).is_none_or(|&known| depth + 1 < known) {
                self.depths.insert(name, depth + 1);
                changed = true;
            }
        }
        changed
    }

    fn depth(&self, part: &Part) -> Option<usize> {
        match part {
            Part::Either(parts) => parts.iter().filter_map(|p| self.depth(p)).min(),
            Part::Chain(parts) => {
                parts.iter().map(|p| self.depth(p)).try_fold(0, |most, depth| Some(most.max(depth?)))
            }
            Part::Repeat(0, ..) | Part::Literal(_) | Part::Range(..) => Some(0),
            Part::Repeat(_, _, part) => self.depth(part),
            Part::Rule(name) => self.depths.get(name.as_str()).copied(),
        }
    }

    /// A sentence of the rule `start`.
    pub fn sentence(&mut self, start: &str) -> Sentence {
        self.sentence = Sentence::default();
        self.time = 0;
        self.open.clear();
        let (start, _) = self.grammar.rules.get_key_value(start).expect("a rule to start with");
        self.rule(start, 0);
        std::mem::take(&mut self.sentence)
    }

    fn rule(&mut self, name: &'g str, level: usize) {
        *self.uses.entry(name).or_default() += 1;
        let start = self.sentence.text.len();
        match name {
            "time" => {
                self.time += self.seed.between(0, 5);
                self.sentence.text.push_str(&format!("{}u", self.time));
            }
            "closing-name" => {
                let name = self.open.last().cloned().unwrap_or_default();
                self.sentence.text.push_str(&name);
            }
            "subcircuit" => {
                self.open.push(String::new());
                self.part(&self.grammar.rules[name], level);
                self.open.pop();
            }
            _ => self.named(name, start, level),
        }
        let text = &self.sentence.text[start..];
        match name {
            "parameter" => self.sentence.parameters.push(text.to_owned()),
            "definition-name" => {
                if let Some(open) = self.open.last_mut() {
                    text.clone_into(open);
                }
            }
            _ => {}
        }
    }

    fn named(&mut self, name: &str, start: usize, level: usize) {
        loop {
            self.part(&self.grammar.rules[name], level);
            let text = &self.sentence.text[start..];
            if !NAMES.contains(&name) || !RESERVED.iter().any(|r| r.eq_ignore_ascii_case(text)) {
                return;
            }
            self.sentence.text.truncate(start);
        }
    }

    fn part(&mut self, part: &'g Part, level: usize) {
        let short = level > DEEPEST || self.sentence.text.len() > LONGEST;
        match part {
            Part::Either(parts) if short => {
                let least = parts.iter().min_by_key(|p| self.depth(p)).expect("alternatives");
                self.part(least, level);
            }
            Part::Either(parts) => {
                let part = self.seed.pick(parts);
                self.part(part, level);
            }
            Part::Chain(parts) => parts.iter().for_each(|p| self.part(p, level)),
            Part::Repeat(least, most, part) => {
                // the lines of a file are many, what is within them is little
                let (often, times) = if level == 0 {
                    (90, 4 * MOST_TIMES)
                } else {
                    (45 * DEEPEST.saturating_sub(level) / DEEPEST, MOST_TIMES)
                };
                let most = most.unwrap_or(usize::MAX).min(least + times);
                let mut count = *least;
                while !short && count < most && self.seed.chance(often) {
                    count += 1;
                }
                (0..count).for_each(|_| self.part(part, level));
            }
            Part::Rule(name) => self.rule(name, level + 1),
            Part::Literal(text) => {
                for c in text.chars() {
                    let upper = self.seed.chance(50);
                    self.sentence.text.push(if upper {
                        c.to_ascii_uppercase()
                    } else {
                        c.to_ascii_lowercase()
                    });
                }
            }
            Part::Range(low, high) => {
                let code = low + u32::try_from(self.seed.below((high - low + 1) as usize)).unwrap();
                self.sentence.text.push(char::from_u32(code).expect("a character"));
            }
        }
    }
}
