//! Archives: what goes in comes out, within its bound, and no damage passes unseen.

mod random;

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use endgrain::basis::Planner;
use endgrain::codec::{Archive, ArchivedChannel, Cast, Effort, Gaps, Header, Limit, Made, Writer, encode};

use random::Random;

fn endgrain(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_endgrain")).args(arguments).current_dir(folder).output().expect("the program runs")
}

fn fixture(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures").join(name)
}

fn run(folder: &Path, arguments: &[&str]) -> String {
    let output = endgrain(folder, arguments);
    let told = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(output.status.success(), "{arguments:?}: {told}");
    told
}

fn refused(folder: &Path, arguments: &[&str], code: i32, word: &str) {
    let output = endgrain(folder, arguments);
    let told = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(code), "{arguments:?}: {told}");
    assert!(told.contains(word), "{arguments:?}: {told}");
}

/// Numbers of a table's rows, decimal commas included.
fn numbers(text: &str, delimiter: char) -> Vec<Vec<f64>> {
    let row =
        |line: &str| line.split(delimiter).map(|f| f.replace(',', ".").parse().ok()).collect::<Option<Vec<f64>>>();
    text.lines().filter_map(row).collect()
}

#[test]
fn lossless_files_come_back_byte_for_byte() {
    let folder = tempfile::tempdir().expect("a folder");
    for name in ["plank.csv", "hoist.csv", "hoist.wav"] {
        let source = fixture(name);
        let (archive, back) = (format!("{name}.grain"), format!("back-{name}"));
        run(folder.path(), &["compress", &source.display().to_string(), "--lossless", "-o", &archive]);
        run(folder.path(), &["restore", &archive, "-o", &back]);
        let (a, b) =
            (std::fs::read(&source).expect("source"), std::fs::read(folder.path().join(&back)).expect("result"));
        assert!(a == b, "{name} is not restored byte for byte");
        let size = std::fs::metadata(folder.path().join(&archive)).expect("archive").len();
        // Text takes several times the bytes that its numbers need; a WAV file of 16 bits does not.
        let times = if name.ends_with(".csv") { 6 } else { 1 };
        assert!(size * times < a.len() as u64, "{name}: {size} bytes");
    }
}

#[test]
fn bounds_hold_in_the_restored_file() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("plank.csv");
    let text = std::fs::read_to_string(&source).expect("source");
    let wanted: Vec<f64> = numbers(&text, ';').iter().map(|row| row[1]).collect();
    let range = wanted.iter().copied().fold(f64::MIN, f64::max) - wanted.iter().copied().fold(f64::MAX, f64::min);
    let mut sizes = Vec::new();
    for (option, value, bound) in [
        ("--max-error", "0.5um", 0.5),
        ("--max-error", "0.05", 0.05),
        ("--max-error", "0.001mm", 1.0),
        ("--rms-error", "0.5", 0.5),
        ("--rms-error", "0.1%", 0.001 * range),
    ] {
        for effort in ["1", "2", "3"] {
            let source = source.display().to_string();
            run(folder.path(), &["compress", &source, option, value, "--effort", effort, "-o", "a.grain", "--force"]);
            run(folder.path(), &["restore", "a.grain", "-o", "back.csv", "--force"]);
            let back = std::fs::read_to_string(folder.path().join("back.csv")).expect("result");
            let found: Vec<f64> = numbers(&back, ';').iter().map(|row| row[1]).collect();
            assert_eq!(found.len(), wanted.len());
            let off = wanted.iter().zip(&found).map(|(a, b)| a - b);
            let error = match option {
                "--max-error" => off.map(f64::abs).fold(0.0, f64::max),
                _ => (off.map(|e| e * e).sum::<f64>() / wanted.len() as f64).sqrt(),
            };
            // Subtracting two decimals rounds by an ulp of 100.
            assert!(error <= bound + 2e-14, "{option} {value} effort {effort}: {error}");
            sizes.push((
                option,
                value,
                effort,
                std::fs::metadata(folder.path().join("a.grain")).expect("archive").len(),
            ));
        }
    }
    for three in sizes.chunks(3) {
        // Tried on stretches or in full: an effort more is never much larger.
        assert!(three[1].3 <= three[0].3 + 40 && three[2].3 <= three[1].3 + 40, "{three:?}");
    }
}

