//! Why a diode is in its state, by the method's own reasoning: assume the other states, see them fail; assume this
//! one, see it hold; and what would change it. Plain words with the numbers that convince.

use super::assemble::{Owner, Setting};
use super::case::state;
use super::evaluate::Solved;
use super::excerpt::Excerpt;
use super::flip::{Way, follow};
use super::result::{Case, DiodeResult, Flip, Reasoning};
use crate::circuit::{Circuit, ElementId, State};
use crate::complementarity::{Interval, Law, Network, Quantity, View};
use crate::finding::{interval, quantity};

/// How far a source is followed: ten times its value, both ways.
const FURTHEST: f64 = 10.0;
/// Most sources that are followed.
const MOST_SOURCES: usize = 32;
/// Most work of one search: solves times branches.
const MOST_WORK: usize = 10_000_000;

/// Gathers the reasoning over the conditions. Conditions with one state share one line of reasoning, told for the
/// first of them; what differs between them is told as a spread.
#[derive(Default)]
pub(crate) struct Reasoner {
    lines: Vec<Line>,
}

/// One line of reasoning and the numbers of the conditions that share it.
struct Line {
    reasoning: Reasoning,
    /// Which of several consistent sets, from 0.
    set: usize,
    has_view: bool,
    not_evaluated: Option<String>,
    currents: Vec<f64>,
    margins: Vec<f64>,
}

impl Reasoner {
    /// Adds one case.
    pub fn add(&mut self, setting: &Setting<'_>, solved: &Solved, case: &Case, element: ElementId) {
        for (set, solution) in case.solutions.iter().enumerate() {
            // diodes stand in the order of their numbers
            let Ok(at) = solution.diodes.binary_search_by_key(&element, |d| d.element) else { continue };
            let diode = &solution.diodes[at];
            if !self.shares(case, set, diode) {
                self.tell(setting, solved, case, set, diode);
            }
        }
        if case.solutions.is_empty() {
            self.nothing(case);
        }
    }

    /// All lines, in the order of their first conditions.
    pub fn finish(self) -> Vec<Reasoning> {
        self.lines.into_iter().map(Line::finish).collect()
    }

    /// Joins the case to a line that reasons alike.
    fn shares(&mut self, case: &Case, set: usize, diode: &DiodeResult) -> bool {
        let alike = |line: &&mut Line| {
            line.reasoning.state == diode.state
                && line.set == set
                && line.has_view == diode.view.is_some()
                && line.not_evaluated == diode.not_evaluated
        };
        let Some(line) = self.lines.iter_mut().find(alike) else { return false };
        line.reasoning.cases.push(case.name.clone());
        line.currents.push(diode.current.known().unwrap_or(f64::NAN));
        line.margins.push(diode.margin.unwrap_or(f64::NAN));
        true
    }

    fn tell(&mut self, setting: &Setting<'_>, solved: &Solved, case: &Case, set: usize, diode: &DiodeResult) {
        let count = case.solutions.len();
        let mut sentences = Vec::new();
        if count > 1 {
            sentences.push(format!("This is set {} of {count} that are consistent.", set + 1));
        }
        sentences.extend(self::sentences(setting.circuit, case, diode));
        let is_single = count == 1 && diode.state != State::NotEvaluated;
        let search = if is_single { flips(setting, solved, diode.element) } else { Search::default() };
        self.lines.push(Line {
            set,
            has_view: diode.view.is_some(),
            not_evaluated: diode.not_evaluated.clone(),
            currents: vec![diode.current.known().unwrap_or(f64::NAN)],
            margins: vec![diode.margin.unwrap_or(f64::NAN)],
            reasoning: Reasoning {
                cases: vec![case.name.clone()],
                state: diode.state,
                flip_sentence: if is_single { search.sentence(diode.state) } else { String::new() },
                sentences,
                flips: search.flips,
            },
        });
    }

    /// A case in which nothing could be solved.
    fn nothing(&mut self, case: &Case) {
        let sentences = case.contradictions.iter().map(|c| sentence(&c.text)).collect();
        self.lines.push(Line {
            set: 0,
            has_view: false,
            not_evaluated: None,
            currents: Vec::new(),
            margins: Vec::new(),
            reasoning: Reasoning {
                cases: vec![case.name.clone()],
                state: State::NotEvaluated,
                sentences,
                flips: Vec::new(),
                flip_sentence: String::new(),
            },
        });
    }
}

