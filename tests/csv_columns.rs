//! What the columns of delimited text are, what options say of them, and text that is short, odd or hostile.

mod tables;

use endgrain::error::Kind;
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::Layout;
use endgrain::unit::Unit;
use tables::{ROWS, check_numbers, codes, data, plain, row, stamped, take, text, with_line};

#[test]
fn options_override_what_would_be_found() {
    let comma = |options: ReadOptions, bytes: &[u8]| take(bytes, &options);
    let integers: Vec<String> = (0..20).map(|n| format!("{n},{}", n * n % 7)).collect();
    let open = text("", &integers);
    let error = comma(ReadOptions::default(), &open).expect_err("two readings").to_string();
    assert!(error.starts_with("-:1: \"0,0\" can be read as 2 fields"), "{error}");
    assert!(error.contains("--delimiter") && error.contains("--decimal"), "{error}");
    let two = comma(ReadOptions { delimiter: Some(b','), ..ReadOptions::default() }, &open).expect("settled");
    assert_eq!((two.channels.len(), two.channels[0].values[3]), (1, 2.0));
    let one = comma(ReadOptions { delimiter: Some(b';'), decimal: Some(b','), ..ReadOptions::default() }, &open)
        .expect("settled");
    assert_eq!((one.channels.len(), one.channels[0].values[3]), (1, 3.2));

    let mut thousands = data(";", ",");
    thousands[0] = "0,00;1.200,50;0,00".into();
    let thousands = text("t;ax;ay\n", &thousands);
    let read = comma(ReadOptions { thousands: Some(b'.'), ..ReadOptions::default() }, &thousands).expect("declared");
    assert_eq!((read.channels[0].values[0], read.channels[0].values[1]), (1200.5, row(1).1));

    let headed = plain("1,2,3\nt,ax,ay\n");
    let read = comma(ReadOptions { header_lines: Some(2), ..ReadOptions::default() }, &headed).expect("told");
    assert_eq!((read.channels[0].values.len(), read.channels[0].name.as_str()), (ROWS, "ax"));

    let read = comma(ReadOptions { time_column: Some("none".into()), ..ReadOptions::default() }, &plain("t,ax,ay\n"))
        .expect("told");
    assert_eq!((read.channels.len(), read.stamps.is_none()), (3, true));
    let ms =
        ReadOptions { time_column: Some("#1".into()), time_unit: Some(Unit::parse("ms")), ..ReadOptions::default() };
    let read = comma(ms, &plain("foo,ax,ay\n")).expect("told");
    assert_eq!(read.stamps.expect("told").unit.label(), "ms");
    let wrong = comma(ReadOptions { channels: Some(vec!["aX".into()]), ..ReadOptions::default() }, &plain("t,ax,ay\n"));
    assert_eq!(
        wrong.expect_err("no such column").to_string(),
        "-: --channel aX: there is no such column; did you mean \"ax\"?"
    );
    let doubled =
        comma(ReadOptions { channels: Some(vec!["ax".into()]), ..ReadOptions::default() }, &plain("t,ax,ax\n"));
    assert!(doubled.expect_err("ambiguous").to_string().contains("the name stands for 2 columns"));
}

#[test]
fn the_time_or_position_column_is_chosen_with_care() {
    let stamps = |head: &str| {
        take(&plain(head), &ReadOptions::default()).map(|record| {
            let stamps = record.stamps.as_ref().map(|stamps| (stamps.name.clone(), stamps.unit.label().to_owned()));
            (stamps, codes(&record))
        })
    };
    let named = |name: &str, unit: &str| Some((name.to_owned(), unit.to_owned()));
    assert_eq!(stamps("time (s),ax,ay\n"), Ok((named("time", "s"), vec![])));
    assert_eq!(stamps("Zeit [s],ax,ay\n"), Ok((named("Zeit", "s"), vec![])));
    assert_eq!(stamps("x [mm],height,width\n"), Ok((named("x", "mm"), vec![])));
    assert_eq!(stamps("station_m,height,width\n"), Ok((named("station", "m"), vec![])));
    assert_eq!(stamps("x,y,z\n"), Ok((None, vec!["time_column_unsure"])));
    assert_eq!(stamps("foo,ax,ay\n"), Ok((None, vec!["time_column_unsure"])));
    let error = stamps("position,height,width\n").expect_err("no unit");
    assert_eq!((error.kind(), error.place().line), (Kind::Usage, Some(1)));
    assert!(error.to_string().contains("--time-unit"), "{error}");
    let whole = take(&stamped("t,ax,ay\n", ",", |n| format!("{}", 10 * n)), &ReadOptions::default()).expect("a table");
    assert_eq!(codes(&whole), ["time_unit_assumed"]);
    let dated = stamped("date,time,ax,ay\n", ",", |n| format!("2026-03-01,10:00:00.{n:02}0"));
    assert_eq!(take(&dated, &ReadOptions::default()).expect("a table").stamps.expect("a clock").name, "time");
    let counted = stamped("sample,t,ax,ay\n", ",", |n| format!("{n},{:.2}", n as f64 / 100.0));
    let record = take(&counted, &ReadOptions::default()).expect("a table");
    assert_eq!((record.channels.len(), codes(&record).len()), (2, 0));
}

