//! Files into text.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use super::Diagnostics;

/// Largest text that is read, in bytes: 16 MiB. Larger circuits are built in code.
pub const MAX_BYTES: usize = 16 << 20;

/// Why a file gave nothing.
#[derive(Debug, thiserror::Error)]
pub enum ReadError {
    /// It could not be read as text.
    #[error(transparent)]
    File(#[from] FileError),
    /// Its text has faults.
    #[error(transparent)]
    Faults(#[from] Diagnostics),
}

/// Why a file could not be read as text.
#[derive(Debug, thiserror::Error)]
#[error("{file}: {what}; {help}")]
pub struct FileError {
    /// The file as it was named.
    pub file: String,
    /// What is wrong.
    pub what: String,
    /// What would be right.
    pub help: String,
}

/// The text of a file.
pub(super) fn text(path: &Path) -> Result<String, FileError> {
    let error = |what: String, help: &str| FileError { file: path.display().to_string(), what, help: help.to_string() };
    if path.is_dir() {
        return Err(error("this is a folder".into(), "name a scenario file in it"));
    }
    let mut bytes = Vec::new();
    let read = File::open(path).and_then(|file| file.take(MAX_BYTES as u64 + 1).read_to_end(&mut bytes));
    if let Err(cause) = read {
        return Err(match cause.kind() {
            io::ErrorKind::NotFound => error("there is no such file".into(), "check the name and the folder"),
            io::ErrorKind::PermissionDenied => error("this file may not be read".into(), "check its permissions"),
            _ => error(format!("this file cannot be read: {cause}"), "check the file"),
        });
    }
    if bytes.len() > MAX_BYTES {
        return Err(error("this file is larger than 16 MiB".into(), "build larger circuits in code, with the library"));
    }
    String::from_utf8(bytes).map_err(|cause| {
        let at = cause.utf8_error().valid_up_to();
        let line = cause.as_bytes()[..at].iter().filter(|byte| **byte == b'\n').count() + 1;
        let what = format!("this file is not UTF-8: line {line}, byte {at} of the file is no part of a letter");
        error(what, "save it as UTF-8 text")
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn fault(bytes: &[u8]) -> FileError {
        let folder = tempfile::tempdir().expect("a temporary folder");
        let path = folder.path().join("scenario.toml");
        std::fs::write(&path, bytes).expect("a temporary file");
        text(&path).expect_err("a file that is no text")
    }

    #[test]
    fn files_that_are_no_text_say_why() {
        let fault_text = fault(b"title = \"a\"\nb = \"\xff\"\n").to_string();
        assert!(fault_text.contains("line 2, byte 17"), "{fault_text}");
        assert!(fault(&vec![b'#'; MAX_BYTES + 1]).to_string().contains("16 MiB"));
        let folder = tempfile::tempdir().expect("a temporary folder");
        assert!(text(folder.path()).expect_err("a folder").to_string().contains("folder"));
        assert!(text(&folder.path().join("none")).expect_err("no file").to_string().contains("no such file"));
    }
}
