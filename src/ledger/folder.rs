//! The folder of a ledger: its marker, its lock, its segments.
//!
//! ```text
//! ledger.json            one line: {"schema":"proofhouse/ledger/1","name":"32 hex digits","created_ms":N}
//! ledger.lock            empty; whoever writes holds an exclusive flock(2) on it
//! segment-000001.jsonl   lines (see `record`); numbered without gaps from 1
//! ```
//!
//! A folder without the marker is another program's and is never written into, unless it is empty. The marker
//! appears by a rename after it was synced, so there is never half a marker; its random `name` and the chain that
//! starts from its hash tie the segments to this folder.

use std::fs::{self, File, OpenOptions, TryLockError};
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

use crate::ledger::digest::Digest;
use crate::ledger::error::Error;
use crate::ledger::names;

/// The marker of a ledger's folder.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Marker {
    /// Random name of this ledger.
    pub name: String,
    /// Host clock when it was made.
    pub created_ms: u64,
    /// Over all bytes of the marker file: what the first line follows from.
    pub sha256: Digest,
}

/// No marker that we wrote comes near this length.
const MARKER_BYTES: u64 = 4096;

#[derive(Serialize, Deserialize)]
struct MarkerText {
    schema: String,
    name: String,
    created_ms: u64,
}

/// The marker of the ledger at `path`; an error that says what is there instead.
pub fn marker(path: &Path) -> Result<Marker, Error> {
    if path.as_os_str().is_empty() {
        // joined with a file's name it would mean the current folder
        return Err(Error::NotAFolder { path: "\"\"".into() });
    }
    match fs::metadata(path) {
        Ok(about) if !about.is_dir() => return Err(Error::NotAFolder { path: path.into() }),
        Ok(_) => {}
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Err(Error::NoLedger { path: path.into() }),
        Err(error) => return Err(Error::io(path, "look at", error)),
    }
    let file = path.join(names::MARKER);
    match read_limited(&file, MARKER_BYTES) {
        Ok(Some(bytes)) => parse_marker(path, &bytes),
        Ok(None) => Err(foreign(path, format!("its {} is too long", names::MARKER))),
        Err(error) if error.kind() == io::ErrorKind::NotFound => match first_foreign(path)? {
            Some(found) => Err(foreign(path, found)),
            None => Err(Error::NoLedger { path: path.into() }),
        },
        Err(error) => Err(Error::io(&file, "read", error)),
    }
}

fn parse_marker(path: &Path, bytes: &[u8]) -> Result<Marker, Error> {
    #[derive(Deserialize)]
    struct OnlySchema {
        schema: String,
    }
    let Ok(OnlySchema { schema }) = serde_json::from_slice(bytes) else {
        return Err(foreign(path, format!("its {} names no schema", names::MARKER)));
    };
    if schema != names::SCHEMA {
        return Err(if schema.starts_with(names::SCHEMA_FAMILY) {
            Error::Newer { path: path.into(), found: schema }
        } else {
            foreign(path, format!("its {} names the schema {schema:?}", names::MARKER))
        });
    }
    match serde_json::from_slice::<MarkerText>(bytes) {
        Ok(MarkerText { name, created_ms, .. }) => Ok(Marker { name, created_ms, sha256: Digest::of(bytes) }),
        Err(error) => Err(foreign(path, format!("its {} is damaged: {error}", names::MARKER))),
    }
}

fn foreign(path: &Path, found: String) -> Error {
    Error::Foreign { path: path.into(), found }
}

/// The first thing in the folder that does not belong to a ledger in the making. `None`: it may become one.
fn first_foreign(path: &Path) -> Result<Option<String>, Error> {
    for entry in fs::read_dir(path).map_err(|e| Error::io(path, "list", e))? {
        let entry = entry.map_err(|e| Error::io(path, "list", e))?;
        let name = entry.file_name();
        let ours = match name.to_str() {
            // an empty file system of its own
            Some("lost+found") => true,
            // left by a start that was cut off before the marker had its name
            Some(names::LOCK) => entry.metadata().is_ok_and(|m| m.is_file() && m.len() == 0),
            Some(names::MARKER_NEW) => true,
            _ => false,
        };
        if !ours {
            return Ok(Some(format!("it holds {name:?} and no {}", names::MARKER)));
        }
    }
    Ok(None)
}

/// All of a file, or `None` if it is longer than `most` bytes.
pub fn read_limited(file: &Path, most: u64) -> io::Result<Option<Vec<u8>>> {
    let open = File::open(file)?;
    let length = open.metadata()?.len();
    if length > most {
        return Ok(None);
    }
    let mut bytes = Vec::with_capacity(length as usize);
    open.take(most + 1).read_to_end(&mut bytes)?;
    Ok((bytes.len() as u64 <= most).then_some(bytes))
}

