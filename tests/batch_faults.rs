//! Batches in trouble: hostile lists, full disks, too many failures, interrupts, kills, two runs at once.

mod batches;

use std::fs;
use std::process::Command;
use std::time::{Duration, Instant};

use batches::{QUICK, Scene, lines, log};
use serde_json::Value;

fn batch<'a>(into: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&["batch", "--into", into], QUICK, more].concat()
}

/// The result of the record with this path.
fn of<'v>(merged: &'v [Value], path: &str) -> &'v Value {
    merged.iter().find(|line| line["path"] == path).unwrap_or_else(|| panic!("no result of {path}"))
}

#[cfg(unix)]
#[test]
fn each_hostile_name_gets_a_clear_line_and_the_rest_is_done() {
    use std::os::unix::ffi::OsStrExt;
    let scene = Scene::new();
    scene.logs(3);
    scene.file("bad.csv", "t,a\n0,1\n1,2\n2,x\n3,4\n4,5\n5,6\n6,7\n7,8\n8,9\n9,1\n");
    scene.file("empty.csv", "");
    scene.file("a\nb.csv", log(3, 100));
    let raw = std::ffi::OsStr::from_bytes(b"c\xff.csv");
    fs::write(scene.path("").join(raw), log(4, 100)).expect("a file");
    fs::create_dir(scene.path("folder.csv")).expect("a folder");
    assert!(Command::new("mkfifo").arg(scene.path("pipe.csv")).status().expect("mkfifo runs").success());
    std::os::unix::fs::symlink(scene.path("logs/0000.csv"), scene.path("0000.csv")).expect("a link");
    // A file as large as a disk, without a byte on it.
    let sparse = fs::File::create(scene.path("huge.csv")).expect("a file");
    sparse.set_len(1 << 40).expect("a sparse file");
    let mut list = Vec::new();
    for name in [
        &b"logs/0000.csv"[..],
        b"bad.csv",
        b"empty.csv",
        b"a\nb.csv",
        b"c\xff.csv",
        b"folder.csv",
        b"pipe.csv",
        b"absent.csv",
        b"huge.csv",
        b"./logs/0000.csv",
        b"0000.csv",
        b"logs/0001.csv",
        b"logs/0002.csv",
    ] {
        list.extend(name);
        list.push(0);
    }
    let ended = scene.fed(&list, &batch("out", &["--null", "--files-from", "-", "--memory", "1GB"]));
    assert_eq!(ended.code, Some(5), "{}", ended.told);
    assert!(ended.told.contains("13 records: 5 done, 2 repeated names, 6 failed"), "{}", ended.told);
    scene.ends(5, &["merge", "out"]);
    let merged = scene.merged("out");
    for (path, kind, text) in [
        ("bad.csv", "malformed", "not a number"),
        ("empty.csv", "malformed", "empty"),
        ("folder.csv", "malformed", "directory"),
        ("pipe.csv", "malformed", "neither a file nor a folder"),
        ("absent.csv", "malformed", "no such file"),
        ("huge.csv", "unsupported", "MiB of memory would be needed"),
    ] {
        let failure = &of(&merged, path)["failure"];
        assert_eq!(failure["kind"], kind, "{path}: {failure}");
        assert!(failure["text"].as_str().is_some_and(|told| told.contains(text)), "{path}: {failure}");
        assert_eq!(failure["place"]["file"], path);
    }
    assert_eq!(of(&merged, "bad.csv")["failure"]["place"]["line"], 4);
    assert!(of(&merged, "bad.csv")["input_sha256"].is_string());
    assert_eq!(of(&merged, "./logs/0000.csv")["same_as"], 0);
    assert_eq!(of(&merged, "0000.csv")["same_as"], 0);
    assert_eq!(of(&merged, "a\nb.csv")["status"], "done");
    assert_eq!(of(&merged, "c\u{fffd}.csv")["path_bytes"], "63ff2e637376");
    assert!(scene.path("out").join(raw).is_file() && scene.path("out/a\nb.csv").is_file());
    // Again: what is done is kept, what failed is tried again.
    let again = scene.fed(&list, &batch("out", &["--null", "--files-from", "-", "--memory", "1GB"]));
    assert!(again.told.contains("0 done, 5 kept"), "{}", again.told);
}

