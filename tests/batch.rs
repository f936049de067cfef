//! Batches as users run them: outputs, order, resuming, shards, merging, recipes and manifests.

#[expect(dead_code, reason = "what other tests of runs need")]
mod batches;

use std::collections::BTreeSet;
use std::fs;

use batches::{QUICK, Scene, lines};
use serde_json::Value;

/// `batch --into OUT` with the quick options and more arguments.
fn batch<'a>(into: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&["batch", "--into", into], QUICK, more].concat()
}

fn records(lines: &[Value]) -> Vec<u64> {
    lines.iter().map(|line| line["record"].as_u64().expect("a number")).collect()
}

#[test]
fn a_batch_does_what_condition_does_in_the_order_of_the_list() {
    let scene = Scene::new();
    let logs = scene.logs(40);
    let names: Vec<&str> = logs.iter().map(String::as_str).collect();
    for jobs in ["1", "4"] {
        let told = scene.ends(0, &batch(&format!("out{jobs}"), &[&["--jobs", jobs], &names[..]].concat())).told;
        assert!(told.contains("40 records: 40 done"), "{told}");
    }
    let single = [&["condition", "logs/0007.csv", "-o", "one.csv"], QUICK].concat();
    scene.ends(0, &single);
    assert_eq!(scene.bytes("one.csv"), scene.bytes("out1/0007.csv"));
    let (one, four) = (scene.attempts("out1"), scene.attempts("out4"));
    assert_eq!((one.len(), four.len()), (1, 1));
    assert_eq!(fs::read(&one[0]).expect("results"), fs::read(&four[0]).expect("results"));
    for name in &names {
        let output = name.replace("logs", "");
        assert_eq!(scene.bytes(&format!("out1{output}")), scene.bytes(&format!("out4{output}")));
    }
    let found = lines(&one[0]);
    assert_eq!(found[0]["records"], 40);
    assert_eq!(records(&found[1..]), (0..40).collect::<Vec<_>>());
    let line = &found[8];
    let sidecar: Value = serde_json::from_slice(&scene.bytes("one.csv.json")).expect("JSON");
    assert_eq!(line["input"], sidecar["input"]);
    assert_eq!(line["outputs"][0]["sha256"], sidecar["outputs"][0]["sha256"]);
    assert_eq!(line["channels"][0]["rms"], sidecar["channels"][0]["rms"]);
    assert_eq!(line["audit"]["channels"][1]["name"], "ay");
}

#[test]
fn what_is_whole_is_not_done_again_and_what_is_not_is() {
    let scene = Scene::new();
    scene.logs(12);
    let list = (0..12).map(|n| format!("logs/{n:04}.csv\n")).collect::<String>();
    scene.file("list", &list);
    let again = |told: &str, more: &[&str]| {
        let ended = scene.ends(0, &batch("out", &[&["--files-from", "list"], more].concat()));
        assert!(ended.told.contains(told), "wanted {told:?}: {}", ended.told);
    };
    again("12 done", &[]);
    again("0 done, 12 kept", &[]);
    assert_eq!(scene.attempts("out").len(), 1, "a run that does nothing leaves no file");
    // The output is gone, is damaged, or is another record's; the input has changed.
    fs::remove_file(scene.path("out/0003.csv")).expect("removed");
    fs::write(scene.path("out/0004.csv"), "damaged").expect("written");
    fs::copy(scene.path("out/0006.csv"), scene.path("out/0005.csv")).expect("copied");
    scene.file("logs/0007.csv", batches::log(99, 150));
    again("4 done, 8 kept", &[]);
    again("0 done, 12 kept", &[]);
    // The last writer died between the rename and the line: a line is cut short.
    let attempt = scene.attempts("out").remove(0);
    let text = fs::read_to_string(&attempt).expect("results");
    fs::write(&attempt, &text[..text.len() - 30]).expect("written");
    again("1 done, 11 kept", &[]);
    // Other options make other outputs; a longer list keeps what it can.
    again("12 done", &["--decimals", "4"]);
    scene.file("logs/new.csv", batches::log(5, 100));
    scene.file("list", format!("logs/new.csv\n{list}"));
    again("1 done, 12 kept", &["--decimals", "4"]);
    let printed = scene.ends(0, &["merge", "out"]).printed;
    assert!(printed.contains("13 records: 13 done") && printed.contains("another list"), "{printed}");
    let merged = scene.merged("out");
    assert_eq!(records(&merged), (0..13).collect::<Vec<_>>());
    assert_eq!((&merged[0]["path"], &merged[1]["path"]), (&"logs/new.csv".into(), &"logs/0000.csv".into()));
}

