//! Where netlists come from: files, directories that are walked, and standard input as `-`.

use super::settings::Shelf;
use kneewise::text::{Disk, LoadProblem, Loader, bounded, trouble};
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// What a file in a directory must end in to be a netlist of its own.
const ENDINGS: [&str; 3] = ["net", "cir", "ckt"];

/// Whether a path means standard input.
pub fn is_standard_input(path: &Path) -> bool {
    path == Path::new("-")
}

/// The file system, with `-` for standard input, and files that are held as they were.
#[derive(Debug, Default)]
pub struct Input {
    disk: Disk,
    /// Standard input, which can be read once only.
    standard: Option<Arc<Vec<u8>>>,
    held: Vec<(PathBuf, Vec<u8>)>,
    /// What was read, by resolved path, where it is to be kept.
    kept: Option<BTreeMap<PathBuf, Vec<u8>>>,
}

impl Input {
    /// With what stands on standard input, where it was read already.
    pub fn with(standard: Option<Arc<Vec<u8>>>) -> Self {
        Input { standard, ..Input::default() }
    }

    /// Reads every file once only, and keeps what it held then.
    pub fn keeping() -> Self {
        Input { kept: Some(BTreeMap::new()), ..Input::default() }
    }

    /// What the file at a resolved path held when it was read.
    pub fn kept(&self, path: &Path) -> Option<&[u8]> {
        self.kept.as_ref()?.get(path).map(Vec::as_slice)
    }

    /// What stands on standard input, where one of the jobs wants it and it can be read.
    pub fn standard(jobs: &[Job]) -> Option<Arc<Vec<u8>>> {
        jobs.iter().any(|job| is_standard_input(&job.path)).then(read_standard).and_then(Result::ok)
    }

    /// From now on the file at `path` holds these bytes.
    pub fn hold(&mut self, path: &Path, bytes: Vec<u8>) {
        self.held.push((path.to_path_buf(), bytes));
    }

    fn held(&self, path: &Path) -> Option<&Vec<u8>> {
        self.held.iter().find(|(held, _)| held == path).map(|(_, bytes)| bytes)
    }
}

fn read_standard() -> Result<Arc<Vec<u8>>, LoadProblem> {
    let bytes = bounded(std::io::stdin().lock()).map_err(|e| LoadProblem(trouble::reading(&e)))?;
    Ok(Arc::new(bytes))
}

impl Loader for Input {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        if let Some(bytes) = self.held(path) {
            return Ok(bytes.clone());
        }
        if !is_standard_input(path) {
            let Some(kept) = &mut self.kept else { return self.disk.load(path) };
            let resolved = self.disk.resolve(path);
            if let Some(bytes) = kept.get(&resolved) {
                return Ok(bytes.clone());
            }
            let bytes = self.disk.load(path)?;
            kept.insert(resolved, bytes.clone());
            return Ok(bytes);
        }
        if self.standard.is_none() {
            self.standard = Some(read_standard()?);
        }
        let resolved = self.resolve(path);
        if let (Some(kept), Some(bytes)) = (&mut self.kept, self.standard.as_deref()) {
            kept.insert(resolved, bytes.clone());
        }
        Ok(self.standard.as_deref().cloned().unwrap_or_default())
    }

    fn size(&self, path: &Path) -> Option<u64> {
        if is_standard_input(path) || self.held(path).is_some() { None } else { self.disk.size(path) }
    }

    fn exists(&self, path: &Path) -> bool {
        is_standard_input(path) || self.held(path).is_some() || self.disk.exists(path)
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

/// A file to examine.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Job {
    /// Where it is.
    pub path: PathBuf,
    /// Found in a directory, rather than named.
    pub walked: bool,
}

/// Files to examine, each once, and what was wrong with the paths.
#[derive(Debug, Default)]
pub struct Wanted {
    pub jobs: Vec<Job>,
    pub problems: Vec<String>,
}

/// Turns paths into files: a directory stands for the netlists below it, sorted; hidden ones and those that ignore
/// files name are passed over.
pub fn wanted(paths: &[PathBuf], shelf: &mut Shelf) -> Wanted {
    let mut wanted = Wanted::default();
    for path in paths {
        if !is_standard_input(path) && path.is_dir() {
            let found = shelf.of(path);
            let own = found.as_ref().and_then(|f| f.settings.extensions.clone());
            walk(path, &own.unwrap_or_else(|| ENDINGS.map(str::to_owned).to_vec()), &mut wanted);
        } else {
            wanted.jobs.push(Job { path: path.clone(), walked: false });
        }
    }
    let mut seen = std::collections::BTreeSet::new();
    wanted.jobs.retain(|job| {
        let known = if is_standard_input(&job.path) { job.path.clone() } else { Disk.resolve(&job.path) };
        seen.insert(known)
    });
    wanted
}

fn walk(directory: &Path, endings: &[String], wanted: &mut Wanted) {
    let before = (wanted.jobs.len(), wanted.problems.len());
    let walk = ignore::WalkBuilder::new(directory)
        .sort_by_file_name(std::ffi::OsStr::cmp)
        .require_git(false)
        // what one person has told his machine to ignore, the others' machines see
        .git_global(false)
        .build();
    for entry in walk {
        match entry {
            Ok(entry) if is_netlist(entry.path(), endings) && entry.path().is_file() => {
                wanted.jobs.push(Job { path: entry.into_path(), walked: true });
            }
            Ok(_) => {}
            Err(problem) => wanted.problems.push(trouble_of_walk(&problem)),
        }
    }
    if (wanted.jobs.len(), wanted.problems.len()) == before {
        let endings: Vec<String> = endings.iter().map(|e| format!(".{e}")).collect();
        wanted.problems.push(format!(
            "{}: no netlist in this directory ({})",
            directory.display(),
            endings.join(", ")
        ));
    }
}

/// What stood in the way of a walk, and where.
fn trouble_of_walk(problem: &ignore::Error) -> String {
    use ignore::Error;
    match problem {
        Error::WithPath { path, err } => format!("{}: {}", path.display(), trouble_of_walk(err)),
        Error::WithDepth { err, .. } | Error::WithLineNumber { err, .. } => trouble_of_walk(err),
        Error::Io(error) => trouble::reading(error),
        other => other.to_string(),
    }
}

fn is_netlist(path: &Path, endings: &[String]) -> bool {
    path.extension().is_some_and(|e| endings.iter().any(|wanted| e.eq_ignore_ascii_case(wanted)))
}
