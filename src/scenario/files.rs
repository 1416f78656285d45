//! Files on disk: written whole or not at all, and never over somebody else's work.
//!
//! - [`write_whole`] writes a temporary file beside the target, forces it to the disk and renames it over the target, so
//!   that a crash leaves either the old file or the new one. A symbolic link stays a link: its target is replaced. The
//!   permissions of an existing file are kept; its owner becomes whoever runs the program, and further hard links to it
//!   keep the old bytes. A write-protected file, a folder or a device is refused.
//! - [`write_outputs`] does the same for a set of files in one folder. A list of SHA-256 hashes in the folder
//!   ([`MANIFEST_NAME`], in the form that `sha256sum --check` reads) says what the program wrote. A file that still has
//!   those bytes is replaced by a later run; one that the user made or changed is not, unless the caller says so, and then
//!   nothing of the set is written.
//! - [`save_keeping_backup`] writes one document; a file there that the program did not write is kept as `.bak`.

use std::collections::BTreeSet;
use std::ffi::{OsStr, OsString};
use std::fs::{self, File, Metadata, OpenOptions};
use std::io::{self, ErrorKind, Read, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU32, Ordering};

use sha2::{Digest, Sha256};

/// Name of the list of hashes in each folder that the program wrote to.
pub const MANIFEST_NAME: &str = ".loopwright-written";

const MANIFEST_HEAD: &str = "# SHA-256 of the files that Loopwright wrote here. It replaces a file without asking only while the file still has these bytes.\n";
/// A list longer than this is not one of ours: tens of thousands of files in a folder.
const MANIFEST_LIMIT: u64 = 4 << 20;
/// Temporary or backup names that are tried before giving up.
const NAME_ATTEMPTS: u32 = 1000;

/// Why a file could not be read or written.
#[derive(Debug, thiserror::Error)]
pub enum FileError {
    #[error("cannot {action} {}: {source}", path.display())]
    Io {
        action: &'static str,
        path: PathBuf,
        source: io::Error,
    },
    #[error("{} has more than {limit} bytes: too large to be what it should be", path.display())]
    TooLarge { path: PathBuf, limit: u64 },
    #[error("{} is not an ordinary file: name a file to write to", path.display())]
    NotAFile { path: PathBuf },
    #[error("{} is write-protected: allow writing to it, or name another file", path.display())]
    WriteProtected { path: PathBuf },
    #[error("{} is a link to a file that does not exist: remove the link, or name another file", path.display())]
    DanglingLink { path: PathBuf },
    #[error("\"{name}\" cannot be the name of an output file")]
    BadName { name: String },
    #[error(
        "{} not written by this program, or changed since: {}; nothing was written. Move it away, choose another folder, or give --replace",
        if paths.len() == 1 { "a file is" } else { "some files are" },
        paths.iter().map(|path| path.display().to_string()).collect::<Vec<_>>().join(", ")
    )]
    NotOurs { paths: Vec<PathBuf> },
    #[error("no free name for a {what} beside {}", path.display())]
    NoFreeName { what: &'static str, path: PathBuf },
}

impl FileError {
    fn io(action: &'static str, path: &Path) -> impl FnOnce(io::Error) -> FileError {
        let path = path.to_owned();
        move |source| FileError::Io {
            action,
            path,
            source,
        }
    }
}

/// What to do with files that the user made or changed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Replace {
    /// Refuse, and write nothing.
    OnlyOurs,
    /// Replace them, because the user said so.
    Everything,
}

/// One file to write into a folder.
#[derive(Clone, Copy, Debug)]
pub struct Output<'a> {
    /// File name without folders.
    pub name: &'a str,
    pub bytes: &'a [u8],
}

/// Reads a file of at most `limit` bytes; a larger one is refused before reading.
///
/// # Errors
/// Too large, missing, unreadable.
pub fn read_limited(path: &Path, limit: u64) -> Result<Vec<u8>, FileError> {
    let file = File::open(path).map_err(FileError::io("open", path))?;
    let metadata = file.metadata().map_err(FileError::io("read", path))?;
    if metadata.is_dir() {
        return Err(FileError::NotAFile {
            path: path.to_owned(),
        });
    }
    let too_large = || FileError::TooLarge {
        path: path.to_owned(),
        limit,
    };
    if metadata.len() > limit {
        return Err(too_large());
    }
    // A device or a file that grows does not tell its size beforehand.
    let mut bytes = Vec::new();
    file.take(limit.saturating_add(1))
        .read_to_end(&mut bytes)
        .map_err(FileError::io("read", path))?;
    if u64::try_from(bytes.len()).is_ok_and(|length| length <= limit) {
        Ok(bytes)
    } else {
        Err(too_large())
    }
}

/// Writes a file whole or not at all, through a symbolic link to its target.
///
/// # Errors
/// Anything that keeps the file from being written; the old file then stands untouched.
pub fn write_whole(path: &Path, bytes: &[u8]) -> Result<(), FileError> {
    Target::of(path)?.write(bytes)
}

