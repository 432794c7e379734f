//! Files written whole or not at all, and never over an input.

use std::io::Write;
use std::path::{Path, PathBuf};

/// Why an output could not be written.
#[derive(Debug, thiserror::Error)]
pub enum OutputError {
    #[error("{path} is an input of this run and is not overwritten")]
    IsInput { path: PathBuf },
    #[error("{path} cannot be written: {source}")]
    Write {
        path: PathBuf,
        source: std::io::Error,
    },
}

/// Writes `text` to a temporary neighbour and moves it into place.
pub fn write_whole(path: &Path, text: &str, inputs: &[&Path]) -> Result<(), OutputError> {
    refuse_input(path, inputs)?;
    let failed = |source| OutputError::Write {
        path: path.to_owned(),
        source,
    };
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
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

/// Refuses a path that names the same file as an input, also by another name.
pub fn refuse_input(path: &Path, inputs: &[&Path]) -> Result<(), OutputError> {
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
