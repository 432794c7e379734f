//! The program run as a user runs it, in a folder of its own.

// Each test file uses its own part of this.
#![allow(dead_code)]

use assert_cmd::Command;
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::Output;
use tempfile::TempDir;

/// A folder that goes away with the test.
pub struct Bench {
    folder: TempDir,
}

/// What a run left behind.
pub struct Ran {
    pub code: i32,
    pub stdout: String,
    pub stderr: String,
}

impl Bench {
    pub fn new() -> Bench {
        Bench {
            folder: tempfile::tempdir().unwrap(),
        }
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn write(&self, name: &str, content: impl AsRef<[u8]>) {
        std::fs::write(self.path(name), content).unwrap();
    }

    pub fn read(&self, name: &str) -> String {
        std::fs::read_to_string(self.path(name)).unwrap()
    }

    /// The names of all files, sorted.
    pub fn files(&self) -> Vec<String> {
        let mut names: Vec<String> = std::fs::read_dir(self.folder.path())
            .unwrap()
            .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    /// The program, to be started in this folder without settings of the surroundings.
    pub fn program(&self) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_wellwright"));
        command.current_dir(self.folder.path());
        for name in ["NO_COLOR", "CLICOLOR", "CLICOLOR_FORCE"] {
            command.env_remove(name);
        }
        command
    }

    pub fn run(&self, arguments: &[&str]) -> Ran {
        Ran::from(self.program().args(arguments).output().unwrap())
    }
}

impl From<Output> for Ran {
    fn from(output: Output) -> Ran {
        Ran {
            code: output.status.code().expect("the program ended by itself"),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }
}

impl Ran {
    /// Holds that the run ended with this exit code.
    #[track_caller]
    pub fn code(self, expected: i32) -> Ran {
        assert_eq!(self.code, expected, "\n{}\n{}", self.stdout, self.stderr);
        self
    }

    #[track_caller]
    pub fn json(&self) -> Value {
        serde_json::from_str(&self.stdout)
            .unwrap_or_else(|error| panic!("{error}\n{}", self.stdout))
    }
}

/// The structure files that come with the program and can be tuned, by name.
pub fn shipped_structures() -> Vec<PathBuf> {
    let tuned = |file: &PathBuf| std::fs::read_to_string(file).unwrap().contains("\ntune:");
    shipped_files().into_iter().filter(tuned).collect()
}

/// All structure files that come with the program, by name.
pub fn shipped_files() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("structures");
    let mut files: Vec<PathBuf> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "yaml"))
        .collect();
    files.sort();
    files
}

#[track_caller]
pub fn number(value: &Value, key: &str) -> f64 {
    value[key]
        .as_f64()
        .unwrap_or_else(|| panic!("no number `{key}` in {value}"))
}

#[track_caller]
pub fn list<'v>(value: &'v Value, key: &str) -> &'v [Value] {
    value[key]
        .as_array()
        .unwrap_or_else(|| panic!("no list `{key}` in {value}"))
}
