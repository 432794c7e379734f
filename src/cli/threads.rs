//! How many threads a command works on.

use super::deliver::{Exit, complain};

/// Threads for a command's work: as many as there are cores unless the user says otherwise.
pub fn pool(threads: Option<u16>) -> Result<rayon::ThreadPool, Exit> {
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads.map_or(0, usize::from))
        .build()
        .map_err(|error| {
            complain(&format!("error: no threads can be started: {error}"));
            Exit::NotPossible
        })
}
