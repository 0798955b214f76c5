//! Certificates in files: written entirely or not at all.
//!
//! The document goes into a temporary file beside its destination, is flushed to the disk and then
//! renamed. Whatever fails on the way, an older file of that name stays as it was and no temporary
//! file is left.

use super::Certificate;
use crate::error::Error;
use std::fs;
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// Largest certificate that is read, in bytes.
const MAX_BYTES: u64 = 64 << 20;

/// Checks, before a long computation, that a certificate can be written to `path`.
///
/// # Errors
/// [`Error::BadInput`] if `path` is not a place for a file or its directory refuses a new one.
pub fn check_writable(path: &Path) -> Result<(), Error> {
    let destination = destination(path)?;
    temporary_beside(&destination).map(drop).map_err(|error| {
        let wanted = format!("its directory refuses a new file ({}); give a path that can be written", plain(&error));
        Error::bad_input("certificate", path.display(), &wanted)
    })
}

impl Certificate {
    /// Writes the document to `path`, replacing an older one, entirely or not at all.
    ///
    /// # Errors
    /// [`Error::BadInput`] if `path` is not a place for a file, [`Error::File`] if writing fails.
    pub fn write(&self, path: &Path) -> Result<(), Error> {
        let destination = destination(path)?;
        let text = self.to_json()?;
        write_and_rename(&destination, text.as_bytes()).map_err(|error| failure("write", path, &error))
    }

    /// Reads a document from `path` with the checks of [`Certificate::from_json`].
    ///
    /// # Errors
    /// [`Error::File`] if the file cannot be read, otherwise as for [`Certificate::from_json`].
    pub fn read(path: &Path) -> Result<Certificate, Error> {
        Certificate::from_json(&text(path)?)
    }
}

/// The text of a file that should hold a certificate.
pub(super) fn text(path: &Path) -> Result<String, Error> {
    let mut text = String::new();
    let reading = fs::File::open(path).and_then(|file| file.take(MAX_BYTES).read_to_string(&mut text));
    reading.map_err(|error| failure("read", path, &error))?;
    Ok(text)
}

/// Where the file will be: a link is followed, and only ordinary files are replaced.
fn destination(path: &Path) -> Result<PathBuf, Error> {
    let refuse = |wanted: &str| Err(Error::bad_input("certificate", path.display(), wanted));
    match fs::metadata(path) {
        Ok(found) if found.is_dir() => return refuse("this is a directory; give the path of a file"),
        Ok(found) if !found.is_file() => return refuse("this is a device or pipe; give the path of a file"),
        Ok(found) if found.permissions().readonly() => {
            return refuse("this file is read-only; give a path that can be written");
        }
        Ok(_) => return fs::canonicalize(path).map_err(|error| failure("find", path, &error)),
        Err(error) if matches!(error.kind(), io::ErrorKind::NotFound | io::ErrorKind::NotADirectory) => {}
        // A name that is too long or contains a zero byte, a directory that may not be searched.
        Err(error) => return refuse(&format!("the system says: {}; give a path that can be written", plain(&error))),
    }
    let ends_in_name = path.file_name().is_some() && !path.as_os_str().as_encoded_bytes().ends_with(b"/");
    if !ends_in_name {
        return refuse("this has no file name at its end; give the path of a file");
    }
    if !directory(path).is_dir() {
        return refuse("its directory does not exist; give a path in an existing directory");
    }
    Ok(path.to_owned())
}

/// The directory that a path lies in.
fn directory(path: &Path) -> &Path {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    }
}

fn temporary_beside(destination: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".coneproof-").suffix(".part");
    #[cfg(unix)]
    {
        // Readable for others like any new file, within the limits of the process's mask.
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    builder.tempfile_in(directory(destination))
}

fn write_and_rename(destination: &Path, content: &[u8]) -> io::Result<()> {
    let mut file = temporary_beside(destination)?;
    if let Ok(older) = fs::metadata(destination) {
        file.as_file().set_permissions(older.permissions())?;
    }
    file.write_all(content)?;
    file.as_file().sync_all()?;
    file.persist(destination).map_err(|error| error.error)?;
    // The file is in place; flushing its directory entry is a courtesy that some systems refuse.
    if let Ok(directory) = fs::File::open(directory(destination)) {
        let _ = directory.sync_all();
    }
    Ok(())
}

fn failure(action: &str, path: &Path, error: &io::Error) -> Error {
    Error::file(action, path.display(), plain(error))
}

/// The reason in words, without the paths of temporary files.
fn plain(error: &io::Error) -> String {
    error.kind().to_string()
}