#[test]
fn shards_join_to_the_whole_batch() {
    let scene = Scene::new();
    let logs = scene.logs(10);
    let names: Vec<&str> = logs.iter().map(String::as_str).collect();
    scene.ends(0, &batch("whole", &names));
    scene.ends(0, &["merge", "whole"]);
    for shard in ["0/3", "2/3"] {
        scene.ends(0, &batch("out", &[&["--shard", shard], &names[..]].concat()));
    }
    let ended = scene.ends(6, &["merge", "out"]);
    assert!(ended.printed.contains("7 done, 3 to be done again"), "{}", ended.printed);
    assert!(ended.printed.contains("record 4, logs/0004.csv: missing"), "{}", ended.printed);
    assert_eq!(records(&lines(&scene.path("out/results/redo.jsonl"))), [1, 4, 7]);
    scene.ends(0, &batch("out", &[&["--shard", "1/3"], &names[..]].concat()));
    let printed = scene.ends(0, &["merge", "out"]).printed;
    assert!(printed.contains("10 records: 10 done"), "{printed}");
    assert!(!scene.path("out/results/redo.jsonl").exists());
    assert_eq!(scene.bytes("out/results/merged.jsonl"), scene.bytes("whole/results/merged.jsonl"));
    assert_eq!(scene.bytes("out/results/merged.csv"), scene.bytes("whole/results/merged.csv"));
    // An output that is no longer what its result tells.
    fs::write(scene.path("out/0002.csv"), "damaged").expect("written");
    fs::remove_file(scene.path("out/0003.csv")).expect("removed");
    let printed = scene.ends(6, &["merge", "out"]).printed;
    assert!(printed.contains("0002.csv: mismatched") && printed.contains("0003.csv: output gone"), "{printed}");
    // A retry beside an orphan: both attempts tell the same, one line of each record stands.
    scene.ends(0, &batch("out", &names));
    let twice = scene.attempts("out").remove(0);
    fs::copy(&twice, twice.with_file_name("shard-0-of-3.again.jsonl")).expect("copied");
    let printed = scene.ends(0, &["merge", "out"]).printed;
    assert!(printed.contains("superseded"), "{printed}");
    assert_eq!(records(&scene.merged("out")), (0..10).collect::<Vec<_>>());
    for shard in ["3/3", "x", "1/0"] {
        scene.ends(2, &batch("out", &[&["--shard", shard], &names[..]].concat()));
    }
}

#[test]
fn the_table_has_a_row_for_each_channel_and_the_worst_first_on_request() {
    let scene = Scene::new();
    scene.logs(4);
    scene.file("logs/bad.csv", "t,a\n0,1\n1,2\n2,x\n3,4\n4,5\n5,6\n6,7\n7,8\n8,9\n9,1\n");
    let arguments = ["batch", "--into", "out", "--lowpass", "5Hz", "--tolerance", "0.001%", "--require", "within"];
    let names = ["logs/0000.csv", "logs/0001.csv", "logs/bad.csv", "logs/0002.csv"];
    let told = scene.ends(5, &[&arguments[..], &names[..]].concat()).told;
    assert!(told.contains("3 done, 1 failed, 3 below --require"), "{told}");
    let printed = scene.ends(5, &["merge", "out", "--worst-first"]).printed;
    assert!(printed.contains("failed, malformed: 1, such as logs/bad.csv: "), "{printed}");
    assert!(printed.contains("edge error in % of its tolerance"), "{printed}");
    let mut reader = csv::Reader::from_path(scene.path("out/results/merged.csv")).expect("a table");
    let header = reader.headers().expect("headings").clone();
    let column = |name: &str| header.iter().position(|head| head == name).expect("a column");
    let rows: Vec<csv::StringRecord> = reader.records().map(|row| row.expect("a row")).collect();
    assert_eq!(rows.len(), 7);
    assert_eq!(&rows[0][column("path")], "logs/bad.csv");
    assert_eq!((&rows[0][column("failure")], &rows[0][column("failure_place")]), ("malformed", "line 4, column 2"));
    let worst: Vec<f64> = (1..7)
        .map(|row| {
            let value = |name: &str| rows[row][column(name)].parse::<f64>().expect("a number");
            value("edge_error") / value("tolerance")
        })
        .collect();
    assert!(worst[0].max(worst[1]) >= worst[2].max(worst[3]) && worst[2].max(worst[3]) >= worst[4].max(worst[5]));
    // Without a failure the requirement decides.
    let fine = [&arguments[..], &names[..2]].concat();
    scene.ends(1, &fine.iter().map(|a| if *a == "out" { "fine" } else { *a }).collect::<Vec<_>>());
    scene.ends(1, &["merge", "fine"]);
}

