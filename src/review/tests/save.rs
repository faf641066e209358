//! Rewriting stopped at every step: by an error, and by the end of the program. The old or the new file is there.

use super::*;
use std::collections::BTreeMap;

const OLD: &[u8] = b"old file";
const NEW: &[u8] = b"the new file, which is longer";

/// How a step goes wrong.
#[derive(Clone, Copy, PartialEq, Debug)]
enum Mishap {
    /// It says no, and the program goes on.
    Refused,
    /// The program ends: from here on nothing happens.
    Killed,
}

/// A file system in memory that stops at a step. Writes take a few bytes at a time.
struct Trap {
    files: BTreeMap<PathBuf, Vec<u8>>,
    open: Option<PathBuf>,
    steps: usize,
    stop: usize,
    mishap: Mishap,
    read_only: bool,
    /// Somebody else writes the file just before this step.
    meddle: Option<usize>,
}

fn target() -> PathBuf {
    PathBuf::from("/boards/a.net")
}

impl Trap {
    fn new(stop: usize, mishap: Mishap) -> Self {
        let files = BTreeMap::from([(target(), OLD.to_vec())]);
        Trap { files, open: None, steps: 0, stop, mishap, read_only: false, meddle: None }
    }

    fn step(&mut self) -> io::Result<()> {
        let at = self.steps;
        self.steps += 1;
        if self.meddle == Some(at) {
            self.files.insert(target(), b"somebody else's".to_vec());
        }
        match self.mishap {
            Mishap::Refused if at == self.stop => Err(io::ErrorKind::StorageFull.into()),
            Mishap::Killed if at >= self.stop => Err(io::ErrorKind::Other.into()),
            _ => Ok(()),
        }
    }

    fn others(&self) -> usize {
        self.files.len() - 1
    }
}

impl Desk for Trap {
    fn resolve(&mut self, _: &Path) -> io::Result<PathBuf> {
        self.step()?;
        Ok(target())
    }
    fn is_read_only(&mut self, _: &Path) -> io::Result<bool> {
        self.step()?;
        Ok(self.read_only)
    }
    fn read(&mut self, path: &Path) -> io::Result<Vec<u8>> {
        self.step()?;
        Ok(self.files[path].clone())
    }
    fn create(&mut self, path: &Path) -> io::Result<()> {
        self.step()?;
        self.files.insert(path.to_owned(), Vec::new());
        self.open = Some(path.to_owned());
        Ok(())
    }
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.step()?;
        let count = bytes.len().min(7);
        let open = self.open.clone().unwrap();
        self.files.get_mut(&open).unwrap().extend_from_slice(&bytes[..count]);
        Ok(count)
    }
    fn take_permissions(&mut self, _: &Path) -> io::Result<()> {
        self.step()
    }
    fn flush(&mut self) -> io::Result<()> {
        self.step()
    }
    fn rename(&mut self, from: &Path, to: &Path) -> io::Result<()> {
        self.step()?;
        let bytes = self.files.remove(from).unwrap();
        self.files.insert(to.to_owned(), bytes);
        Ok(())
    }
    fn flush_directory(&mut self, _: &Path) -> io::Result<()> {
        self.step()
    }
    fn remove(&mut self, path: &Path) -> io::Result<()> {
        self.step()?;
        self.files.remove(path);
        Ok(())
    }
}

#[test]
fn all_goes_well() {
    let mut trap = Trap::new(usize::MAX, Mishap::Refused);
    assert_eq!(save(&mut trap, Path::new("a.net"), OLD, NEW), Ok(()));
    assert_eq!((trap.files[&target()].as_slice(), trap.others()), (NEW, 0));
    assert!(trap.steps >= 12, "{}", trap.steps);
}

#[test]
fn stopped_at_any_step_the_old_or_the_new_file_is_there() {
    let steps = {
        let mut trap = Trap::new(usize::MAX, Mishap::Refused);
        save(&mut trap, Path::new("a.net"), OLD, NEW).unwrap();
        trap.steps
    };
    let (mut olds, mut news) = (0, 0);
    for mishap in [Mishap::Refused, Mishap::Killed] {
        for stop in 0..steps {
            let mut trap = Trap::new(stop, mishap);
            let outcome = save(&mut trap, Path::new("a.net"), OLD, NEW);
            let there = trap.files[&target()].as_slice();
            assert!(there == OLD || there == NEW, "{mishap:?} at {stop}: {there:?}");
            assert_eq!(outcome.is_ok(), there == NEW, "{mishap:?} at {stop}: {outcome:?}");
            if let Err(SaveProblem(text)) = &outcome {
                assert!(text.starts_with("a.net stays as it was: "), "{text}");
            }
            // who is not killed leaves no litter
            assert!(mishap == Mishap::Killed || trap.others() == 0, "{mishap:?} at {stop}");
            if there == OLD { olds += 1 } else { news += 1 }
        }
    }
    // the last step only waits for the directory
    assert_eq!((olds, news), (2 * (steps - 1), 2));
}

#[test]
fn what_somebody_else_wrote_is_not_lost() {
    for meddle in 0..10 {
        let mut trap = Trap::new(usize::MAX, Mishap::Refused);
        trap.meddle = Some(meddle);
        let outcome = save(&mut trap, Path::new("a.net"), OLD, NEW);
        assert!(outcome.unwrap_err().0.contains("changed it in the meantime"), "{meddle}");
        assert_eq!((trap.files[&target()].as_slice(), trap.others()), (&b"somebody else's"[..], 0));
    }
}

#[test]
fn a_read_only_file_stays_and_nothing_is_written_for_nothing() {
    let mut trap = Trap::new(usize::MAX, Mishap::Refused);
    trap.read_only = true;
    assert!(save(&mut trap, Path::new("a.net"), OLD, NEW).unwrap_err().0.contains("read-only"));
    assert_eq!((trap.files[&target()].as_slice(), trap.others()), (OLD, 0));
    let mut trap = Trap::new(0, Mishap::Refused);
    assert_eq!(save(&mut trap, Path::new("a.net"), OLD, OLD), Ok(()));
    assert_eq!(trap.steps, 0);
}

#[cfg(unix)]
#[test]
fn nobody_else_may_read_the_new_file_before_it_has_its_permissions() {
    use std::os::unix::fs::PermissionsExt;
    let path = std::env::temp_dir().join(format!("kneewise-save-{}", std::process::id()));
    let mut desk = DiskDesk::default();
    desk.create(&path).unwrap();
    let mode = std::fs::metadata(&path).unwrap().permissions().mode();
    desk.remove(&path).unwrap();
    assert_eq!(mode & 0o777, 0o600);
}
