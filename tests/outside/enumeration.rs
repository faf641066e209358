//! Random networks against the exhaustive enumeration.

use crate::circuits::{Circuit, random};
use crate::compare::{CLOSE, both, differences};
use crate::oracle::{self, Assumed, StateWord, Verdict, acceptable_verdicts};
use crate::run;
use crate::shrink::shrink;
use std::collections::BTreeMap;

/// Networks in an ordinary run; `KNEEWISE_NETWORKS=20000` asks for more, `KNEEWISE_SEED=…` for others,
/// `KNEEWISE_SHOW=…` to see more failures.
pub fn wanted(ordinary: u64) -> (u64, u64) {
    let number = |name: &str| std::env::var(name).ok().and_then(|text| text.parse().ok());
    (number("KNEEWISE_SEED").unwrap_or(0), number("KNEEWISE_NETWORKS").unwrap_or(ordinary))
}

/// Stops with the smallest failing form of each of the first few networks that fail.
pub fn all_agree(make: &dyn Fn(u64) -> Option<Circuit>, seeds: std::ops::Range<u64>) {
    let mut failures = Vec::new();
    let mut checked = 0;
    for seed in seeds {
        let Some(circuit) = make(seed) else { continue };
        checked += 1;
        if fails(&circuit) {
            failures.push(seed);
        }
    }
    let most = std::env::var("KNEEWISE_SHOW").ok().and_then(|text| text.parse().ok()).unwrap_or(5);
    let shown: Vec<String> =
        failures.iter().take(most).filter_map(|&seed| make(seed)).map(|c| report(&c)).collect();
    assert!(
        failures.is_empty(),
        "{} of {checked} networks differ from the enumeration (seeds {:?}); the first, made as small as they still differ:\n\n{}",
        failures.len(),
        &failures[..failures.len().min(40)],
        shown.join("\n\n")
    );
}

fn fails(circuit: &Circuit) -> bool {
    let answer = oracle::solve(circuit);
    // what a continuum of solutions should be called is settled for passive networks only
    let settled = circuit.is_passive() || !answer.continuum;
    if !circuit.is_passive() {
        let verdicts = verdicts(circuit);
        // an answer withheld is no wrong answer; `dependent` counts them
        if verdicts.contains(&kneewise::complementarity::Verdict::Unverified) {
            return false;
        }
        // beside a part without a solution, dependent parts may have several sets or a continuum of their own
        if !answer.solvable() {
            return verdicts != [kneewise::complementarity::Verdict::None];
        }
    }
    settled && !differences(circuit, &answer, &run::states(&circuit.text()), CLOSE).is_empty()
}

/// kneewise's verdict in each condition.
pub fn verdicts(circuit: &Circuit) -> Vec<kneewise::complementarity::Verdict> {
    let operating = run::states(&circuit.text()).operating.unwrap_or_default();
    operating.cases.iter().map(|case| case.verdict).collect()
}

fn report(circuit: &Circuit) -> String {
    let least = shrink(circuit, &fails);
    let answer = oracle::solve(&least);
    let analysis = run::states(&least.text());
    let list = differences(&least, &answer, &analysis, CLOSE);
    format!("{}differences:\n  {}", both(&least, &answer, &analysis), list.join("\n  "))
}

#[test]
fn random_networks_agree_with_the_enumeration() {
    let (first, count) = wanted(2000);
    all_agree(&|seed| Some(random::network(seed)), first..first + count);
}

#[test]
fn the_random_networks_hold_every_verdict_in_good_number() {
    let mut shares: BTreeMap<Verdict, usize> = BTreeMap::new();
    let (first, count) = (0, 1000);
    for seed in first..first + count {
        let circuit = random::network(seed);
        let answer = oracle::solve(&circuit);
        let verdicts = acceptable_verdicts(&circuit, &answer);
        *shares.entry(*verdicts.last().expect("there is always one")).or_default() += 1;
    }
    eprintln!("shares in {count} networks: {shares:?}");
    for verdict in
        [Verdict::Unique, Verdict::Shared, Verdict::Floating, Verdict::SharedFloating, Verdict::None]
    {
        let share = shares.get(&verdict).copied().unwrap_or(0);
        assert!(share >= 30, "only {share} of {count} random networks are {verdict:?}: {shares:?}");
    }
}

/// In passive networks one assignment holds the whole solution set: that of each diode's state over all of it.
#[test]
fn the_enumeration_agrees_with_itself() {
    let mut compared = 0;
    for seed in 0..1000 {
        let circuit = random::network(seed);
        let answer = oracle::solve(&circuit);
        let ideal = circuit.diodes().any(|(_, d)| d.drop.is_zero());
        if !answer.solvable() || ideal {
            continue;
        }
        let states: Option<Vec<Assumed>> = circuit
            .diodes()
            .map(|(at, _)| match answer.current(at).state() {
                StateWord::Conducting => Some(Assumed::Conducting),
                StateWord::Blocking => Some(Assumed::Blocking),
                StateWord::Breakdown => Some(Assumed::Breakdown),
                StateWord::Open => None,
            })
            .collect();
        let states = states.unwrap_or_else(|| panic!("a passive diode goes both ways\n{}", circuit.text()));
        let alone = oracle::with_states(&circuit, &states);
        assert_eq!(alone.ranges, answer.ranges, "{}", circuit.text());
        compared += 1;
    }
    assert!(compared > 300, "only {compared} were compared");
}
