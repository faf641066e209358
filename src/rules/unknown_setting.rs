//! A key of `kneewise.toml` that is not known, found when that file is read.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule. Its examples are `kneewise.toml` files.
pub const RULE: Rule = Rule {
    name: "unknown-setting",
    group: Group::Settings,
    severity: Severity::Warning,
    also: None,
    summary: "a key of `kneewise.toml` that is not known",
    why: "A misspelt key has no effect, and whoever wrote it believes that it has.",
    remedy: "Correct the key; the nearest known one is proposed.",
    source: None,
    failing: "[levels]\ndangling-nod = \"note\"\n",
    passing: "[levels]\ndangling-node = \"note\"\n",
    check: Check::Reading,
};