#[test]
fn recipes_manifests_and_the_command_line_meet() {
    let scene = Scene::new();
    scene.logs(4);
    scene.file(
        "r.toml",
        "lowpass = \"10Hz\"\nextension = \"even\"\ndecimals = 4\nname = \"{stem}_c.{ext}\"\n\n[[override]]\nmatch = \"*/0001.csv\"\nlowpass = \"5Hz\"\n",
    );
    scene.file(
        "m.csv",
        "path,output,channel,calibrate,assert\nlogs/0000.csv,,ax,ax=9.80665m/s2,left:zero-slope\nlogs/0001.csv,x/one.csv,,,\nlogs/0002.csv,,ax;ay,,\n",
    );
    let run = |more: &[&str]| {
        scene.ends(0, &[&["batch", "--recipe", "r.toml", "--manifest", "m.csv", "--into", "out"], more].concat());
        scene.ends(0, &["merge", "out"]);
        scene.merged("out")
    };
    // An extension that is asked for and an assertion contradict each other: the command line settles it.
    let merged = run(&["--extension", "auto"]);
    let settings = |n: usize, key: &str| merged[n]["settings"][key].clone();
    assert_eq!(settings(0, "channel"), serde_json::json!(["ax"]));
    assert_eq!(merged[0]["channels"][0]["unit"], "m/s2");
    assert_eq!((settings(0, "decimals"), settings(0, "extension")), ("4".into(), "auto".into()));
    assert_eq!(settings(0, "lowpass"), serde_json::json!(["10Hz"]));
    assert_eq!(settings(1, "lowpass"), serde_json::json!(["5Hz"]));
    let outputs: Vec<&str> = merged.iter().map(|line| line["outputs"][0]["path"].as_str().expect("a name")).collect();
    assert_eq!(outputs, ["0000_c.csv", "x/one.csv", "0002_c.csv"]);
    assert!(scene.path("out/x/one.csv").is_file());
    let flagged = run(&["--extension", "auto", "--lowpass", "8Hz"]);
    assert!(flagged.iter().all(|line| line["settings"]["lowpass"] == serde_json::json!(["8Hz"])));
    scene.file("bad.toml", "lowpas = \"10Hz\"\n");
    let told = scene.ends(2, &["batch", "--recipe", "bad.toml", "--into", "no", "logs/0000.csv"]).told;
    assert!(told.contains("bad.toml:1:1") && told.contains("did you mean \"lowpass\"?"), "{told}");
    scene.file("bad.csv", "path,lowpass\nlogs/0000.csv,10Hz\nlogs/0001.csv,10\n");
    let told = scene.ends(2, &["batch", "--manifest", "bad.csv", "--into", "no"]).told;
    assert!(told.contains("bad.csv:3"), "{told}");
    assert!(!scene.path("no").exists());
}