#[test]
fn exactly_one_bound_is_required() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("plank.csv").display().to_string();
    refused(folder.path(), &["compress", &source, "-o", "a.grain"], 2, "--max-error");
    refused(folder.path(), &["compress", &source, "--lossless", "--keep", "9", "-o", "a.grain"], 2, "more than one");
    refused(folder.path(), &["compress", &source, "--max-error", "0", "-o", "a.grain"], 2, "not an error");
    refused(folder.path(), &["compress", &source, "--max-error", "1kg", "-o", "a.grain"], 2, "kg");
    assert!(!folder.path().join("a.grain").exists());
}

#[test]
fn a_stretch_comes_back_by_its_stamps() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("hoist.csv");
    run(folder.path(), &["compress", &source.display().to_string(), "--lossless", "-o", "a.grain"]);
    run(folder.path(), &["restore", "a.grain", "--from", "2s", "--to", "2.01s", "-o", "part.csv"]);
    let part = std::fs::read_to_string(folder.path().join("part.csv")).expect("result");
    let whole = std::fs::read_to_string(&source).expect("source");
    let wanted: Vec<&str> =
        whole.lines().filter(|l| ["2.000,", "2.005,", "2.010,"].iter().any(|s| l.starts_with(s))).collect();
    let found: Vec<&str> = part.lines().skip(2).collect();
    assert_eq!(found, wanted);
    refused(folder.path(), &["restore", "a.grain", "--from", "99s", "-o", "none.csv"], 4, "no row");
}

#[test]
fn uneven_stamps_and_gaps_come_back() {
    let folder = tempfile::tempdir().expect("a folder");
    let mut text = "t [s],ax [g],ay [g]\n".to_owned();
    let mut at = 0;
    for n in 0..200 {
        at += 7 + n * n % 5;
        let ax = if (50..60).contains(&n) { String::new() } else { format!("0.{:03}", 100 + n) };
        text.push_str(&format!("{}.{:03},{ax},-{}.5\n", at / 1000, at % 1000, n % 9));
    }
    std::fs::write(folder.path().join("log.csv"), &text).expect("a file");
    run(folder.path(), &["compress", "log.csv", "--lossless", "-o", "a.grain"]);
    run(folder.path(), &["restore", "a.grain", "-o", "back.csv"]);
    assert_eq!(std::fs::read_to_string(folder.path().join("back.csv")).expect("result"), text);
}

#[test]
fn an_audit_lists_an_archive() {
    let folder = tempfile::tempdir().expect("a folder");
    run(
        folder.path(),
        &["compress", &fixture("hoist.csv").display().to_string(), "--max-error", "0.001g", "-o", "a.grain"],
    );
    let output = endgrain(folder.path(), &["audit", "a.grain"]);
    let told = String::from_utf8_lossy(&output.stdout).into_owned();
    for word in ["archive", "2400 rows", "ax", "max error 0.001g", "made from hoist.csv"] {
        assert!(told.contains(word), "{word}: {told}");
    }
    // A job that wants a record says what to do.
    refused(folder.path(), &["condition", "a.grain", "--lowpass", "9Hz", "-o", "b.csv"], 3, "restore it first");
}

#[test]
fn truncated_bases_report_parseval() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("plank.csv").display().to_string();
    for (option, value) in [("--keep", "40"), ("--corner", "20mm")] {
        run(folder.path(), &["compress", &source, option, value, "-o", "a.grain", "--json", "a.json", "--force"]);
        let text = std::fs::read_to_string(folder.path().join("a.json")).expect("JSON");
        let json: serde_json::Value = serde_json::from_str(&text).expect("JSON");
        let channel = &json["channels"][0];
        // 400 mm of profile: a wavelength of 20 mm is the 40th half-cycle.
        assert_eq!(channel["kept"], 40);
        let (rmse, parseval) =
            (channel["rmse"].as_f64().expect("a number"), channel["parseval_rmse"].as_f64().expect("a number"));
        // Restored samples are rounded to the source's decimals of 0.001 um: 0.0003 um RMS more at most.
        assert!((rmse - parseval).abs() < 3e-4, "{rmse} {parseval}");
        // 40 half-cycles in 0.4 m: 50 cycles a metre.
        assert!((channel["cut_off"].as_f64().expect("a number") - 50.0).abs() < 1e-9);
    }
}

