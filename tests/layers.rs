//! The house stands: imports follow the order of `lib.rs`, files stay small and are named by nouns.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// Source files as (module path such as `read::csv`, text).
type Files = BTreeMap<String, String>;

fn sources() -> Files {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Files::new();
    let mut folders = vec![root.clone()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("a folder of the source tree") {
            let path: PathBuf = entry.expect("an entry").path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                let inside = path.strip_prefix(&root).expect("inside src").with_extension("");
                let mut parts: Vec<String> = inside.iter().map(|part| part.to_string_lossy().into_owned()).collect();
                if parts.last().is_some_and(|last| last == "mod") {
                    parts.pop();
                }
                files.insert(parts.join("::"), std::fs::read_to_string(&path).expect("UTF-8 source"));
            }
        }
    }
    files
}

/// Top-level modules in the order of the data.
fn order(lib: &str) -> Vec<String> {
    lib.lines().filter_map(|line| line.trim().strip_prefix("pub mod ")?.strip_suffix(';')).map(str::to_owned).collect()
}

/// The text without comments and without what follows `#[cfg(test)]`: tests may look anywhere.
fn code_of(text: &str) -> String {
    let body = text.split("#[cfg(test)]").next().unwrap_or_default();
    body.lines().map(|line| line.split("//").next().unwrap_or_default()).collect::<Vec<_>>().join("\n")
}

/// Every top-level module that `text` of module `own` mentions by a `crate::` or `super::` path.
fn mentioned(own: &str, text: &str) -> Vec<String> {
    let mut found = Vec::new();
    for (start, _) in text.match_indices("crate::") {
        let rest = &text[start + "crate::".len()..];
        match rest.strip_prefix('{') {
            Some(group) => found.extend(heads_of_group(group)),
            None => found.extend(name_at(rest)),
        }
    }
    let depth = own.split("::").count();
    for (start, _) in text.match_indices("super::") {
        // `super::` repeated climbs; only a climb to the crate root can leave the module.
        if text[..start].ends_with("super::") {
            continue;
        }
        let mut rest = &text[start..];
        let mut climbs = 0;
        while let Some(next) = rest.strip_prefix("super::") {
            climbs += 1;
            rest = next;
        }
        if climbs >= depth {
            found.extend(name_at(rest));
        }
    }
    found
}

fn name_at(text: &str) -> Option<String> {
    let name: String = text.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
    (!name.is_empty()).then_some(name)
}

/// First path segments of `a::b, c::{d, e}, f}` up to the closing brace.
fn heads_of_group(group: &str) -> Vec<String> {
    let mut heads = Vec::new();
    let mut depth = 0;
    let mut expecting = true;
    for (at, c) in group.char_indices() {
        match c {
            '{' => depth += 1,
            '}' if depth == 0 => break,
            '}' => depth -= 1,
            ',' if depth == 0 => expecting = true,
            c if expecting && depth == 0 && (c.is_alphanumeric() || c == '_') => {
                heads.extend(name_at(&group[at..]));
                expecting = false;
            }
            _ => {}
        }
    }
    heads
}

/// All faults of a set of files against the order that `lib.rs` gives.
fn faults(files: &Files) -> Vec<String> {
    let order = order(&files["lib"]);
    let rank = |module: &str| order.iter().position(|name| name == module);
    let mut faults = Vec::new();
    for (module, text) in files {
        let top = module.split("::").next().unwrap_or_default();
        let code = code_of(text);
        let own = rank(top);
        if module != "lib" {
            for line in code.lines().filter(|line| line.trim_start().starts_with("pub use ")) {
                let target = line.trim_start().trim_start_matches("pub use ");
                let child = name_at(target).unwrap_or_default();
                let private_child = code.lines().any(|l| l.trim() == format!("mod {child};"));
                if !private_child {
                    faults.push(format!("{module}: re-exports what is not its own: {}", line.trim()));
                }
            }
        }
        let Some(own) = own else { continue }; // lib.rs and the binary
        for other in mentioned(module, &code) {
            match rank(&other) {
                Some(above) if above > own => faults.push(format!("{module} imports {other}, which comes after it")),
                _ => {}
            }
        }
    }
    for (module, text) in files {
        let top = module.split("::").next().unwrap_or_default();
        if top == "cli" || module == "main" {
            if code_of(text).contains("crate::") && mentioned(module, &code_of(text)).iter().any(|m| order.contains(m))
            {
                faults.push(format!("{module} reaches into the library by crate:: instead of endgrain::"));
            }
        } else if module != "lib" && rank(top).is_none() {
            faults.push(format!("{module} is not listed in lib.rs"));
        }
    }
    faults
}

#[test]
fn imports_follow_the_order_of_the_data() {
    let faults = faults(&sources());
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn a_planted_import_against_the_flow_is_found() {
    let plants = [
        ("ends", "use crate::condition::Outcome;"),
        ("numeric::sum", "use crate::{place::Place, operator::Chain};"),
        ("numeric::noise", "use super::super::condition::Outcome;"),
        ("baseline::estimate", "pub use crate::ends::Ends;"),
        ("unit", "fn f() { let _ = crate::basis::Planner::new(); }"),
    ];
    for (module, line) in plants {
        let mut files = sources();
        let text = files.get_mut(module).expect("a module to plant in");
        *text = format!("{line}\n{text}");
        assert!(!faults(&files).is_empty(), "{module}: {line}");
    }
}

#[test]
fn files_are_small_and_named_by_nouns() {
    for (module, text) in sources() {
        let lines = text.lines().count();
        assert!(lines <= 500, "{module} has {lines} lines: find the second noun");
        let name = module.rsplit("::").next().unwrap_or_default().to_owned();
        let kinds = ["util", "utils", "helper", "helpers", "common", "misc", "trait", "traits", "types"];
        assert!(!kinds.contains(&name.as_str()), "{module} is named by kind");
        assert!(text.starts_with("//! "), "{module} does not open with a sentence");
    }
}
