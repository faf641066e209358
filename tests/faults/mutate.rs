//! The mistakes, fixed beforehand: each operator at every place it fits. Text in, texts out.

use super::netlist::{Card, cards, is_element, number};
use super::roles::{is_bridge_leg, is_freewheel};

/// One mistake in one file.
#[derive(Debug, Clone)]
pub struct Mutant {
    /// The operator.
    pub operator: &'static str,
    /// The line that was changed, or what was joined.
    pub what: String,
    /// The netlist.
    pub text: String,
    /// Lower-case names of the changed element and of its nodes before and after; empty where all is changed.
    pub names: Vec<String>,
}

/// Operators by group, in the order of the table.
pub const WIRING: [&str; 10] = [
    "disconnect a terminal",
    "misspell a node",
    "duplicate a line",
    "drop a port",
    "remove the ground",
    "short an element",
    "undefined model",
    "delete a line",
    "take out a series resistor",
    "join two nodes",
];
pub const ORIENTATION: [&str; 4] =
    ["reverse a diode", "reverse a bridge leg", "reverse a freewheel diode", "flip a source"];
pub const VALUE: [&str; 4] = ["swap the model", "value by 1000", "meg to m", "swap two ports"];

/// All mutants of one text.
pub fn mutants(text: &str) -> Vec<Mutant> {
    let maker = Maker {
        text,
        lines: text.lines().collect(),
        cards: cards(text),
        flat: super::netlist::Flat::read(text, &[]),
    };
    let mut all = Vec::new();
    for card in &maker.cards {
        maker.terminals(card, &mut all);
        maker.whole_line(card, &mut all);
        maker.orientation(card, &mut all);
        maker.values(card, &mut all);
    }
    maker.ground(&mut all);
    maker.deletions(&mut all);
    maker.series(&mut all);
    maker.joins(&mut all);
    all
}

struct Maker<'a> {
    text: &'a str,
    lines: Vec<&'a str>,
    cards: Vec<Card>,
    flat: super::netlist::Flat,
}

