//! A file that is written while the work goes on, and is complete under its name or not there.

use std::fs::{self, File};
use std::io::{self, BufReader, BufWriter, Write};
use std::path::{Path, PathBuf};

use super::bundle::{WriteError, beside};

/// Bytes that wait in memory.
const BUFFER: usize = 1 << 16;

/// A file that is being written beside its place. [`Stream::keep`] moves it there; dropped before that, it is taken away.
#[derive(Debug)]
pub struct Stream {
    place: PathBuf,
    to: Option<BufWriter<File>>,
}

impl Stream {
    /// Opens a file beside its place; the folder must be there.
    ///
    /// Errors: what the system says.
    pub fn open(place: &Path) -> io::Result<Stream> {
        let file = File::create(beside(place))?;
        Ok(Stream { place: place.to_path_buf(), to: Some(BufWriter::with_capacity(BUFFER, file)) })
    }

    /// Writes the file once more: `pass` reads what there is and writes what is to be there. Nothing grows in memory.
    ///
    /// Errors: what the system says, or `pass`; then nothing of the file is left.
    pub fn again(
        mut self,
        pass: impl FnOnce(BufReader<File>, &mut BufWriter<File>) -> io::Result<()>,
    ) -> io::Result<Stream> {
        self.flush()?;
        let first = beside(&self.place);
        let second = beside(&first);
        let written = File::open(&first).and_then(|from| {
            let mut to = BufWriter::with_capacity(BUFFER, File::create(&second)?);
            pass(BufReader::with_capacity(BUFFER, from), &mut to)?;
            to.flush()?;
            fs::rename(&second, &first)?;
            Ok(to)
        });
        match written {
            Ok(to) => {
                self.to = Some(to);
                Ok(self)
            }
            Err(error) => {
                let _ = fs::remove_file(&second);
                Err(error)
            }
        }
    }

    /// Moves the file, whole, into its place; a file of that name is replaced.
    ///
    /// Errors: what was still waiting could not be written, or the file not be moved; then nothing of it is left.
    pub fn keep(mut self) -> Result<(), WriteError> {
        let written = self.to.as_mut().map_or(Ok(()), Write::flush);
        let moved = written.and_then(|()| fs::rename(beside(&self.place), &self.place));
        moved.map_err(|source| WriteError::File { file: self.place.clone(), source })?;
        self.to = None;
        Ok(())
    }
}

impl Write for Stream {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.to.as_mut().map_or_else(|| Ok(0), |to| to.write(bytes))
    }

    fn flush(&mut self) -> io::Result<()> {
        self.to.as_mut().map_or(Ok(()), Write::flush)
    }
}

impl Drop for Stream {
    fn drop(&mut self) {
        if let Some(to) = self.to.take() {
            // not flushed: nobody will read it
            let _ = to.into_parts();
            let _ = fs::remove_file(beside(&self.place));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> =
            fs::read_dir(folder).unwrap().map(|it| it.unwrap().file_name().into_string().unwrap()).collect();
        names.sort();
        names
    }

    #[test]
    fn it_is_there_whole_or_not_at_all() {
        let folder = tempfile::tempdir().unwrap();
        let place = folder.path().join("a.csv");
        fs::write(&place, "old").unwrap();
        let long = "0123456789".repeat(BUFFER / 5);

        let mut dropped = Stream::open(&place).unwrap();
        dropped.write_all(long.as_bytes()).unwrap();
        assert_eq!(names(folder.path()), [".a.csv.part", "a.csv"]);
        assert_eq!(fs::read_to_string(&place).unwrap(), "old");
        drop(dropped);
        assert_eq!(names(folder.path()), ["a.csv"]);
        assert_eq!(fs::read_to_string(&place).unwrap(), "old");

        let mut kept = Stream::open(&place).unwrap();
        kept.write_all(long.as_bytes()).unwrap();
        kept.keep().unwrap();
        assert_eq!(names(folder.path()), ["a.csv"]);
        assert_eq!(fs::read_to_string(&place).unwrap(), long);
    }

    #[test]
    fn a_second_pass_replaces_the_first_or_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        let place = folder.path().join("a.vcd");
        let written = || {
            let mut stream = Stream::open(&place).unwrap();
            stream.write_all(&b"0123456789".repeat(BUFFER)).unwrap();
            stream
        };
        let again = written().again(|mut from, to| io::copy(&mut io::Read::take(&mut from, 70_000), to).map(drop));
        again.unwrap().keep().unwrap();
        assert_eq!(names(folder.path()), ["a.vcd"]);
        assert_eq!(fs::read(&place).unwrap().len(), 70_000);
        fs::remove_file(&place).unwrap();
        assert!(written().again(|_, _| Err(io::Error::other("full"))).is_err());
        assert_eq!(names(folder.path()), [""; 0]);
    }

    #[test]
    fn what_cannot_be_moved_is_taken_away() {
        let folder = tempfile::tempdir().unwrap();
        let place = folder.path().join("taken");
        fs::create_dir_all(place.join("by a folder")).unwrap();
        let mut stream = Stream::open(&place).unwrap();
        stream.write_all(b"a").unwrap();
        let error = stream.keep().unwrap_err();
        assert!(error.to_string().contains("taken"), "{error}");
        assert_eq!(names(folder.path()), ["taken"]);
        assert!(Stream::open(&folder.path().join("no/such/folder.csv")).is_err());
    }
}
