//! Rewrites a file so that at every moment either the old or the new one is there, whole: written beside, flushed,
//! renamed. Every step is one call on a [`Desk`], so that tests can stop at each.

use crate::text::trouble;
use std::fs::{self, File, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Why a file was not rewritten, in words for a person. The file is as it was.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SaveProblem(pub String);

/// The steps of rewriting, each of which may fail.
pub trait Desk {
    /// The file that a path stands for, links followed.
    ///
    /// # Errors
    /// As the file system says; likewise for all others.
    fn resolve(&mut self, path: &Path) -> io::Result<PathBuf>;
    /// Whether nobody may write the file.
    fn is_read_only(&mut self, path: &Path) -> io::Result<bool>;
    /// The bytes that are there now.
    fn read(&mut self, path: &Path) -> io::Result<Vec<u8>>;
    /// Makes a new, empty file, which the next steps are about; fails where one is there already.
    fn create(&mut self, path: &Path) -> io::Result<()>;
    /// Writes some of the bytes and says how many.
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize>;
    /// Gives the new file the permissions and, as far as allowed, the owner of another.
    fn take_permissions(&mut self, from: &Path) -> io::Result<()>;
    /// Waits until the new file is on the disk.
    fn flush(&mut self) -> io::Result<()>;
    /// Puts the new file in the place of the old one.
    fn rename(&mut self, from: &Path, to: &Path) -> io::Result<()>;
    /// Waits until the directory is on the disk.
    fn flush_directory(&mut self, path: &Path) -> io::Result<()>;
    /// Takes the new file away again.
    fn remove(&mut self, path: &Path) -> io::Result<()>;
}

/// The real file system.
#[derive(Debug, Default)]
pub struct DiskDesk {
    file: Option<File>,
}

impl DiskDesk {
    fn file(&mut self) -> io::Result<&mut File> {
        self.file.as_mut().ok_or_else(|| io::Error::from(io::ErrorKind::NotFound))
    }
}

impl Desk for DiskDesk {
    fn resolve(&mut self, path: &Path) -> io::Result<PathBuf> {
        path.canonicalize()
    }
    fn is_read_only(&mut self, path: &Path) -> io::Result<bool> {
        Ok(fs::metadata(path)?.permissions().readonly())
    }
    fn read(&mut self, path: &Path) -> io::Result<Vec<u8>> {
        fs::read(path)
    }
    fn create(&mut self, path: &Path) -> io::Result<()> {
        let mut options = OpenOptions::new();
        options.write(true).create_new(true);
        // nobody else may read it before it has the permissions of the old file
        #[cfg(unix)]
        std::os::unix::fs::OpenOptionsExt::mode(&mut options, 0o600);
        self.file = Some(options.open(path)?);
        Ok(())
    }
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.file()?.write(bytes)
    }
    fn take_permissions(&mut self, from: &Path) -> io::Result<()> {
        let metadata = fs::metadata(from)?;
        #[cfg(unix)]
        {
            use std::os::unix::fs::{MetadataExt, fchown};
            // only root may give files away; anybody else owns what he rewrites
            let _ = fchown(self.file()?, Some(metadata.uid()), Some(metadata.gid()));
        }
        self.file()?.set_permissions(metadata.permissions())
    }
    fn flush(&mut self) -> io::Result<()> {
        self.file()?.sync_all()?;
        self.file = None;
        Ok(())
    }
    fn rename(&mut self, from: &Path, to: &Path) -> io::Result<()> {
        fs::rename(from, to)
    }
    fn flush_directory(&mut self, path: &Path) -> io::Result<()> {
        if cfg!(unix) { File::open(path)?.sync_all() } else { Ok(()) }
    }
    fn remove(&mut self, path: &Path) -> io::Result<()> {
        self.file = None;
        fs::remove_file(path)
    }
}

/// Replaces the file at `path`, which was read as `before`, by `after`. A link stays a link: the file it leads to is
/// rewritten. Permissions stay. Nothing is written where nothing changes.
///
/// # Errors
/// [`SaveProblem`] where a step failed, the file may not be written, or is no longer what was read; the file is then
/// as it was.
pub fn save(desk: &mut dyn Desk, path: &Path, before: &[u8], after: &[u8]) -> Result<(), SaveProblem> {
    if before == after {
        return Ok(());
    }
    let problem = |what: &str, error: &io::Error| {
        SaveProblem(format!("{} stays as it was: {what}: {}", path.display(), trouble::writing(error)))
    };
    let target = desk.resolve(path).map_err(|e| problem("it cannot be found any more", &e))?;
    if desk.is_read_only(&target).map_err(|e| problem("its permissions cannot be read", &e))? {
        return Err(SaveProblem(format!("{} stays as it was: it is read-only", path.display())));
    }
    let beside = create_beside(desk, &target).map_err(|e| problem("no file can be made beside it", &e))?;
    let written = fill(desk, &target, &beside, before, after);
    if let Err((what, error)) = written {
        // the old file is what counts; a new one that cannot be taken away again is only litter
        let _ = desk.remove(&beside);
        return Err(match error {
            Some(error) => problem(what, &error),
            None => SaveProblem(format!("{} stays as it was: {what}", path.display())),
        });
    }
    if let Some(directory) = target.parent() {
        // the new file is in its place; whether the directory waits for the disk is no longer ours
        let _ = desk.flush_directory(directory);
    }
    Ok(())
}

type Step = (&'static str, Option<io::Error>);

/// The steps from the empty new file to its being in place.
fn fill(desk: &mut dyn Desk, target: &Path, beside: &Path, before: &[u8], after: &[u8]) -> Result<(), Step> {
    let failed = |what: &'static str| move |error| (what, Some(error));
    write_all(desk, after).map_err(failed("the new file beside it cannot be written"))?;
    desk.take_permissions(target).map_err(failed("its permissions cannot be given to the new file"))?;
    desk.flush().map_err(failed("the new file beside it cannot be brought to the disk"))?;
    let now = desk.read(target).map_err(failed("it cannot be read again"))?;
    if now != before {
        return Err(("somebody has changed it in the meantime; run it again", None));
    }
    desk.rename(beside, target).map_err(failed("the new file cannot take its place"))
}

fn write_all(desk: &mut dyn Desk, mut bytes: &[u8]) -> io::Result<()> {
    while !bytes.is_empty() {
        match desk.write(bytes) {
            Ok(0) => return Err(io::ErrorKind::WriteZero.into()),
            Ok(count) => bytes = bytes.get(count..).unwrap_or_default(),
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(error),
        }
    }
    Ok(())
}

/// A new file in the same directory, hidden, under a name that nobody uses.
fn create_beside(desk: &mut dyn Desk, target: &Path) -> io::Result<PathBuf> {
    let name = target.file_name().unwrap_or_default().to_string_lossy().into_owned();
    let mut number = 0;
    loop {
        let beside = target.with_file_name(format!(".{name}.{}-{number}.new", std::process::id()));
        match desk.create(&beside) {
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists && number < 100 => number += 1,
            Err(error) => return Err(error),
            Ok(()) => return Ok(beside),
        }
    }
}

#[cfg(test)]
#[path = "tests/save.rs"]
mod tests;
