//! Result folder: whole or absent.
//!
//! Everything is written into a hidden sibling folder, flushed to disk, and renamed into place at
//! the very end. If anything goes wrong before that, the sibling is removed and nothing that
//! existed before has changed.

use std::fs::{self, File};
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use super::folder_error::{FolderError, failed};

/// File by which a result folder is recognised.
pub(super) const MARK: &str = "run.json";

/// A result folder in the making.
#[derive(Debug)]
pub struct ResultFolder {
    target: PathBuf,
    parent: PathBuf,
    staging: tempfile::TempDir,
    replace: bool,
    /// Parent folders that had to be made, outermost first.
    made: MadeFolders,
}

/// Folders to be removed again if nothing comes of the result.
#[derive(Debug, Default)]
struct MadeFolders(Vec<PathBuf>);

impl Drop for MadeFolders {
    fn drop(&mut self) {
        for folder in self.0.iter().rev() {
            // A folder that is no longer empty is somebody else's by now and stays.
            let _ = fs::remove_dir(folder);
        }
    }
}

impl ResultFolder {
    /// Begins a result folder at `target`; missing parents are made. With `force`, a result
    /// folder that exists is replaced at the end.
    ///
    /// # Errors
    /// If something is in the way (see [`FolderError`]) or the parent cannot be written to.
    pub fn begin(target: &Path, force: bool) -> Result<Self, FolderError> {
        // A link is followed, so that the folder it names is replaced and not the link.
        let target = target.canonicalize().unwrap_or_else(|_| target.to_owned());
        let no_name = || FolderError::NoName {
            path: target.clone(),
        };
        let name = target
            .file_name()
            .ok_or_else(no_name)?
            .to_string_lossy()
            .into_owned();
        let parent = match target.parent() {
            Some(parent) if parent.as_os_str().is_empty() => PathBuf::from("."),
            Some(parent) => parent.to_owned(),
            None => return Err(no_name()),
        };
        let replace = check_place(&target, force)?;
        let unwritable = |source| FolderError::UnwritableParent {
            path: parent.clone(),
            source,
        };
        let made = make_parents(&parent).map_err(unwritable)?;
        let staging = staging_folder(&parent, &name).map_err(|source| match source.kind() {
            io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded => FolderError::FullDisk {
                path: parent.clone(),
            },
            _ => unwritable(source),
        })?;
        Ok(Self {
            target,
            parent,
            staging,
            replace,
            made,
        })
    }

    /// Writes one file. `name` may have folders in it, such as `figures/bias.svg`.
    ///
    /// # Errors
    /// If the file cannot be written.
    pub fn write(&self, name: &str, contents: &[u8]) -> Result<(), FolderError> {
        let mut file = self.create(name)?;
        let path = self.target.join(name);
        file.write_all(contents)
            .and_then(|()| file.sync_all())
            .map_err(|e| failed(&path, e))
    }

    /// Opens a file to be written bit by bit; it is flushed to disk by [`Self::commit`].
    ///
    /// # Errors
    /// If the file cannot be created.
    pub fn create(&self, name: &str) -> Result<File, FolderError> {
        let path = self.staging.path().join(name);
        let shown = self.target.join(name);
        if let Some(folder) = path.parent() {
            fs::create_dir_all(folder).map_err(|e| failed(&shown, e))?;
        }
        File::create(&path).map_err(|e| failed(&shown, e))
    }

    /// Flushes everything to disk and renames the folder into place.
    ///
    /// # Errors
    /// If flushing or renaming fails; a folder that was to be replaced is then back in place.
    pub fn commit(self) -> Result<PathBuf, FolderError> {
        let Self {
            target,
            parent,
            staging,
            replace,
            mut made,
        } = self;
        sync_tree(staging.path()).map_err(|e| failed(&target, e))?;
        let renamed = if replace {
            // The old folder moves into a sibling that is deleted with everything in it.
            let aside = tempfile::Builder::new()
                .prefix(".replaced-")
                .suffix(".tmp")
                .tempdir_in(&parent)
                .map_err(|e| failed(&target, e))?;
            let old = aside.path().join("old");
            fs::rename(&target, &old).map_err(|e| failed(&target, e))?;
            fs::rename(staging.path(), &target).inspect_err(|_| {
                if fs::rename(&old, &target).is_err() {
                    // Not deleting it is all that is left to do for the old result.
                    let _ = aside.keep();
                }
            })
        } else {
            // An empty folder may stand here. It is removed first, because not every system
            // renames onto it; if it is not empty by now, this fails and the rename tells why.
            let _ = fs::remove_dir(&target);
            fs::rename(staging.path(), &target)
        };
        renamed.map_err(|e| failed(&target, e))?;
        // The staging path no longer exists; forget it rather than have it deleted.
        let _ = staging.keep();
        made.0.clear();
        // The result is in place; a parent that cannot be flushed is no reason to call it failed.
        let _ = sync_folder(&parent);
        Ok(target)
    }
}

/// Whether an old result folder stands at `target` and is to be replaced.
fn check_place(target: &Path, force: bool) -> Result<bool, FolderError> {
    let path = target.to_owned();
    match fs::symlink_metadata(target) {
        Err(_) => return Ok(false),
        Ok(found) if !found.is_dir() => return Err(FolderError::FileInTheWay { path }),
        Ok(_) => {}
    }
    if std::env::current_dir().is_ok_and(|here| here == path) {
        return Err(FolderError::NoName { path });
    }
    let unreadable = |source| FolderError::Unwritable {
        path: path.clone(),
        source,
    };
    if fs::read_dir(target).map_err(unreadable)?.next().is_none() {
        return Ok(false);
    }
    if !force {
        return Err(FolderError::NotEmpty { path });
    }
    if !target.join(MARK).is_file() {
        return Err(FolderError::NotAResultFolder { path });
    }
    Ok(true)
}