impl Line {
    fn finish(mut self) -> Reasoning {
        let cases = &self.reasoning.cases;
        if cases.len() > 1 && self.reasoning.state != State::NotEvaluated {
            let current = spread(cases, &self.currents);
            let margin = least(cases, &self.margins);
            let parts: Vec<String> = [
                current.map(|(low, high)| format!("its current runs from {low} to {high}")),
                margin.map(|m| format!("the margin is least with {m}")),
            ]
            .into_iter()
            .flatten()
            .collect();
            let first = cases.first().cloned().unwrap_or_default();
            if parts.is_empty() {
                self.reasoning.sentences.push(format!("That was {first}; the others go alike."));
            } else {
                let told = format!("That was {first}; over the conditions named, {}.", parts.join(", and "));
                self.reasoning.sentences.push(told);
            }
        }
        self.reasoning
    }
}

/// Least and greatest with their conditions, where they differ.
fn spread(cases: &[String], values: &[f64]) -> Option<(String, String)> {
    let known = || cases.iter().zip(values).filter(|(_, v)| v.is_finite());
    let (low_case, low) = known().min_by(|a, b| a.1.total_cmp(b.1))?;
    let (high_case, high) = known().max_by(|a, b| a.1.total_cmp(b.1))?;
    let tell = |value: f64, case: &str| format!("{} ({case})", quantity(value, "A"));
    (low < high && quantity(*low, "A") != quantity(*high, "A"))
        .then(|| (tell(*low, low_case), tell(*high, high_case)))
}

fn least(cases: &[String], values: &[f64]) -> Option<String> {
    let known = cases.iter().zip(values).filter(|(_, v)| v.is_finite());
    let (case, value) = known.min_by(|a, b| a.1.total_cmp(b.1))?;
    Some(format!("{} ({case})", quantity(*value, "V")))
}

/// The method's reasoning about one diode in one condition.
pub(crate) fn sentences(circuit: &Circuit, case: &Case, diode: &DiodeResult) -> Vec<String> {
    Speaker { circuit, case, diode }.sentences()
}

/// A clause as a sentence.
fn sentence(clause: &str) -> String {
    let mut letters = clause.chars();
    let first: String = letters.next().map(|c| c.to_uppercase().collect()).unwrap_or_default();
    format!("{first}{}.", letters.as_str())
}

/// Two quantities with as many digits as it takes to tell them apart.
fn apart(a: f64, b: f64, unit: &str) -> (String, String) {
    let plain = (quantity(a, unit), quantity(b, unit));
    if plain.0 != plain.1 || a == b {
        return plain;
    }
    let digits = |value: f64, digits: usize| {
        let rounded: f64 = format!("{value:.digits$e}").parse().unwrap_or(value);
        format!("{rounded} {unit}")
    };
    (3..17).map(|n| (digits(a, n), digits(b, n))).find(|(a, b)| a != b).unwrap_or(plain)
}

struct Speaker<'a> {
    circuit: &'a Circuit,
    case: &'a Case,
    diode: &'a DiodeResult,
}

