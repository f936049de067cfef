//! Results as delimited text: back in the form of their source with untouched fields byte for byte, or as a plain new table.

use std::sync::Arc;

use endgrain::error::{Error, Kind};
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::{
    Axis, ColumnRole, Encoding, Format, Layout, RateSource, RawChannel, RawRecord, Record, RowLines, Source,
    TableLayout, TextSource,
};
use endgrain::unit::Unit;
use endgrain::write::{Cells, Content, Digits, Extra, Origin, Rows, writer};
use ndarray::Array2;
use proptest::prelude::*;
use sha2::{Digest, Sha256};

/// A table as a reader hands it on: column 0 holds the stamps, the others channels named c1, c2, ... in `units`.
struct Table {
    text: &'static str,
    data: usize,
    header: Option<usize>,
    units_line: Option<usize>,
    delimiter: u8,
    decimal: u8,
    newline: &'static str,
    units: &'static [&'static str],
}

/// Commas, points, line feeds, one header line, channels in g.
const PLAIN: Table = Table {
    text: "",
    data: 1,
    header: Some(0),
    units_line: None,
    delimiter: b',',
    decimal: b'.',
    newline: "\n",
    units: &["g", "g"],
};

impl Table {
    fn raw(&self) -> RawRecord {
        let head: String = self.text.split_inclusive('\n').take(self.data).collect();
        let roles = (0..self.units.len()).map(ColumnRole::Channel);
        let layout = TableLayout {
            text: TextSource::Held(Arc::new(self.text.as_bytes().to_vec())),
            encoding: Encoding::Utf8,
            thousands: None,
            lines: RowLines::consecutive(self.data as u64 + 1, self.text.lines().skip(self.data).count() as u64),
            delimiter: self.delimiter,
            decimal: self.decimal,
            header_line: self.header,
            units_line: self.units_line,
            data_start: head.len() as u64,
            data_line: self.data as u64 + 1,
            head,
            columns: std::iter::once(ColumnRole::Stamps).chain(roles).collect(),
            newline: self.newline,
        };
        let channels = self.units.iter().enumerate().map(|(index, unit)| RawChannel {
            name: format!("c{}", index + 1),
            unit: Unit::parse(unit),
            values: Vec::new(),
            missing: Vec::new(),
            missing_spelling: None,
            full_scale: None,
        });
        RawRecord {
            source: Source { path: "-".to_owned(), sha256: String::new(), bytes: 0, format: Format::Csv },
            channels: channels.collect(),
            stamps: None,
            stated_rate: None,
            metadata: Vec::new(),
            findings: Vec::new(),
            layout: Layout::Table(layout),
        }
    }
}

/// Channels as (unit, samples), at 100 Hz.
fn record(channels: &[(&str, &[f64])]) -> Record {
    let len = channels[0].1.len();
    let axis = Axis::from_rate_hz(100.0, len, RateSource::Given).unwrap();
    let names = (1..=channels.len()).map(|n| format!("c{n}")).collect();
    let units = channels.iter().map(|(unit, _)| Unit::parse(unit)).collect();
    let samples = Array2::from_shape_fn((channels.len(), len), |(c, n)| channels[c].1[n]);
    Record::new(axis, names, units, samples).unwrap()
}

fn write(content: &Content<'_>) -> Result<String, Error> {
    let csv = writer(Format::Csv);
    (csv.check)(content)?;
    let mut out = Vec::new();
    (csv.write)(content, &mut out)?;
    Ok(String::from_utf8(out).unwrap())
}

/// `record` put back into `table`; `channels` gives the raw channel of each of its channels.
fn back(table: &Table, record: &Record, channels: &[Option<usize>], rows: Rows<'_>) -> String {
    let origin = Origin::new(&table.raw(), channels, rows).unwrap();
    write(&Content { origin: Some(&origin), ..Content::new(record) }).unwrap()
}

