//! A small reader of ABNF (RFC 5234): rules, alternatives, groups, options, repetitions, literals (case-blind) and
//! ranges. Prose values and `=/` are not used here and not read.

use std::collections::BTreeMap;

/// What a rule is made of.
#[derive(Debug, Clone, PartialEq)]
pub enum Part {
    /// One of several.
    Either(Vec<Part>),
    /// One behind the other.
    Chain(Vec<Part>),
    /// From the first to the second number of times; without end where the second is absent.
    Repeat(usize, Option<usize>, Box<Part>),
    /// A rule, in lower case.
    Rule(String),
    /// Text in any case.
    Literal(String),
    /// One character of a range.
    Range(u32, u32),
}

/// All rules by lower-case name.
#[derive(Debug, Default)]
pub struct Grammar {
    pub rules: BTreeMap<String, Part>,
}

/// The core rules of RFC 5234, appendix B.1, as far as they are used.
const CORE: &str =
    "ALPHA = %x41-5A / %x61-7A\nDIGIT = %x30-39\nDQUOTE = %x22\nHTAB = %x09\nSP = %x20\nVCHAR = %x21-7E\n";

impl Grammar {
    /// Reads grammars that use each other's rules. A rule that is given twice, used and not given, or never used
    /// (except by `starts`) is a mistake.
    pub fn read(texts: &[&str], starts: &[&str]) -> Grammar {
        let mut grammar = Grammar::default();
        for text in [CORE].iter().chain(texts) {
            for (name, body) in rules(text) {
                let mut reader = Reader { text: body.chars().collect(), at: 0 };
                let part = reader.alternatives();
                assert_eq!(reader.at, reader.text.len(), "{name}: cannot read on at {:?}", reader.rest());
                assert!(grammar.rules.insert(name.clone(), part).is_none(), "{name} is given twice");
            }
        }
        let mut used: Vec<&str> = starts.to_vec();
        for (name, part) in &grammar.rules {
            part.each_rule(&mut |rule| {
                assert!(grammar.rules.contains_key(rule), "{name} uses {rule}, which is not given");
                used.push(rule);
            });
        }
        for name in grammar.rules.keys() {
            assert!(used.contains(&name.as_str()), "nothing uses {name}");
        }
        grammar
    }
}

impl Part {
    fn each_rule<'p>(&'p self, see: &mut dyn FnMut(&'p str)) {
        match self {
            Part::Either(parts) | Part::Chain(parts) => parts.iter().for_each(|p| p.each_rule(see)),
            Part::Repeat(_, _, part) => part.each_rule(see),
            Part::Rule(name) => see(name),
            Part::Literal(_) | Part::Range(..) => {}
        }
    }
}

/// Name and body of each rule; lines that begin with a blank continue the rule above.
fn rules(text: &str) -> Vec<(String, String)> {
    let mut rules: Vec<(String, String)> = Vec::new();
    for line in text.lines() {
        let line = without_comment(line);
        if line.trim().is_empty() {
            continue;
        }
        if line.starts_with(' ') {
            let last = rules.last_mut().expect("a rule to continue");
            last.1.push_str(line);
        } else {
            let (name, body) = line.split_once('=').unwrap_or_else(|| panic!("no rule: {line}"));
            rules.push((name.trim().to_lowercase(), body.to_owned()));
        }
    }
    rules.into_iter().map(|(name, body)| (name, body.trim().to_owned())).collect()
}

fn without_comment(line: &str) -> &str {
    let mut quoted = false;
    for (at, c) in line.char_indices() {
        match c {
            '"' => quoted = !quoted,
            ';' if !quoted => return &line[..at],
            _ => {}
        }
    }
    line
}

struct Reader {
    text: Vec<char>,
    at: usize,
}

impl Reader {
    fn rest(&self) -> String {
        self.text[self.at..].iter().collect()
    }

    fn peek(&self) -> Option<char> {
        self.text.get(self.at).copied()
    }

    fn skip(&mut self) {
        while self.peek() == Some(' ') {
            self.at += 1;
        }
    }

    fn take(&mut self, sign: char) -> bool {
        let found = self.peek() == Some(sign);
        self.at += usize::from(found);
        found
    }

