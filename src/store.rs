//! Writing files whole or not at all.

use std::collections::BTreeMap;
use std::fs::{self, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// A file that could not be written; what was there before is unchanged.
#[derive(Debug, thiserror::Error)]
#[error("{path:?} cannot be written")]
pub struct StoreError {
    /// The file.
    pub path: PathBuf,
    /// What the system says.
    source: io::Error,
}

/// Writes a file in one step: whoever reads it finds the old content or the new, never a part.
///
/// A symbolic link keeps pointing where it points. What is not a plain file (a device, a named
/// pipe) is written to directly, for it must not be replaced.
///
/// # Errors
/// If the system does not let it be written.
pub fn write_whole(path: &Path, content: &[u8]) -> Result<(), StoreError> {
    let failed = |source| StoreError {
        path: path.to_owned(),
        source,
    };
    match fs::metadata(path) {
        Ok(known) if !known.is_file() => write_into(path, content).map_err(failed),
        // The target of a link takes the new content; a path that cannot be followed is new.
        Ok(_) => replace(&fs::canonicalize(path).map_err(failed)?, content).map_err(failed),
        Err(error) if error.kind() == io::ErrorKind::NotFound => {
            replace(path, content).map_err(failed)
        }
        Err(error) => Err(failed(error)),
    }
}

/// Writes the tables of a folder by name, each whole or not at all; the folder and folders in it
/// are made where they are missing.
///
/// # Errors
/// If the system does not let one be written; those before it are.
pub fn write_tables(folder: &Path, tables: &BTreeMap<String, String>) -> Result<(), StoreError> {
    for (name, text) in tables {
        let path = folder.join(name);
        if let Some(parent) = path.parent() {
            fs::create_dir_all(parent).map_err(|source| StoreError {
                path: parent.to_owned(),
                source,
            })?;
        }
        write_whole(&path, text.as_bytes())?;
    }
    Ok(())
}

fn write_into(path: &Path, content: &[u8]) -> io::Result<()> {
    OpenOptions::new()
        .write(true)
        .open(path)?
        .write_all(content)
}

fn replace(path: &Path, content: &[u8]) -> io::Result<()> {
    let folder = path
        .parent()
        .filter(|folder| !folder.as_os_str().is_empty())
        .unwrap_or(Path::new("."));
    let mut file = beside(path, folder)?;
    file.write_all(content)?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|error| error.error)?;
    Ok(())
}

/// A temporary file in the folder, with the permissions the finished file shall have.
fn beside(path: &Path, folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".linstock-");
    match fs::metadata(path) {
        Ok(old) => {
            let file = builder.tempfile_in(folder)?;
            file.as_file().set_permissions(old.permissions())?;
            Ok(file)
        }
        Err(_) => new_file(&mut builder, folder),
    }
}

#[cfg(unix)]
fn new_file(builder: &mut tempfile::Builder, folder: &Path) -> io::Result<NamedTempFile> {
    use std::os::unix::fs::PermissionsExt;
    // As for any new file; the mask of the user takes away from it.
    builder
        .permissions(fs::Permissions::from_mode(0o666))
        .tempfile_in(folder)
}

#[cfg(not(unix))]
fn new_file(builder: &mut tempfile::Builder, folder: &Path) -> io::Result<NamedTempFile> {
    builder.tempfile_in(folder)
}

#[cfg(test)]
mod tests {
    use super::*;

    type Outcome = Result<(), Box<dyn std::error::Error>>;

    #[test]
    fn files_are_replaced_whole_and_nothing_is_left_behind() -> Outcome {
        let folder = tempfile::tempdir()?;
        let path = folder.path().join("report.txt");
        write_whole(&path, b"first, and longer")?;
        write_whole(&path, b"second")?;
        assert_eq!(fs::read(&path)?, b"second");
        assert_eq!(fs::read_dir(folder.path())?.count(), 1);
        Ok(())
    }

    #[test]
    fn a_folder_that_is_not_there_is_an_error_that_names_the_file() -> Outcome {
        let folder = tempfile::tempdir()?;
        let path = folder.path().join("none").join("report.txt");
        let error = write_whole(&path, b"x").err().ok_or("was written")?;
        assert!(error.to_string().contains("report.txt"), "{error}");
        assert!(
            write_whole(folder.path(), b"x").is_err(),
            "a folder was written to"
        );
        Ok(())
    }

    #[cfg(unix)]
    #[test]
    fn links_and_devices_stay_what_they_are() -> Outcome {
        let folder = tempfile::tempdir()?;
        let (target, link) = (folder.path().join("target"), folder.path().join("link"));
        fs::write(&target, "old")?;
        std::os::unix::fs::symlink(&target, &link)?;
        write_whole(&link, b"new")?;
        assert!(fs::symlink_metadata(&link)?.is_symlink());
        assert_eq!(fs::read(&target)?, b"new");
        write_whole(Path::new("/dev/null"), b"x")?;
        assert!(!fs::metadata("/dev/null")?.is_file());
        Ok(())
    }
}
