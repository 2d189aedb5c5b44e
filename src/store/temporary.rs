//! A file that appears under its name only when it is complete: written as a
//! temporary in the same directory, synced, renamed, the directory synced.

use std::fs::{self, File};
use std::io;
use std::path::{Path, PathBuf};
use std::sync::OnceLock;

use tempfile::TempPath;

use super::StoreError;

/// The temporary; removed when dropped before [`Temporary::publish`].
#[derive(Debug)]
pub(super) struct Temporary {
    temporary: TempPath,
    target: PathBuf,
    force: bool,
}

impl Temporary {
    /// An empty file in the directory of `target`.
    pub fn create(target: &Path, force: bool) -> Result<Self, StoreError> {
        survive_file_size_limit();
        let target = check_target(target, force)?;
        let temporary = tempfile::Builder::new()
            .prefix(".shots-")
            .suffix(".h5.tmp")
            .permissions_of_new_files()
            .tempfile_in(directory_of(&target))
            .map_err(|error| StoreError::io("create a file in", directory_of(&target), error))?
            .into_temp_path();
        Ok(Temporary {
            temporary,
            target,
            force,
        })
    }

    /// Where to write.
    pub fn path(&self) -> &Path {
        &self.temporary
    }

    /// Makes the file permanent under its final name. An existing file is
    /// replaced only with force; where the name was taken in the meantime the
    /// finished file is kept beside it.
    pub fn publish(self) -> Result<(), StoreError> {
        let sync = File::open(&self.temporary).and_then(|file| file.sync_all());
        sync.map_err(|error| StoreError::io("write", &self.target, error))?;
        let taken = !self.force && fs::symlink_metadata(&self.target).is_ok();
        let renamed = if taken {
            Err(io::Error::from(io::ErrorKind::AlreadyExists))
        } else {
            fs::rename(&self.temporary, &self.target)
        };
        let directory = directory_of(&self.target).to_owned();
        match (renamed, self.temporary.keep()) {
            (Ok(()), _) => sync_directory(&directory),
            (Err(source), Ok(kept)) => Err(StoreError::Rename {
                path: self.target,
                kept,
                source,
            }),
            (Err(source), Err(_)) => Err(StoreError::io("rename", &self.target, source)),
        }
    }
}

/// The path to write to, links followed, or why it cannot be written.
fn check_target(target: &Path, force: bool) -> Result<PathBuf, StoreError> {
    let path = || target.to_owned();
    if target.file_name().is_none() {
        return Err(StoreError::NotAFile { path: path() });
    }
    let directory = directory_of(target);
    if !directory.is_dir() {
        return Err(StoreError::NoDirectory {
            path: path(),
            directory: directory.to_owned(),
        });
    }
    match fs::metadata(target) {
        Ok(found) if !found.is_file() => Err(StoreError::NotAFile { path: path() }),
        Ok(_) if !force => Err(StoreError::Exists { path: path() }),
        Ok(_) => fs::canonicalize(target).map_err(|error| StoreError::io("find", target, error)),
        Err(error) if error.kind() == io::ErrorKind::NotFound => {
            let dangling_link = fs::symlink_metadata(target).is_ok();
            if dangling_link && !force {
                return Err(StoreError::Exists { path: path() });
            }
            Ok(path())
        }
        Err(error) => Err(StoreError::io("look at", target, error)),
    }
}

/// The directory a path is in.
fn directory_of(path: &Path) -> &Path {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    }
}

/// Makes a rename in `directory` last. Where a directory cannot be opened or
/// synced (some network file systems) the rename itself has succeeded and that
/// is all there is to have.
fn sync_directory(directory: &Path) -> Result<(), StoreError> {
    if cfg!(unix)
        && let Ok(handle) = File::open(directory)
        && let Err(error) = handle.sync_all()
        && error.kind() != io::ErrorKind::InvalidInput
        && error.kind() != io::ErrorKind::Unsupported
    {
        return Err(StoreError::io("sync", directory, error));
    }
    Ok(())
}

/// Past a file-size limit the system sends a signal that by default ends the
/// program; with a handler in place the write fails with an error instead.
fn survive_file_size_limit() {
    static REGISTERED: OnceLock<()> = OnceLock::new();
    REGISTERED.get_or_init(|| {
        #[cfg(unix)]
        {
            let flag = std::sync::Arc::new(std::sync::atomic::AtomicBool::new(false));
            // Without the handler everything but the error message works as well.
            let _ = signal_hook::flag::register(signal_hook::consts::SIGXFSZ, flag);
        }
    });
}

/// Access rights of a new file: those the user's mask leaves, not the private
/// ones of a temporary.
trait NewFilePermissions {
    fn permissions_of_new_files(&mut self) -> &mut Self;
}

impl NewFilePermissions for tempfile::Builder<'_, '_> {
    #[cfg(unix)]
    fn permissions_of_new_files(&mut self) -> &mut Self {
        use std::os::unix::fs::PermissionsExt;
        self.permissions(fs::Permissions::from_mode(0o666))
    }

    #[cfg(not(unix))]
    fn permissions_of_new_files(&mut self) -> &mut Self {
        self
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn entries(directory: &Path) -> usize {
        fs::read_dir(directory).unwrap().count()
    }

    #[test]
    fn appears_only_when_published() {
        let folder = tempfile::tempdir().unwrap();
        let target = folder.path().join("a.h5");
        let file = Temporary::create(&target, false).unwrap();
        fs::write(file.path(), b"whole").unwrap();
        assert!(!target.exists());
        file.publish().unwrap();
        assert_eq!(fs::read(&target).unwrap(), b"whole");
        assert_eq!(entries(folder.path()), 1);
    }

    #[test]
    fn leaves_nothing_when_dropped() {
        let folder = tempfile::tempdir().unwrap();
        drop(Temporary::create(&folder.path().join("a.h5"), false).unwrap());
        assert_eq!(entries(folder.path()), 0);
    }

    #[test]
    fn keeps_the_work_when_the_name_was_taken() {
        let folder = tempfile::tempdir().unwrap();
        let target = folder.path().join("a.h5");
        let file = Temporary::create(&target, false).unwrap();
        fs::write(file.path(), b"mine").unwrap();
        fs::write(&target, b"theirs").unwrap();
        let Err(StoreError::Rename { kept, .. }) = file.publish() else {
            panic!("the other file must not be replaced");
        };
        assert_eq!(fs::read(kept).unwrap(), b"mine");
        assert_eq!(fs::read(target).unwrap(), b"theirs");
    }

    #[test]
    fn bad_targets_fail_at_once() {
        let folder = tempfile::tempdir().unwrap();
        let missing = folder.path().join("none").join("a.h5");
        assert!(matches!(
            Temporary::create(&missing, true),
            Err(StoreError::NoDirectory { .. })
        ));
        assert!(matches!(
            Temporary::create(folder.path(), true),
            Err(StoreError::NotAFile { .. })
        ));
        let taken = folder.path().join("taken.h5");
        fs::write(&taken, b"").unwrap();
        assert!(matches!(
            Temporary::create(&taken, false),
            Err(StoreError::Exists { .. })
        ));
        assert_eq!(entries(folder.path()), 1);
        if cfg!(target_os = "linux") {
            // A device must not be replaced by a file, whoever asks.
            assert!(matches!(
                Temporary::create(Path::new("/dev/full"), true),
                Err(StoreError::NotAFile { .. })
            ));
        }
    }
}
