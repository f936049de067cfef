//! What is refused rather than done in silence: inputs that would be replaced, options that nothing reads, numbers that are none.

#[expect(dead_code, reason = "what other tests of runs need")]
mod batches;

use std::fs;

use batches::{Scene, log};

/// A record, and the bytes that it must still have at the end.
fn scene() -> (Scene, Vec<u8>) {
    let scene = Scene::new();
    scene.file("in.csv", log(1, 300));
    let bytes = scene.bytes("in.csv");
    (scene, bytes)
}

#[test]
fn an_input_is_never_replaced() {
    let (scene, bytes) = scene();
    fs::hard_link(scene.path("in.csv"), scene.path("alias.csv")).expect("a link");
    let cases: &[&[&str]] = &[
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "in.csv"],
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "./in.csv"],
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "alias.csv"],
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv", "--json", "in.csv"],
        &["compare", "in.csv", "--lowpass", "10Hz", "--json", "in.csv"],
        &["compare", "in.csv", "--lowpass", "10Hz", "--plot", "in.csv"],
        &["audit", "in.csv", "--json", "in.csv"],
    ];
    for case in cases {
        let told = scene.ends(74, &[case, &["--force"][..]].concat()).told;
        assert!(told.contains("the input itself"), "{case:?}: {told}");
        assert_eq!(scene.bytes("in.csv"), bytes, "{case:?}");
    }
    assert!(!scene.path("out.csv").exists());
}

#[test]
fn two_outputs_never_share_a_name() {
    let (scene, _) = scene();
    let cases: &[&[&str]] = &[
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv", "--json", "out.csv"],
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv", "--json", "./out.csv"],
        &["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv", "--json", "out.csv.json"],
        &["compare", "in.csv", "--lowpass", "10Hz", "--plot", "out.svg", "--json", "out.svg"],
    ];
    for case in cases {
        for force in [&[][..], &["--force"]] {
            let told = scene.ends(2, &[case, force].concat()).told;
            assert!(told.contains("two outputs would go to"), "{case:?}: {told}");
        }
    }
    assert!(!scene.path("out.csv").exists() && !scene.path("out.csv.json").exists());
}

#[test]
fn a_sidecar_that_cannot_appear_takes_its_record_back() {
    use endgrain::write::{Durability, Overwrite, Pending, finish_together};
    use std::io::Write;
    let (scene, _) = scene();
    for durability in [Durability::Handed, Durability::OnDisk] {
        let open = |name: &str| {
            let mut output = Pending::create(&scene.path(name), &[], Overwrite::Refuse).expect("opened");
            output.write_all(b"x").expect("written");
            output
        };
        let outputs = vec![open("out.csv"), open("out.csv.json")];
        // Somebody else was faster.
        scene.file("out.csv.json", "theirs");
        assert!(finish_together(outputs, durability).is_err());
        assert!(!scene.path("out.csv").exists());
        assert_eq!(scene.bytes("out.csv.json"), b"theirs");
        fs::remove_file(scene.path("out.csv.json")).expect("removed");
    }
    // A full device under the further JSON: neither record nor sidecar appears.
    #[cfg(target_os = "linux")]
    {
        let told =
            scene.ends(74, &["condition", "in.csv", "--lowpass", "9Hz", "-o", "o.csv", "--json", "/dev/full"]).told;
        assert!(told.contains("/dev/full: No space left"), "{told}");
        assert!(!scene.path("o.csv").exists() && !scene.path("o.csv.json").exists());
    }
}

#[test]
fn one_faulty_file_does_not_lose_the_other_audits() {
    let (scene, _) = scene();
    scene.file("more.csv", log(2, 100));
    let ended = scene.ends(3, &["audit", "in.csv", "absent.csv", "more.csv", "--json", "audits.json"]);
    assert!(ended.told.contains("absent.csv"), "{}", ended.told);
    let audits: serde_json::Value = serde_json::from_slice(&scene.bytes("audits.json")).expect("JSON");
    let paths: Vec<&str> = audits.as_array().expect("a list").iter().filter_map(|a| a["path"].as_str()).collect();
    assert_eq!(paths, ["in.csv", "more.csv"]);
    // Refused before any work, replaced on demand.
    let ended = scene.ends(74, &["audit", "in.csv", "--json", "audits.json"]);
    assert!(ended.told.contains("--force") && ended.printed.is_empty(), "{}", ended.told);
    scene.ends(0, &["audit", "in.csv", "--json", "audits.json", "--force"]);
    let audits: serde_json::Value = serde_json::from_slice(&scene.bytes("audits.json")).expect("JSON");
    assert_eq!(audits.as_array().map(Vec::len), Some(1));
}

#[test]
fn options_that_nothing_reads_are_refused() {
    let (scene, _) = scene();
    let cases: &[(&[&str], &str)] = &[
        (&["-o", "o.csv", "--encoding", "pcm24"], "--encoding tells a sample type of WAV, but the output is csv"),
        (&["-o", "o.wav", "--decimals", "3"], "--decimals tells the digits of CSV, but the output is wav"),
        (&["-o", "o.csv", "--format", "wav", "--decimals", "3"], "--decimals"),
        (&["-o", "o.xlsx"], "does not tell a format"),
        (&["-o", "o.csv", "--dry-run", "--json"], "cannot be used with"),
    ];
    for (more, told) in cases {
        let ended = scene.ends(2, &[&["condition", "in.csv", "--lowpass", "10Hz"], *more].concat());
        assert!(ended.told.contains(told), "{more:?}: {}", ended.told);
    }
    let left: Vec<_> = fs::read_dir(scene.path("")).expect("a folder").collect();
    assert_eq!(left.len(), 1, "{left:?}");
    // A name without an extension, and one that the input has too, are in the input's format.
    scene.file("in.log", log(1, 100));
    scene.ends(0, &["condition", "in.log", "--lowpass", "10Hz", "-o", "plain"]);
    scene.ends(0, &["condition", "in.log", "--lowpass", "10Hz", "-o", "o.log"]);
    assert_eq!(scene.bytes("plain"), scene.bytes("o.log"));
}

#[test]
fn numbers_that_no_double_holds_are_refused() {
    let (scene, _) = scene();
    for more in [
        ["--calibrate", "ax=1e400"],
        ["--calibrate", "ax=2 3"],
        ["--calibrate", "ax=g"],
        ["--tolerance", "1e400%"],
        ["--tolerance", "1e400g"],
        ["--from", "1e400s"],
        ["--lowpass", "1e400Hz"],
    ] {
        let ended = scene.ends(2, &["condition", "in.csv", "-o", "o.csv", more[0], more[1]]);
        assert!(ended.told.contains(more[0]), "{more:?}: {}", ended.told);
    }
    scene
        .ends(0, &["condition", "in.csv", "-q", "-o", "o.csv", "--calibrate", "ax=1e2mg", "--calibrate", "ay=-2.5e-1"]);
}
