//! Files appear whole or not at all: written beside their place, then renamed.

use std::fs::{self, File};
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use crate::fail::Fail;

/// A file under way. Dropped before [`Whole::finish`], it leaves nothing.
#[derive(Debug)]
pub struct Whole {
    path: PathBuf,
    beside: PathBuf,
    file: Option<BufWriter<File>>,
}

impl Whole {
    /// Begins to write what will be `path`.
    pub fn begin(path: &Path) -> Result<Self, Fail> {
        let name = path
            .file_name()
            .ok_or_else(|| Fail::file(path, "names no file"))?;
        let mut beside = name.to_os_string();
        beside.push(format!(".{}.part", std::process::id()));
        let beside = path.with_file_name(beside);
        let file = File::create(&beside)
            .map_err(|e| Fail::file(path, format_args!("cannot be written: {e}")))?;
        Ok(Whole {
            path: path.to_path_buf(),
            beside,
            file: Some(BufWriter::new(file)),
        })
    }

    /// A file that is never written, to take the place of one that is finished.
    pub fn nothing(path: &Path) -> Self {
        Whole {
            path: path.to_path_buf(),
            beside: PathBuf::new(),
            file: None,
        }
    }

    /// Puts the file in its place.
    pub fn finish(mut self) -> Result<(), Fail> {
        let done = match self.file.take() {
            Some(mut file) => file.flush().and_then(|()| file.get_ref().sync_all()),
            None => Ok(()),
        };
        done.and_then(|()| fs::rename(&self.beside, &self.path))
            .map_err(|e| Fail::file(&self.path, format_args!("cannot be written: {e}")))
    }
}

impl Write for Whole {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        self.file
            .as_mut()
            .map_or(Ok(bytes.len()), |file| file.write(bytes))
    }
    fn flush(&mut self) -> std::io::Result<()> {
        self.file.as_mut().map_or(Ok(()), BufWriter::flush)
    }
}

impl Drop for Whole {
    fn drop(&mut self) {
        // After `finish` the name is gone already; before it, nothing may stay.
        let _ = fs::remove_file(&self.beside);
    }
}