    /// `alternation = concatenation *( "/" concatenation )`
    fn alternatives(&mut self) -> Part {
        let mut parts = vec![self.chain()];
        while self.take('/') {
            parts.push(self.chain());
        }
        if parts.len() == 1 { parts.remove(0) } else { Part::Either(parts) }
    }

    /// `concatenation = repetition *( 1*c-wsp repetition )`
    fn chain(&mut self) -> Part {
        let mut parts = Vec::new();
        self.skip();
        while self.peek().is_some_and(|c| !matches!(c, '/' | ')' | ']')) {
            parts.push(self.repetition());
            self.skip();
        }
        assert!(!parts.is_empty(), "nothing stands before {:?}", self.rest());
        if parts.len() == 1 { parts.remove(0) } else { Part::Chain(parts) }
    }

    /// `repetition = [ 1*DIGIT / *DIGIT "*" *DIGIT ] element`
    fn repetition(&mut self) -> Part {
        let least = self.number(10);
        let (least, most) = if self.take('*') {
            (least.unwrap_or(0), self.number(10))
        } else if let Some(count) = least {
            (count, Some(count))
        } else {
            return self.element();
        };
        let as_size = |n: u32| usize::try_from(n).unwrap();
        Part::Repeat(as_size(least), most.map(as_size), Box::new(self.element()))
    }

    /// `element = rulename / group / option / char-val / num-val`
    fn element(&mut self) -> Part {
        match self.peek() {
            Some('(') => self.bracketed(')'),
            Some('[') => Part::Repeat(0, Some(1), Box::new(self.bracketed(']'))),
            Some('"') => {
                self.at += 1;
                Part::Literal(self.while_true(|c| c != '"', true))
            }
            Some('%') => self.range(),
            Some(c) if c.is_ascii_alphabetic() => {
                Part::Rule(self.while_true(|c| c.is_ascii_alphanumeric() || c == '-', false).to_lowercase())
            }
            _ => panic!("no element: {:?}", self.rest()),
        }
    }

    fn bracketed(&mut self, close: char) -> Part {
        self.at += 1;
        let inner = self.alternatives();
        assert!(self.take(close), "{close} is missing before {:?}", self.rest());
        inner
    }

    fn while_true(&mut self, holds: impl Fn(char) -> bool, closed: bool) -> String {
        let start = self.at;
        while self.peek().is_some_and(&holds) {
            self.at += 1;
        }
        let text = self.text[start..self.at].iter().collect();
        self.at += usize::from(closed);
        text
    }

    /// `num-val = "%x" hex [ "-" hex / 1*( "." hex ) ]`
    fn range(&mut self) -> Part {
        assert!(self.take('%') && self.take('x'), "only %x is read");
        let first = self.number(16).expect("a number behind %x");
        if self.take('-') {
            return Part::Range(first, self.number(16).expect("the range's end"));
        }
        let mut parts = vec![Part::Range(first, first)];
        while self.take('.') {
            let next = self.number(16).expect("a number behind the point");
            parts.push(Part::Range(next, next));
        }
        if parts.len() == 1 { parts.remove(0) } else { Part::Chain(parts) }
    }

    fn number(&mut self, radix: u32) -> Option<u32> {
        let digits = self.while_true(|c| c.is_digit(radix), false);
        u32::from_str_radix(&digits, radix).ok()
    }
}

#[test]
fn a_rule_is_read_with_all_its_signs() {
    let text = "a = 1*2b [ \"X;\" / %x41-5A ] ; tail\n  3( b )\nb = %x0D.0A\n";
    let read = |(name, body): (String, String)| {
        (name, Reader { text: body.chars().collect(), at: 0 }.alternatives())
    };
    let rules: Vec<_> = rules(text).into_iter().map(read).collect();
    let b = || Box::new(Part::Rule("b".into()));
    let choice = Part::Either(vec![Part::Literal("X;".into()), Part::Range(0x41, 0x5A)]);
    let a = Part::Chain(vec![
        Part::Repeat(1, Some(2), b()),
        Part::Repeat(0, Some(1), Box::new(choice)),
        Part::Repeat(3, Some(3), b()),
    ]);
    assert_eq!(rules[0], ("a".to_owned(), a));
    assert_eq!(rules[1], ("b".to_owned(), Part::Chain(vec![Part::Range(13, 13), Part::Range(10, 10)])));
}