#[test]
fn odd_headers_and_columns_of_text() {
    let names = |head: &str| {
        let record = take(&plain(head), &ReadOptions::default()).unwrap_or_else(|error| panic!("{head}: {error}"));
        let channels: Vec<String> = record.channels.iter().map(|c| format!("{} [{}]", c.name, c.unit)).collect();
        (record.stamps.map(|stamps| stamps.name), channels.join(", "), record.findings.len())
    };
    let expected = |stamps: &str, channels: &str| (Some(stamps.to_owned()), channels.to_owned(), 0);
    assert_eq!(names("\"t\n(s)\",\"ax\n(g)\",ay\n"), expected("t", "ax [g], ay []"));
    assert_eq!(names("Time,1,2\n"), expected("Time", "1 [], 2 []"));
    assert_eq!(names("Time,Acc X,Acc Y\nof sample,from mount,from floor\n"), expected("Time", "Acc X [], Acc Y []"));
    assert_eq!(names("# t ax ay\n# t,ax,ay\n"), expected("t", "ax [], ay []"));
    assert_eq!(names("t / s,a in g,b [m/s^2]\n"), expected("t", "a [g], b [m/s2]"));

    let with_column = |head: &str, cell: &dyn Fn(usize) -> String| {
        let lines: Vec<String> =
            data(",", ".").iter().enumerate().map(|(n, line)| format!("{line},{}", cell(n))).collect();
        take(&text(head, &lines), &ReadOptions::default())
    };
    let note = |n: usize| if n.is_multiple_of(5) { "door open".to_owned() } else { String::new() };
    let record = with_column("t,ax,ay,remark\n", &note).expect("a table");
    check_numbers("a column of remarks", &record, ROWS);
    assert_eq!(codes(&record), [""; 0]);
    let late = |n: usize| if n == 40 { "door open".to_owned() } else { String::new() };
    let record = with_column("t,ax,ay,remark\n", &late).expect("a table");
    check_numbers("a remark late in the file", &record, ROWS);
    let record = with_column("t,ax,ay,load\n", &|n| format!("{n}%")).expect("a table");
    assert_eq!(codes(&record), ["text_column"]);
    let alone = take(b"t,load\n0.0,1%\n0.1,2%\n", &ReadOptions::default()).expect_err("no channel").to_string();
    assert!(alone.contains("\"1%\" is no number"), "{alone}");
    let record = with_column("t,ax,ay,\n", &|_| String::new()).expect("a table");
    assert_eq!(codes(&record), [""; 0]);
    let refused = with_column("t,ax,ay\n", &|n| if n == 30 { "x".to_owned() } else { String::new() });
    assert!(refused.is_err_and(|error| error.to_string().starts_with("-:32:4: text after the last separator")));
    let mut long: Vec<String> = (0..400).map(|n| format!("{n}.5,{n},{n},")).collect();
    long[300].push('x');
    let refused = take(&text("t,ax,ay\n", &long), &ReadOptions::default());
    assert!(refused.is_err_and(|error| error.to_string().starts_with("-:302:4: text after the last separator")));
}

#[test]
fn what_follows_the_first_rows_does_not_change_what_the_columns_are() {
    let rows: Vec<String> =
        (0..100).map(|n| format!("0.{n:03},{n}")).chain((0..400).map(|_| "x,".to_owned())).collect();
    let record = take(&text("t,a\n", &rows), &ReadOptions::default()).expect("a table and a footer");
    assert_eq!((codes(&record), record.channels[0].values.len()), (vec!["footer"], 100));
    let rows: Vec<String> = rows.into_iter().chain(["0.1,2".to_owned()]).collect();
    let refused = take(&text("t,a\n", &rows), &ReadOptions::default()).expect_err("data after text");
    assert!(refused.to_string().starts_with("-:102:1: not a time stamp like those above: \"x\""), "{refused}");
}

#[test]
fn faulty_spacing_is_handed_on_as_it_is() {
    // Cases 20 to 24 are judged by the audit: the reader keeps every stamp and its line.
    let repeated = take(&with_line(33, "0.30,1,2"), &ReadOptions::default()).expect("a table");
    let stamps = repeated.stamps.expect("stamps");
    assert_eq!((stamps.ticks[30], stamps.ticks[31], stamps.ticks[32], stamps.tick), (30, 30, 32, 0.01));
    let back = take(&with_line(42, "0.35,1,2"), &ReadOptions::default()).expect("a table");
    assert_eq!((back.stamps.as_ref().expect("stamps").ticks[40], back.row_place(40).line), (35, Some(42)));
    let coarse =
        take(&stamped("t,ax,ay\n", ",", |n| format!("{}.0", n / 10)), &ReadOptions::default()).expect("a table");
    assert_eq!(coarse.stamps.expect("stamps").ticks[..12], [0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 10, 10]);
}