/// Writes a set of files into a folder, which is made where it is missing, and records their hashes there.
///
/// # Errors
/// [`FileError::NotOurs`] before anything is written; otherwise what kept a file from being written.
pub fn write_outputs(
    folder: &Path,
    outputs: &[Output<'_>],
    replace: Replace,
) -> Result<(), FileError> {
    for output in outputs {
        check_name(output.name)?;
    }
    fs::create_dir_all(folder).map_err(FileError::io("make the folder", folder))?;
    let manifest = Manifest::read(folder)?;
    let mut writes = Vec::new();
    let mut not_ours = Vec::new();
    for output in outputs {
        let target = Target::of(&folder.join(output.name))?;
        if replace == Replace::OnlyOurs && target.differs_from_ours(&manifest, output)? {
            not_ours.push(folder.join(output.name));
        }
        writes.push((target, *output));
    }
    if !not_ours.is_empty() {
        return Err(FileError::NotOurs { paths: not_ours });
    }
    write_recorded(manifest, &writes)
}

/// Saves a document. A file there that this program did not write, or that was changed since, is kept beside it with
/// `.bak` after its name (`.bak2`, `.bak3` where those are taken); its path is returned.
///
/// # Errors
/// Anything that keeps the backup or the document from being written; the old file then stands untouched.
pub fn save_keeping_backup(path: &Path, bytes: &[u8]) -> Result<Option<PathBuf>, FileError> {
    let target = Target::of(path)?;
    let name = target.name().to_string_lossy().into_owned();
    let output = Output { name: &name, bytes };
    let manifest = Manifest::read(target.folder())?;
    let backup = if target.differs_from_ours(&manifest, &output)? {
        Some(target.back_up()?)
    } else {
        None
    };
    write_recorded(manifest, &[(target, output)])?;
    Ok(backup)
}

/// Writes files and their hashes in an order that leaves no file of ours unrecorded after a crash: first the list with old
/// and new hashes, then the files, then the list without the old ones.
fn write_recorded(
    mut manifest: Manifest,
    writes: &[(Target, Output<'_>)],
) -> Result<(), FileError> {
    for (_, output) in writes {
        manifest.add(output);
    }
    manifest.write()?;
    for (target, output) in writes {
        target.write(output.bytes)?;
    }
    for (_, output) in writes {
        manifest.forget_others(output);
    }
    manifest.write()
}

fn check_name(name: &str) -> Result<(), FileError> {
    let plain = Path::new(name).file_name() == Some(OsStr::new(name));
    if plain && name != MANIFEST_NAME && !name.contains(['/', '\\', '\n', '\r', '\0']) {
        Ok(())
    } else {
        Err(FileError::BadName {
            name: name.to_owned(),
        })
    }
}

/// Where bytes really go: the end of the chain of links.
#[derive(Debug)]
struct Target {
    path: PathBuf,
    existing: Option<Metadata>,
}

impl Target {
    fn of(path: &Path) -> Result<Self, FileError> {
        let named = path.to_owned();
        if path.file_name().is_none() {
            return Err(FileError::NotAFile { path: named });
        }
        let link = match fs::symlink_metadata(path) {
            Ok(metadata) => metadata,
            Err(error) if error.kind() == ErrorKind::NotFound => {
                return Ok(Target {
                    path: named,
                    existing: None,
                });
            }
            Err(error) => return Err(FileError::io("look at", path)(error)),
        };
        let (real, metadata) = if link.is_symlink() {
            let real = match fs::canonicalize(path) {
                Err(error) if error.kind() == ErrorKind::NotFound => {
                    return Err(FileError::DanglingLink { path: named });
                }
                other => other.map_err(FileError::io("follow the link", path))?,
            };
            let metadata = fs::metadata(&real).map_err(FileError::io("look at", &real))?;
            (real, metadata)
        } else {
            (named.clone(), link)
        };
        if !metadata.is_file() {
            Err(FileError::NotAFile { path: named })
        } else if metadata.permissions().readonly() {
            Err(FileError::WriteProtected { path: named })
        } else {
            Ok(Target {
                path: real,
                existing: Some(metadata),
            })
        }
    }

    fn folder(&self) -> &Path {
        match self.path.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent,
            _ => Path::new("."),
        }
    }

    fn name(&self) -> &OsStr {
        self.path.file_name().unwrap_or_default()
    }

    /// Whether a file stands there that the program neither wrote nor is about to write the same.
    fn differs_from_ours(
        &self,
        manifest: &Manifest,
        output: &Output<'_>,
    ) -> Result<bool, FileError> {
        if self.existing.is_none() {
            return Ok(false);
        }
        let mut hasher = Sha256::new();
        File::open(&self.path)
            .and_then(|mut file| io::copy(&mut file, &mut hasher))
            .map_err(FileError::io("read", &self.path))?;
        let found = hex(&hasher.finalize());
        Ok(found != hash(output.bytes) && !manifest.lists(output.name, &found))
    }

    fn write(&self, bytes: &[u8]) -> Result<(), FileError> {
        let (mut file, temporary) = create_beside(self)?;
        let written = file
            .write_all(bytes)
            .and_then(|()| match &self.existing {
                Some(metadata) => file.set_permissions(metadata.permissions()),
                None => Ok(()),
            })
            .and_then(|()| file.sync_all());
        drop(file);
        if let Err(error) = written.and_then(|()| fs::rename(&temporary, &self.path)) {
            // The first error is the one to report; what is left behind is only the temporary file.
            let _ = fs::remove_file(&temporary);
            return Err(FileError::io("write", &self.path)(error));
        }
        // Not every system lets a folder be opened and forced to the disk; the file itself is whole either way.
        if let Ok(folder) = File::open(self.folder()) {
            let _ = folder.sync_all();
        }
        Ok(())
    }

    /// Copies the file to the first free name with `.bak` after it.
    fn back_up(&self) -> Result<PathBuf, FileError> {
        let mut bytes = Vec::new();
        File::open(&self.path)
            .and_then(|mut file| file.read_to_end(&mut bytes))
            .map_err(FileError::io("read", &self.path))?;
        for number in 1..=NAME_ATTEMPTS {
            let mut name = OsString::from(self.name());
            name.push(".bak");
            if number > 1 {
                name.push(number.to_string());
            }
            let path = self.folder().join(name);
            // Claims the name, so that nothing is overwritten; then the bytes go there whole.
            match OpenOptions::new().write(true).create_new(true).open(&path) {
                Ok(_) => {}
                Err(error) if error.kind() == ErrorKind::AlreadyExists => continue,
                Err(error) => return Err(FileError::io("write", &path)(error)),
            }
            let backup = Target {
                existing: self.existing.clone(),
                path: path.clone(),
            };
            return match backup.write(&bytes) {
                Ok(()) => Ok(path),
                Err(error) => {
                    let _ = fs::remove_file(&path);
                    Err(error)
                }
            };
        }
        Err(FileError::NoFreeName {
            what: "backup",
            path: self.path.clone(),
        })
    }
}

/// A new, empty file in the target's folder.
fn create_beside(target: &Target) -> Result<(File, PathBuf), FileError> {
    static COUNTER: AtomicU32 = AtomicU32::new(0);
    for _ in 0..NAME_ATTEMPTS {
        let number = COUNTER.fetch_add(1, Ordering::Relaxed);
        let name = format!(".loopwright-{}-{number}.part", std::process::id());
        let path = target.folder().join(name);
        match OpenOptions::new().write(true).create_new(true).open(&path) {
            Ok(file) => return Ok((file, path)),
            Err(error) if error.kind() == ErrorKind::AlreadyExists => {}
            Err(error) => return Err(FileError::io("write", &target.path)(error)),
        }
    }
    Err(FileError::NoFreeName {
        what: "temporary file",
        path: target.path.clone(),
    })
}

/// The list of hashes of one folder.
#[derive(Debug)]
struct Manifest {
    path: PathBuf,
    /// Name and hash. Lines that cannot be read are left out: their files then count as the user's.
    entries: BTreeSet<(String, String)>,
}

impl Manifest {
    fn read(folder: &Path) -> Result<Self, FileError> {
        let path = folder.join(MANIFEST_NAME);
        let bytes = match read_limited(&path, MANIFEST_LIMIT) {
            Err(FileError::Io { source, .. }) if source.kind() == ErrorKind::NotFound => Vec::new(),
            other => other?,
        };
        let entries = String::from_utf8_lossy(&bytes)
            .lines()
            .filter_map(|line| {
                let (hash, name) = line.split_once("  ")?;
                let is_hash = hash.len() == 64 && hash.bytes().all(|byte| byte.is_ascii_hexdigit());
                is_hash.then(|| (name.to_owned(), hash.to_ascii_lowercase()))
            })
            .collect();
        Ok(Manifest { path, entries })
    }

    fn lists(&self, name: &str, hash: &str) -> bool {
        self.entries.contains(&(listed_name(name), hash.to_owned()))
    }

    fn add(&mut self, output: &Output<'_>) {
        self.entries
            .insert((listed_name(output.name), hash(output.bytes)));
    }

    fn forget_others(&mut self, output: &Output<'_>) {
        let (name, current) = (listed_name(output.name), hash(output.bytes));
        self.entries
            .retain(|(listed, hash)| *listed != name || *hash == current);
    }

    fn write(&self) -> Result<(), FileError> {
        let mut text = MANIFEST_HEAD.to_owned();
        for (name, hash) in &self.entries {
            text.push_str(&format!("{hash}  {name}\n"));
        }
        write_whole(&self.path, text.as_bytes())
    }
}

/// A name as it stands on one line of the list; a line break in it would end the line.
fn listed_name(name: &str) -> String {
    name.replace(['\n', '\r'], "?")
}

fn hash(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}
