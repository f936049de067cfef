//! Delimited text in the wild: each fixture must give the right numbers, or a remark that names the guess, or an error with its place.

mod tables;

use endgrain::read::ReadOptions;
use endgrain::record::{Layout, RawRecord, StatedRate};
use tables::{ROWS, check_numbers, codes, data, plain, row, stamped, take, text, with_line};

/// What a fixture must give.
enum Want {
    /// The right numbers and no remark.
    Accept,
    /// The right numbers and exactly these remarks.
    Note(&'static [&'static str]),
    /// An error that starts so (after the file) and whose remedy names that option.
    Error(&'static str, &'static str),
}

use Want::{Accept, Error, Note};

/// The stamps in the column's unit, from the first on.
fn times(record: &RawRecord) -> Vec<f64> {
    let stamps = record.stamps.as_ref().expect("stamps");
    stamps.ticks.iter().map(|&tick| stamps.first + tick as f64 * stamps.tick).collect()
}

fn check(case: &str, bytes: &[u8], options: &ReadOptions, want: &Want, rows: usize) {
    match (take(bytes, options), want) {
        (Ok(record), Accept) => {
            assert_eq!(codes(&record), [""; 0], "{case}: {:?}", record.findings);
            check_numbers(case, &record, rows);
        }
        (Ok(record), Note(expected)) => {
            assert_eq!(codes(&record), *expected, "{case}: {:?}", record.findings);
            check_numbers(case, &record, rows);
        }
        (Err(error), Error(start, option)) => {
            let message = error.to_string();
            let start = format!("-:{start}");
            assert!(message.starts_with(&start), "{case}: {message:?} does not start with {start:?}");
            assert!(message.contains(option), "{case}: {message:?} does not name {option:?}");
        }
        (Ok(record), Error(..)) => panic!("{case}: accepted, {:?}, {:?}", record.findings, record.channels),
        (Err(error), _) => panic!("{case}: {error}"),
    }
}

fn utf16(text: &[u8], bytes_of: fn(u16) -> [u8; 2]) -> Vec<u8> {
    let text = format!("\u{feff}{}", String::from_utf8(text.to_vec()).expect("own text"));
    text.encode_utf16().flat_map(bytes_of).collect()
}