#[test]
fn faults_of_the_list_are_found_before_any_work() {
    let scene = Scene::new();
    scene.logs(2);
    scene.file("other/0000.csv", log(7, 100));
    let cases: &[(&[&str], &str)] = &[
        (&["logs/0000.csv", "logs/0001.csv", "other/0000.csv"], "logs/0000.csv and other/0000.csv (as 0000.csv)"),
        (&["logs/0000.csv", "--name", "../{name}"], "leads out of the output folder"),
        (&["logs/0000.csv", "--name", "results/{name}"], "kept for result files"),
        (&["logs/0000.csv", "--name", "{nam}"], "unknown word"),
        (&[], "no records"),
        (&["logs/0000.csv", "--lowpass", "7"], "a corner without a unit"),
        (&["logs/0000.csv", "--memory", "much"], "--memory"),
        (&["logs/0000.csv", "--max-failures", "0"], "max-failures"),
    ];
    for (more, told) in cases {
        let ended = scene.ends(2, &[&["batch", "--into", "no"], *more].concat());
        assert!(ended.told.contains(told), "{more:?}: {}", ended.told);
    }
    assert!(!scene.path("no").exists());
    let told = scene.ends(2, &["batch", "--into", "logs", "--lowpass", "10Hz", "--force", "logs/0000.csv"]).told;
    assert!(told.contains("would replace an input"), "{told}");
    let told = scene.ends(74, &["batch", "--into", "other", "--lowpass", "10Hz", "logs/0000.csv"]).told;
    assert!(told.contains("which no batch made"), "{told}");
    // No user may make folders there, nor write over a file as if it were one.
    for into in ["/proc/endgrain", "logs/0000.csv/out"] {
        scene.ends(74, &batch(into, &["logs/0001.csv"]));
    }
    scene.ends(3, &["merge", "other"]);
}

#[test]
fn a_hundred_thousand_names_come_from_standard_input() {
    let scene = Scene::new();
    scene.logs(2);
    let mut list: String = (0..99_999).map(|n| format!("none/{n:05}.csv\n")).collect();
    list.push_str("logs/0001.csv");
    let ended = scene.fed(list.as_bytes(), &batch("out", &["--files-from", "-", "--shard", "999/1000"]));
    assert_eq!(ended.code, Some(5), "{}", ended.told);
    assert!(ended.told.contains("100 records: 1 done, 99 failed"), "{}", ended.told);
    let found = lines(&scene.attempts("out")[0]);
    assert_eq!((&found[0]["records"], &found[100]["record"]), (&100_000.into(), &99_999.into()));
}

#[test]
fn failures_may_end_a_batch_early() {
    let scene = Scene::new();
    scene.logs(3);
    let absent: Vec<String> = (0..300).map(|n| format!("none/{n}.csv")).collect();
    let names: Vec<&str> = absent.iter().map(String::as_str).chain(["logs/0000.csv"]).collect();
    let told = scene.ends(5, &batch("out", &[&["--jobs", "1", "--max-failures", "7"], &names[..]].concat())).told;
    assert!(told.contains("7 failed, 294 not begun") && told.contains("too many failures"), "{told}");
    let told = scene.ends(5, &batch("out", &[&["--jobs", "1", "--fail-fast"], &names[..]].concat())).told;
    assert!(told.contains("1 failed, 300 not begun"), "{told}");
    scene.ends(6, &["merge", "out"]);
}

#[cfg(unix)]
#[test]
fn a_full_disk_costs_the_records_that_do_not_fit() {
    let scene = Scene::new();
    scene.logs(6);
    scene.file("logs/long.csv", log(1, 40_000));
    fs::create_dir(scene.path("out")).expect("a folder");
    // A disk of 700 kB where mounting is permitted; else no file may pass 700 kB. The long log's output has a megabyte.
    let own = env!("CARGO_BIN_EXE_endgrain");
    let run = format!("{own} batch --jobs 1 --into out {} logs/*.csv", QUICK.join(" "));
    let mounted = format!("mount -t tmpfs -o size=1700k none out && {{ {run}; code=$?; cp -r out kept; exit $code; }}");
    let limited = format!("trap '' XFSZ; ulimit -f 1400; {run}; code=$?; cp -r out kept; exit $code");
    let permitted = Command::new("unshare")
        .args(["-m", "sh", "-c", "mount -t tmpfs none out"])
        .current_dir(scene.path(""))
        .output()
        .is_ok_and(|tried| tried.status.success());
    let mut command = Command::new(if permitted { "unshare" } else { "sh" });
    let arguments: &[&str] = if permitted { &["-m", "sh", "-c", &mounted] } else { &["-c", &limited] };
    let output = command.args(arguments).current_dir(scene.path("")).output().expect("a shell");
    let told = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(5), "{told}");
    assert!(told.contains("7 records: 6 done, 1 failed"), "{told}");
    scene.ends(5, &["merge", "kept"]);
    let merged = scene.merged("kept");
    let failure = &of(&merged, "logs/long.csv")["failure"];
    assert_eq!(failure["kind"], "io", "{failure}");
    let text = failure["text"].as_str().expect("a text");
    assert!(text.contains("No space left") || text.contains("File too large"), "{text}");
    let left: Vec<String> = fs::read_dir(scene.path("kept"))
        .expect("a folder")
        .map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned())
        .collect();
    assert!(!left.iter().any(|name| name.starts_with('.') || name == "long.csv"), "{left:?}");
}

