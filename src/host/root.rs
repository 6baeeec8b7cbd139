//! Reads small text files under one root folder, and never writes. In life the root is `/`; a test hands over a
//! made-up tree. What stands in the files is untrusted: lengths are limited, garbage is an answer and no panic.
//!
//! *Absent*, *unreadable* and *zero* are three different values, see [`Reading`].

use std::fs::File;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

use crate::host::cpulist::CpuSet;
use crate::host::text::clean;

/// Most bytes read from one ordinary file: sysfs attributes end at one page, binary ones somewhat later.
pub const SMALL: u64 = 64 << 10;
/// Most bytes read from `/proc/interrupts` and `/proc/cpuinfo`, which grow with the number of cpus.
pub const LARGE: u64 = 8 << 20;
/// Most names taken from one folder.
const MOST_NAMES: usize = 1 << 17;

/// Why something that is there could not be read.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Why {
    /// The kernel refused for want of rights.
    Denied,
    /// The kernel gave another error, in its own words.
    Failed(String),
    /// More bytes than such a file can have.
    TooLarge,
    /// Not UTF-8.
    NotText,
    /// Text that makes no sense where it stands; the beginning of it.
    Nonsense(String),
}

impl Why {
    /// Nonsense, quoting the beginning of `text` without control characters.
    pub fn nonsense(text: &str) -> Why {
        Why::Nonsense(clean(text, 40))
    }
}

impl std::fmt::Display for Why {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Why::Denied => f.write_str("permission denied"),
            Why::Failed(error) => f.write_str(error),
            Why::TooLarge => f.write_str("longer than such a file can be"),
            Why::NotText => f.write_str("holds bytes that are no text"),
            Why::Nonsense(text) => write!(f, "holds {text:?}, which makes no sense there"),
        }
    }
}

/// What came of reading one thing.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Reading<T> {
    /// It was read; zero is such a value.
    Value(T),
    /// This kernel or machine does not offer it.
    Absent,
    /// It is there and could not be read.
    Unreadable(Why),
}

impl<T> Reading<T> {
    /// The value, if there is one.
    pub fn value(&self) -> Option<&T> {
        match self {
            Reading::Value(value) => Some(value),
            _ => None,
        }
    }

    /// The value itself, if there is one.
    pub fn ok(self) -> Option<T> {
        match self {
            Reading::Value(value) => Some(value),
            _ => None,
        }
    }

    /// Goes on with the value.
    pub fn and_then<U>(self, next: impl FnOnce(T) -> Reading<U>) -> Reading<U> {
        match self {
            Reading::Value(value) => next(value),
            Reading::Absent => Reading::Absent,
            Reading::Unreadable(why) => Reading::Unreadable(why),
        }
    }

    /// Changes the value.
    pub fn map<U>(self, change: impl FnOnce(T) -> U) -> Reading<U> {
        self.and_then(|value| Reading::Value(change(value)))
    }

    /// This reading, or where it is absent the other one.
    pub fn or_else_absent(self, other: impl FnOnce() -> Reading<T>) -> Reading<T> {
        match self {
            Reading::Absent => other(),
            here => here,
        }
    }
}

impl<T: Copy> Reading<T> {
    /// A copy of the value, if there is one.
    pub fn get(&self) -> Option<T> {
        self.value().copied()
    }
}

/// The folder under which everything is read.
#[derive(Clone, Debug)]
pub struct Root {
    base: PathBuf,
}

impl Root {
    /// Everything is read under `base`, which is `/` in life.
    pub fn new(base: impl Into<PathBuf>) -> Root {
        Root { base: base.into() }
    }

    /// The folder itself.
    pub fn base(&self) -> &Path {
        &self.base
    }

    /// Text of a small file without the white space and NULs at its ends; `inside` is relative to the root.
    pub fn text(&self, inside: &str) -> Reading<String> {
        self.bytes(inside, SMALL).and_then(|bytes| match String::from_utf8(bytes) {
            Ok(text) => Reading::Value(text.trim_matches(|c: char| c.is_whitespace() || c == '\0').to_owned()),
            Err(_) => Reading::Unreadable(Why::NotText),
        })
    }

    /// Text of a file of up to [`LARGE`] bytes; what is not UTF-8 comes as U+FFFD.
    pub fn long_text(&self, inside: &str) -> Reading<String> {
        self.bytes(inside, LARGE).map(|bytes| String::from_utf8_lossy(&bytes).into_owned())
    }

    /// A file with one whole decimal number, which may be negative.
    pub fn number(&self, inside: &str) -> Reading<i64> {
        self.text(inside).and_then(|text| match text.parse() {
            Ok(number) => Reading::Value(number),
            Err(_) => Reading::Unreadable(Why::nonsense(&text)),
        })
    }

