//! An `expect … over time` note that the circuit does not meet.

use super::{About, Check, Claim, Evidence, Group, Rule, claims, expected};
use crate::circuit::State;
use crate::finding::{Finding, Severity, interval, quantity};
use crate::operating::{Operating, apart};
use crate::swing::{OverTime, Swing};

pub const RULE: Rule = Rule {
    name: "broken-over-time",
    group: Group::Time,
    severity: Severity::Error,
    also: None,
    summary: "a diode or a node does not do over time what an `expect … over time` note says",
    why: "Somebody wrote down what this circuit must do while its sources move, and as it stands it does something else.",
    remedy: "Mend the circuit, or, where the change was meant, the note.",
    source: None,
    failing: "tide gauge buoy: ping detector\n\
              VPING in 0 SIN(0 5 40k)\n\
              D1 in env DDET\n\
              C1 env 0 10n\n\
              R1 env 0 100k\n\
              .model DDET D(RS=10)\n\
              *@ made-of DDET schottky\n\
              *@ expect v(env) 4.8..5 over time\n",
    passing: "tide gauge buoy: ping detector\n\
              VPING in 0 SIN(0 5 40k)\n\
              D1 in env DDET\n\
              C1 env 0 10n\n\
              R1 env 0 100k\n\
              .model DDET D(RS=10)\n\
              *@ made-of DDET schottky\n\
              *@ expect v(env) 4.5..4.7 over time\n\
              *@ expect D1 conducting over time\n\
              *@ expect D1 blocking over time\n",
    check: Check::Time(check),
};

/// Rounding is no miss.
const ROUNDING: f64 = 1e-9;

/// What is different, and the reasoning.
enum Seen {
    Held,
    Broken(String, String),
    Unchecked(String),
}

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let (claims, _) = claims(evidence);
    let over_time = claims.iter().filter(|c| c.wanted.over_time);
    over_time.filter_map(|claim| judge(evidence, swing, claim)).collect()
}

fn judge(evidence: &Evidence<'_>, swing: &Swing, claim: &Claim<'_>) -> Option<Finding> {
    let subject = claim.subject(evidence);
    let seen = match claim.about {
        About::Diode(id) => {
            let figures = swing.diode(id);
            match figures.and_then(|d| d.over_time.as_ref()) {
                Some(time) => diode(swing, claim, time),
                None => Seen::Unchecked(reason(swing, figures.and_then(|d| d.not_evaluated.clone()))),
            }
        }
        About::Node(node) => match swing.node(node).and_then(|n| n.over_time) {
            Some(level) => bounds(claim, (level.min, level.max), "V"),
            None => Seen::Unchecked(reason(swing, None)),
        },
    };
    let place = |rule: &Rule, message: String| {
        evidence.at(rule, claim.note.scope, claim.note.span, message).about(subject.clone())
    };
    match seen {
        Seen::Held => None,
        Seen::Broken(what, why) => {
            let expected = expected(claim.wanted);
            let finding = place(&RULE, format!("{subject} should be {expected}, but {what}"));
            let help = format!("{why} {}", RULE.remedy);
            Some(finding.label(format!("expects {expected}")).help(help.trim().to_owned()))
        }
        Seen::Unchecked(why) => {
            let rule = &super::unchecked_expectation::RULE;
            let finding =
                place(rule, format!("what is expected of {subject} over time could not be checked: {why}"));
            Some(finding.label("not checked").help(format!("{} {}", rule.why, rule.remedy)))
        }
    }
}

fn reason(swing: &Swing, own: Option<String>) -> String {
    own.or_else(|| swing.cut_short.clone())
        .or_else(|| swing.span.is_none().then(|| "no source of this circuit moves".to_owned()))
        .unwrap_or_else(|| "its part could not be followed".into())
        .trim_end_matches('.')
        .to_owned()
}

/// Whether the state is reached in the window, and the greatest current in it lies in the range.
fn diode(swing: &Swing, claim: &Claim<'_>, time: &OverTime) -> Seen {
    let broken: f64 = time.breakdown_intervals.iter().map(|(from, to)| to - from).sum();
    let broken = if swing.window > 0.0 { broken / swing.window } else { 0.0 };
    let shares = format!(
        "It conducts {} of the time{}.",
        percent(time.conducting_share),
        if broken > 0.0 { format!(" and breaks down {}", percent(broken)) } else { String::new() }
    );
    let is_reached = claim.wanted.state.is_none_or(|state| time.states(swing.window).contains(&state));
    if !is_reached {
        let state = claim.wanted.state.map_or("", State::word);
        return Seen::Broken(format!("never is: {state} does not occur"), shares);
    }
    let peak = match claim.wanted.state {
        Some(State::Conducting) => time.current_peak,
        Some(State::Breakdown) => time.reverse_peak,
        _ => return Seen::Held,
    };
    match bounds(claim, (peak, peak), "A") {
        Seen::Broken(..) => Seen::Broken(format!("its current reaches {}", quantity(peak, "A")), shares),
        other => other,
    }
}

/// Whether both extremes lie in the range.
fn bounds(claim: &Claim<'_>, (least, greatest): (f64, f64), unit: &str) -> Seen {
    let Some((low, high)) = claim.wanted.range else { return Seen::Held };
    let slack = ROUNDING * low.abs().max(high.abs());
    let what = if least < low - slack {
        format!("falls to {}", apart(least, low, unit).0)
    } else if greatest > high + slack {
        format!("rises to {}", apart(greatest, high, unit).0)
    } else {
        return Seen::Held;
    };
    Seen::Broken(what, format!("Over the period it runs through {}.", interval(least, greatest, unit)))
}

fn percent(share: f64) -> String {
    format!("{:.3} %", 100.0 * share).replace(".000 %", " %")
}
