//! Records as read become uniform records, or are refused with the line, the reason and the option that settles it.

mod random;

use endgrain::audit::audit;
use endgrain::error::Kind;
use endgrain::record::{
    ColumnRole, Encoding, Format, Layout, RateSource, RawChannel, RawRecord, Record, RowLines, Source, Spacing, Stamps,
    StatedRate, TableLayout, TextSource,
};
use endgrain::regularise::{
    Bound, Duplicates, Gaps, Regrid, Regular, RegulariseOptions, RowMap, regularise, regularise_each, regularise_parts,
};
use endgrain::unit::Unit;
use random::Random;

/// A log of one header line, a time column in seconds of `tick`, and channels of the given values.
fn log(tick: f64, ticks: Vec<i64>, channels: Vec<Vec<f64>>) -> RawRecord {
    let first = ticks.first().copied().unwrap_or(0);
    let mut raw = bare(channels);
    raw.stamps = Some(Stamps {
        name: "t".to_owned(),
        unit: Unit::parse("s"),
        tick,
        ticks: ticks.iter().map(|t| t - first).collect(),
        first: first as f64 * tick,
        resolution: tick,
        civil: None,
        first_line: 2,
    });
    raw
}

/// The same without a time column.
fn bare(channels: Vec<Vec<f64>>) -> RawRecord {
    let rows = channels.iter().map(Vec::len).max().unwrap_or(0);
    let mut columns = vec![ColumnRole::Stamps];
    columns.extend((0..channels.len()).map(ColumnRole::Channel));
    let channel = |(k, values): (usize, Vec<f64>)| RawChannel {
        name: format!("a{k}"),
        unit: Unit::parse("g"),
        missing: (0..values.len()).filter(|&n| values[n].is_nan()).collect(),
        missing_spelling: values.iter().any(|v| v.is_nan()).then(|| "NA".to_owned()),
        values,
        full_scale: None,
    };
    RawRecord {
        source: Source { path: "log.csv".to_owned(), sha256: String::new(), bytes: 0, format: Format::Csv },
        channels: channels.into_iter().enumerate().map(channel).collect(),
        stamps: None,
        stated_rate: None,
        metadata: Vec::new(),
        findings: Vec::new(),
        layout: Layout::Table(TableLayout {
            text: TextSource::Held(Vec::new().into()),
            encoding: Encoding::Utf8,
            delimiter: b',',
            decimal: b'.',
            thousands: None,
            head: "t,a0\n".to_owned(),
            header_line: Some(0),
            units_line: None,
            data_start: 5,
            data_line: 2,
            columns,
            lines: RowLines::consecutive(2, rows as u64),
            newline: "\n",
        }),
    }
}

fn tone(n: usize) -> f64 {
    (n as f64 * 0.2).sin() + 0.3 * (n as f64 * 0.07 + 1.0).cos()
}

fn tones(rows: impl Iterator<Item = usize>) -> Vec<f64> {
    rows.map(tone).collect()
}

fn plain(raw: RawRecord) -> (Record, RowMap) {
    with(raw, &RegulariseOptions::default())
}

fn with(raw: RawRecord, options: &RegulariseOptions) -> (Record, RowMap) {
    match regularise(raw, options) {
        Ok(Regular { record, rows, .. }) => (record, rows),
        Err(error) => panic!("{error}"),
    }
}

fn refused(raw: RawRecord, options: &RegulariseOptions) -> (Kind, String) {
    match regularise(raw, options) {
        Ok(_) => panic!("this must be refused"),
        Err(error) => (error.kind(), error.to_string()),
    }
}

fn codes(record: &Record) -> Vec<&'static str> {
    record.findings().iter().map(|finding| finding.code).collect()
}

fn stated(rate_base: f64, given: bool) -> Option<StatedRate> {
    let origin = if given { "--rate" } else { "header key \"rate\"" };
    Some(StatedRate { rate_base, unit: Unit::parse("s"), given, origin: origin.to_owned() })
}

/// Stamps of 100 Hz, printed in hundredths, as coarse as the step, or in thousandths.
const PRINTS: [(f64, i64); 2] = [(0.01, 1), (0.001, 10)];