    /// A file with one whole decimal number from 0 to 2⁶⁴ − 1.
    pub fn count(&self, inside: &str) -> Reading<u64> {
        self.text(inside).and_then(|text| match text.parse() {
            Ok(number) => Reading::Value(number),
            Err(_) => Reading::Unreadable(Why::nonsense(&text)),
        })
    }

    /// A file with a list of cpus in the kernel's syntax; may be empty.
    pub fn cpus(&self, inside: &str) -> Reading<CpuSet> {
        self.text(inside).and_then(|text| match CpuSet::parse_kernel(&text) {
            Ok(set) => Reading::Value(set),
            Err(_) => Reading::Unreadable(Why::nonsense(&text)),
        })
    }

    /// Names in a folder, sorted; names that are no UTF-8 are left out.
    pub fn names(&self, inside: &str) -> Reading<Vec<String>> {
        let path = match self.path(inside) {
            Ok(path) => path,
            Err(why) => return Reading::Unreadable(why),
        };
        let entries = match path.read_dir() {
            Ok(entries) => entries,
            Err(error) => return reading_of(&error),
        };
        let mut names: Vec<String> =
            entries.take(MOST_NAMES).filter_map(|entry| entry.ok()?.file_name().into_string().ok()).collect();
        names.sort_unstable();
        Reading::Value(names)
    }

    /// The numbers n of the entries `prefix` + n in a folder, ascending: `cpu` gives 0, 1, … and not `cpufreq`.
    pub fn numbered(&self, inside: &str, prefix: &str) -> Reading<Vec<u32>> {
        self.names(inside).map(|names| {
            let number = |name: &String| {
                let digits = name.strip_prefix(prefix)?;
                let canonical = digits == "0" || !digits.starts_with('0');
                (canonical && digits.bytes().all(|b| b.is_ascii_digit())).then(|| digits.parse().ok())?
            };
            let mut numbers: Vec<u32> = names.iter().filter_map(number).collect();
            numbers.sort_unstable();
            numbers
        })
    }

    /// Whether something of that name can be seen.
    pub fn exists(&self, inside: &str) -> bool {
        self.path(inside).is_ok_and(|path| path.symlink_metadata().is_ok())
    }

    fn path(&self, inside: &str) -> Result<PathBuf, Why> {
        if inside.starts_with('/') || inside.split('/').any(|part| part == "..") || inside.contains('\0') {
            return Err(Why::Failed(format!("{} leads out of the root folder", clean(inside, 80))));
        }
        Ok(self.base.join(inside))
    }

    fn bytes(&self, inside: &str, limit: u64) -> Reading<Vec<u8>> {
        let path = match self.path(inside) {
            Ok(path) => path,
            Err(why) => return Reading::Unreadable(why),
        };
        let mut bytes = Vec::new();
        match File::open(path).and_then(|file| file.take(limit + 1).read_to_end(&mut bytes)) {
            Ok(_) if bytes.len() as u64 > limit => Reading::Unreadable(Why::TooLarge),
            Ok(_) => Reading::Value(bytes),
            Err(error) => reading_of(&error),
        }
    }
}

/// What an error of the kernel says: nothing there, no rights, or something else.
fn reading_of<T>(error: &io::Error) -> Reading<T> {
    match error.kind() {
        io::ErrorKind::NotFound | io::ErrorKind::NotADirectory => Reading::Absent,
        io::ErrorKind::PermissionDenied => Reading::Unreadable(Why::Denied),
        _ => Reading::Unreadable(Why::Failed(error.to_string().to_lowercase())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn kernel_errors_keep_absent_and_denied_apart() {
        // numbers of errno.h on Linux: ENOENT 2, EIO 5, EACCES 13, ENOTDIR 20, EPERM 1, ENODATA 61
        let of = |code| reading_of::<u64>(&io::Error::from_raw_os_error(code));
        assert_eq!(of(2), Reading::Absent);
        assert_eq!(of(20), Reading::Absent);
        assert_eq!(of(13), Reading::Unreadable(Why::Denied));
        assert_eq!(of(1), Reading::Unreadable(Why::Denied));
        assert!(matches!(of(5), Reading::Unreadable(Why::Failed(words)) if words.contains("input/output")));
        assert!(matches!(of(61), Reading::Unreadable(Why::Failed(_))));
    }

    #[test]
    fn no_path_leaves_the_root() {
        let root = Root::new("/nowhere");
        for path in ["../etc/passwd", "a/../../b", "/etc/passwd", "a\0b"] {
            assert!(matches!(root.text(path), Reading::Unreadable(Why::Failed(_))), "{path:?}");
            assert!(!root.exists(path));
        }
        assert_eq!(root.text("a..b/c"), Reading::Absent);
    }
}