#[test]
fn threads_change_no_byte() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("hoist.csv").display().to_string();
    let mut archives = Vec::new();
    for threads in ["1", "2", "5"] {
        let output = Command::new(env!("CARGO_BIN_EXE_endgrain"))
            .args(["compress", &source, "--max-error", "0.5x", "-o", threads])
            .env("RAYON_NUM_THREADS", threads)
            .current_dir(folder.path())
            .output()
            .expect("the program runs");
        assert!(output.status.success());
        archives.push(std::fs::read(folder.path().join(threads)).expect("archive"));
    }
    assert!(archives[0] == archives[1] && archives[0] == archives[2]);
}

/// A small archive of two channels in all modes, one with a gap.
fn small() -> Vec<u8> {
    let planner = Planner::new();
    let wave = |n: usize| (0.21 * n as f64).sin() + 0.3 * (1.3 * n as f64).cos();
    let mut rows: Vec<f64> = (0..90).map(wave).collect();
    rows[17] = f64::NAN;
    let header = Header { rows: 90, channels: ["a", "b", "c"].map(channel).to_vec(), ..Header::default() };
    let mut bytes = Vec::new();
    let mut writer = Writer::start(&mut bytes, &header).expect("a vector");
    for (stream, limit) in [Limit::Max(0.01), Limit::Rms(0.05), Limit::Keep(9)].into_iter().enumerate() {
        for block in encode(&rows, Cast::Double, limit, Effort::Usual, &planner).expect("coded") {
            put(&mut writer, stream, &block);
        }
    }
    writer.finish().expect("a vector");
    bytes
}

fn channel(name: &str) -> ArchivedChannel {
    ArchivedChannel {
        name: name.to_owned(),
        unit: "g".to_owned(),
        cast: Cast::Double,
        bound: String::new(),
        error: None,
    }
}

fn put(writer: &mut Writer<&mut Vec<u8>>, stream: usize, block: &Made) {
    writer.block(stream, block.first, block.rows, &block.gaps, block.coded.as_ref()).expect("a vector");
}

#[test]
fn every_flipped_byte_and_every_cut_is_noticed() {
    let bytes = small();
    assert!(Archive::open(&bytes).is_ok() && bytes.len() < 1500, "{}", bytes.len());
    for at in 0..bytes.len() {
        for bit in 0..8 {
            let mut damaged = bytes.clone();
            damaged[at] ^= 1 << bit;
            assert!(Archive::open(&damaged).is_err(), "byte {at}, bit {bit}");
        }
        let mut damaged = bytes.clone();
        damaged[at] = !damaged[at];
        assert!(Archive::open(&damaged).is_err(), "byte {at}");
        assert!(Archive::open(&bytes[..at]).is_err(), "cut at {at}");
    }
    let longer = [&bytes[..], &[0]].concat();
    assert!(Archive::open(&longer).is_err());
}

#[test]
fn undamaged_blocks_are_recovered_and_losses_named() {
    let bytes = small();
    let planner = Planner::new();
    let sound = Archive::open(&bytes).expect("sound");
    let middle = sound.entries[1].at + sound.entries[1].bytes / 2;
    let mut damaged = bytes.clone();
    damaged[middle] ^= 0x40;
    let found = Archive::recover(&damaged).expect("a sound header");
    assert_eq!(found.lost.iter().map(|lost| lost.rows).collect::<Vec<_>>(), [Some((1, 0, 90))]);
    for stream in [0, 2] {
        let (a, b) = (
            sound.samples(stream, 0, 90, &planner).expect("sound"),
            found.samples(stream, 0, 90, &planner).expect("sound"),
        );
        assert!(a.iter().zip(&b).all(|(a, b)| a.to_bits() == b.to_bits()));
    }
    assert!(found.samples(1, 0, 90, &planner).expect("blank").iter().all(|v| v.is_nan()));
    // Without its end: the blocks are found one after another.
    let cut = Archive::recover(&bytes[..bytes.len() - 9]).expect("a sound header");
    assert_eq!((cut.entries.len(), cut.lost.len()), (3, 1));
}

