//! Why the system would not read or write a file, in plain words: the one place that words such troubles.

use std::io::{Error, ErrorKind};

/// Too many links in a path, on systems that number their errors as POSIX does.
const LINKS_IN_A_CIRCLE: i32 = 40;

/// Why a file could not be read.
pub fn reading(error: &Error) -> String {
    match error.kind() {
        ErrorKind::NotFound => "there is no such file".into(),
        ErrorKind::PermissionDenied => "you have no permission to read it".into(),
        _ => any(error),
    }
}

/// Why a file could not be written.
pub fn writing(error: &Error) -> String {
    match error.kind() {
        ErrorKind::NotFound => "its directory is not there".into(),
        ErrorKind::PermissionDenied => "you have no permission to write there".into(),
        _ => any(error),
    }
}

fn any(error: &Error) -> String {
    let words = match error.kind() {
        ErrorKind::IsADirectory => "it is a directory",
        ErrorKind::NotADirectory => "a part of its path is a file and no directory",
        ErrorKind::StorageFull => "the disk is full",
        ErrorKind::QuotaExceeded => "the space you may use on this disk is used up",
        ErrorKind::ReadOnlyFilesystem => "it lies on a read-only file system",
        ErrorKind::FileTooLarge => "it would be too large",
        ErrorKind::InvalidFilename => "its name is too long, or no name of a file",
        ErrorKind::InvalidData => "it is no text in UTF-8",
        ErrorKind::WriteZero => "nothing more could be written",
        ErrorKind::OutOfMemory => "there is too little memory",
        _ if error.raw_os_error() == Some(LINKS_IN_A_CIRCLE) && cfg!(target_os = "linux") => {
            "its links lead in a circle"
        }
        _ => return without_number(&error.to_string()),
    };
    words.into()
}

/// The system's own words without the number behind them, beginning as the middle of a sentence does.
fn without_number(text: &str) -> String {
    let text = text.split(" (os error ").next().unwrap_or(text);
    let mut letters = text.chars();
    letters.next().map(|first| first.to_lowercase().chain(letters).collect()).unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn troubles_are_told_in_plain_words() {
        assert_eq!(reading(&ErrorKind::NotFound.into()), "there is no such file");
        assert_eq!(writing(&ErrorKind::NotFound.into()), "its directory is not there");
        assert_eq!(reading(&ErrorKind::IsADirectory.into()), "it is a directory");
        for number in 1..134 {
            let error = Error::from_raw_os_error(number);
            for text in [reading(&error), writing(&error)] {
                assert!(!text.contains("os error") && !text.is_empty(), "{number}: {text}");
                assert!(!text.starts_with(char::is_uppercase), "{number}: {text}");
            }
        }
    }
}