impl Speaker<'_> {
    fn name(&self) -> String {
        self.circuit.element_name(self.diode.element)
    }

    fn sentences(&self) -> Vec<String> {
        let origin = format!(
            "{} has a drop of {} ({}){}{}.",
            self.name(),
            quantity(self.diode.drop.volts, "V"),
            self.diode.drop.origin,
            self.diode
                .breakdown
                .map_or(String::new(), |bv| format!(", breaks down at {}", quantity(bv, "V"))),
            match self.diode.series {
                0.0 => String::new(),
                ohms => format!(", and has {} in series", quantity(ohms, "Ω")),
            }
        );
        let mut all = vec![origin];
        all.extend(match (self.diode.state, self.diode.view) {
            (State::Conducting | State::Breakdown | State::Blocking, Some(view)) if view.resistance < 0.0 => {
                self.behind_negative_resistance(view)
            }
            (State::Conducting, Some(view)) => self.carries(view, true),
            (State::Breakdown, Some(view)) => self.carries(view, false),
            (State::Blocking, Some(view)) => self.blocks(view),
            (State::NotEvaluated, _) => self.not_evaluated(),
            (state, _) => self.without_view(state),
        });
        all
    }

    /// Level in the direction that is examined: the drop, or minus the breakdown voltage.
    fn level(&self, forward: bool) -> f64 {
        if forward { self.diode.drop.volts } else { -self.diode.breakdown.unwrap_or(f64::INFINITY) }
    }

    /// `(4.62 V − 700 mV) / 1 kΩ = 3.92 mA`, the current that an assumption leads to, and its value.
    fn current(&self, view: View, forward: bool) -> (String, f64) {
        let level = self.level(forward);
        let (seen, limit) = apart(view.open_circuit, level.abs(), "V");
        let sign = if forward { "−" } else { "+" };
        let current = (view.open_circuit - level) / view.resistance;
        let sum = format!(
            "({seen} {sign} {limit}) / {} = {}",
            quantity(view.resistance, "Ω"),
            quantity(current, "A")
        );
        (sum, current)
    }

    /// Behind a negative resistance each assumption may hold by itself.
    fn behind_negative_resistance(&self, view: View) -> Vec<String> {
        let seen = quantity(view.open_circuit, "V");
        let mut all = vec![format!(
            "With every other diode in its state the rest of the circuit acts as {seen} behind a negative resistance of {}: what it puts across {} rises as more is drawn.",
            quantity(view.resistance, "Ω"),
            self.name()
        )];
        match self.diode.state {
            State::Blocking => all.push(format!(
                "Assume it blocks: {seen} stands across it, within its limits, so this holds."
            )),
            state => {
                let (sum, _) = self.current(view, state == State::Conducting);
                all.push(format!(
                    "Assume it is {}: {sum} flows from anode to cathode, which agrees, so this holds.",
                    state.word()
                ));
            }
        }
        all.push("Other assumptions may hold by themselves too; all diodes together decide.".to_owned());
        all
    }

    fn carries(&self, view: View, forward: bool) -> Vec<String> {
        let level = self.level(forward);
        let (seen, limit) = apart(view.open_circuit, level, "V");
        let (beyond, what, verb, way) = if forward {
            ("more than its drop of", "drop", "conducts", "which is forward")
        } else {
            ("beyond its breakdown at", "breakdown voltage", "breaks down", "which is backward")
        };
        let (sum, _) = self.current(view, forward);
        let mut all = vec![
            format!(
                "Assume {} blocks: with every other diode in its state the rest of the circuit puts {seen} across it, {beyond} {limit}, so that assumption fails.",
                self.name()
            ),
            format!("Assume it {verb}: {sum} flows from anode to cathode, {way}, so this holds."),
        ];
        if let Some(margin) = self.diode.margin {
            all.push(format!(
                "Margin: its {what} would have to exceed {}, {} more, to change the state.",
                quantity(view.open_circuit.abs(), "V"),
                quantity(margin, "V")
            ));
        }
        all
    }

    fn blocks(&self, view: View) -> Vec<String> {
        let drop = self.diode.drop.volts;
        let (seen, limit) = apart(view.open_circuit, drop, "V");
        let mut all = Vec::new();
        if self.diode.margin == Some(0.0) {
            all.push(format!(
                "{} stands exactly at a corner: the rest of the circuit puts {seen} across it and it carries nothing. The smallest change decides.",
                self.name()
            ));
            return all;
        }
        if view.resistance > 0.0 {
            let (sum, _) = self.current(view, true);
            all.push(format!("Assume {} conducts: {sum} would have to flow from anode to cathode, which is backward, so that assumption fails.", self.name()));
            if self.diode.breakdown.is_some() {
                let (sum, _) = self.current(view, false);
                all.push(format!("Assume it breaks down: {sum} would have to flow, which is forward, so that assumption fails."));
            }
        }
        let floor = self
            .diode
            .breakdown
            .map_or(String::new(), |bv| format!(" and above its breakdown at {}", quantity(-bv, "V")));
        all.push(format!("Assume it blocks: with every other diode in its state the rest of the circuit puts {seen} across it, less than its drop of {limit}{floor}, so this holds."));
        if let Some(margin) = self.diode.margin {
            let is_reverse =
                self.diode.breakdown.is_some_and(|bv| view.open_circuit + bv < drop - view.open_circuit);
            let what = if is_reverse { "it would break down" } else { "it would conduct" };
            let direction = if is_reverse { "less" } else { "more" };
            all.push(format!("Margin: {} {direction} across it and {what}.", quantity(margin, "V")));
        }
        all
    }

    /// No finite open-circuit voltage: fed by currents, floating, or part of an open split.
    fn without_view(&self, state: State) -> Vec<String> {
        let name = self.name();
        let causes = || self.case.contradictions.iter().filter(|c| c.elements.contains(&self.diode.element));
        let mut all = match (state, self.diode.current, self.diode.voltage) {
            (State::Conducting | State::Breakdown, Quantity::Known(current), _) => vec![format!(
                "Assume {name} blocks: the {} that the sources push through it have no other way, so that assumption fails. Assume it is {}: it carries them, so this holds. No voltage stands behind that current, so there is no margin in volts.",
                quantity(current, "A"),
                state.word()
            )],
            (_, Quantity::Open(Interval { low, high }), _) => vec![format!(
                "The model leaves its current open: {}. In some solution it is {}.",
                interval(low, high, "A"),
                state.word()
            )],
            (State::Blocking, _, Quantity::Open(Interval { low, high })) => vec![format!(
                "It carries nothing in every solution, but the model leaves its voltage open: {}.",
                interval(low, high, "V")
            )],
            (State::Blocking, _, Quantity::Known(volts)) => vec![format!(
                "Assume {name} blocks: {} stands across it, less than its drop of {}, so this holds.",
                quantity(volts, "V"),
                quantity(self.diode.drop.volts, "V")
            )],
            _ => vec![format!("{name} is {}.", state.word())],
        };
        all.extend(causes().map(|c| sentence(&c.text)));
        all
    }

    fn not_evaluated(&self) -> Vec<String> {
        let reason = self.diode.not_evaluated.clone().unwrap_or_else(|| "its part was not solved".into());
        vec![format!("{} is not evaluated: {reason}.", self.name())]
    }
}

