//! Files written beside their place and renamed when whole: nothing half-written ever bears the final name.

use std::ffi::OsString;
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// Why a file cannot be written.
#[derive(Debug, thiserror::Error)]
pub enum WriteError {
    /// The folder is not there.
    #[error("{}: the folder {} does not exist; create it, or set another output folder", path.display(), folder.display())]
    NoFolder {
        /// The file that was to be written.
        path: PathBuf,
        /// Its folder.
        folder: PathBuf,
    },
    /// Something that is no file stands in the place.
    #[error("{}: a folder stands in the place of the file; expected a free name", path.display())]
    IsFolder {
        /// The place.
        path: PathBuf,
    },
    /// No new file can be made in the folder.
    #[error("{}: no file can be written in {}; expected a folder with write permission", path.display(), folder.display())]
    Create {
        /// The file that was to be written.
        path: PathBuf,
        /// Its folder.
        folder: PathBuf,
        /// What the system says.
        #[source]
        source: io::Error,
    },
    /// Writing failed on the way.
    #[error("{}: cannot be written ({}); an earlier file of that name is untouched", path.display(), cause(source))]
    Write {
        /// The file that was to be written.
        path: PathBuf,
        /// What the system says.
        #[source]
        source: io::Error,
    },
}

/// A short reason for the common cases.
fn cause(error: &io::Error) -> &'static str {
    match error.kind() {
        io::ErrorKind::StorageFull => "the disk is full",
        io::ErrorKind::QuotaExceeded => "the disk quota is used up",
        io::ErrorKind::FileTooLarge => "the file is larger than the system allows",
        io::ErrorKind::PermissionDenied => "no permission",
        io::ErrorKind::ReadOnlyFilesystem => "the file system is read-only",
        _ => "the system refused",
    }
}

/// What a killed run leaves is removed when the same file is written again; younger files may belong to a running program.
const LEFTOVER_AGE: std::time::Duration = std::time::Duration::from_hours(24);

/// Removes hidden parts of the same file that are older than a day. Failures do not matter: they cost a little disk.
fn remove_leftovers(folder: &Path, prefix: &str) {
    for entry in std::fs::read_dir(folder).into_iter().flatten().flatten() {
        let name = entry.file_name();
        let name = name.to_string_lossy();
        let old = || {
            entry
                .metadata()
                .and_then(|data| data.modified())
                .is_ok_and(|at| at.elapsed().is_ok_and(|age| age > LEFTOVER_AGE))
        };
        if name.starts_with(prefix) && name.ends_with(".part") && old() {
            std::fs::remove_file(entry.path()).ok();
        }
    }
}

/// A file on its way: bytes go to a hidden file in the same folder, `finish` gives it its name.
#[derive(Debug)]
pub struct ReplaceFile {
    path: PathBuf,
    folder: PathBuf,
    file: NamedTempFile,
}

impl ReplaceFile {
    /// Begins a file that will replace whatever bears this name.
    ///
    /// # Errors
    /// When the folder is missing or not writable, or when the place is a folder.
    pub fn create(path: &Path) -> Result<Self, WriteError> {
        let folder = match path.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
            _ => PathBuf::from("."),
        };
        if !folder.is_dir() {
            return Err(WriteError::NoFolder { path: path.to_owned(), folder });
        }
        if path.is_dir() {
            return Err(WriteError::IsFolder { path: path.to_owned() });
        }
        let mut prefix = OsString::from(".");
        prefix.push(path.file_name().unwrap_or_default());
        prefix.push(".");
        remove_leftovers(&folder, &prefix.to_string_lossy());
        let mut builder = tempfile::Builder::new();
        builder.prefix(&prefix).suffix(".part");
        #[cfg(unix)]
        builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
        let file = builder.tempfile_in(&folder).map_err(|source| WriteError::Create {
            path: path.to_owned(),
            folder: folder.clone(),
            source,
        })?;
        Ok(Self { path: path.to_owned(), folder, file })
    }

    /// The final name.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Brings the bytes to the disk and gives the file its name.
    ///
    /// # Errors
    /// When the disk cannot take it; then nothing bears the name that did not before.
    pub fn finish(mut self) -> Result<(), WriteError> {
        let failed = |source| WriteError::Write { path: self.path.clone(), source };
        self.file.flush().map_err(failed)?;
        self.file.as_file().sync_all().map_err(failed)?;
        let Self { path, folder, file } = self;
        file.persist(&path).map_err(|error| WriteError::Write { path: path.clone(), source: error.error })?;
        // The new name itself must survive a power cut too; not every system lets a folder be synchronised.
        if let Ok(folder) = std::fs::File::open(folder) {
            folder.sync_all().ok();
        }
        Ok(())
    }
}

impl Write for ReplaceFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.file.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.file.flush()
    }
}

/// Writes a whole small file in this way.
///
/// # Errors
/// As `ReplaceFile`.
pub fn replace_with(path: &Path, bytes: &[u8]) -> Result<(), WriteError> {
    let mut file = ReplaceFile::create(path)?;
    file.write_all(bytes).map_err(|source| WriteError::Write { path: path.to_owned(), source })?;
    file.finish()
}