fn make_parents(parent: &Path) -> io::Result<MadeFolders> {
    let missing: Vec<&Path> = parent
        .ancestors()
        .take_while(|folder| !folder.as_os_str().is_empty() && !folder.exists())
        .collect();
    let mut made = MadeFolders::default();
    for folder in missing.into_iter().rev() {
        fs::create_dir(folder)?;
        made.0.push(folder.to_owned());
    }
    Ok(made)
}

fn staging_folder(parent: &Path, name: &str) -> io::Result<tempfile::TempDir> {
    let prefix = format!(".{name}-");
    let mut builder = tempfile::Builder::new();
    builder.prefix(&prefix).suffix(".tmp");
    // Temporary folders are private by default; a result is as readable as any other folder.
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(fs::Permissions::from_mode(0o777));
    }
    builder.tempdir_in(parent)
}

fn sync_tree(folder: &Path) -> io::Result<()> {
    for entry in fs::read_dir(folder)? {
        let path = entry?.path();
        if path.is_dir() {
            sync_tree(&path)?;
        } else {
            // Opened for writing because not every system flushes a file opened for reading.
            fs::OpenOptions::new()
                .append(true)
                .open(&path)?
                .sync_all()?;
        }
    }
    sync_folder(folder)
}

#[cfg(unix)]
fn sync_folder(folder: &Path) -> io::Result<()> {
    File::open(folder)?.sync_all()
}

/// Other systems do not open folders; renaming is as safe as they make it.
#[cfg(not(unix))]
fn sync_folder(_folder: &Path) -> io::Result<()> {
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let entries = fs::read_dir(folder).unwrap();
        let mut names: Vec<String> = entries
            .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    fn write(target: &Path, force: bool) -> Result<PathBuf, FolderError> {
        let folder = ResultFolder::begin(target, force)?;
        folder.write(MARK, b"{}")?;
        folder.write("figures/coverage.svg", b"<svg/>")?;
        folder.commit()
    }

    #[test]
    fn a_result_is_whole_and_alone() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("deep/er/result");
        write(&target, false).unwrap();
        assert_eq!(names(&target), ["figures", "run.json"]);
        assert_eq!(names(&home.path().join("deep/er")), ["result"]);
        assert_eq!(
            fs::read_to_string(target.join("figures/coverage.svg")).unwrap(),
            "<svg/>"
        );
    }

    #[test]
    fn a_failure_leaves_nothing_behind() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("deep/result");
        let folder = ResultFolder::begin(&target, false).unwrap();
        folder.write("measures.csv", b"half").unwrap();
        // A file cannot be a folder at the same time.
        let error = folder.write("measures.csv/inside", b"").unwrap_err();
        assert!(matches!(error, FolderError::Unwritable { .. }), "{error}");
        drop(folder);
        assert!(names(home.path()).is_empty());
    }

    #[test]
    fn an_unfinished_replacement_keeps_the_old_result() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("result");
        write(&target, false).unwrap();
        let folder = ResultFolder::begin(&target, true).unwrap();
        folder.write("run.json", b"half").unwrap();
        drop(folder);
        assert_eq!(names(home.path()), ["result"]);
        assert_eq!(fs::read(target.join(MARK)).unwrap(), b"{}");
    }

    #[test]
    fn an_old_result_is_replaced_only_by_force() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("result");
        write(&target, false).unwrap();
        fs::write(target.join("stale.txt"), "old").unwrap();
        assert!(matches!(
            write(&target, false),
            Err(FolderError::NotEmpty { .. })
        ));
        assert!(target.join("stale.txt").exists());
        write(&target, true).unwrap();
        assert!(!target.join("stale.txt").exists());
        assert_eq!(names(home.path()), ["result"]);
    }

    #[test]
    fn only_a_result_folder_is_replaced() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("thesis");
        fs::create_dir(&target).unwrap();
        // An empty folder is as good as none.
        write(&target, false).unwrap();
        fs::remove_file(target.join("run.json")).unwrap();
        assert!(matches!(
            write(&target, true),
            Err(FolderError::NotAResultFolder { .. })
        ));
        let file = home.path().join("file");
        fs::write(&file, "mine").unwrap();
        assert!(matches!(
            write(&file, true),
            Err(FolderError::FileInTheWay { .. })
        ));
        assert_eq!(fs::read_to_string(&file).unwrap(), "mine");
        let below = write(&file.join("result"), false);
        assert!(
            matches!(below, Err(FolderError::UnwritableParent { .. })),
            "{below:?}"
        );
        assert!(matches!(
            write(Path::new("/"), true),
            Err(FolderError::NoName { .. })
        ));
        assert!(matches!(
            write(Path::new("."), true),
            Err(FolderError::NoName { .. })
        ));
    }

    #[test]
    fn a_full_disk_is_called_by_its_name() {
        let error = failed(
            Path::new("result"),
            io::Error::from(io::ErrorKind::StorageFull),
        );
        assert!(error.to_string().contains("free some space"), "{error}");
    }

    #[cfg(unix)]
    #[test]
    fn a_result_is_as_readable_as_other_folders() {
        use std::os::unix::fs::PermissionsExt as _;
        let home = tempfile::tempdir().unwrap();
        let plain = home.path().join("plain");
        fs::create_dir(&plain).unwrap();
        let target = write(&home.path().join("result"), false).unwrap();
        let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
        assert_eq!(mode(&plain), mode(&target));
    }
}