/// What following the sources gave.
#[derive(Default)]
struct Search {
    flips: Vec<Flip>,
    followed: usize,
    is_cut_off: bool,
}

impl Search {
    fn sentence(&self, state: State) -> String {
        let tail = if self.is_cut_off { " The search was cut off: there may be nearer values." } else { "" };
        let list: Vec<String> = self.flips.iter().take(4).map(Flip::words).collect();
        match (list.is_empty(), self.followed) {
            (true, 0) if self.is_cut_off => {
                "Its part is too large to follow what single sources would change.".into()
            }
            (true, 0) => "Its part has no source that is not at zero, so there is none to follow.".into(),
            (true, _) if self.is_cut_off => {
                format!("No single source was seen to change the state from {}.{tail}", state.word())
            }
            (true, _) => "No single source changes the state within ten times its value.".into(),
            (false, _) => format!("One source alone changes the state: {}.{tail}", list.join("; ")),
        }
    }
}

impl Flip {
    /// `V1 from 5 V to 700 mV makes it block`.
    fn words(&self) -> String {
        let unit = if self.is_current { "A" } else { "V" };
        let becomes = match self.state {
            State::Conducting => "makes it conduct",
            State::Blocking => "makes it block",
            State::Breakdown => "makes it break down",
            State::Open => "leaves it open",
            State::NotEvaluated => "leaves no consistent state",
        };
        let (from, to) = apart(self.from, self.to, unit);
        format!("{} from {from} to {to} {becomes}", self.source)
    }
}

/// Follows every source of the diode's part, both ways to ten times its value.
fn flips(setting: &Setting<'_>, solved: &Solved, element: ElementId) -> Search {
    let mut search = Search::default();
    let junction = solved.assembly.branch[element.index()];
    let Some(excerpt) = Excerpt::around(&solved.assembly.network, &solved.outcome, junction) else {
        return search;
    };
    let Some(target) = excerpt.number(junction) else { return search };
    let all = sources(&excerpt.network);
    let budget = MOST_WORK / excerpt.network.branches.len().max(1);
    let each = budget / (2 * all.len().clamp(1, MOST_SOURCES));
    for (number, from, is_current) in all {
        let Some(source) = name(setting, solved, excerpt.original[number as usize]) else { continue };
        if search.followed == MOST_SOURCES || each < 4 {
            search.is_cut_off = true;
            break;
        }
        search.followed += 1;
        for limit in [FURTHEST * from, -FURTHEST * from] {
            match follow(&excerpt.network, target, number, from, limit, each) {
                Way::Never => {}
                Way::Lost => search.is_cut_off = true,
                Way::Changes { at, place, nearest } => {
                    search.is_cut_off |= !nearest;
                    let state = state(place);
                    search.flips.push(Flip { source: source.clone(), is_current, from, to: at, state });
                }
            }
        }
    }
    let distance = |f: &Flip| ((f.to - f.from) / f.from).abs();
    search.flips.sort_by(|a, b| distance(a).total_cmp(&distance(b)));
    search
}

/// Sources that are not zero, with their values.
fn sources(network: &Network) -> Vec<(u32, f64, bool)> {
    let value = |law: &Law| match law {
        Law::Voltage(level) => Some((level.value, false)),
        Law::Current(level) => Some((level.value, true)),
        _ => None,
    };
    let branches = network.branches.iter().enumerate();
    let sources = branches.filter_map(|(n, b)| value(&b.law).map(|(value, kind)| (n as u32, value, kind)));
    sources.filter(|s| s.1 != 0.0 && s.1.is_finite()).collect()
}

fn name(setting: &Setting<'_>, solved: &Solved, branch: u32) -> Option<String> {
    match *solved.assembly.owner.get(branch as usize)? {
        Owner::Element(id) => {
            setting.plan.sources.binary_search(&id).ok().map(|_| setting.circuit.element_name(id))
        }
        Owner::Supply(n) => Some(setting.circuit.node_name(setting.plan.supplies.get(n)?.node)),
    }
}