#[test]
fn numbers_in_hostile_fields_allocate_nothing() {
    // A sound seal over a header that claims 2^60 rows, and no block.
    let header = Header { rows: 1 << 60, channels: vec![channel("a")], ..Header::default() };
    let mut bytes = Vec::new();
    Writer::start(&mut bytes, &header).expect("a vector").finish().expect("a vector");
    assert!(Archive::open(&bytes).is_err());
    let found = Archive::recover(&bytes).expect("a sound header");
    assert!(found.samples(0, 0, 1 << 60, &Planner::new()).is_err());
    // Random payloads under sound seals decode to something or to an error, never to a panic.
    let mut random = Random(1);
    for round in 0..300 {
        let mut payload: Vec<u8> = (0..40).map(|_| random.next() as u8).collect();
        if round % 3 == 0 {
            // A sound start: whole steps, predicted.
            payload[..21].copy_from_slice(&[1, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 240, 63, 8, 9, 0, 0]);
        }
        let modes = endgrain::codec::MODES;
        let mode = modes[round % modes.len()].1;
        let coded = endgrain::codec::Coded { mode, payload, kept: None, dropped: None };
        let header = Header { rows: 50, channels: vec![channel("a")], ..Header::default() };
        let mut bytes = Vec::new();
        let mut writer = Writer::start(&mut bytes, &header).expect("a vector");
        writer.block(0, 0, 50, &Gaps::new(), Some(&coded)).expect("a vector");
        writer.finish().expect("a vector");
        let archive = Archive::open(&bytes).expect("sound seals");
        if let Ok(samples) = archive.samples(0, 0, 50, &Planner::new()) {
            assert!(samples.len() == 50 && samples.iter().all(|v| v.is_finite()));
        }
    }
}

#[test]
fn a_road_profile_comes_nearer_the_bound_than_scalar_quantisation() {
    // ISO 8608: displacement density falls as the square of the spatial frequency. The record is a Gaussian one of that
    // density in the cosine basis, so its rate-distortion function is known: reverse water-filling over the variances
    // (Shannon 1959; Berger 1971, chapter 4).
    let len = 65_536;
    let planner = Planner::new();
    let deviations: Vec<f64> = (0..len).map(|k| 1.0 / (k.max(3) as f64)).collect();
    let mut random = Random(5);
    let mut record: Vec<f64> = deviations.iter().map(|s| s * random.normal()).collect();
    let plan = planner.plan(endgrain::ends::Ends::EVEN, len).expect("a plan");
    plan.inverse(&mut record, &mut vec![0.0; plan.scratch_len()]);
    {
        let water = 8e-6_f64;
        let distortion = deviations.iter().map(|s| (s * s).min(water * water)).sum::<f64>() / len as f64;
        let rate = deviations.iter().map(|s| (s / water).log2().max(0.0)).sum::<f64>() / len as f64;
        let made =
            encode(&record, Cast::Double, Limit::Rms(distortion.sqrt()), Effort::Usual, &planner).expect("coded");
        let bytes: usize = made.iter().filter_map(|m| m.coded.as_ref()).map(|c| c.payload.len()).sum();
        let found = 8.0 * bytes as f64 / len as f64;
        // A uniform quantiser with an ideal entropy coder stays 0.5 log2(2 pi e / 12) = 0.2546 bits above the bound at high
        // rates (Gish and Pierce 1968); and nothing gets below it.
        assert!(found < rate + 0.2546 && found > rate - 0.05, "{found} bits a sample against {rate}");
    }
}

#[path = "../fuzz/archive.rs"]
mod fuzzed;

