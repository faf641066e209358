//! Findings as SARIF 2.1.0 (OASIS Standard, 2020), for code review and dashboards: rules with their help, findings with
//! related places, trails, edits and acceptances, and the states of all diodes as informational results.

mod places;
mod shape;

use crate::finding::{Finding, Fix, Severity};
use crate::review::Record;
use crate::rules::{self, Rule};
use crate::text::{FileId, Sources, Span};
use places::{Places, region};
use shape::{
    ArtifactChange, CodeFlow, Configuration, Descriptor, Driver, Fingerprints, FlowLocation, Invocation, Log,
    LogicalLocation, Mend, Notification, Outcome, Replacement, Rich, RuleReference, Run, Subjects,
    Suppression, Tags, Text, ThreadFlow, Tool,
};
use std::collections::BTreeMap;
use std::path::Path;

/// Name of the informational results.
const STATE: &str = "diode-state";

/// All findings of a run as one log. `compared` says that `known` findings were sifted out: then every result tells
/// whether it is new.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
pub fn findings(records: &[Record], compared: bool) -> serde_json::Result<String> {
    let mut writer =
        Writer { compared, places: Places::default(), seen: BTreeMap::new(), results: Vec::new() };
    let mut notifications = Vec::new();
    for record in records {
        // the root is listed even where nothing is told of it
        writer.places.artifact(&record.sources, Span::new(FileId(0), 0, 0));
        for skip in &record.skipped {
            let place = writer.places.location(&record.sources, Span::new(FileId(0), 0, 0), None);
            notifications.push(Notification {
                associated_rule: RuleReference { id: skip.rule },
                level: "note",
                locations: vec![place],
                message: Text::message(format!("not judged: {}", skip.reason)),
            });
        }
        for finding in &record.findings {
            writer.finding(&record.sources, finding, "new");
        }
        for finding in &record.known {
            writer.finding(&record.sources, finding, "unchanged");
        }
        for (place, state) in &record.states {
            writer.state(&record.sources, *place, state);
        }
    }
    let log = Log {
        schema: "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json",
        version: "2.1.0",
        runs: [Run {
            tool: Tool {
                driver: Driver {
                    name: "kneewise",
                    semantic_version: env!("CARGO_PKG_VERSION"),
                    rules: descriptors(),
                },
            },
            invocations: [Invocation {
                execution_successful: true,
                tool_execution_notifications: notifications,
            }],
            artifacts: writer.places.finish(),
            results: writer.results,
            column_kind: "unicodeCodePoints",
        }],
    };
    let mut text = serde_json::to_string(&log)?;
    text.push('\n');
    Ok(text)
}

/// All rules, and the informational results as one more.
fn descriptors() -> Vec<Descriptor<'static>> {
    let mut all: Vec<Descriptor<'static>> = rules::all().iter().map(|rule| descriptor(rule)).collect();
    all.push(Descriptor {
        id: STATE,
        short_description: Text::of("the state of a diode"),
        full_description: Text::of(
            "Every diode's state by the constant-drop model, proved by putting it back.",
        ),
        help: Rich {
            text: "`kneewise states FILE --why DIODE` tells the reasoning.".into(),
            markdown: "`kneewise states FILE --why DIODE` tells the reasoning.".into(),
        },
        default_configuration: Configuration { level: "none" },
        properties: Tags { tags: vec!["states"] },
    });
    all
}

fn descriptor(rule: &'static Rule) -> Descriptor<'static> {
    let text = format!("{} {}", rule.why, rule.remedy);
    let source = rule.source.map(|s| format!("\n\nIt rests on: {s}.")).unwrap_or_default();
    let example = |what: &str, text: &str| format!("\n\n{what}\n\n```\n{}\n```", text.trim_end());
    let markdown = format!(
        "{}\n\n{}{source}{}{}",
        rule.why,
        rule.remedy,
        example("Gives this finding:", rule.failing),
        example("Gives none:", rule.passing)
    );
    Descriptor {
        id: rule.name,
        short_description: Text::of(rule.summary),
        full_description: Text::of(rule.why),
        help: Rich { text, markdown },
        default_configuration: Configuration { level: level(rule.worst()) },
        properties: Tags { tags: vec![rule.group.word()] },
    }
}

fn level(severity: Severity) -> &'static str {
    severity.word()
}

struct Writer<'a> {
    compared: bool,
    places: Places,
    /// How often each fingerprint's text has been seen.
    seen: BTreeMap<String, usize>,
    results: Vec<Outcome<'a>>,
}