#[test]
fn any_result_is_a_recipe_that_gives_the_same_bytes() {
    let scene = Scene::new();
    scene.logs(2);
    let cases: &[(&str, &[&str])] = &[
        ("csv", &["--lowpass", "10Hz"]),
        (
            "csv",
            &["--notch", "17Hz:1Hz", "--highpass", "0.5Hz", "--lowpass", "20Hz", "--decimals", "6", "--regrid", "off"],
        ),
        (
            "wav",
            &["--bandpass", "0.5Hz..20Hz", "--extension", "odd", "--calibrate", "ax=0.1", "--calibrate", "ay=0.1FS"],
        ),
        ("wav", &["--channel", "ay", "--lowpass", "9Hz", "--encoding", "pcm24", "--calibrate", "ay=0.1"]),
        (
            "csv",
            &[
                "--from",
                "0.5s",
                "--edges",
                "mark",
                "--tolerance",
                "3%",
                "--integrate",
                "1",
                "--conditions",
                "steady",
                "--highpass",
                "2Hz",
            ],
        ),
    ];
    for (format, options) in cases {
        let (first, again, batched) = (format!("first.{format}"), format!("again.{format}"), format!("b.{format}"));
        scene.ends(0, &[&["condition", "logs/0001.csv", "--force", "-o", &first], *options].concat());
        let recipe = format!("{first}.json");
        scene.ends(0, &["condition", "logs/0001.csv", "--force", "--recipe", &recipe, "-o", &again]);
        assert_eq!(scene.bytes(&first), scene.bytes(&again), "{options:?}");
        let into = ["batch", "logs/0001.csv", "--force", "--recipe", &recipe, "--into", "out", "--name", &batched];
        scene.ends(0, &into);
        assert_eq!(scene.bytes(&first), scene.bytes(&format!("out/{batched}")), "{options:?}");
        // A line of results, then the joined results.
        let line = fs::read_to_string(scene.attempts("out").remove(0)).expect("results");
        scene.file("line.json", line.lines().nth(1).expect("a line"));
        scene.ends(0, &["merge", "out"]);
        for recipe in ["line.json", "out/results/merged.jsonl"] {
            scene.ends(0, &["condition", "logs/0001.csv", "--force", "--recipe", recipe, "-o", &again]);
            assert_eq!(scene.bytes(&first), scene.bytes(&again), "{recipe} {options:?}");
        }
        fs::remove_dir_all(scene.path("out")).expect("removed");
    }
    scene.ends(0, &["compare", "logs/0001.csv", "--lowpass", "10Hz", "--channel", "ax", "--json", "compared.json"]);
    scene.ends(0, &["condition", "logs/0001.csv", "--recipe", "compared.json", "-o", "c.csv"]);
    scene.ends(0, &["condition", "logs/0001.csv", "--lowpass", "10Hz", "--channel", "ax", "-o", "d.csv"]);
    assert_eq!(scene.bytes("c.csv"), scene.bytes("d.csv"));
    scene.ends(0, &["audit", "logs/0001.csv", "logs/0000.csv", "--channel", "ay", "--json", "audited.json"]);
    scene.ends(0, &["condition", "logs/0001.csv", "--recipe", "audited.json", "--lowpass", "10Hz", "-o", "e.csv"]);
    let names: BTreeSet<String> = ["a.csv", "b.csv"].iter().map(|name| (*name).to_owned()).collect();
    assert_eq!(names.len(), 2);
    let sidecar: Value = serde_json::from_slice(&scene.bytes("e.csv.json")).expect("JSON");
    assert_eq!(sidecar["channels"].as_array().map(Vec::len), Some(1));
}

