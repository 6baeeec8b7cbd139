//! A made-up root folder.

use std::fs;
use std::os::unix::fs::PermissionsExt;
use std::path::Path;

use proofhouse::host::{Host, Root};

/// A folder that is removed at the end.
pub struct Tree {
    folder: tempfile::TempDir,
}

impl Tree {
    /// An empty root.
    pub fn new() -> Tree {
        // hundreds of small files: in memory where the machine has such a place
        let memory = Path::new("/dev/shm");
        let parent = if memory.is_dir() { memory.to_owned() } else { std::env::temp_dir() };
        let all_may_look = fs::Permissions::from_mode(0o755);
        let folder = tempfile::Builder::new().permissions(all_may_look).tempdir_in(parent);
        Tree { folder: folder.expect("a folder for a made-up root") }
    }

    /// Writes a file, and the folders above it; the last word counts.
    pub fn file(&self, inside: &str, content: impl AsRef<[u8]>) -> &Tree {
        let path = self.folder.path().join(inside);
        fs::create_dir_all(path.parent().expect("a parent")).expect("folders");
        fs::write(path, content).expect("a file");
        self
    }

    /// Writes one line, with the line feed that the kernel puts after it.
    pub fn line(&self, inside: &str, content: impl std::fmt::Display) -> &Tree {
        self.file(inside, format!("{content}\n"))
    }

    /// Puts an empty folder there, in the place of what was.
    pub fn folder(&self, inside: &str) -> &Tree {
        self.remove(inside);
        fs::create_dir_all(self.folder.path().join(inside)).expect("a folder");
        self
    }

    /// Removes a file or a folder.
    pub fn remove(&self, inside: &str) -> &Tree {
        let path = self.folder.path().join(inside);
        if path.is_dir() {
            fs::remove_dir_all(path).expect("removed");
        } else if path.exists() {
            fs::remove_file(path).expect("removed");
        }
        self
    }

    /// Leaves a file to its owner, as the kernel does with serial numbers.
    pub fn owner_only(&self, inside: &str, mode: u32) -> &Tree {
        fs::set_permissions(self.folder.path().join(inside), fs::Permissions::from_mode(mode)).expect("a file");
        self
    }

    /// Every file, relative to the root, sorted.
    pub fn files(&self) -> Vec<String> {
        fn walk(base: &Path, folder: &Path, list: &mut Vec<String>) {
            for entry in fs::read_dir(folder).expect("a folder") {
                let path = entry.expect("an entry").path();
                if path.is_dir() {
                    walk(base, &path, list);
                } else {
                    list.push(path.strip_prefix(base).expect("inside").to_str().expect("UTF-8").to_owned());
                }
            }
        }
        let mut list = Vec::new();
        walk(self.folder.path(), self.folder.path(), &mut list);
        list.sort();
        list
    }

    /// As the root to read under.
    pub fn root(&self) -> Root {
        Root::new(self.folder.path())
    }

    /// Read for a thread with this affinity mask.
    pub fn host(&self, mask: &str) -> Host {
        Host::read_with_mask(&self.root(), super::set(mask))
    }
}
