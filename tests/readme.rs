//! The commands in README.md run as written and print what it shows.
//!
//! A block fenced as `console` holds lines starting with `$ ` and, after each, the output (standard output, then standard
//! error). Setting ENDGRAIN_WRITE_README writes the real output into the file instead of comparing.

use std::fmt::Write as _;
use std::path::Path;
use std::process::Command;

struct Scene {
    folder: tempfile::TempDir,
}

impl Scene {
    /// A folder with the demo records, and the program first on the path.
    fn new() -> Scene {
        let folder = tempfile::tempdir().expect("a temporary folder");
        let fixtures = folder.path().join("fixtures");
        std::fs::create_dir(&fixtures).expect("a folder");
        let own = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures");
        for entry in std::fs::read_dir(own).expect("fixtures") {
            let entry = entry.expect("an entry");
            if entry.file_type().expect("a type").is_file() {
                std::fs::copy(entry.path(), fixtures.join(entry.file_name())).expect("a copy");
            }
        }
        Scene { folder }
    }

    fn run(&self, line: &str) -> String {
        let program = Path::new(env!("CARGO_BIN_EXE_endgrain")).parent().expect("a folder");
        let path = std::env::var("PATH").unwrap_or_default();
        let output = Command::new("sh")
            .arg("-c")
            .arg(line.replace("cargo run --release --", "endgrain"))
            .current_dir(self.folder.path())
            .env("PATH", format!("{}:{path}", program.display()))
            .env("COLUMNS", "100")
            .env("NO_COLOR", "1")
            .output()
            .expect("a shell");
        let mut text = String::from_utf8_lossy(&output.stdout).into_owned();
        text.push_str(&String::from_utf8_lossy(&output.stderr));
        text
    }
}

#[test]
fn readme_commands_print_what_it_shows() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md");
    let readme = std::fs::read_to_string(&path).expect("README.md");
    let scene = Scene::new();
    let mut rewritten = String::new();
    let mut commands = 0;
    let mut inside = false;
    for line in readme.lines() {
        match (inside, line) {
            (false, "```console") => inside = true,
            (true, "```") => inside = false,
            (true, _) if !line.starts_with("$ ") => continue, // old output: replaced by the new one
            _ => {}
        }
        writeln!(rewritten, "{line}").expect("a string grows");
        if inside && let Some(command) = line.strip_prefix("$ ") {
            commands += 1;
            let output = scene.run(command);
            for shown in output.lines() {
                writeln!(rewritten, "{}", shown.trim_end()).expect("a string grows");
            }
        }
    }
    assert!(commands >= 6, "README.md shows only {commands} commands");
    if std::env::var_os("ENDGRAIN_WRITE_README").is_some() {
        std::fs::write(&path, rewritten).expect("README.md is written");
        return;
    }
    for (number, (shown, real)) in readme.lines().zip(rewritten.lines()).enumerate() {
        assert_eq!(shown, real, "README.md line {}: left is shown, right is real", number + 1);
    }
    assert_eq!(readme.lines().count(), rewritten.lines().count(), "README.md shows more or less output than there is");
}