impl<'a> Writer<'a> {
    fn finding(&mut self, sources: &'a Sources, finding: &'a Finding, baseline: &'static str) {
        let mut main = self.places.location(
            sources,
            finding.span,
            Some(&finding.label).filter(|l| !l.is_empty()).map(String::as_str),
        );
        main.logical_locations = finding
            .subjects
            .first()
            .map(|name| LogicalLocation { fully_qualified_name: name })
            .into_iter()
            .collect();
        let related = finding.labels.iter().enumerate().map(|(n, label)| {
            let mut place = self.places.location(sources, label.span, Some(&label.message));
            place.id = Some(n + 1);
            place
        });
        let related: Vec<_> = related.collect();
        let flow = self.flow(sources, finding);
        let mend = finding.fix.as_ref().map(|fix| self.mend(sources, fix));
        let accepted = finding.accepted.as_deref().map(|justification| Suppression {
            kind: "inSource",
            status: "accepted",
            justification,
        });
        let outcome = Outcome {
            rule_id: finding.rule,
            rule_index: rule_index(finding.rule),
            kind: "fail",
            level: level(finding.severity),
            message: Text::message(sentence(finding)),
            locations: vec![main],
            partial_fingerprints: self.fingerprint(sources, finding.span, finding.rule, &finding.subjects),
            related_locations: related,
            code_flows: flow.into_iter().collect(),
            fixes: mend.into_iter().collect(),
            suppressions: accepted.into_iter().collect(),
            baseline_state: self.compared.then_some(baseline),
            properties: (!finding.subjects.is_empty()).then_some(Subjects { subjects: &finding.subjects }),
        };
        self.results.push(outcome);
    }

    fn state(&mut self, sources: &'a Sources, place: Span, state: &'a str) {
        let statement = sources.slice(place);
        let name = statement.split_whitespace().next().unwrap_or("").to_owned();
        let outcome = Outcome {
            rule_id: STATE,
            rule_index: rules::all().len(),
            kind: "informational",
            level: "none",
            message: Text::message(format!("{name}: {state}")),
            locations: vec![self.places.location(sources, place, None)],
            partial_fingerprints: self.fingerprint(sources, place, STATE, &[name]),
            related_locations: Vec::new(),
            code_flows: Vec::new(),
            fixes: Vec::new(),
            suppressions: Vec::new(),
            baseline_state: None,
            properties: None,
        };
        self.results.push(outcome);
    }

    /// The way from the root file to the place.
    fn flow(&mut self, sources: &Sources, finding: &'a Finding) -> Option<CodeFlow<'a>> {
        if finding.trail.is_empty() {
            return None;
        }
        let steps = finding.trail.iter().map(|step| (step.span, step.what.as_str()));
        let all = steps.chain(std::iter::once((finding.span, "here")));
        let locations = all.enumerate().map(|(depth, (span, what))| FlowLocation {
            location: self.places.location(sources, span, Some(what)),
            nesting_level: depth,
        });
        Some(CodeFlow {
            message: Text::of("the way from the file that was checked to this place"),
            thread_flows: [ThreadFlow { locations: locations.collect() }],
        })
    }

    fn mend(&mut self, sources: &Sources, fix: &'a Fix) -> Mend<'a> {
        let mut by_file: BTreeMap<FileId, ArtifactChange<'a>> = BTreeMap::new();
        for edit in &fix.edits {
            let location = self.places.artifact(sources, edit.span);
            let change = by_file
                .entry(edit.span.file)
                .or_insert_with(|| ArtifactChange { artifact_location: location, replacements: Vec::new() });
            change.replacements.push(Replacement {
                deleted_region: region(sources, edit.span),
                inserted_content: Text::of(edit.replacement.as_str()),
            });
        }
        Mend {
            description: Text::message(fix.title.as_str()),
            artifact_changes: by_file.into_values().collect(),
        }
    }

    /// From what does not change when other lines do: rule, file name and subjects, or where there are none, the
    /// marked text; and which of several alike this is.
    fn fingerprint(
        &mut self,
        sources: &Sources,
        span: Span,
        rule: &str,
        subjects: &[String],
    ) -> Fingerprints {
        let file = Path::new(sources.name(span.file)).file_name().unwrap_or_default().to_string_lossy();
        let what = if subjects.is_empty() {
            sources.slice(span).split_whitespace().collect::<Vec<_>>().join(" ")
        } else {
            subjects.join("\n").to_lowercase()
        };
        let text = format!("{rule}\n{file}\n{what}");
        let count = self.seen.entry(text.clone()).or_insert(0);
        *count += 1;
        Fingerprints { first: format!("{:016x}:{count}", fnv(text.as_bytes())) }
    }
}

/// Message and help as whole sentences.
fn sentence(finding: &Finding) -> String {
    format!("{}. {}", finding.message, finding.help).trim_end().to_owned()
}

fn rule_index(name: &str) -> usize {
    rules::all().iter().position(|rule| rule.name == name).unwrap_or(0)
}

/// FNV-1a, 64 bits (Fowler, Noll & Vo; RFC 9923): the same on every machine and in every version.
fn fnv(bytes: &[u8]) -> u64 {
    let step = |hash: u64, &byte: &u8| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3);
    bytes.iter().fold(0xcbf2_9ce4_8422_2325, step)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_hash_is_the_published_one() {
        // test vectors of the algorithm's authors, from memory
        assert_eq!(fnv(b""), 0xcbf2_9ce4_8422_2325);
        assert_eq!(fnv(b"a"), 0xaf63_dc4c_8601_ec8c);
        assert_eq!(fnv(b"foobar"), 0x8594_4171_f739_67e8);
    }
}
