//! A line of `kneewise.toml` that is no TOML, found when that file is read.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule. Its examples are `kneewise.toml` files.
pub const RULE: Rule = Rule {
    name: "unreadable-settings",
    group: Group::Settings,
    severity: Severity::Error,
    also: None,
    summary: "a line of `kneewise.toml` that is no TOML",
    why: "What stands there has no effect.",
    remedy: "Mend the line; the TOML language is described at toml.io.",
    source: None,
    failing: "fail-on = error of the worst kind\n",
    passing: "fail-on = \"error\"\n",
    check: Check::Reading,
};
