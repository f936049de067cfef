//! Replays the kept inputs of the fuzz targets, what they once broke among them.

#[path = "../fuzz/checks.rs"]
mod checks;

use std::fs;
use std::path::Path;

#[test]
fn kept_inputs_do_no_harm() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("fuzz/corpus");
    for (name, check) in checks::CHECKS {
        let mut inputs: Vec<_> = fs::read_dir(folder.join(name))
            .unwrap_or_else(|error| panic!("no inputs for {name}: {error}"))
            .filter_map(|entry| Some(entry.ok()?.path()))
            .collect();
        inputs.sort();
        assert!(inputs.len() >= 5, "{name}");
        for input in inputs {
            println!("{}", input.display()); // the last one named is the one that panicked
            check(&fs::read(&input).unwrap_or_else(|error| panic!("{}: {error}", input.display())));
        }
    }
}