#[test]
fn untouched_fields_stay_byte_for_byte() {
    let table = Table { text: "t,ax [g],ay [g]\n0.00,1.50,007\n 0.01 ,-2,+1e0\n0.02,3,.5\n", ..PLAIN };
    let record = record(&[("g", &[0.25, -1e-7, 3.0])]);
    let text = back(&table, &record, &[Some(0)], Rows::From(0));
    assert_eq!(text, "t,ax [g],ay [g]\n0.00,0.25,007\n 0.01 ,-1e-7,+1e0\n0.02,3,.5\n");
}

#[test]
fn a_changed_unit_changes_the_header() {
    let table = Table {
        text: "# rig 7, run 2\nt [s],ax [g],\"ay (m/s^2)\"\n0,1,2\n1,3,4\n",
        data: 2,
        header: Some(1),
        ..PLAIN
    };
    let table = Table { units: &["g", "m/s2"], ..table };
    let record = record(&[("m/s", &[0.5, 0.25]), ("m/s", &[5.0, 6.0])]);
    let text = back(&table, &record, &[Some(0), Some(1)], Rows::From(0));
    assert_eq!(text, "# rig 7, run 2\nt [s],ax [m/s],\"ay (m/s)\"\n0,0.5,5\n1,0.25,6\n");
}

#[test]
fn a_units_row_takes_the_new_unit() {
    let table = Table { text: "t;ax;ay\r\n[s];[g];[g]\r\n0,0;1,5;2\r\n0,1;2,5;3\r\n", data: 2, ..PLAIN };
    let table = Table { units_line: Some(1), delimiter: b';', decimal: b',', newline: "\r\n", ..table };
    let record = record(&[("mm/s", &[0.125, -4.75])]);
    let text = back(&table, &record, &[Some(1)], Rows::From(0));
    assert_eq!(text, "t;ax;ay\r\n[s];[g];[mm/s]\r\n0,0;1,5;0,125\r\n0,1;2,5;-4,75\r\n");
}

#[test]
fn quotes_are_kept_and_given_where_commas_need_them() {
    let table = Table { text: "\"t\",\"a\",\"b\"\n\"0,0\",\"1,5\",\"x\"\n\"0,1\",2,\"y\"\n", decimal: b',', ..PLAIN };
    let record = record(&[("g", &[0.5, 2.5])]);
    let text = back(&table, &record, &[Some(0)], Rows::From(0));
    assert_eq!(text, "\"t\",\"a\",\"b\"\n\"0,0\",\"0,5\",\"x\"\n\"0,1\",\"2,5\",\"y\"\n");
}

#[test]
fn columns_aligned_by_blanks_stay_aligned() {
    let table =
        Table { text: "   t    ax [g]   ay\n 0.0    1.50000    2\n10.0   -2.25000    3\n", delimiter: b' ', ..PLAIN };
    let record = record(&[("g", &[-0.5, 12345.678901])]);
    let text = back(&table, &record, &[Some(0)], Rows::From(0));
    assert_eq!(text, "   t    ax [g]   ay\n 0.0       -0.5    2\n10.0 12345.678901    3\n");
}

#[test]
fn a_cut_takes_its_own_rows() {
    let table = Table { text: "t,a,b\n0,1,x\n1,1,y\n2,1,z\n3,1,w", ..PLAIN };
    let record = record(&[("g", &[5.0, 6.0])]);
    assert_eq!(back(&table, &record, &[Some(0)], Rows::From(2)), "t,a,b\n2,5,z\n3,6,w\n");
}

#[test]
fn inserted_rows_are_blank_but_for_stamp_and_values() {
    let table = Table { text: "t,a,b\n0,1,x\n3,1,w\n4,1,v\n", ..PLAIN };
    let record = record(&[("g", &[1.0, 2.0, 3.0, 4.0, 5.0])]);
    let rows = [Some(0), None, None, Some(1), None];
    let stamp = |n: usize, _| format!("{n}");
    let origin = Origin::new(&table.raw(), &[Some(0)], Rows::Each(&rows)).unwrap().with_stamps(&stamp);
    let text = write(&Content { origin: Some(&origin), ..Content::new(&record) }).unwrap();
    assert_eq!(text, "t,a,b\n0,1,x\n1,2,\n2,3,\n3,4,w\n4,5,\n");
    let backwards = [Some(1), Some(0), None, None, None];
    let Err(error) = Origin::new(&table.raw(), &[Some(0)], Rows::Each(&backwards)) else { panic!("rows go back") };
    assert_eq!(error.kind(), Kind::Usage);
}

