//! Makes the list of rules from the files in `src/rules/`, so that adding a rule is adding a file.
//! A file there is a rule; what rules share lives in folders below, which are not looked at.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::{env, fs, io};

fn main() -> io::Result<()> {
    let root = PathBuf::from(env::var_os("CARGO_MANIFEST_DIR").unwrap_or_default());
    let folder = root.join("src").join("rules");
    println!("cargo::rerun-if-changed=src/rules");
    println!("cargo::rerun-if-changed=build.rs");
    let out = PathBuf::from(env::var_os("OUT_DIR").unwrap_or_default()).join("rules.rs");
    fs::write(out, list(&folder)?)
}

/// One `mod` for each file, and all their descriptions sorted by rule name.
fn list(folder: &Path) -> io::Result<String> {
    let mut stems = Vec::new();
    for entry in fs::read_dir(folder)? {
        let path = entry?.path();
        let stem = path.file_stem().and_then(|s| s.to_str()).unwrap_or_default().to_owned();
        if path.extension().is_some_and(|e| e == "rs") && stem != "mod" {
            stems.push(stem);
        }
    }
    // rule names have hyphens where file names have underscores; sort as the names sort
    stems.sort_by_key(|stem| stem.replace('_', "-"));
    let mut text = String::new();
    for stem in &stems {
        let path = folder.join(format!("{stem}.rs"));
        let _ = writeln!(text, "#[path = {:?}]\nmod {stem};", path.display().to_string());
    }
    let rules: Vec<String> = stems.iter().map(|stem| format!("&{stem}::RULE")).collect();
    let _ = writeln!(text, "static ALL: &[&Rule] = &[{}];", rules.join(", "));
    let _ = writeln!(text, "#[cfg(test)]\nstatic FILES: &[&str] = &{stems:?};");
    Ok(text)
}