impl Maker<'_> {
    fn names(&self, card: &Card) -> Vec<String> {
        let mut names = vec![card.name.to_lowercase()];
        names.extend(card.nodes.iter().filter(|n| n.as_str() != "0").cloned());
        if card.letter == 'K' {
            names.extend(card.rest.iter().map(|w| w.to_lowercase()));
        }
        // a port inside is a node outside
        let own = |name: &str| name.rsplit(':').next().unwrap_or(name).to_owned();
        let flat = self.flat.parts.iter().filter(|p| own(&p.name) == card.name.to_lowercase());
        names.extend(flat.flat_map(|p| &p.nodes).filter(|n| n.as_str() != "0").map(|n| own(n)));
        names
    }

    fn words(&self, card: &Card) -> Vec<String> {
        self.lines[card.line].split_whitespace().map(str::to_owned).collect()
    }

    fn with_line(&self, number: usize, line: Option<String>) -> String {
        let lines = self.lines.iter().enumerate();
        let kept = lines.filter_map(|(n, l)| if n == number { line.clone() } else { Some((*l).to_owned()) });
        kept.map(|l| l + "\n").collect()
    }

    fn mutant(&self, operator: &'static str, card: &Card, words: &[String]) -> Mutant {
        let line = words.join(" ");
        let mut names = self.names(card);
        names.extend(words.iter().map(|w| w.to_lowercase()).filter(|w| w != "0"));
        Mutant {
            operator,
            what: format!("{} -> {line}", self.lines[card.line]),
            text: self.with_line(card.line, Some(line)),
            names,
        }
    }

    fn terminals(&self, card: &Card, all: &mut Vec<Mutant>) {
        for pin in 0..card.nodes.len() {
            let mut words = self.words(card);
            words[pin + 1] = "loose9".into();
            all.push(self.mutant("disconnect a terminal", card, &words));
            let mut words = self.words(card);
            if let Some(wrong) = self.misspelt(&words[pin + 1], card.line + pin) {
                words[pin + 1] = wrong;
                all.push(self.mutant("misspell a node", card, &words));
            }
            if card.letter == 'X' {
                let mut words = self.words(card);
                words.remove(pin + 1);
                all.push(self.mutant("drop a port", card, &words));
            }
        }
    }

    /// One letter changed, left out, doubled or exchanged, giving a name that is not there yet.
    fn misspelt(&self, name: &str, seed: usize) -> Option<String> {
        let letters: Vec<char> = name.chars().collect();
        if name == "0" {
            return Some("O".into());
        }
        let places: Vec<usize> = (0..letters.len()).filter(|&n| letters[n].is_alphabetic()).collect();
        let taken =
            |word: &str| self.cards.iter().flat_map(|c| &c.nodes).any(|n| n.eq_ignore_ascii_case(word));
        (0..4 * places.len()).map(|n| seed + n).find_map(|n| {
            let at = *places.get(n % places.len())?;
            let mut new = letters.clone();
            match (n / places.len() + seed) % 4 {
                0 => new[at] = if letters[at] == 'k' { 'j' } else { 'k' },
                1 if letters.len() > 2 => drop(new.remove(at)),
                2 => new.insert(at, letters[at]),
                _ if at + 1 < letters.len() && letters[at] != letters[at + 1] => new.swap(at, at + 1),
                _ => return None,
            }
            let word: String = new.into_iter().collect();
            let is_name = word.chars().next().is_some();
            (is_name && !taken(&word)).then_some(word)
        })
    }

    fn whole_line(&self, card: &Card, all: &mut Vec<Mutant>) {
        let line = self.lines[card.line];
        all.push(Mutant {
            operator: "duplicate a line",
            what: line.to_owned(),
            text: self.with_line(card.line, Some(format!("{line}\n{line}"))),
            names: self.names(card),
        });
        let two_ends = !"QMJXK".contains(card.letter);
        if two_ends {
            let mut words = self.words(card);
            words[2] = words[1].clone();
            all.push(self.mutant("short an element", card, &words));
        }
        if "DQMJSW".contains(card.letter) {
            let mut words = self.words(card);
            let at = card.nodes.len() + if card.letter == 'W' { 2 } else { 1 };
            words[at].push('X');
            all.push(self.mutant("undefined model", card, &words));
        }
    }

    fn orientation(&self, card: &Card, all: &mut Vec<Mutant>) {
        let mut words = self.words(card);
        let operator = match card.letter {
            'D' if is_bridge_leg(&self.cards, card) => "reverse a bridge leg",
            'D' if is_freewheel(&self.cards, card) => "reverse a freewheel diode",
            'D' => "reverse a diode",
            'V' | 'I' => "flip a source",
            _ => return,
        };
        words.swap(1, 2);
        all.push(self.mutant(operator, card, &words));
    }

    fn values(&self, card: &Card, all: &mut Vec<Mutant>) {
        let words = self.words(card);
        if "RCLVI".contains(card.letter)
            && let Some(value) = words.get(3).filter(|w| !w.contains('(')).and_then(|w| number(w))
            && value != 0.0
            && !words[3].starts_with('{')
        {
            for factor in [1e3, 1e-3] {
                let mut changed = words.clone();
                changed[3] = format!("{:e}", value * factor);
                all.push(self.mutant("value by 1000", card, &changed));
            }
        }
        for at in 1 + card.nodes.len()..words.len() {
            if words[at].to_lowercase().contains("meg") {
                let mut changed = words.clone();
                changed[at] = words[at].to_lowercase().replace("meg", "m");
                all.push(self.mutant("meg to m", card, &changed));
            }
        }
        if card.letter == 'X' {
            for pin in 1..card.nodes.len() {
                let mut changed = words.clone();
                changed.swap(pin, pin + 1);
                all.push(self.mutant("swap two ports", card, &changed));
            }
        }
        if card.letter == 'D' {
            self.other_model(card, all);
        }
    }

    /// The next diode model of the file, or where there is none, a Zener diode for a plain one and a plain one for a Zener.
    fn other_model(&self, card: &Card, all: &mut Vec<Mutant>) {
        let mut words = self.words(card);
        let models: Vec<&str> = self
            .lines
            .iter()
            .filter(|l| {
                let mut words = l.split_whitespace();
                words.next() == Some(".model")
                    && words.nth(1).is_some_and(|w| w == "D" || w.starts_with("D("))
            })
            .filter_map(|l| l.split_whitespace().nth(1))
            .collect();
        let own = models.iter().position(|m| *m == words[3]).unwrap_or(0);
        let line = if models.len() > 1 {
            words[3] = models[(own + 1) % models.len()].to_owned();
            String::new()
        } else {
            let zener =
                self.lines.iter().any(|l| l.contains(&format!(".model {}", words[3])) && l.contains("BV="));
            words[3] = "DOTHER".into();
            if zener {
                ".model DOTHER D(IS=1e-18 N=2 RS=3)\n".to_owned()
            } else {
                ".model DOTHER D(IS=1n N=1.3 RS=7 BV=5.1)\n".to_owned()
            }
        };
        let mut mutant = self.mutant("swap the model", card, &words);
        mutant.text = mutant.text.replace(".end\n", &format!("{line}.end\n"));
        all.push(mutant);
    }

    fn ground(&self, all: &mut Vec<Mutant>) {
        let text = self.renamed("", |name| (name == "0").then(|| "ret".into()), true);
        all.push(Mutant { operator: "remove the ground", what: "0 -> ret".into(), text, names: Vec::new() });
    }

    fn deletions(&self, all: &mut Vec<Mutant>) {
        let cards = |n: usize| self.cards.iter().find(|c| c.line == n);
        for (n, line) in self.lines.iter().enumerate().skip(1) {
            let first = line.split_whitespace().next().unwrap_or("").to_lowercase();
            let is_ours =
                is_element(line) || [".model", ".param", ".subckt", ".ends"].contains(&first.as_str());
            if !is_ours {
                continue;
            }
            let names = match cards(n) {
                Some(card) => self.names(card),
                None => Vec::new(),
            };
            let what = (*line).to_owned();
            all.push(Mutant { operator: "delete a line", what, text: self.with_line(n, None), names });
        }
    }

    /// Resistors with one end at a node that only one other pin touches: a wire in their place.
    fn series(&self, all: &mut Vec<Mutant>) {
        for card in self.cards.iter().filter(|c| c.letter == 'R') {
            let pins = |node: &String| {
                let here = self.cards.iter().filter(|c| c.inside == card.inside);
                here.flat_map(|c| &c.nodes).filter(|n| *n == node).count()
            };
            let [one, two] = [card.nodes[0].clone(), card.nodes[1].clone()];
            let gone = [&two, &one]
                .into_iter()
                .find(|n| n.as_str() != "0" && pins(n) == 2 && !self.is_port(card, n));
            let Some(gone) = gone.cloned() else { continue };
            let kept = if gone == one { two } else { one };
            let renamed = self.renamed(&card.inside, |name| (name == gone).then(|| kept.clone()), true);
            let text: String = renamed
                .lines()
                .enumerate()
                .filter(|(n, _)| *n != card.line)
                .map(|(_, l)| format!("{l}\n"))
                .collect();
            // the line of the neighbour at the node that is gone is changed with it
            let mut names = self.names(card);
            let neighbours = self.cards.iter().filter(|c| c.inside == card.inside && c.nodes.contains(&gone));
            names.extend(neighbours.flat_map(|c| self.names(c)));
            all.push(Mutant {
                operator: "take out a series resistor",
                what: self.lines[card.line].to_owned(),
                text,
                names,
            });
        }
    }

    fn is_port(&self, card: &Card, node: &str) -> bool {
        let opens = |l: &&&str| {
            let mut words = l.split_whitespace();
            words.next().is_some_and(|w| w.eq_ignore_ascii_case(".subckt"))
                && words.next().is_some_and(|w| w.eq_ignore_ascii_case(&card.inside))
        };
        let head = self.lines.iter().find(opens);
        head.is_some_and(|l| l.split_whitespace().skip(2).any(|w| w.eq_ignore_ascii_case(node)))
    }

    /// Ten pairs of nodes of the root circuit, spread evenly over all of them.
    fn joins(&self, all: &mut Vec<Mutant>) {
        let mut nodes: Vec<String> =
            self.cards.iter().filter(|c| c.inside.is_empty()).flat_map(|c| c.nodes.clone()).collect();
        nodes.sort();
        nodes.dedup();
        let pairs: Vec<(usize, usize)> =
            (0..nodes.len()).flat_map(|a| (a + 1..nodes.len()).map(move |b| (a, b))).collect();
        let count = pairs.len().min(10);
        for k in 0..count {
            let (a, b) = pairs[k * pairs.len() / count];
            let (kept, gone) = (nodes[a].clone(), nodes[b].clone());
            let text = self.renamed("", |name| (name == gone).then(|| kept.clone()), true);
            let what = format!("{kept} = {gone}");
            let touching = self.cards.iter().filter(|c| c.nodes.contains(&kept) || c.nodes.contains(&gone));
            let mut names: Vec<String> = touching.map(|c| c.name.to_lowercase()).collect();
            names.extend([kept, gone].into_iter().filter(|n| n != "0"));
            all.push(Mutant { operator: "join two nodes", what, text, names });
        }
    }

    /// The text with nodes of one circuit renamed, in the notes too.
    fn renamed(&self, inside: &str, to: impl Fn(&str) -> Option<String>, notes: bool) -> String {
        let mut text = String::new();
        for (n, line) in self.lines.iter().enumerate() {
            let card = self.cards.iter().find(|c| c.line == n);
            let line = match card {
                Some(card) if card.inside == inside || to("0").is_some() => {
                    let mut words: Vec<String> = line.split_whitespace().map(str::to_owned).collect();
                    for (pin, node) in card.nodes.iter().enumerate() {
                        if let Some(new) = to(node) {
                            words[pin + 1] = new;
                        }
                    }
                    words.join(" ")
                }
                None if notes && line.starts_with("*@") => {
                    let swap = |w: &str| {
                        let bare = w.trim_start_matches("v(").trim_end_matches(')');
                        to(&bare.to_lowercase()).map_or(w.to_owned(), |new| w.replace(bare, &new))
                    };
                    line.split_whitespace().map(swap).collect::<Vec<_>>().join(" ")
                }
                _ => (*line).to_owned(),
            };
            text.push_str(&line);
            text.push('\n');
        }
        debug_assert!(text.lines().count() == self.text.lines().count());
        text
    }
}