#[test]
fn even_rows_are_taken_silently() {
    for (tick, step) in PRINTS {
        let (record, rows) = plain(log(tick, (0..60).map(|n| n * step).collect(), vec![tones(0..60), tones(5..65)]));
        assert_eq!(codes(&record), [""; 0]);
        assert_eq!(rows, RowMap::Even { first: 0, every: 1, count: 60 });
        assert_eq!(
            (record.axis().step(), record.axis().start(), record.axis().source()),
            (0.01, 0.0, RateSource::Stamps)
        );
        assert_eq!(record.axis().spacing(), Some(Spacing::Uniform));
        assert!(record.axis().interval().is_some_and(|[low, high]| low <= 0.01 && 0.01 <= high));
        assert_eq!(record.channel(1).samples, tones(5..65));
    }
}

#[test]
fn coarse_stamps_are_noted() {
    let (record, _) = plain(log(0.1, (0..500).map(|n| n / 10).collect(), vec![tones(0..500)]));
    assert_eq!(record.axis().step(), 0.01);
    let texts: Vec<String> = record.findings().iter().map(|f| f.to_string()).collect();
    assert_eq!(texts, ["log.csv: 10 rows per stamp, rate 100 Hz"]);
}

#[test]
fn jitter_is_noted_and_interpolated_away() {
    let mut random = Random(3);
    let jitter = random.logarithmic(0.025, 0.035);
    let instants: Vec<f64> = (0..2000).map(|n| f64::from(n) + jitter * random.normal()).collect();
    let value = |x: f64| (x * 0.2).sin() + 0.3 * (x * 0.07 + 1.0).cos();
    let raw = log(
        1e-6,
        instants.iter().map(|x| (x * 1e4).round() as i64).collect(),
        vec![instants.iter().map(|&x| value(x)).collect()],
    );
    let (record, rows) = plain(raw.clone());
    assert_eq!(codes(&record), ["jittered", "regridded"]);
    assert_eq!(rows, RowMap::Regridded { count: 2000 });
    assert_eq!(record.axis().spacing(), Some(Spacing::Jittered));
    let error = |record: &Record| {
        let samples = record.channel(0).samples;
        let off = |n: usize| samples[n] - value(record.axis().stamp(n) / 0.01);
        ((10..1990).map(|n| off(n).powi(2)).sum::<f64>() / 1980.0).sqrt()
    };
    // Band edge 0.032 cycles a sample: below the 1.7e-6 measured for 0.05 with more jitter, plus 1e-4 steps of print
    // resolution times a slope of 0.2.
    assert!(error(&record) < 1e-4, "{}", error(&record));
    let options = RegulariseOptions { regrid: Some(Regrid::Off), ..RegulariseOptions::default() };
    let (taken, rows) = with(raw, &options);
    assert_eq!(rows, RowMap::Even { first: 0, every: 1, count: 2000 });
    assert_eq!(codes(&taken), ["jittered"]);
    // 2 pi f_rms s_j: 0.03 steps times a slope of 0.14 rms.
    assert!((0.002..0.01).contains(&error(&taken)), "{}", error(&taken));
}

#[test]
fn a_repeated_row_is_refused_by_line_or_dropped() {
    for (tick, step) in PRINTS {
        let ticks: Vec<i64> = (0..31).chain(30..60).map(|n| n * step).collect();
        let values = tones((0..31).chain(30..60));
        let raw = log(tick, ticks.clone(), vec![values.clone()]);
        let (kind, text) = refused(raw.clone(), &RegulariseOptions::default());
        assert_eq!(kind, Kind::Malformed);
        assert_eq!(text, "log.csv:33: repeats line 32; --duplicates drop leaves repeated rows out");
        let options = RegulariseOptions { duplicates: Duplicates::Drop, ..RegulariseOptions::default() };
        let (record, rows) = with(raw, &options);
        assert_eq!(record.channel(0).samples, tones(0..60));
        assert_eq!((rows.row(30), rows.row(31)), (Some(30), Some(32)));
        assert_eq!(codes(&record), ["repeats_dropped"]);
        if step > 1 {
            let mut other = values;
            other[31] += 0.5;
            let (_, text) = refused(log(tick, ticks, vec![other]), &options);
            assert!(text.starts_with("log.csv:33:2: channel \"a0\": repeats the stamp"), "{text}");
        }
    }
}

