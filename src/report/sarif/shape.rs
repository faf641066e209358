//! The parts of SARIF 2.1.0 (OASIS Standard, 2020) that are written here, as plain data with the standard's names.

use serde::Serialize;

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Log<'a> {
    #[serde(rename = "$schema")]
    pub schema: &'static str,
    pub version: &'static str,
    pub runs: [Run<'a>; 1],
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Run<'a> {
    pub tool: Tool<'a>,
    pub invocations: [Invocation<'a>; 1],
    pub artifacts: Vec<Artifact>,
    pub results: Vec<Outcome<'a>>,
    pub column_kind: &'static str,
}

#[derive(Serialize)]
pub(super) struct Tool<'a> {
    pub driver: Driver<'a>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Driver<'a> {
    pub name: &'static str,
    pub semantic_version: &'static str,
    pub rules: Vec<Descriptor<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Descriptor<'a> {
    pub id: &'a str,
    pub short_description: Text<'a>,
    pub full_description: Text<'a>,
    pub help: Rich,
    pub default_configuration: Configuration,
    pub properties: Tags<'a>,
}

#[derive(Serialize)]
pub(super) struct Configuration {
    pub level: &'static str,
}

#[derive(Serialize)]
pub(super) struct Tags<'a> {
    pub tags: Vec<&'a str>,
}

#[derive(Serialize)]
pub(super) struct Text<'a> {
    pub text: std::borrow::Cow<'a, str>,
}

impl<'a> Text<'a> {
    pub fn of(text: impl Into<std::borrow::Cow<'a, str>>) -> Self {
        Text { text: text.into() }
    }

    /// A message of a result: braces would be placeholders there, so the standard has them doubled (section 3.11.5).
    pub fn message(text: impl Into<std::borrow::Cow<'a, str>>) -> Self {
        let text = text.into();
        if text.contains(['{', '}']) {
            return Text::of(text.replace('{', "{{").replace('}', "}}"));
        }
        Text { text }
    }
}

#[derive(Serialize)]
pub(super) struct Rich {
    pub text: String,
    pub markdown: String,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Invocation<'a> {
    pub execution_successful: bool,
    pub tool_execution_notifications: Vec<Notification<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Notification<'a> {
    pub associated_rule: RuleReference<'a>,
    pub level: &'static str,
    pub locations: Vec<Location<'a>>,
    pub message: Text<'a>,
}

#[derive(Serialize)]
pub(super) struct RuleReference<'a> {
    pub id: &'a str,
}

#[derive(Serialize)]
pub(super) struct Artifact {
    pub location: ArtifactLocation,
    pub encoding: &'static str,
}

#[derive(Serialize, Clone)]
pub(super) struct ArtifactLocation {
    pub uri: String,
    pub index: usize,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Outcome<'a> {
    pub rule_id: &'a str,
    pub rule_index: usize,
    pub kind: &'static str,
    pub level: &'static str,
    pub message: Text<'a>,
    pub locations: Vec<Location<'a>>,
    pub partial_fingerprints: Fingerprints,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub related_locations: Vec<Location<'a>>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub code_flows: Vec<CodeFlow<'a>>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub fixes: Vec<Mend<'a>>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub suppressions: Vec<Suppression<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub baseline_state: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub properties: Option<Subjects<'a>>,
}

#[derive(Serialize)]
pub(super) struct Subjects<'a> {
    pub subjects: &'a [String],
}

#[derive(Serialize)]
pub(super) struct Fingerprints {
    #[serde(rename = "kneewise/v1")]
    pub first: String,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Location<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    pub id: Option<usize>,
    pub physical_location: PhysicalLocation,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub logical_locations: Vec<LogicalLocation<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub message: Option<Text<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct LogicalLocation<'a> {
    pub fully_qualified_name: &'a str,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct PhysicalLocation {
    pub artifact_location: ArtifactLocation,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub region: Option<Region>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Region {
    pub start_line: usize,
    pub start_column: usize,
    pub end_line: usize,
    pub end_column: usize,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct CodeFlow<'a> {
    pub message: Text<'a>,
    pub thread_flows: [ThreadFlow<'a>; 1],
}

#[derive(Serialize)]
pub(super) struct ThreadFlow<'a> {
    pub locations: Vec<FlowLocation<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct FlowLocation<'a> {
    pub location: Location<'a>,
    pub nesting_level: usize,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Mend<'a> {
    pub description: Text<'a>,
    pub artifact_changes: Vec<ArtifactChange<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct ArtifactChange<'a> {
    pub artifact_location: ArtifactLocation,
    pub replacements: Vec<Replacement<'a>>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Replacement<'a> {
    pub deleted_region: Region,
    pub inserted_content: Text<'a>,
}

#[derive(Serialize)]
pub(super) struct Suppression<'a> {
    pub kind: &'static str,
    pub status: &'static str,
    pub justification: &'a str,
}