#[test]
fn extra_columns_stand_at_the_right() {
    let table = Table { text: "t,a,b,\n0,1,x,\n1,2,y,\n", ..PLAIN };
    let record = record(&[("g", &[0.5, 0.25]), ("m", &[7.0, 8.0])]);
    let origin = Origin::new(&table.raw(), &[Some(0), None], Rows::From(0)).unwrap();
    let extra = [
        Extra { name: "trusted", cells: Cells::Flags(&[Some(true), None]) },
        Extra { name: "edge, g", cells: Cells::Numbers(&[Some(0.125), Some(2.0)]) },
    ];
    let text = write(&Content { origin: Some(&origin), extra: &extra, ..Content::new(&record) }).unwrap();
    // The empty field after each trailing comma would shift the new columns.
    assert_eq!(text, "t,a,b,c2 [m],trusted,\"edge, g\"\n0,0.5,x,7,1,0.125\n1,0.25,y,8,,2\n");
}

#[test]
fn a_source_that_changed_is_noticed() {
    let table = Table { text: "t,a,b\n0,1,x\n1,1,y\n", ..PLAIN };
    let record = record(&[("g", &[1.0, 2.0])]);
    let mut raw = table.raw();
    let Layout::Table(layout) = &mut raw.layout else { panic!("no table") };
    layout.text = TextSource::Held(Arc::new(b"t,a,b\n0,1,x\n".to_vec()));
    let origin = Origin::new(&raw, &[Some(0)], Rows::From(0)).unwrap();
    let error = write(&Content { origin: Some(&origin), ..Content::new(&record) }).unwrap_err();
    assert_eq!(error.kind(), Kind::Io);
    // Rows that the table never had.
    let origin = Origin::new(&table.raw(), &[Some(0)], Rows::From(1)).unwrap();
    let error = write(&Content { origin: Some(&origin), ..Content::new(&record) }).unwrap_err();
    assert_eq!((error.kind(), error.place().sample), (Kind::Usage, Some(1)));
    // Same number of rows, another fingerprint.
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.csv");
    let text = "\u{feff}t,a,b\n0,1,x\n1,1,y\n";
    std::fs::write(&path, text).unwrap();
    let fingerprint: String = Sha256::digest(text).iter().map(|byte| format!("{byte:02x}")).collect();
    for (sha256, fine) in [(fingerprint, true), ("0".repeat(64), false)] {
        let mut raw = table.raw();
        raw.source.sha256 = sha256;
        let Layout::Table(layout) = &mut raw.layout else { panic!("no table") };
        layout.text = TextSource::File(path.clone());
        layout.encoding = Encoding::Utf8Marked;
        let origin = Origin::new(&raw, &[Some(0)], Rows::From(0)).unwrap();
        let result = write(&Content { origin: Some(&origin), ..Content::new(&record) });
        match result {
            Ok(text) => assert!(fine && text == "t,a,b\n0,1,x\n1,2,y\n"),
            Err(error) => assert!(!fine && error.to_string().contains("a.csv"), "{error}"),
        }
    }
}

