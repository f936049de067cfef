//! A folder of invented logs and the program run on them.

use std::fs;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};

use serde_json::Value;

/// A folder that goes when it is dropped.
pub struct Scene {
    folder: tempfile::TempDir,
}

/// How a run ended.
pub struct Ended {
    pub code: Option<i32>,
    pub told: String,
    pub printed: String,
}

impl Scene {
    pub fn new() -> Scene {
        Scene { folder: tempfile::tempdir().expect("a temporary folder") }
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn file(&self, name: &str, text: impl AsRef<[u8]>) -> PathBuf {
        let path = self.path(name);
        fs::create_dir_all(path.parent().expect("a folder")).expect("a folder");
        fs::write(&path, text).expect("a file");
        path
    }

    /// Logs `logs/0000.csv` and so on.
    pub fn logs(&self, count: usize) -> Vec<String> {
        (0..count)
            .map(|n| {
                let name = format!("logs/{n:04}.csv");
                self.file(&name, log(n, 200 + n % 7));
                name
            })
            .collect()
    }

    pub fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_endgrain"));
        command.args(arguments).current_dir(self.folder.path());
        command
    }

    pub fn run(&self, arguments: &[&str]) -> Ended {
        ended(self.command(arguments).output().expect("the program runs"))
    }

    /// Runs with bytes on standard input.
    pub fn fed(&self, input: &[u8], arguments: &[&str]) -> Ended {
        let mut command = self.command(arguments);
        command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
        let mut child = command.spawn().expect("the program runs");
        let mut pipe = child.stdin.take().expect("a pipe");
        let input = input.to_owned();
        let feeder = std::thread::spawn(move || drop(pipe.write_all(&input)));
        let output = child.wait_with_output().expect("it ends");
        feeder.join().expect("fed");
        ended(output)
    }

    /// Runs, expecting an exit code.
    pub fn ends(&self, code: i32, arguments: &[&str]) -> Ended {
        let ended = self.run(arguments);
        assert_eq!(ended.code, Some(code), "{arguments:?}: {}{}", ended.told, ended.printed);
        ended
    }

    pub fn start(&self, arguments: &[&str]) -> Child {
        self.command(arguments).stderr(Stdio::piped()).stdout(Stdio::null()).spawn().expect("the program runs")
    }

    pub fn bytes(&self, name: &str) -> Vec<u8> {
        fs::read(self.path(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
    }

    /// The joined results.
    pub fn merged(&self, into: &str) -> Vec<Value> {
        lines(&self.path(into).join("results/merged.jsonl"))
    }

    /// The result files of a batch.
    pub fn attempts(&self, into: &str) -> Vec<PathBuf> {
        let mut found: Vec<PathBuf> = fs::read_dir(self.path(into).join("results"))
            .expect("a folder")
            .map(|entry| entry.expect("an entry").path())
            .filter(|path| path.file_name().is_some_and(|name| name.to_string_lossy().starts_with("shard-")))
            .collect();
        found.sort();
        found
    }
}

fn ended(output: Output) -> Ended {
    Ended {
        code: output.status.code(),
        told: String::from_utf8_lossy(&output.stderr).into_owned(),
        printed: String::from_utf8_lossy(&output.stdout).into_owned(),
    }
}

/// The lines of a file of results.
pub fn lines(path: &Path) -> Vec<Value> {
    let text = fs::read_to_string(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
    text.lines().map(|line| serde_json::from_str(line).expect("JSON")).collect()
}

/// Three tones in two axes at 100 Hz, of another phase in every log.
pub fn log(number: usize, rows: usize) -> String {
    let mut text = "t [s],ax [g],ay [g]\n".to_owned();
    for row in 0..rows {
        let t = row as f64 / 100.0;
        let wave = |f: f64| (std::f64::consts::TAU * f * t + number as f64).sin();
        text.push_str(&format!("{t:.2},{:.5},{:.5}\n", wave(1.3) + 0.2 * wave(21.0), wave(2.9) - 0.1 * wave(17.0)));
    }
    text
}

/// Options of a quick run.
pub const QUICK: &[&str] = &["--lowpass", "10Hz", "--extension", "odd", "--baseline", "line"];