#[cfg(unix)]
#[test]
fn a_request_to_end_finishes_the_records_in_work() {
    let scene = Scene::new();
    let logs = scene.logs(900);
    let names: Vec<&str> = logs.iter().map(String::as_str).collect();
    let arguments = batch("out", &[&["--jobs", "1"], &names[..]].concat());
    let child = scene.start(&arguments);
    wait_for("results", || scene.path("out/0031.csv").exists());
    assert!(Command::new("kill").args(["-TERM", &child.id().to_string()]).status().expect("kill runs").success());
    let output = child.wait_with_output().expect("it ends");
    let told = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(75), "{told}");
    assert!(told.contains("run it again for the rest") && told.contains("not begun"), "{told}");
    assert!(temporaries(&scene).is_empty());
    let told = scene.ends(0, &arguments).told;
    assert!(told.contains("kept from before"), "{told}");
    scene.ends(0, &["merge", "out"]);
    assert_eq!(scene.merged("out").len(), 900);
}

fn wait_for(what: &str, ready: impl Fn() -> bool) {
    let start = Instant::now();
    while !ready() {
        assert!(start.elapsed() < Duration::from_secs(60), "no {what}");
        std::thread::sleep(Duration::from_millis(2));
    }
}

fn temporaries(scene: &Scene) -> Vec<String> {
    ["out", "out/results"]
        .iter()
        .flat_map(|folder| fs::read_dir(scene.path(folder)).expect("a folder"))
        .map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned())
        .filter(|name| name.starts_with('.'))
        .collect()
}

/// Kills at random instants and two attempts at once. Many more of them: scripts/kill_batches.
#[test]
fn killed_at_any_instant_nothing_is_lost_doubled_or_partial() {
    let scene = Scene::new();
    let logs = scene.logs(120);
    let names: Vec<&str> = logs.iter().map(String::as_str).collect();
    let arguments = batch("out", &names);
    let start = Instant::now();
    scene.ends(0, &batch("whole", &names));
    let whole = start.elapsed();
    scene.ends(0, &["merge", "whole"]);
    let mut state = std::process::id() | 1;
    let mut part = || {
        state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        f64::from(state >> 8) / f64::from(1 << 24)
    };
    for round in 0..6 {
        let _ = fs::remove_dir_all(scene.path("out"));
        for _ in 0..2 {
            let mut child = scene.start(&arguments);
            std::thread::sleep(whole.mul_f64(part()));
            child.kill().expect("killed");
            child.wait().expect("it ends");
            for name in names.iter().map(|name| name.replace("logs/", "")) {
                let path = scene.path("out").join(&name);
                if path.exists() {
                    assert_eq!(fs::read(&path).expect("bytes"), scene.bytes(&format!("whole/{name}")), "round {round}");
                }
            }
        }
        // What a kill leaves of a plan is stale like what it leaves of an output.
        scene.file("out/results/.plan.jsonl.abcdefgh.part", "half");
        // An orphan runs on beside the retry.
        let orphan = scene.start(&arguments);
        scene.ends(0, &arguments);
        assert!(orphan.wait_with_output().expect("it ends").status.success());
        let printed = scene.ends(0, &["merge", "out", "--clear-stale"]).printed;
        assert!(printed.contains("120 records: 120 done"), "{printed}");
        assert!(temporaries(&scene).is_empty());
        assert_eq!(scene.bytes("out/results/merged.jsonl"), scene.bytes("whole/results/merged.jsonl"), "round {round}");
    }
}