#[test]
fn missing_rows_are_refused_by_line_or_filled() {
    for (tick, step) in PRINTS {
        let kept = || (0..30).chain(35..200);
        let raw = log(tick, kept().map(|n| n as i64 * step).collect(), vec![tones(kept())]);
        let (kind, text) = refused(raw.clone(), &RegulariseOptions::default());
        assert_eq!(kind, Kind::Malformed);
        assert!(text.starts_with("log.csv:32: gap of 0.06 s = 5 samples; --gaps fill"), "{text}");
        let options = RegulariseOptions { gaps: Gaps::Fill, ..RegulariseOptions::default() };
        let (record, rows) = with(raw, &options);
        assert_eq!(codes(&record), ["filled"]);
        assert_eq!((record.len(), rows.row(29), rows.row(30), rows.row(35)), (200, Some(29), None, Some(30)));
        for n in 30..35 {
            // Two tones without noise: the model leaves next to nothing (5e-9 measured for a longer record).
            assert!((record.channel(0).samples[n] - tone(n)).abs() < 1e-3, "{n}");
        }
    }
}

#[test]
fn stamps_that_go_back_are_refused_by_line() {
    let raw = log(0.01, (0..40).chain(35..60).collect(), vec![tones(0..65)]);
    let (kind, text) = refused(raw.clone(), &RegulariseOptions::default());
    assert_eq!(kind, Kind::Malformed);
    assert!(text.starts_with("log.csv:42: 0.35 after 0.39; "), "{text}");
    // Cut off before it, the rest is sound.
    let options = RegulariseOptions { to: Bound::parse("0.3s").ok(), ..RegulariseOptions::default() };
    let (record, _) = with(raw, &options);
    assert_eq!(record.channel(0).samples, tones(0..31));
}

#[test]
fn missing_values_are_refused_by_field_or_filled() {
    let mut values = tones(0..300);
    values[50] = f64::NAN;
    values[51] = f64::NAN;
    values[200] = f64::NAN;
    let raw = log(0.001, (0..300).map(|n| n * 10).collect(), vec![tones(0..300), values]);
    let (kind, text) = refused(raw.clone(), &RegulariseOptions::default());
    assert_eq!(kind, Kind::Malformed);
    assert!(text.starts_with("log.csv:52:3: channel \"a1\": no value (\"NA\"), the first of 3; --gaps fill"), "{text}");
    let options = RegulariseOptions { gaps: Gaps::Fill, ..RegulariseOptions::default() };
    let (record, rows) = with(raw, &options);
    assert_eq!(rows, RowMap::Even { first: 0, every: 1, count: 300 });
    for n in [50, 51, 200] {
        assert!((record.channel(1).samples[n] - tone(n)).abs() < 1e-3, "{n}: {}", record.channel(1).samples[n]);
    }
    assert_eq!(record.channel(0).samples, tones(0..300));
}

#[test]
fn gaps_longer_than_a_cycle_or_at_an_end_stay_refused() {
    let options = RegulariseOptions { gaps: Gaps::Fill, ..RegulariseOptions::default() };
    let kept = || (0..300).chain(360..700);
    let raw = log(0.001, kept().map(|n| n as i64 * 10).collect(), vec![tones(kept())]);
    let (kind, text) = refused(raw, &options);
    assert_eq!(kind, Kind::Unsupported);
    assert!(text.contains("log.csv:301:2") && text.contains("60 missing samples span"), "{text}");
    let mut values = tones(0..100);
    values[99] = f64::NAN;
    let (_, text) = refused(log(0.001, (0..100).map(|n| n * 10).collect(), vec![values]), &options);
    assert!(text.contains("at an end of the record"), "{text}");
}