#[test]
fn every_row_of_the_matrix() {
    let blank_lines = |lines: Vec<String>| lines.iter().flat_map(|l| [l.clone(), String::new()]).collect::<Vec<_>>();
    let aligned: Vec<String> = (0..ROWS).map(row).map(|(t, a, b)| format!("{t:8.2} {a:9.2} {b:9.2}")).collect();
    let quoted = |line: &String| line.split(',').map(|f| format!("\"{f}\"")).collect::<Vec<_>>().join(",");
    let all_quoted: Vec<String> = data(",", ".").iter().map(quoted).collect();
    let comma_quoted: Vec<String> =
        data(";", ",").iter().map(|l| l.split(';').map(|f| format!("\"{f}\"")).collect::<Vec<_>>().join(",")).collect();
    let trailing: Vec<String> = data(",", ".").iter().map(|l| format!("{l},")).collect();
    let mut thousands = data(";", ",");
    thousands[0] = "0,00;1.200,50;0,00".into();
    let crlf = String::from_utf8(plain("t,ax,ay\n")).expect("own text").replace('\n', "\r\n").into_bytes();
    let cr = String::from_utf8(plain("t,ax,ay\n")).expect("own text").replace('\n', "\r").into_bytes();
    let marked = [&b"\xef\xbb\xbf"[..], &plain("t,ax,ay\n")].concat();
    let unterminated = plain("t,ax,ay\n").strip_suffix(b"\n").expect("a line end").to_vec();
    let clock = |n: usize| format!("10:00:00.{:02}0", n);
    let loggers =
        "\"TOA5\",\"unit three\",\"logger\"\n\"TIMESTAMP\",\"ax\",\"ay\"\n\"TS\",\"g\",\"g\"\n\"\",\"Smp\",\"Smp\"\n";
    let latin = [&b"t;ax [m/s\xb2];temp [\xb0C]\n"[..], &text("", &data(";", "."))].concat();

    let cases: Vec<(&str, Vec<u8>, Want)> = vec![
        ("1 plain t,ax,ay", plain("t,ax,ay\n"), Accept),
        ("2 no header", plain(""), Note(&["time_column_guessed"])),
        (
            "3 # preamble with commas in it",
            plain("# unit 3, rate = 100 Hz, range = 16 g\n# a, b, c\nt,ax,ay\n"),
            Accept,
        ),
        ("4 key,value preamble of two fields", plain("device,three\nrate,100\nt,ax,ay\n"), Accept),
        ("5 free-text preamble", plain("Run of the new mount, third try, cold.\nAll well.\n\nt,ax,ay\n"), Accept),
        ("6 units row under the header", plain("t,ax,ay\ns,g,g\n"), Accept),
        ("7 ; with blank lines, names, units", text("\nt;ax;ay\n\ns;g;g\n\n", &blank_lines(data(";", "."))), Accept),
        (
            "8 four quoted header lines, quoted stamps",
            stamped(loggers, ",", |n| format!("\"2026-03-01 {}\"", clock(n))),
            Accept,
        ),
        ("9 ; with decimal comma", text("t;ax;ay\n", &data(";", ",")), Accept),
        ("10 tab with decimal comma", text("t\tax\tay\n", &data("\t", ",")), Accept),
        ("11 comma-delimited, decimal comma quoted", text("t,ax,ay\n", &comma_quoted), Accept),
        (
            "12 comma-delimited, decimal comma unquoted",
            text("t,ax,ay\n", &data(",", ",")),
            Error("2:1: the header", "separator"),
        ),
        ("13 1.200,50", text("t;ax;ay\n", &thousands), Error("2:2: two separators in \"1.200,50\"", "--thousands")),
        ("14 blank-aligned columns", text("       t        ax        ay\n", &aligned), Accept),
        ("14 blank-aligned, units in brackets", text("t [s]   ax [m/s2]   ay [m/s2]\n", &aligned), Accept),
        ("15 blank after comma", text("t, ax, ay\n", &data(", ", ".")), Accept),
        ("16 ISO 8601 with Z", stamped("t,ax,ay\n", ",", |n| format!("2026-03-01T{}Z", clock(n))), Accept),
        ("16 ISO 8601 with offset", stamped("t,ax,ay\n", ",", |n| format!("2026-03-01T{}+01:00", clock(n))), Accept),
        (
            "17 01/03/2026 10:00:00",
            stamped("t,ax,ay\n", ",", |n| format!("01/03/2026 {}", clock(n))),
            Note(&["date_order"]),
        ),
        (
            "18 epoch ms",
            stamped("t,ax,ay\n", ",", |n| format!("{}", 1_772_359_200_000_i64 + 10 * n as i64)),
            Note(&["epoch_unit"]),
        ),
        (
            "19 epoch ns, 19 digits",
            stamped("t,ax,ay\n", ",", |n| format!("{}", 1_772_359_200_000_000_001_i64 + 10_000_000 * n as i64)),
            Note(&["epoch_unit"]),
        ),
        ("26 UTF-8 BOM", marked, Accept),
        ("27 UTF-16 LE", utf16(&plain("t,ax,ay\n"), u16::to_le_bytes), Accept),
        ("28 UTF-16 BE", utf16(&plain("t,ax,ay\n"), u16::to_be_bytes), Accept),
        ("29 Latin-1 header", latin, Note(&["encoding_guessed"])),
        ("30 CRLF", crlf, Accept),
        ("31 CR only", cr, Accept),
        ("32 no final newline", unterminated, Note(&["no_final_line_end"])),
        ("33 trailing delimiter on all lines", text("t,ax,ay,\n", &trailing), Accept),
        ("34 trailing delimiter on data lines only", text("t,ax,ay\n", &trailing), Note(&["trailing_separator"])),
        ("35 everything quoted", text("\"t\",\"ax\",\"ay\"\n", &all_quoted), Accept),
        ("37 block of NUL bytes", with_line(42, &"\0".repeat(4096)), Error("42:1: 4096 NUL bytes", "--missing NUL")),
        ("40 duplicate header names", plain("t,ax,ax\n"), Note(&["duplicate_name"])),
        ("a clock alone", stamped("time,ax,ay\n", ",", clock), Accept),
        (
            "a units row and CRLF",
            text("t;ax;ay\r\ns;m/s²;m/s²\r\n", &data(";", ",").iter().map(|l| format!("{l}\r")).collect::<Vec<_>>()),
            Accept,
        ),
        ("ms in the header", stamped("t [ms],ax,ay\n", ",", |n| format!("{}", 10 * n)), Accept),
        ("an unbalanced quote", with_line(20, "0.18,\"0.1,0.2"), Error("20: a quote is opened", "close it")),
        ("a letter in a number", with_line(33, "0.31,x,0.2"), Error("33:2: not a number: \"x\"", "--missing x")),
        ("a letter in the fourth row", with_line(5, "0.03,x,0.2"), Error("5:2: not a number: \"x\"", "--missing x")),
        ("a letter in the first row", with_line(2, "0.00,x,0.2"), Error("2:2: not a number: \"x\"", "--missing x")),
        (
            "a letter in the first stamp",
            with_line(2, "x,0.1,0.2"),
            Error("2:1: not a time stamp", "--time-column none"),
        ),
        (
            "a letter in the first row, no header",
            text("", &[vec!["0.00,x,0.2".into()], data(",", ".")[1..].to_vec()].concat()),
            Error("1:2: not a number: \"x\"", "--missing x"),
        ),
        (
            "the first row too short",
            with_line(2, "0.00"),
            Error("3: 3 fields where the line above has 1", "--delimiter"),
        ),
        ("the first row too long", with_line(2, "0.00,1,2,3"), Error("3: 3 fields where the line above has 4", "")),
        ("the second row too short", with_line(3, "0.01,1"), Error("3: 2 fields where the rows above have 3", "")),
        ("a field too many", with_line(20, "0.18,1,2,3"), Error("20: 4 fields where the rows above have 3", "")),
        ("a field too few", with_line(20, "0.18,1"), Error("20: 2 fields where the rows above have 3", "")),
        ("a header of another width", plain("t,ax,ay,az\n"), Error("2:1: the header", "--header-lines")),
        ("beyond the range", with_line(20, "0.18,1e309,2"), Error("20:2: beyond the range", "")),
        ("a missing stamp", with_line(20, ",1,2"), Error("20:1: the row has no time stamp", "--time-column none")),
    ];
    for (case, bytes, want) in &cases {
        check(case, bytes, &ReadOptions::default(), want, ROWS);
    }
}