#[test]
fn what_was_read_from_the_wild_goes_back_line_by_line() {
    // Blank lines, carriage returns, inches, a footer: none of them moves a row.
    let rows: Vec<String> =
        (0..12).map(|n| format!("0.{n:02};{n}.5;5\" pipe{}", if n % 5 == 0 { "\r\n" } else { "" })).collect();
    let text = format!("rig 7\r\nt;ax [g];note\r\n{}\r\n", rows.join("\r\n"));
    let raw = read(Input::Stream(Box::new(std::io::Cursor::new(text.clone()))), &ReadOptions::default()).unwrap();
    assert_eq!((raw.channels.len(), raw.channels[0].values.len()), (1, 12));
    let values: Vec<f64> = (0..12).map(|n| f64::from(n) / 4.0).collect();
    let record = record(&[("g", &values)]);
    let origin = Origin::new(&raw, &[Some(0)], Rows::From(0)).unwrap();
    let written = write(&Content { origin: Some(&origin), ..Content::new(&record) }).unwrap();
    let expected: Vec<String> = (0..12).map(|n| format!("0.{n:02};{};5\" pipe\r\n", values[n])).collect();
    assert_eq!(written, format!("rig 7\r\nt;ax [g];note\r\n{}", expected.concat()));
}

#[test]
fn a_plain_table_has_exact_stamps() {
    let record = record(&[("m/s2", &[1.0, -0.5, 1e300, 0.1])]);
    let text = write(&Content::new(&record)).unwrap();
    assert_eq!(text, "t [s],c1 [m/s2]\n0,1\n0.01,-0.5\n0.02,1e300\n0.03,0.1\n");
    let text = write(&Content { digits: Digits::Fixed(2), ..Content::new(&record) }).unwrap();
    assert!(text.ends_with("0.03,0.10\n"));
}

#[test]
fn long_tables_come_out_in_order_on_any_number_of_threads() {
    let len = 60_000_u32;
    let values: Vec<f64> = (0..len).map(|n| f64::from(n) / 7.0).collect();
    let mut source = "t,a,b\n".to_owned();
    let mut expected = source.clone();
    for (n, value) in values.iter().enumerate() {
        // Rows of uneven width, some over two lines.
        let note = if n % 1000 == 0 { "\"two\nlines\"".to_owned() } else { "x".repeat(n % 50) };
        source.push_str(&format!("{n},0,{note}\n"));
        expected.push_str(&format!("{n},{value},{note}\n"));
    }
    let record = record(&[("g", &values)]);
    let mut raw = PLAIN.raw();
    let Layout::Table(layout) = &mut raw.layout else { panic!("no table") };
    layout.head = "t,a,b\n".to_owned();
    layout.text = TextSource::Held(Arc::new(source.into_bytes()));
    layout.lines = RowLines::new();
    // Two lines for every thousandth row.
    (0..u64::from(len)).for_each(|n| layout.lines.push(2 + n + n.div_ceil(1000)));
    let origin = Origin::new(&raw, &[Some(0)], Rows::From(0)).unwrap();
    for threads in [1, 3] {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        let content = Content { origin: Some(&origin), ..Content::new(&record) };
        let text = pool.install(|| write(&content)).unwrap();
        assert!(text == expected, "differs on {threads} threads");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, failure_persistence: None, ..ProptestConfig::default() })]

    /// The csv crate 1.4 reads what was written; the standard library parses it.
    #[test]
    fn a_plain_table_reads_back_bit_for_bit(
        bits in prop::collection::vec(any::<u64>(), 1..50), rate in 1_u32..1_000_000,
    ) {
        let values: Vec<f64> = bits.iter().map(|&b| f64::from_bits(b)).filter(|v| v.is_finite()).collect();
        prop_assume!(!values.is_empty());
        let axis = Axis::from_rate_hz(f64::from(rate), values.len(), RateSource::Given).unwrap();
        let samples = Array2::from_shape_vec((1, values.len()), values.clone()).unwrap();
        let record = Record::new(axis, vec!["a,\"b\"".to_owned()], vec![Unit::parse("g")], samples).unwrap();
        let text = write(&Content::new(&record)).unwrap();
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        prop_assert_eq!(&reader.headers().unwrap()[1], "a,\"b\" [g]");
        for (n, row) in reader.records().enumerate() {
            let row = row.unwrap();
            prop_assert_eq!(row[0].parse::<f64>().unwrap(), n as f64 / f64::from(rate));
            prop_assert_eq!(row[1].parse::<f64>().unwrap().to_bits(), values[n].to_bits());
        }
    }
}