#[test]
fn a_channel_at_its_own_rate_is_left_out_or_taken_alone() {
    let sparse: Vec<f64> = (0..400).map(|n| if n % 10 == 3 { tone(n) } else { f64::NAN }).collect();
    let ticks: Vec<i64> = (0..400).map(|n| n * 10).collect();
    let raw = log(0.001, ticks.clone(), vec![tones(0..400), sparse.clone()]);
    let (record, _) = plain(raw.clone());
    assert_eq!((record.channel_count(), codes(&record)), (1, vec!["sparse_channel"]));
    assert_eq!(audit(&raw).findings.iter().map(|f| f.code).collect::<Vec<_>>(), ["sparse_channel"]);
    let (alone, rows) = plain(log(0.001, ticks, vec![sparse]));
    assert_eq!((alone.len(), alone.axis().step(), alone.axis().start()), (40, 0.1, 0.03));
    assert_eq!(rows, RowMap::Even { first: 3, every: 10, count: 40 });
    let each = regularise_each(raw, &RegulariseOptions::default());
    let rates: Vec<f64> = each.iter().flat_map(|group| &group.parts).map(|p| p[0].record.axis().rate_base()).collect();
    assert_eq!(rates, [100.0, 10.0]);
    assert_eq!((&each[0].channels, &each[1].channels), (&vec!["a0".to_owned()], &vec!["a1".to_owned()]));
}

#[test]
fn a_given_rate_wins_and_a_stated_one_is_compared() {
    let raw = || log(0.001, (0..500).map(|n| n * 10).collect(), vec![tones(0..500)]);
    let mut given = raw();
    given.stated_rate = stated(250.0, true);
    let (record, _) = plain(given);
    assert_eq!((record.axis().step(), record.axis().source()), (0.004, RateSource::Given));
    assert_eq!(codes(&record), ["rate_overrides_stamps"]);
    assert!(record.findings()[0].text.contains("the stamps show 100 Hz"), "{}", record.findings()[0]);
    let mut header = raw();
    header.stated_rate = stated(99.0, false);
    let (record, _) = plain(header);
    assert_eq!((record.axis().step(), codes(&record)), (0.01, vec!["stated_rate_differs"]));
    let mut agreeing = raw();
    agreeing.stated_rate = stated(100.0, false);
    assert_eq!(codes(&plain(agreeing).0), [""; 0]);
}

#[test]
fn without_stamps_a_rate_is_needed() {
    let (kind, text) = refused(bare(vec![tones(0..50)]), &RegulariseOptions::default());
    assert_eq!(kind, Kind::Unsupported);
    assert!(text.contains("give --rate"), "{text}");
    for (given, source) in [(true, RateSource::Given), (false, RateSource::Header)] {
        let mut raw = bare(vec![tones(0..50)]);
        raw.stated_rate = stated(100.0, given);
        let (record, _) = plain(raw);
        assert_eq!((record.axis().step(), record.axis().source()), (0.01, source));
    }
    assert_eq!(refused(bare(Vec::new()), &RegulariseOptions::default()).0, Kind::Unsupported);
    assert_eq!(refused(bare(vec![Vec::new()]), &RegulariseOptions::default()).0, Kind::Unsupported);
    assert_eq!(refused(log(0.01, vec![0], vec![vec![1.0]]), &RegulariseOptions::default()).0, Kind::Unsupported);
}

#[test]
fn a_cut_keeps_stamps_and_rows() {
    let options = RegulariseOptions {
        from: Bound::parse("1.5s").ok(),
        to: Bound::parse("1990 ms").ok(),
        ..RegulariseOptions::default()
    };
    let (record, rows) = with(log(0.001, (0..500).map(|n| n * 10).collect(), vec![tones(0..500)]), &options);
    assert_eq!(
        (record.axis().start(), record.len(), rows),
        (1.5, 50, RowMap::Even { first: 150, every: 1, count: 50 })
    );
    assert_eq!(record.channel(0).samples, tones(150..200));
    let mut raw = bare(vec![tones(0..500)]);
    raw.stated_rate = stated(100.0, true);
    let (record, rows) = with(raw, &options);
    assert_eq!((record.axis().start(), record.len(), rows.row(0)), (1.5, 50, Some(150)));
    // A fault outside the cut does not matter.
    let kept = || (0..30).chain(35..500);
    let gap = log(0.001, kept().map(|n| n as i64 * 10).collect(), vec![tones(kept())]);
    assert_eq!(with(gap, &options).0.channel(0).samples, tones(150..200));
    for (wrong, kind) in [("30mm", Kind::Usage), ("9s", Kind::Unsupported)] {
        let options = RegulariseOptions { from: Bound::parse(wrong).ok(), ..RegulariseOptions::default() };
        assert_eq!(refused(log(0.001, (0..500).map(|n| n * 10).collect(), vec![tones(0..500)]), &options).0, kind);
    }
}

