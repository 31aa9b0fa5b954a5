//! What can keep a result folder from being written.

use std::io;
use std::path::{Path, PathBuf};

use super::CsvError;

/// Why a result folder could not be written.
#[derive(Debug, thiserror::Error)]
pub enum FolderError {
    /// A file stands where the folder should be.
    #[error("{} is a file, so no result folder can be written there; name another folder", path.display())]
    FileInTheWay {
        /// The file.
        path: PathBuf,
    },
    /// The folder exists and holds something.
    #[error("{} exists and is not empty; name another folder, or force its replacement", path.display())]
    NotEmpty {
        /// The folder.
        path: PathBuf,
    },
    /// The folder to be replaced was not written by this program.
    #[error(
        "{} holds no run.json, so it is not a result folder and is not replaced even by force; \
         name another folder, or empty this one by hand",
        path.display()
    )]
    NotAResultFolder {
        /// The folder.
        path: PathBuf,
    },
    /// The path has no last part, or is the folder that the program runs in.
    #[error("{} cannot be replaced by a result folder; name a folder inside it", path.display())]
    NoName {
        /// The path.
        path: PathBuf,
    },
    /// The parent folder cannot be written to.
    #[error(
        "{} cannot be written to ({source}); name a folder elsewhere, or change its permissions",
        path.display()
    )]
    UnwritableParent {
        /// The parent folder.
        path: PathBuf,
        /// What the system says.
        source: io::Error,
    },
    /// The disk or the quota is full.
    #[error(
        "no room is left on the disk while writing {}; free some space, or name a folder on \
         another disk. Nothing was left behind",
        path.display()
    )]
    FullDisk {
        /// What was being written.
        path: PathBuf,
    },
    /// Any other failure of the file system.
    #[error("{} cannot be written: {source}. Nothing was left behind", path.display())]
    Unwritable {
        /// What was being written.
        path: PathBuf,
        /// What the system says.
        source: io::Error,
    },
    /// A table could not be written.
    #[error(transparent)]
    Csv(#[from] CsvError),
    /// The run record could not be written as JSON.
    #[error("run.json cannot be written: {0}")]
    Json(#[from] serde_json::Error),
}

/// The error of a failed file operation; `path` is what the user knows, not the staging folder.
pub(super) fn failed(path: &Path, source: io::Error) -> FolderError {
    let path = path.to_owned();
    match source.kind() {
        io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded => FolderError::FullDisk { path },
        _ => FolderError::Unwritable { path, source },
    }
}
