//! Writing beside, then renaming: an existing output is replaced as a whole or left untouched.
use crate::error::{OutputProblem, SurveyError};
use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use tempfile::{Builder, NamedTempFile, TempDir};

const PREFIX: &str = ".hillpull-";

/// Checks that a file can be written at `path`, leaving nothing behind.
pub(crate) fn check_writable(path: &Path) -> Result<(), SurveyError> {
    let problem = |problem| {
        Err(SurveyError::Output {
            path: path.to_owned(),
            problem,
        })
    };
    match fs::metadata(path) {
        Ok(there) if !there.is_file() => return problem(OutputProblem::NotAFile),
        Ok(there) if there.permissions().readonly() => return problem(OutputProblem::ReadOnly),
        _ => {}
    }
    let folder = folder_of(path);
    if !folder.is_dir() {
        return problem(OutputProblem::NoFolder { folder });
    }
    // A file without a name: gone when closed, never seen.
    tempfile::tempfile_in(&folder).map_err(|e| folder_error(&folder, e))?;
    Ok(())
}

fn folder_of(path: &Path) -> PathBuf {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
        _ => PathBuf::from("."),
    }
}

fn folder_error(folder: &Path, source: io::Error) -> SurveyError {
    SurveyError::Io {
        action: "write into the folder",
        path: folder.to_owned(),
        source,
    }
}

fn write_error(path: &Path, source: io::Error) -> SurveyError {
    SurveyError::Io {
        action: "write",
        path: path.to_owned(),
        source,
    }
}

/// The file that a symbolic link leads to, so that renaming replaces that file and not the link.
fn real_target(path: &Path) -> PathBuf {
    fs::canonicalize(path).unwrap_or_else(|_| path.to_owned())
}

/// A file written completely, waiting beside its place.
#[derive(Debug)]
pub(crate) struct Waiting {
    file: NamedTempFile,
    target: PathBuf,
}

impl Waiting {
    /// Writes a file beside `target` and flushes it to the disk.
    pub(crate) fn write(
        target: &Path,
        fill: impl FnOnce(&mut dyn Write) -> io::Result<()>,
    ) -> Result<Self, SurveyError> {
        let real = real_target(target);
        let folder = folder_of(&real);
        let mut builder = Builder::new();
        builder.prefix(PREFIX);
        // Temporary files are private by default; an output has the permissions of any new file.
        #[cfg(unix)]
        builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
        let mut file = builder
            .tempfile_in(&folder)
            .map_err(|e| folder_error(&folder, e))?;
        let mut out = BufWriter::with_capacity(1 << 16, file.as_file_mut());
        fill(&mut out)
            .and_then(|()| out.flush())
            .map_err(|e| write_error(target, e))?;
        drop(out);
        file.as_file()
            .sync_all()
            .map_err(|e| write_error(target, e))?;
        keep_permissions(file.path(), &real);
        Ok(Self { file, target: real })
    }

    /// Puts the file in its place.
    pub(crate) fn put(self) -> Result<(), SurveyError> {
        let target = self.target;
        self.file
            .persist(&target)
            .map_err(|e| write_error(&target, e.error))?;
        Ok(())
    }
}

/// A folder beside the target, for writers that want a path and make files of their own beside it.
#[derive(Debug)]
pub(crate) struct WaitingFolder {
    folder: TempDir,
    target: PathBuf,
}

impl WaitingFolder {
    pub(crate) fn new(target: &Path) -> Result<Self, SurveyError> {
        let target = real_target(target);
        let parent = folder_of(&target);
        let folder = Builder::new()
            .prefix(PREFIX)
            .tempdir_in(&parent)
            .map_err(|e| folder_error(&parent, e))?;
        Ok(Self { folder, target })
    }

    /// Where to write.
    pub(crate) fn path(&self) -> PathBuf {
        self.folder
            .path()
            .join(self.target.file_name().unwrap_or_else(|| "output".as_ref()))
    }

    /// Flushes the file to the disk and puts it in its place.
    pub(crate) fn put(self) -> Result<(), SurveyError> {
        let path = self.path();
        let put = || {
            File::open(&path)?.sync_all()?;
            keep_permissions(&path, &self.target);
            fs::rename(&path, &self.target)?;
            self.folder.close()
        };
        put().map_err(|e| write_error(&self.target, e))
    }
}

/// Gives a new file the permissions of the one it replaces.
fn keep_permissions(new: &Path, old: &Path) {
    if let Ok(there) = fs::metadata(old) {
        // Not owning the old file is no reason to lose the results.
        let _ = fs::set_permissions(new, there.permissions());
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(folder)
            .unwrap()
            .map(|e| e.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }

    #[test]
    fn an_error_leaves_the_old_file_and_no_litter() {
        let dir = tempfile::tempdir().unwrap();
        let path = dir.path().join("a.csv");
        fs::write(&path, "old").unwrap();
        let error = Waiting::write(&path, |out| {
            out.write_all(b"half")?;
            Err(io::Error::from(io::ErrorKind::StorageFull))
        })
        .unwrap_err();
        assert!(error.hint().unwrap().contains("space"), "{error}");
        assert_eq!(fs::read_to_string(&path).unwrap(), "old");
        assert_eq!(names(dir.path()), ["a.csv"]);
    }

    #[test]
    fn waiting_is_not_seen_until_put() {
        let dir = tempfile::tempdir().unwrap();
        let path = dir.path().join("a.csv");
        fs::write(&path, "old").unwrap();
        let waiting = Waiting::write(&path, |out| out.write_all(b"new")).unwrap();
        assert_eq!(fs::read_to_string(&path).unwrap(), "old");
        waiting.put().unwrap();
        assert_eq!(fs::read_to_string(&path).unwrap(), "new");
        assert_eq!(names(dir.path()), ["a.csv"]);
    }

    #[test]
    fn checking_leaves_nothing() {
        let dir = tempfile::tempdir().unwrap();
        check_writable(&dir.path().join("new.csv")).unwrap();
        assert!(names(dir.path()).is_empty());
        let nowhere = check_writable(&dir.path().join("no/new.csv")).unwrap_err();
        assert!(matches!(
            nowhere,
            SurveyError::Output {
                problem: OutputProblem::NoFolder { .. },
                ..
            }
        ));
        let folder = check_writable(dir.path()).unwrap_err();
        assert!(matches!(
            folder,
            SurveyError::Output {
                problem: OutputProblem::NotAFile,
                ..
            }
        ));
    }

    #[cfg(unix)]
    #[test]
    fn permissions_and_links_are_kept() {
        use std::os::unix::fs::PermissionsExt;
        let dir = tempfile::tempdir().unwrap();
        let (path, link) = (dir.path().join("a.csv"), dir.path().join("link.csv"));
        fs::write(&path, "old").unwrap();
        fs::set_permissions(&path, fs::Permissions::from_mode(0o640)).unwrap();
        std::os::unix::fs::symlink(&path, &link).unwrap();
        Waiting::write(&link, |out| out.write_all(b"new"))
            .unwrap()
            .put()
            .unwrap();
        assert!(
            fs::symlink_metadata(&link)
                .unwrap()
                .file_type()
                .is_symlink()
        );
        assert_eq!(fs::read_to_string(&path).unwrap(), "new");
        assert_eq!(
            fs::metadata(&path).unwrap().permissions().mode() & 0o777,
            0o640
        );
        fs::set_permissions(&path, fs::Permissions::from_mode(0o440)).unwrap();
        let error = check_writable(&path).unwrap_err();
        assert!(matches!(
            error,
            SurveyError::Output {
                problem: OutputProblem::ReadOnly,
                ..
            }
        ));
    }
}
