//! Files written whole or not at all, and never over an input.

use std::io::Write;
use std::path::{Path, PathBuf};

/// Why an output could not be written.
#[derive(Debug, thiserror::Error)]
pub enum OutputError {
    #[error("{path} is an input of this run and is not overwritten")]
    IsInput { path: PathBuf },
    #[error("{path} cannot be written: there is no folder {folder}")]
    NoFolder { path: PathBuf, folder: PathBuf },
    #[error("{path} cannot be written: it is a folder")]
    IsFolder { path: PathBuf },
    #[error("{path} cannot be written: {source}")]
    Write {
        path: PathBuf,
        source: std::io::Error,
    },
}

/// Writes `text` to a temporary neighbour and moves it into place.
pub fn write_whole(path: &Path, text: &str, inputs: &[&Path]) -> Result<(), OutputError> {
    refuse(path, inputs)?;
    // Only the kind of failure is told: the rest names the temporary file.
    let failed = |source: std::io::Error| OutputError::Write {
        path: path.to_owned(),
        source: source.kind().into(),
    };
    let folder = folder_of(path);
    let mut file = tempfile::Builder::new()
        .prefix(".wellwright-")
        .tempfile_in(folder)
        .map_err(failed)?;
    file.write_all(text.as_bytes()).map_err(failed)?;
    file.as_file().sync_all().map_err(failed)?;
    allow_reading(file.as_file()).map_err(failed)?;
    file.persist(path).map_err(|error| failed(error.error))?;
    Ok(())
}

fn folder_of(path: &Path) -> &Path {
    match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    }
}

/// Refuses a path that cannot be written, or that names the same file as an input, also by another name.
pub fn refuse(path: &Path, inputs: &[&Path]) -> Result<(), OutputError> {
    let folder = folder_of(path);
    if !folder.is_dir() {
        return Err(OutputError::NoFolder {
            path: path.to_owned(),
            folder: folder.to_owned(),
        });
    }
    if path.is_dir() {
        return Err(OutputError::IsFolder {
            path: path.to_owned(),
        });
    }
    let same = |input: &Path| match (path.canonicalize(), input.canonicalize()) {
        (Ok(a), Ok(b)) => a == b,
        _ => path == input,
    };
    if inputs.iter().any(|input| same(input)) {
        Err(OutputError::IsInput {
            path: path.to_owned(),
        })
    } else {
        Ok(())
    }
}

/// A temporary file is private; what it becomes is a file like others.
#[cfg(unix)]
fn allow_reading(file: &std::fs::File) -> std::io::Result<()> {
    use std::os::unix::fs::PermissionsExt;
    file.set_permissions(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn allow_reading(_file: &std::fs::File) -> std::io::Result<()> {
    Ok(())
}