/// Takes the folder for one writer, and makes it a ledger if there is none yet.
/// Returns the lock, which is held until it is dropped, the marker, and whether it was made just now.
pub fn take(path: &Path, wall_ms: u64) -> Result<(Lock, Marker, bool), Error> {
    match marker(path) {
        Ok(_) => {}
        Err(Error::NoLedger { .. }) => create_folders(path)?,
        Err(error) => return Err(error),
    }
    let lock = lock(path)?;
    // once more: somebody else may have made it meanwhile
    match marker(path) {
        Ok(marker) => Ok((lock, marker, false)),
        Err(Error::NoLedger { .. }) => {
            let text = MarkerText { schema: names::SCHEMA.into(), name: random_name()?, created_ms: wall_ms };
            let mut bytes = serde_json::to_vec(&text).expect("three plain fields");
            bytes.push(b'\n');
            put_marker(path, &bytes)?;
            Ok((lock, marker(path)?, true))
        }
        Err(error) => Err(error),
    }
}

/// Writes the marker so that it is either there as a whole or not at all.
pub fn put_marker(path: &Path, bytes: &[u8]) -> Result<(), Error> {
    let (new, marker) = (path.join(names::MARKER_NEW), path.join(names::MARKER));
    let made = File::create(&new).and_then(|mut file| {
        file.write_all(bytes)?;
        file.sync_all()
    });
    made.map_err(|e| Error::io(&new, "write", e))?;
    fs::rename(&new, &marker).map_err(|e| Error::io(&marker, "make", e))?;
    sync_folder(path).map_err(|e| Error::io(path, "sync", e))
}

/// Makes the folder and those above it, each on disk before anything is put into it.
pub fn create_folders(path: &Path) -> Result<(), Error> {
    let missing: Vec<&Path> = path.ancestors().take_while(|p| !p.as_os_str().is_empty() && !p.exists()).collect();
    for folder in missing.into_iter().rev() {
        match fs::create_dir(folder) {
            Ok(()) => {}
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists => {}
            Err(error) => return Err(Error::io(folder, "make the folder", error)),
        }
        let parent = folder.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
        sync_folder(parent).map_err(|e| Error::io(parent, "sync", e))?;
    }
    Ok(())
}

/// The writer's lock. Given back by name and not by closing: a process that is being started by another thread holds
/// a copy of every descriptor for a moment.
pub struct Lock(File);

impl Drop for Lock {
    fn drop(&mut self) {
        // closing follows anyway
        let _ = self.0.unlock();
    }
}

fn lock(path: &Path) -> Result<Lock, Error> {
    let file = path.join(names::LOCK);
    let open = OpenOptions::new().create(true).truncate(false).write(true).open(&file);
    let open = open.map_err(|e| Error::io(&file, "open", e))?;
    match open.try_lock() {
        Ok(()) => Ok(Lock(open)),
        Err(TryLockError::WouldBlock) => Err(Error::Locked { path: path.into() }),
        Err(TryLockError::Error(error)) => Err(Error::io(&file, "lock", error)),
    }
}

fn random_name() -> Result<String, Error> {
    let source = Path::new("/dev/urandom");
    let mut bytes = [0u8; 16];
    File::open(source).and_then(|mut f| f.read_exact(&mut bytes)).map_err(|e| Error::io(source, "read", e))?;
    Ok(bytes.iter().map(|b| format!("{b:02x}")).collect())
}

/// Makes names in the folder durable. File systems that cannot sync a folder by itself say EINVAL.
pub fn sync_folder(path: &Path) -> io::Result<()> {
    match File::open(path)?.sync_all() {
        Err(error) if error.kind() == io::ErrorKind::InvalidInput => Ok(()),
        done => done,
    }
}

/// Numbers of the segments in the folder, in order; there may be gaps.
pub fn segments(path: &Path) -> Result<Vec<u32>, Error> {
    let mut numbers = Vec::new();
    for entry in fs::read_dir(path).map_err(|e| Error::io(path, "list", e))? {
        let name = entry.map_err(|e| Error::io(path, "list", e))?.file_name();
        numbers.extend(name.to_str().and_then(names::segment_number));
    }
    numbers.sort_unstable();
    Ok(numbers)
}

/// Path of a segment.
pub fn segment_path(path: &Path, number: u32) -> PathBuf {
    path.join(names::segment(number))
}