#[test]
fn finds_of_the_fuzzer_and_mutations_are_survived() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("fuzz/corpus/archive");
    let mut seeds = vec![small()];
    for entry in std::fs::read_dir(folder).expect("the corpus") {
        seeds.push(std::fs::read(entry.expect("an entry").path()).expect("a file"));
    }
    let mut random = Random(11);
    for seed in seeds {
        fuzzed::archive(&seed);
        for _ in 0..60 {
            let mut bytes = seed.clone();
            // Mostly one change, seldom as many as seven.
            for _ in 0..random.logarithmic(1.0, 8.0) as u64 {
                let at = random.next() as usize % bytes.len().max(1);
                match (random.next() % 3, bytes.get_mut(at)) {
                    (0, Some(byte)) => *byte = random.next() as u8,
                    (1, Some(_)) => drop(bytes.remove(at)),
                    _ => bytes.insert(at.min(bytes.len()), random.next() as u8),
                }
            }
            fuzzed::archive(&bytes);
        }
    }
}

#[test]
fn a_page_shows_the_numbers_of_the_json_and_runs_again() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = fixture("plank.csv").display().to_string();
    let asked =
        ["compress", &source, "--max-error", "0.5um", "-o", "plank.grain", "--html", "lost.html", "--json", "r.json"];
    run(folder.path(), &asked);
    let read = |name: &str| std::fs::read_to_string(folder.path().join(name)).expect("a file");
    let (page, archive) = (read("lost.html"), std::fs::read(folder.path().join("plank.grain")).expect("an archive"));
    let report: serde_json::Value = serde_json::from_str(&read("r.json")).expect("JSON");
    let channel = &report["channels"][0];
    for key in
        ["error", "rmse", "max_error", "max_error_row", "max_error_at", "psnr_db", "bits_per_sample", "noise_bits"]
    {
        let value = channel[key].as_f64().unwrap_or_else(|| panic!("{key}: {}", channel[key]));
        assert!(page.contains(&format!("<data value=\"{value}\">")), "{key}: {value} is not on the page");
    }
    // Stamps of 0.5 mm from 0: the place follows from the row.
    assert_eq!(channel["max_error_at"].as_f64(), channel["max_error_row"].as_f64().map(|row| 0.5 * row));
    let code = page.split("<pre").nth(1).and_then(|rest| rest.split("<code>").nth(1)).expect("settings");
    let code = code.split("</code>").next().expect("settings").replace("\\\n", " ");
    let words: Vec<&str> = code.split_whitespace().skip(1).chain(["--html", "lost.html", "--force"]).collect();
    run(folder.path(), &words);
    assert!(read("lost.html") == page, "another page");
    assert!(std::fs::read(folder.path().join("plank.grain")).expect("an archive") == archive, "another archive");
    refused(
        folder.path(),
        &["compress", &source, "--lossless", "-o", "a.grain", "--html", "a.grain"],
        2,
        "two outputs",
    );
}

#[test]
fn a_page_breaks_its_lines_at_gaps() {
    let folder = tempfile::tempdir().expect("a folder");
    let mut text = String::from("t [s],a [g]\n");
    for n in 0..200 {
        let value = if (90..100).contains(&n) { "NA".to_owned() } else { format!("{:.4}", (0.1 * f64::from(n)).sin()) };
        text.push_str(&format!("{:.2},{value}\n", 0.01 * f64::from(n)));
    }
    std::fs::write(folder.path().join("gaps.csv"), text).expect("written");
    let asked =
        ["compress", "gaps.csv", "--missing", "NA", "--max-error", "0.01g", "-o", "g.grain", "--html", "g.html"];
    run(folder.path(), &asked);
    let figures: serde_json::Value =
        serde_json::from_slice(&std::fs::read(folder.path().join("g.html.json")).expect("a file")).expect("JSON");
    let points = figures["figures"][0]["lines"][0]["points"].as_array().expect("points").clone();
    let breaks: Vec<&serde_json::Value> = points.iter().filter(|point| point[1].is_null()).collect();
    assert_eq!(breaks.len(), 1, "one gap, one break");
    assert_eq!(points.len(), 191);
    let table = std::fs::read_to_string(folder.path().join("g.html.csv")).expect("a file");
    assert!(!table.contains("NaN"));
}