#[test]
fn what_ends_the_data() {
    let mut cut = data(",", ".");
    cut[ROWS - 1] = "0.47,0.1".into();
    let mut cut_sign = data(",", ".");
    cut_sign[ROWS - 1] = "0.47,0.1,2.5e".into();
    let footer = [data(",", "."), vec!["".into(), "End of run".into(), "Samples: 48".into()]].concat();
    let statistics = [data(",", "."), vec!["Max,0.5,24".into()]].concat();
    let resumed = [data(",", "."), vec!["stopped".into(), "0.48,1,2".into()]].concat();
    let quoted = [data(",", "."), vec!["\"x\",\"a, b\"".into()]].concat();
    let joined = |lines: &[String]| format!("t,ax,ay\n{}", lines.join("\n")).into_bytes();
    let cases: Vec<(&str, Vec<u8>, Want, usize)> = vec![
        ("36 last row cut short", joined(&cut), Note(&["last_row_cut"]), ROWS - 1),
        ("36 last row cut short, with a line end", text("t,ax,ay\n", &cut), Note(&["last_row_cut"]), ROWS - 1),
        ("36 last row cut within a number", joined(&cut_sign), Note(&["last_row_cut"]), ROWS - 1),
        ("39 footer after the data", text("t,ax,ay\n", &footer), Note(&["footer"]), ROWS),
        ("39 statistics after the data", text("t,ax,ay\n", &statistics), Note(&["footer"]), ROWS),
        ("39 quoted footer", text("t,ax,ay\n", &quoted), Note(&["footer"]), ROWS),
        ("39 only where no data follows", text("t,ax,ay\n", &resumed), Error("50: 1 fields", "remove"), 0),
    ];
    for (case, bytes, want, rows) in &cases {
        check(case, bytes, &ReadOptions::default(), want, *rows);
    }
    let nuls = [plain("t,ax,ay\n"), vec![0; 5000]].concat();
    check(
        "NUL bytes to the end",
        &nuls,
        &ReadOptions::default(),
        &Error("50:1: 5000 NUL bytes", "--allow-truncated"),
        0,
    );
    let truncated = ReadOptions { allow_truncated: true, ..ReadOptions::default() };
    check("NUL bytes to the end, allowed", &nuls, &truncated, &Note(&["truncated"]), ROWS);
}