#[test]
fn an_audit_tells_all_of_it_and_never_fails() {
    let kept = || (0..30).chain(35..500);
    let mut spiky = tones(kept());
    spiky[100] += 20.0;
    let raw = log(0.001, kept().map(|n| n as i64 * 10).collect(), vec![spiky, vec![2.5; 495]]);
    let found = audit(&raw);
    let codes: Vec<&str> = found.findings.iter().map(|f| f.code).collect();
    assert_eq!(codes, ["gap", "spikes", "constant_channel"]);
    assert_eq!(found.findings[0].place.line, Some(32));
    assert_eq!((found.findings[1].place.line, found.findings[1].place.sample), (Some(102), Some(100)));
    let json = match serde_json::to_value(&found) {
        Ok(json) => json,
        Err(error) => panic!("{error}"),
    };
    assert_eq!(json["stamps"]["spacing"], "uniform");
    assert_eq!(json["channels"][1]["level"]["crest_factor"], serde_json::Value::Null);
    for values in [vec![], vec![f64::NAN; 3], vec![f64::INFINITY, 1.0], vec![1e308, -1e308, 1e308], vec![0.0; 40]] {
        let ticks = (0..values.len() as i64).collect();
        audit(&log(0.01, ticks, vec![values.clone()]));
        audit(&bare(vec![values, vec![]]));
    }
}

#[test]
fn gaps_split_into_parts_on_one_grid() {
    // A day's outage, a short stretch, and a value missing in one channel.
    let kept = || (0..100).chain(8_640_000..8_640_010).chain(8_640_050..8_640_250);
    let mut holed = tones(kept());
    holed[200] = f64::NAN;
    let raw = log(0.001, kept().map(|n| n as i64 * 10).collect(), vec![tones(kept()), holed]);
    let options = RegulariseOptions { gaps: Gaps::Split, ..RegulariseOptions::default() };
    let parts = match regularise_parts(raw.clone(), &options) {
        Ok(parts) => parts,
        Err(error) => panic!("{error}"),
    };
    let found: Vec<(usize, f64, usize)> =
        parts.iter().map(|p| (p.record.len(), p.record.axis().start(), p.rows.row(0).unwrap_or(0))).collect();
    assert_eq!(found, [(100, 0.0, 0), (90, 86_400.5, 110), (109, 86_401.41, 201)]);
    assert_eq!(parts[1].record.channel(1).samples, tones(8_640_050..8_640_140));
    for (index, part) in parts.iter().enumerate() {
        assert_eq!(part.segment.map(|s| (s.number, s.count)), Some((index + 1, 3)));
        assert_eq!(codes(&part.record), ["rows_left_out", "short_stretch", "segment"]);
        assert!((part.record.axis().step() - 0.01).abs() < 1e-15);
    }
    let text = refused(raw, &options).1;
    assert!(text.contains("gaps split the record into 3 parts"), "{text}");
    // Without a gap there is one part, unnumbered; without a long enough stretch there is none.
    let whole = log(0.001, (0..50).map(|n| n * 10).collect(), vec![tones(0..50)]);
    assert_eq!(codes(&with(whole, &options).0), [""; 0]);
    let crumbs = || (0..60).filter(|n| n % 12 != 11);
    let raw = log(0.001, crumbs().map(|n| n as i64 * 10).collect(), vec![tones(crumbs())]);
    assert!(refused(raw, &options).1.contains("no stretch between gaps holds 16 samples"));
}

#[test]
fn a_slip_of_the_clock_splits_where_it_is() {
    let ticks = (0..600).map(|n| n * 1000 + if n >= 311 { 400 } else { 0 }).collect();
    let raw = log(1e-6, ticks, vec![tones(0..600)]);
    let (_, text) = refused(raw.clone(), &RegulariseOptions::default());
    assert!(text.starts_with("log.csv:313: the clock jumps") && text.contains("--gaps split"), "{text}");
    let options = RegulariseOptions { gaps: Gaps::Split, ..RegulariseOptions::default() };
    let parts = match regularise_parts(raw, &options) {
        Ok(parts) => parts,
        Err(error) => panic!("{error}"),
    };
    let lengths: Vec<usize> = parts.iter().map(|part| part.record.len()).collect();
    assert_eq!(lengths, [311, 289]);
    assert!((parts[1].record.axis().start() - 0.3114).abs() < 1e-12);
    assert!(codes(&parts[1].record).contains(&"slipped"));
}

