//! Where netlists come from: files, directories that are walked, and standard input as `-`.

use kneewise::text::{Disk, LoadProblem, Loader, bounded};
use std::path::{Path, PathBuf};

/// What a file in a directory must end in to be a netlist of its own.
const ENDINGS: [&str; 3] = ["net", "cir", "ckt"];

/// Whether a path means standard input.
fn is_standard_input(path: &Path) -> bool {
    path == Path::new("-")
}

/// The file system, with `-` for standard input.
#[derive(Debug, Default)]
pub struct Input {
    disk: Disk,
    /// Standard input can be read once only.
    standard: Option<Vec<u8>>,
}

impl Loader for Input {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        if !is_standard_input(path) {
            return self.disk.load(path);
        }
        if self.standard.is_none() {
            let bytes = bounded(std::io::stdin().lock()).map_err(|e| LoadProblem(e.to_string()))?;
            self.standard = Some(bytes);
        }
        Ok(self.standard.clone().unwrap_or_default())
    }

    fn size(&self, path: &Path) -> Option<u64> {
        if is_standard_input(path) { None } else { self.disk.size(path) }
    }

    fn exists(&self, path: &Path) -> bool {
        is_standard_input(path) || self.disk.exists(path)
    }

    fn resolve(&self, path: &Path) -> PathBuf {
        if is_standard_input(path) {
            // what standard input includes lies in the working directory
            return std::env::current_dir().unwrap_or_default().join(path);
        }
        self.disk.resolve(path)
    }

    fn boundary(&self, root: &Path) -> PathBuf {
        self.disk.boundary(&self.resolve(root))
    }
}

/// Files to read, each once, and what was wrong with the paths.
#[derive(Debug, Default)]
pub struct Wanted {
    pub files: Vec<PathBuf>,
    pub problems: Vec<String>,
}

/// Turns paths into files: a directory stands for the netlists below it, sorted; hidden ones are passed over.
pub fn wanted(paths: &[PathBuf]) -> Wanted {
    let mut wanted = Wanted::default();
    for path in paths {
        if !is_standard_input(path) && path.is_dir() {
            walk(path, &mut wanted);
        } else {
            wanted.files.push(path.clone());
        }
    }
    let mut seen = std::collections::BTreeSet::new();
    wanted.files.retain(|file| seen.insert(file.clone()));
    wanted
}

fn walk(directory: &Path, wanted: &mut Wanted) {
    let before = (wanted.files.len(), wanted.problems.len());
    let visible = |entry: &walkdir::DirEntry| {
        entry.depth() == 0 || !entry.file_name().to_string_lossy().starts_with('.')
    };
    let walk = walkdir::WalkDir::new(directory).sort_by_file_name().into_iter().filter_entry(visible);
    for entry in walk {
        match entry {
            Ok(entry) if entry.path().is_file() && is_netlist(entry.path()) => {
                wanted.files.push(entry.into_path());
            }
            Ok(_) => {}
            Err(problem) => {
                let path = problem.path().unwrap_or(directory).display().to_string();
                let reason = problem.io_error().map_or_else(|| problem.to_string(), ToString::to_string);
                wanted.problems.push(format!("{path}: {reason}"));
            }
        }
    }
    if (wanted.files.len(), wanted.problems.len()) == before {
        let endings = ENDINGS.map(|e| format!(".{e}")).join(", ");
        wanted.problems.push(format!("{}: no netlist in this directory ({endings})", directory.display()));
    }
}

fn is_netlist(path: &Path) -> bool {
    path.extension().is_some_and(|e| ENDINGS.iter().any(|wanted| e.eq_ignore_ascii_case(wanted)))
}