#[test]
fn case_25_missing_spellings_are_listed_with_their_place() {
    for spelling in ["", "nan", "NaN", "NA", "N/A", "null", "#N/A", "-", "1.#IND", "inf", "----"] {
        for quote in ["", "\""] {
            let bytes = with_line(33, &format!("0.31,{quote}{spelling}{quote},0.2"));
            let record = take(&bytes, &ReadOptions::default()).unwrap_or_else(|e| panic!("{spelling}: {e}"));
            let channel = &record.channels[0];
            assert_eq!(channel.missing, [31], "{spelling}");
            assert_eq!(channel.missing_spelling.as_deref(), Some(spelling));
            assert!(channel.values[31].is_nan());
            assert_eq!(record.place(0, 31).to_string(), "-:33:2: channel \"ax\", sample 31");
            assert_eq!(record.channels[1].values[31], 0.2);
        }
    }
    let sentinel = with_line(33, "0.31,-9999,0.2");
    let record = take(&sentinel, &ReadOptions::default()).expect("a number");
    assert_eq!((record.channels[0].values[31], record.channels[0].missing.len()), (-9999.0, 0));
    for declared in ["-9999", "-9999.0"] {
        let options = ReadOptions { missing: vec![declared.into()], ..ReadOptions::default() };
        assert_eq!(take(&sentinel, &options).expect("a declared spelling").channels[0].missing, [31]);
    }
    let options = ReadOptions { missing: vec!["x".into()], ..ReadOptions::default() };
    assert_eq!(take(&with_line(33, "0.31,x,0.2"), &options).expect("declared").channels[0].missing, [31]);
}

#[test]
fn case_38_a_sparse_column_is_named() {
    let lines: Vec<String> = data(",", ".")
        .iter()
        .enumerate()
        .map(|(n, l)| if n % 10 == 0 { format!("{l},{n}.5") } else { format!("{l},") })
        .collect();
    let record = take(&text("t,ax,ay,temp\n", &lines), &ReadOptions::default()).expect("a table");
    assert_eq!(codes(&record), ["sparse_channel"]);
    assert!(record.findings[0].text.contains("one row in 10 only"), "{}", record.findings[0]);
    assert_eq!((record.channels[2].values[20], record.channels[2].missing.len()), (20.5, ROWS - 5));
}

#[test]
fn lost_rows_can_be_declared() {
    let options = ReadOptions { missing: vec!["NUL".into()], ..ReadOptions::default() };
    let record = take(&with_line(42, &"\0".repeat(512)), &options).expect("declared");
    assert_eq!(codes(&record), ["lost_rows"]);
    assert_eq!(record.channels[0].values.len(), ROWS - 1);
    assert!((times(&record)[40] - 0.41).abs() < 1e-12);
    assert_eq!(record.row_place(40).line, Some(43));
}

#[test]
fn metadata_units_and_rate_of_the_preamble_are_kept() {
    let head = "# rate = 100 Hz, range = 16 g\nStart: 2026-03-01 10:00:00\nunit,three\nt [s],ax [g],Acc_Y (m/s^2)\n";
    let record = take(&plain(head), &ReadOptions::default()).expect("a table");
    let keys: Vec<&str> = record.metadata.iter().map(|(key, _)| key.as_str()).collect();
    assert_eq!(keys, ["rate", "range", "Start", "unit"]);
    let rate = record.stated_rate.expect("a stated rate");
    assert_eq!((rate.rate_base, rate.given, rate.origin.as_str()), (100.0, false, "header key \"rate\""));
    let channels: Vec<(&str, &str)> = record.channels.iter().map(|c| (c.name.as_str(), c.unit.label())).collect();
    assert_eq!(channels, [("ax", "g"), ("Acc_Y", "m/s2")]);
    let record = take(&plain("t,ax,ay\ns,mm/s,V\n"), &ReadOptions::default()).expect("a table");
    assert_eq!((record.channels[0].unit.label(), record.channels[1].unit.label()), ("mm/s", "V"));
    let options = ReadOptions { rate: Some(StatedRate::parse("50").expect("a rate")), ..ReadOptions::default() };
    assert!(
        take(&plain("t,ax,ay\n"), &options)
            .expect("a table")
            .stated_rate
            .is_some_and(|r| r.given && r.rate_base == 50.0)
    );
}

#[test]
fn the_layout_tells_how_to_write_the_table_back() {
    let bytes = plain("# rate = 100\nt,ax,note\n");
    let options = ReadOptions { channels: Some(vec!["ax".into()]), ..ReadOptions::default() };
    let record = take(&bytes, &options).expect("a table");
    let Layout::Table(table) = &record.layout else { panic!("a table") };
    assert_eq!(
        (table.head.as_str(), table.header_line, table.units_line),
        ("# rate = 100\nt,ax,note\n", Some(1), None)
    );
    assert_eq!((table.data_start as usize, table.data_line, table.newline), (table.head.len(), 3, "\n"));
    assert_eq!((table.lines.rows(), table.lines.line(0), table.field_of(0)), (ROWS as u64, Some(3), Some(1)));
    let mut again = Vec::new();
    std::io::Read::read_to_end(&mut endgrain::read::reopen(&record.source, table).expect("held"), &mut again)
        .expect("held");
    assert_eq!(again, bytes);
}
