//! A value of `kneewise.toml` that cannot be used, found when that file is read.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule. Its examples are `kneewise.toml` files.
pub const RULE: Rule = Rule {
    name: "unusable-setting",
    group: Group::Settings,
    severity: Severity::Warning,
    also: None,
    summary: "a value of `kneewise.toml` that cannot be used",
    why: "The setting has no effect, and whoever wrote it believes that it has.",
    remedy: "Write a value of the kind that is named.",
    source: None,
    failing: "fail-on = \"never\"\n",
    passing: "fail-on = \"error\"\n",
    check: Check::Reading,
};
