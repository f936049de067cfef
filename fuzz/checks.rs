//! What must hold for any bytes at all: shared by the fuzz targets and the test that replays their finds.

use std::io::Cursor;

use endgrain::audit::audit;
use endgrain::audit::stamps::{Beside, StampReading};
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::{RawRecord, Spacing, Stamps};
use endgrain::regularise::{Duplicates, Gaps, RegulariseOptions, regularise_parts};
use endgrain::settings::{Settings, rows};
use endgrain::unit::Unit;

/// A target's name and what it does with bytes.
pub type Check = (&'static str, fn(&[u8]));

/// The check of each target.
pub static CHECKS: &[Check] = &[("table", table), ("wave", wave), ("stamps", stamps), ("options", options)];

/// Rows beyond which only the reader is checked: the audit would take all the time.
const MANY: usize = 4000;

/// Text, perhaps packed: the first byte chooses what the user says of it.
pub fn table(data: &[u8]) {
    let Some((&choice, text)) = data.split_first() else { return };
    let mut options = ReadOptions::default();
    if choice & 1 != 0 {
        options.missing = vec!["NUL".into(), "x".into(), "-9999".into()];
    }
    if choice & 2 != 0 {
        options.thousands = Some(b'\'');
    }
    if choice & 4 != 0 {
        options.header_lines = Some(usize::from(choice >> 5));
    }
    if choice & 8 != 0 {
        options.time_column = Some(if choice & 32 == 0 { "none".into() } else { "1".into() });
    }
    options.allow_truncated = choice & 16 != 0;
    follow(text, &options);
}

/// A WAV file, from its first byte on.
pub fn wave(data: &[u8]) {
    follow(data, &ReadOptions::default());
    follow(data, &ReadOptions { allow_truncated: true, ..ReadOptions::default() });
}

/// A column of stamps: the first byte gives the print resolution in ticks, each pair after it a difference.
pub fn stamps(data: &[u8]) {
    let Some((&resolution, steps)) = data.split_first() else { return };
    let mut at = 0_i64;
    let mut ticks = vec![0];
    for pair in steps.chunks_exact(2).take(MANY) {
        let step = i64::from(i16::from_le_bytes([pair[0], pair[1]]));
        // A few differences are far larger than the rest, as gaps are.
        at = at.saturating_add(if step % 251 == 7 { step.saturating_mul(1 << 40) } else { step });
        ticks.push(at);
    }
    let stamps = Stamps {
        name: "t".into(),
        unit: Unit::parse("s"),
        tick: 1e-6,
        first: 0.0,
        ticks,
        resolution: f64::from(resolution.max(1)) * 1e-6,
        civil: None,
        first_line: 2,
    };
    let reading = StampReading::new(&stamps, &Beside { step: None, same_row: &|_| false });
    assert_eq!(reading.rows, stamps.ticks.len());
    assert_eq!(reading.missing, reading.gaps.iter().map(|gap| gap.missing).sum::<u64>());
    if let Some([low, high]) = reading.interval {
        assert!(low <= high, "{reading:?}");
    }
    if reading.spacing == Spacing::Uniform {
        // Even means even: every stamp within the print resolution of a line of the stated step.
        let Some(step) = reading.step else { panic!("even without a step: {reading:?}") };
        let rest = reading.positions(&stamps).into_iter().zip(reading.indices()).map(|(t, n)| t - n as f64 * step);
        let (low, high) = rest.fold((f64::MAX, f64::MIN), |(low, high), r| (low.min(r), high.max(r)));
        let span = stamps.ticks.last().map_or(0.0, |&t| t as f64 * stamps.tick).abs();
        assert!(high - low <= 1.01 * reading.resolution + 1e-12 * span, "{low} {high} {reading:?}");
    }
}

/// Lines `key=value`, the key by number where it is none: each is taken or refused, and what is taken is shown again.
pub fn options(data: &[u8]) {
    let text = String::from_utf8_lossy(data);
    let all = rows();
    let mut settings = Settings::default();
    for line in text.lines().take(40) {
        let (key, value) = line.split_once('=').unwrap_or((line, ""));
        let key = match key.parse::<usize>() {
            Ok(number) => all[number % all.len()].key,
            Err(_) => key,
        };
        // Refusals are told, whatever was given.
        if let Err(error) = settings.set(key, value) {
            assert!(!error.to_string().is_empty());
        }
    }
    settings.to_map();
}

fn follow(bytes: &[u8], options: &ReadOptions) {
    let raw = match read(Input::Stream(Box::new(Cursor::new(bytes.to_vec()))), options) {
        Ok(raw) => raw,
        Err(error) => {
            let text = error.to_string();
            assert!(text.starts_with('-') && !text.chars().any(char::is_control), "{text:?}");
            return;
        }
    };
    sound(&raw);
    if raw.channels[0].values.len() > MANY || raw.channels.len() > 16 {
        return;
    }
    audit(&raw);
    for (gaps, duplicates) in
        [(Gaps::Reject, Duplicates::Reject), (Gaps::Fill, Duplicates::Drop), (Gaps::Split, Duplicates::Drop)]
    {
        let options = RegulariseOptions { gaps, duplicates, ..RegulariseOptions::default() };
        let Ok(parts) = regularise_parts(raw.clone(), &options) else { continue };
        for part in &parts {
            assert!(part.rows.len() == part.record.len() && part.record.samples().iter().all(|v| v.is_finite()));
        }
    }
}

/// Columns of one length, and every hole listed.
fn sound(raw: &RawRecord) {
    let rows = raw.channels[0].values.len();
    for channel in &raw.channels {
        assert_eq!(channel.values.len(), rows);
        let gaps: Vec<usize> = (0..rows).filter(|&row| !channel.values[row].is_finite()).collect();
        assert_eq!(gaps, channel.missing);
    }
    if let Some(stamps) = &raw.stamps {
        assert!(stamps.ticks.len() == rows && stamps.tick > 0.0);
    }
    for finding in &raw.findings {
        assert!(!finding.to_string().chars().any(char::is_control), "{finding:?}");
    }
}