#[test]
fn what_is_generated_is_read_again() {
    let scene = Scene::new();
    scene.logs(1);
    let recipe = scene.ends(0, &["generate", "recipe"]).printed;
    scene.file("plain.toml", &recipe);
    scene.ends(0, &["batch", "--recipe", "plain.toml", "--lowpass", "10Hz", "--into", "out", "logs/0000.csv"]);
    scene.ends(0, &["condition", "logs/0000.csv", "--lowpass", "10Hz", "-o", "one.csv"]);
    assert_eq!(scene.bytes("out/0000.csv"), scene.bytes("one.csv"));
    // Every key of the schema stands in the recipe, and the defaults that it shows are read when they are uncommented.
    let schema: Value = serde_json::from_str(&scene.ends(0, &["generate", "schema"]).printed).expect("JSON");
    let keys = schema["properties"].as_object().expect("keys");
    assert!(keys.len() > 30);
    for key in keys.keys().filter(|key| *key != "override") {
        assert!(recipe.contains(&format!("\n#{key} = ")), "{key}");
    }
    let defaults = ["gaps", "duplicates", "regrid", "extension", "seat", "shape", "tolerance", "edges", "strict"];
    let opened = defaults.iter().fold(recipe, |text, key| text.replace(&format!("\n#{key} ="), &format!("\n{key} =")));
    scene.file("opened.toml", opened);
    scene.ends(0, &["condition", "logs/0000.csv", "--recipe", "opened.toml", "--lowpass", "10Hz", "-o", "two.csv"]);
    assert_eq!(scene.bytes("two.csv"), scene.bytes("one.csv"));
    fs::create_dir(scene.path("man")).expect("a folder");
    scene.ends(0, &["generate", "man", "--into", "man"]);
    let page = String::from_utf8(scene.bytes("man/endgrain-batch.1")).expect("text");
    assert!(page.starts_with(".") && page.contains("files\\-from") && page.contains("max\\-failures"));
    assert!(scene.path("man/endgrain-condition.1").is_file());
    for shell in ["bash", "zsh", "fish"] {
        let script = scene.ends(0, &["generate", "completions", shell]).printed;
        assert!(script.contains("max-failures") && script.contains("lowpass"), "{shell}");
    }
}

#[test]
fn the_overview_page_shows_the_figures_of_the_results() {
    let scene = Scene::new();
    scene.logs(6);
    scene.file("logs/<b>bad.csv", "no record\n");
    scene.file("list", (0..6).map(|n| format!("logs/{n:04}.csv\n")).collect::<String>() + "logs/<b>bad.csv\n");
    scene.ends(5, &batch("out", &["--files-from", "list", "--require", "within", "--tolerance", "0.01%"]));
    fs::remove_file(scene.path("out/0003.csv")).expect("removed");
    // Inside the output folder too, where its temporary file must not count as one of a killed attempt.
    scene.ends(6, &["merge", "out", "--html", "out/page.html", "--clear-stale"]);
    let page = String::from_utf8(scene.bytes("out/page.html")).expect("text");
    assert!(page.contains("7 records: 5 done, 1 failed, 5 below the requirement, 1 missing, 0 doubled."), "{page}");
    assert!(page.contains("logs/&lt;b&gt;bad.csv") && !page.contains("<b>bad"), "names are escaped");
    assert!(page.contains("output gone") && page.contains("--lowpass 10Hz") && !page.contains("stale temporary"));
    let summary: Value = serde_json::from_slice(&scene.bytes("out/page.html.json")).expect("JSON");
    // The worst channel, sought in the lines themselves.
    let share = |channel: &Value| {
        let number = |key: &str| channel["verdict"][key].as_f64().expect("a number");
        100.0 * number("predicted_error") / number("tolerance")
    };
    let merged = scene.merged("out");
    let channels = merged.iter().flat_map(|line| line["channels"].as_array().expect("channels"));
    let shares: Vec<f64> = channels.map(share).collect();
    let found = summary["worst"].as_array().expect("channels");
    assert_eq!((shares.len(), found.len()), (10, 10));
    let worst = shares.iter().copied().fold(0.0, f64::max);
    assert!((found[0]["percent_of_tolerance"].as_f64().expect("a number") / worst - 1.0).abs() < 1e-12);
    assert_eq!(summary["failures"][0]["count"], 1);
    assert_eq!(summary["redo"][0], serde_json::json!([3, "logs/0003.csv", "output_gone"]));
    assert_eq!(fs::read_to_string(scene.path("out/page.html.csv")).expect("CSV").lines().count(), 1 + 10 + 10 + 2);
    // The same page again, in whatever order the lines are joined; nothing is replaced unasked, a record never.
    let told = scene.ends(74, &["merge", "out", "--html", "out/page.html"]).told;
    assert!(told.contains("--force"), "{told}");
    scene.ends(6, &["merge", "out", "--html", "other.html", "--worst-first"]);
    assert_eq!(scene.bytes("other.html"), scene.bytes("out/page.html"));
    for kept in ["logs/0001.csv", "out/0001.csv", "out/results/merged.csv"] {
        let told = scene.ends(74, &["merge", "out", "--html", kept, "--force"]).told;
        assert!(told.contains("never replaced"), "{told}");
    }
}