#[test]
fn jitter_between_gaps_is_interpolated_in_each_part() {
    let mut random = Random(3);
    let kept = || (0..300).chain(350..700);
    let instants: Vec<f64> = kept().map(|n| n as f64 + 0.04 * random.normal()).collect();
    let values = instants.iter().map(|x| (0.15 * x).sin()).collect();
    let raw = log(1e-6, instants.iter().map(|x| (x * 1000.0).round() as i64).collect(), vec![values]);
    let options = RegulariseOptions { gaps: Gaps::Split, ..RegulariseOptions::default() };
    let parts = match regularise_parts(raw, &options) {
        Ok(parts) => parts,
        Err(error) => panic!("{error}"),
    };
    assert_eq!(parts.len(), 2);
    for part in parts {
        let axis = part.record.axis().clone();
        let samples = part.record.channel(0).samples;
        let worst = (5..samples.len() - 5)
            .map(|n| (samples[n] - (0.15 * axis.stamp(n) * 1000.0).sin()).abs())
            .fold(0.0, f64::max);
        // The step is found to 4 sqrt(12) 0.04 / 300^1.5 of itself: 1e-4 over 300 rows is 0.03 steps at most, times 0.15.
        assert!(worst < 5e-3, "{worst}");
        assert!(codes(&part.record).contains(&"regridded"));
    }
}

#[test]
fn content_near_the_end_of_the_band_takes_the_least_squares_series() {
    let mut random = Random(8);
    let truth = |x: f64| (2.0 * std::f64::consts::PI * 0.4 * x).sin();
    let instants: Vec<f64> = (0..800).map(|n| f64::from(n) + 0.05 * random.normal()).collect();
    let raw = log(
        1e-6,
        instants.iter().map(|x| (x * 1000.0).round() as i64).collect(),
        vec![instants.iter().map(|&x| truth(x)).collect()],
    );
    let error = |regrid| {
        let (record, _) = with(raw.clone(), &RegulariseOptions { regrid, ..RegulariseOptions::default() });
        let samples = record.channel(0).samples.to_vec();
        let inner = 40..samples.len() - 40;
        let square: f64 = inner.clone().map(|n| (samples[n] - truth(record.axis().stamp(n) * 1000.0)).powi(2)).sum();
        ((square / inner.len() as f64).sqrt(), codes(&record))
    };
    let (series, notes) = error(None);
    let (cubic, cubic_notes) = error(Some(Regrid::Cubic));
    assert!(notes.contains(&"regridded") && !notes.contains(&"regrid_band"), "{notes:?}");
    assert!(cubic_notes.contains(&"regrid_band"), "{cubic_notes:?}");
    // Published for this case, NumPy 2.4 and SciPy 1.17: cubic 0.018, least squares 7.6e-4 of the RMS. What remains here
    // beside is the uncertainty of the step, 1e-5 a row.
    assert!(cubic > 0.005 && series < 0.004, "cubic {cubic}, series {series}");
}

#[test]
fn repairs_are_told_by_sample_and_kind() {
    let mut random = Random(12);
    let mut quiet = tones(0..400);
    let mut noisy: Vec<f64> = (0..400).map(|n| (0.01 * f64::from(n)).sin() + 0.1 * random.normal()).collect();
    quiet[60] = f64::NAN;
    noisy[100] = f64::NAN;
    noisy[101] = f64::NAN;
    let raw = log(0.001, (0..400).map(|n| n * 10).collect(), vec![quiet, noisy]);
    let options = RegulariseOptions { gaps: Gaps::Fill, ..RegulariseOptions::default() };
    let regular = match regularise(raw, &options) {
        Ok(regular) => regular,
        Err(error) => panic!("{error}"),
    };
    let told: Vec<Vec<(usize, usize, &str)>> =
        regular.repairs.iter().map(|own| own.iter().map(|r| (r.first, r.last, r.how.label())).collect()).collect();
    assert_eq!(told[0].len(), 1);
    assert_eq!((told[0][0].0, told[0][0].1), (60, 60));
    assert_eq!(told[1], [(100, 101, "smoother")]);
}
