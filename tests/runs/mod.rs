//! Real runs of the program in a folder of their own.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// A demo record.
pub fn fixture(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures").join(name)
}

/// Runs the program in a folder.
pub fn endgrain(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_endgrain")).args(arguments).current_dir(folder).output().expect("the program runs")
}

/// A temporary folder to run in.
pub struct Run {
    folder: tempfile::TempDir,
}

impl Run {
    pub fn new() -> Run {
        Run { folder: tempfile::tempdir().expect("a temporary folder") }
    }

    pub fn folder(&self) -> &Path {
        self.folder.path()
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn file(&self, name: &str, text: &str) -> &Run {
        fs::write(self.path(name), text).expect("a file");
        self
    }

    pub fn text(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).expect("an output")
    }

    /// Runs, expecting success; returns standard error.
    pub fn ok(&self, arguments: &[&str]) -> String {
        let output = endgrain(self.folder.path(), arguments);
        let told = String::from_utf8_lossy(&output.stderr).into_owned();
        assert!(output.status.success(), "{arguments:?}: {told}");
        told
    }

    /// Runs, expecting an exit code; returns standard error.
    pub fn fails(&self, code: i32, arguments: &[&str]) -> String {
        let output = endgrain(self.folder.path(), arguments);
        let told = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(code), "{arguments:?}: {told}");
        told
    }

    pub fn files(&self) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(self.folder.path())
            .expect("a folder")
            .map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }
}
