//! `kneewise.swing`: how far currents and voltages move over time and over the conditions.

use super::number;
use crate::analysis::Analysis;
use crate::swing::{DiodeSwing, NodeSwing, OverConditions, Swing};
use crate::text::FileId;
use serde::Serialize;

#[derive(Serialize)]
struct Document<'a> {
    format: &'static str,
    version: u32,
    file: &'a str,
    #[serde(rename = "span_s")]
    span: Option<f64>,
    #[serde(rename = "period_s")]
    period: Option<f64>,
    periodic: bool,
    cut_short: Option<&'a str>,
    diodes: Vec<DiodeEntry<'a>>,
    nodes: Vec<NodeEntry>,
}

#[derive(Serialize)]
struct DiodeEntry<'a> {
    name: String,
    conducting_share: Option<f64>,
    #[serde(rename = "intervals_s")]
    intervals: Option<&'a [(f64, f64)]>,
    #[serde(rename = "breakdown_intervals_s")]
    breakdown_intervals: Option<&'a [(f64, f64)]>,
    #[serde(rename = "current_mean_A")]
    current_mean: Option<f64>,
    #[serde(rename = "current_rms_A")]
    current_rms: Option<f64>,
    #[serde(rename = "current_peak_A")]
    current_peak: Option<f64>,
    #[serde(rename = "reverse_peak_A")]
    reverse_peak: Option<f64>,
    #[serde(rename = "charge_span_A")]
    charge_span: Option<(Option<f64>, Option<f64>)>,
    decades: Option<f64>,
    #[serde(rename = "peak_reverse_V")]
    peak_reverse: Option<f64>,
    #[serde(rename = "energy_J")]
    energy: Option<f64>,
    not_evaluated: Option<&'a str>,
    over_conditions: Option<ConditionsEntry<'a>>,
}

#[derive(Serialize)]
struct ConditionsEntry<'a> {
    #[serde(rename = "min_A")]
    min: Option<f64>,
    #[serde(rename = "max_A")]
    max: Option<f64>,
    min_case: &'a str,
    max_case: &'a str,
}

#[derive(Serialize)]
struct NodeEntry {
    name: String,
    #[serde(rename = "mean_V")]
    mean: Option<f64>,
    #[serde(rename = "min_V")]
    min: Option<f64>,
    #[serde(rename = "max_V")]
    max: Option<f64>,
    #[serde(rename = "ripple_V")]
    ripple: Option<f64>,
}

/// What moves in one root file.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
pub fn swing(analysis: &Analysis) -> serde_json::Result<String> {
    let none = Swing::default();
    let swing = analysis.swing.as_ref().unwrap_or(&none);
    super::line(&Document {
        format: "kneewise.swing",
        version: 1,
        file: analysis.sources.name(FileId(0)),
        span: swing.span.and_then(number),
        period: swing.period.and_then(number),
        periodic: swing.periodic,
        cut_short: swing.cut_short.as_deref(),
        diodes: swing.diodes.iter().map(|d| diode(analysis, d)).collect(),
        nodes: swing.nodes.iter().map(|n| node(analysis, n)).collect(),
    })
}

fn diode<'a>(analysis: &Analysis, diode: &'a DiodeSwing) -> DiodeEntry<'a> {
    let time = diode.over_time.as_ref();
    let conditions = |c: &'a OverConditions| ConditionsEntry {
        min: number(c.min),
        max: number(c.max),
        min_case: &c.min_case,
        max_case: &c.max_case,
    };
    DiodeEntry {
        name: analysis.circuit.element_name(diode.element),
        conducting_share: time.and_then(|t| number(t.conducting_share)),
        intervals: time.map(|t| &t.intervals[..]),
        breakdown_intervals: time.map(|t| &t.breakdown_intervals[..]),
        current_mean: time.and_then(|t| number(t.current_mean)),
        current_rms: time.and_then(|t| number(t.current_rms)),
        current_peak: time.and_then(|t| number(t.current_peak)),
        reverse_peak: time.and_then(|t| number(t.reverse_peak)),
        charge_span: time.and_then(|t| t.charge_span).map(|(low, high)| (number(low), number(high))),
        decades: time.and_then(|t| t.decades).and_then(number),
        peak_reverse: time.and_then(|t| number(t.peak_reverse_voltage)),
        energy: time.and_then(|t| number(t.energy)),
        not_evaluated: diode.not_evaluated.as_deref(),
        over_conditions: diode.over_conditions.as_ref().map(conditions),
    }
}

fn node(analysis: &Analysis, node: &NodeSwing) -> NodeEntry {
    let level = node.over_time;
    NodeEntry {
        name: analysis.circuit.node_name(node.node),
        mean: level.and_then(|l| number(l.mean)),
        min: level.and_then(|l| number(l.min)),
        max: level.and_then(|l| number(l.max)),
        ripple: level.and_then(|l| number(l.ripple())),
    }
}