#[test]
fn short_and_odd_files() {
    let one = |text: &str| take(text.as_bytes(), &ReadOptions::default());
    assert_eq!(one("").expect_err("0 bytes").to_string(), "-: the file is empty (0 bytes)");
    assert!(one("t,ax\n").expect_err("header only").to_string().starts_with("-:1: there are no data rows"));
    assert!(one("\n\n \n").expect_err("blanks").to_string().contains("nothing but blanks"));
    for rows in 1..=3 {
        let record = take(&text("t,ax,ay\n", &data(",", ".")[..rows]), &ReadOptions::default()).expect("a short table");
        check_numbers("short", &record, rows);
    }
    let forms = one("t,a,b\n0.0,.5,1e308\n0.1,5.,+1\n0.2,-0,7\n").expect("a table");
    assert_eq!(
        (forms.channels[0].values.as_slice(), forms.channels[1].values.as_slice()),
        (&[0.5, 5.0, -0.0][..], &[1e308, 1.0, 7.0][..])
    );
    let constant = one("t,a\n0.0,1\n0.1,1\n0.2,1\n").expect("a table");
    assert_eq!(constant.channels[0].values, [1.0; 3]);
    assert_eq!(one("value\n1\n2\n4\n").expect("a column").channels[0].name, "value");
    assert!(take(b"\x1f\x8b\x08\0", &ReadOptions::default()).expect_err("gzip").to_string().contains("end too early"));
    let words = one("a page of text\nwith some lines\nand no numbers\n").expect_err("no data");
    assert!(words.to_string().starts_with("-:1: no rows of numbers"), "{words}");
}

#[test]
fn a_directory_and_a_missing_file_are_refused_by_name() {
    let folder = tempfile::tempdir().expect("a folder");
    let error = read(Input::Path(folder.path().to_owned()), &ReadOptions::default()).expect_err("a directory");
    assert_eq!(error.what(), "this is a directory");
    assert_eq!(error.place().file, Some(folder.path().display().to_string()));
    let missing = read(Input::Path(folder.path().join("none.csv")), &ReadOptions::default()).expect_err("missing");
    assert_eq!(missing.what(), "there is no such file");
}

#[test]
fn a_file_and_a_stream_read_alike() {
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("a.csv");
    // Large enough to be read again from the file instead of held.
    let lines: Vec<String> =
        (0..700_000).map(|n| format!("{}.{:03},{}.250000000000,{}", n / 1000, n % 1000, n % 91, n % 17)).collect();
    let bytes = text("t,ax,ay\n", &lines);
    std::fs::write(&path, &bytes).expect("a file");
    let from_file = read(Input::Path(path.clone()), &ReadOptions::default()).expect("a table");
    let from_stream = take(&bytes, &ReadOptions::default()).expect("a table");
    assert_eq!(from_file.channels[0].values, from_stream.channels[0].values);
    assert_eq!(from_file.source.sha256, from_stream.source.sha256);
    assert_eq!(from_file.channels[1].values.len(), 700_000);
    let Layout::Table(table) = &from_file.layout else { panic!("a table") };
    let again = |path_changed: bool| {
        if path_changed {
            std::fs::write(&path, &bytes[..bytes.len() - 1]).expect("a file");
        }
        let mut text = Vec::new();
        std::io::Read::read_to_end(&mut endgrain::read::reopen(&from_file.source, table)?, &mut text)?;
        Ok::<_, endgrain::error::Error>(text)
    };
    assert!(again(false).expect("unchanged") == bytes);
    assert!(again(true).is_err_and(|error| error.to_string().contains("has changed")));
}

#[test]
fn hostile_text_is_refused_or_read_without_harm() {
    let line = "1,".repeat(200_000);
    assert!(
        take(line.as_bytes(), &ReadOptions::default())
            .expect_err("many fields")
            .to_string()
            .contains("more than 65535 fields")
    );
    let escape = with_line(33, "0.31,\u{1b}[31mred,0.2");
    assert!(take(&escape, &ReadOptions::default()).expect_err("text").to_string().contains("\\u{1b}[31mred"));
    let quotes = "\"".repeat(100_000);
    assert!(take(quotes.as_bytes(), &ReadOptions::default()).is_err());
    let digits = format!("t,a\n0,{}\n1,2\n", "7".repeat(4_000));
    assert!(
        take(digits.as_bytes(), &ReadOptions::default())
            .expect_err("too large")
            .to_string()
            .contains("beyond the range")
    );
    let endless = format!("t,a\n0,{}\n1,2\n", "7".repeat(1_000_000));
    assert!(take(endless.as_bytes(), &ReadOptions::default()).is_err());
    let binary: Vec<u8> = (0..100_000_u32).map(|n| (n.wrapping_mul(2_654_435_761) >> 13) as u8).collect();
    assert!(take(&binary, &ReadOptions::default()).is_err());
}
