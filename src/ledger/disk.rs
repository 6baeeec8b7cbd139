//! Where a journal's bytes go: the folder, or in tests a disk that fails.

use std::fs::{File, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use crate::ledger::folder;

/// The writes of a journal.
pub trait Disk: Send {
    /// Appends all of `bytes` to the current segment.
    fn append(&mut self, bytes: &[u8]) -> io::Result<()>;
    /// Returns when everything appended so far is on stable storage.
    fn sync(&mut self) -> io::Result<()>;
    /// Makes a new segment, which must not exist, its name on stable storage, and goes on in it.
    fn begin(&mut self, segment: u32) -> io::Result<()>;
    /// For messages: where the current segment lies.
    fn place(&self) -> &Path;
}

/// A ledger's folder.
pub struct Segments {
    folder: PathBuf,
    place: PathBuf,
    file: Option<File>,
}

impl Segments {
    /// The folder, with no segment to go on in yet.
    pub fn new(folder: &Path) -> Segments {
        Segments { folder: folder.into(), place: folder.into(), file: None }
    }

    /// Goes on in a segment that exists; returns its length. What an earlier process may have left in the cache
    /// of the operating system is synced first: later lines build on it.
    pub fn resume(&mut self, segment: u32) -> io::Result<u64> {
        self.place = folder::segment_path(&self.folder, segment);
        let file = OpenOptions::new().append(true).open(&self.place)?;
        file.sync_all()?;
        let length = file.metadata()?.len();
        self.file = Some(file);
        folder::sync_folder(&self.folder)?;
        Ok(length)
    }

    fn file(&mut self) -> io::Result<&mut File> {
        self.file.as_mut().ok_or_else(|| io::Error::other("no segment was begun"))
    }
}

impl Disk for Segments {
    fn append(&mut self, bytes: &[u8]) -> io::Result<()> {
        self.file()?.write_all(bytes)
    }

    fn sync(&mut self) -> io::Result<()> {
        self.file()?.sync_data()
    }

    fn begin(&mut self, segment: u32) -> io::Result<()> {
        self.place = folder::segment_path(&self.folder, segment);
        let file = OpenOptions::new().append(true).create_new(true).open(&self.place)?;
        file.sync_all()?;
        self.file = Some(file);
        folder::sync_folder(&self.folder)
    }

    fn place(&self) -> &Path {
        &self.place
    }
}
