//! Where bytes come from: the disk, or memory (tests, standard input, two revisions side by side).

use super::trouble;
use std::collections::BTreeMap;
use std::io::Read;
use std::path::{Path, PathBuf};

/// Longest file that is read, in bytes.
pub const LONGEST_FILE: usize = 512 << 20;

/// Why a file could not be had, in words for a person.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LoadProblem(pub String);

/// Something that files can be read from.
pub trait Loader {
    /// The bytes of the file at `path`.
    ///
    /// # Errors
    /// [`LoadProblem`] says in words why there are none.
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem>;
    /// The size of the file in bytes, where it is known without reading it: files longer than [`LONGEST_FILE`] are
    /// not loaded.
    fn size(&self, path: &Path) -> Option<u64> {
        let _ = path;
        None
    }
    /// Whether there is a file at `path`.
    fn exists(&self, path: &Path) -> bool;
    /// The path with links and `..` resolved, to tell two files apart and to confine includes.
    fn resolve(&self, path: &Path) -> PathBuf;
    /// The directory outside which files included by `root` are not opened: its repository, else its directory.
    fn boundary(&self, root: &Path) -> PathBuf {
        self.resolve(root).parent().map(Path::to_path_buf).unwrap_or_default()
    }
}

/// All bytes, or one more than [`LONGEST_FILE`]: what never ends is not read to its end.
///
/// # Errors
/// Those of reading.
pub fn bounded(from: impl Read) -> std::io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    from.take(LONGEST_FILE as u64 + 1).read_to_end(&mut bytes)?;
    Ok(bytes)
}

/// The file system.
#[derive(Debug, Default, Clone, Copy)]
pub struct Disk;

impl Loader for Disk {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        std::fs::File::open(path).and_then(bounded).map_err(|e| LoadProblem(trouble::reading(&e)))
    }
    fn size(&self, path: &Path) -> Option<u64> {
        std::fs::metadata(path).ok().filter(std::fs::Metadata::is_file).map(|m| m.len())
    }
    fn exists(&self, path: &Path) -> bool {
        path.is_file()
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        path.canonicalize().unwrap_or_else(|_| resolved_as_far_as_it_exists(path))
    }
    fn boundary(&self, root: &Path) -> PathBuf {
        let root = self.resolve(root);
        let own = root.parent().unwrap_or(Path::new(""));
        own.ancestors().find(|dir| dir.join(".git").exists()).unwrap_or(own).to_path_buf()
    }
}

/// Files held in memory, by path.
#[derive(Debug, Default, Clone)]
pub struct Memory {
    files: BTreeMap<PathBuf, Vec<u8>>,
}

impl Memory {
    /// One file.
    pub fn with(path: impl Into<PathBuf>, bytes: impl Into<Vec<u8>>) -> Self {
        let mut memory = Memory::default();
        memory.insert(path, bytes);
        memory
    }
    /// Adds or replaces a file.
    pub fn insert(&mut self, path: impl Into<PathBuf>, bytes: impl Into<Vec<u8>>) {
        self.files.insert(path.into(), bytes.into());
    }
}

impl Loader for Memory {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        self.files
            .get(&self.resolve(path))
            .cloned()
            .ok_or_else(|| LoadProblem("there is no such file".into()))
    }
    fn exists(&self, path: &Path) -> bool {
        self.files.contains_key(&self.resolve(path))
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        lexical(path)
    }
}

/// A path of which the end does not exist: its longest beginning that does, resolved, and the rest. So a missing file
/// beside the netlist is missing, and not outside.
fn resolved_as_far_as_it_exists(path: &Path) -> PathBuf {
    let path = lexical(path);
    for beginning in path.ancestors().skip(1) {
        let here = if beginning.as_os_str().is_empty() { Path::new(".") } else { beginning };
        if let (Ok(known), Ok(rest)) = (here.canonicalize(), path.strip_prefix(beginning)) {
            return lexical(&known.join(rest));
        }
    }
    path
}

/// The path without `.` and, as far as it can be told without looking, without `..`.
fn lexical(path: &Path) -> PathBuf {
    let mut clean = PathBuf::new();
    for part in path.components() {
        match part {
            std::path::Component::CurDir => {}
            std::path::Component::ParentDir if clean.file_name().is_some() => {
                clean.pop();
            }
            other => clean.push(other),
        }
    }
    clean
}
