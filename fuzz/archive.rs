//! What must hold for any bytes taken as an archive: shared by the fuzz target and the test that replays its finds.

use endgrain::basis::Planner;
use endgrain::codec::{Archive, Coded, Gaps, Header, MODES, Writer};

/// The bytes as a file; and, under sound seals, as a header and as the payload of a block: the first byte chooses.
pub fn archive(data: &[u8]) {
    follow(data, Archive::open);
    follow(data, Archive::recover);
    let Some((&choice, payload)) = data.split_first() else { return };
    let rows = 1 + u64::from(choice >> 2);
    let mode = MODES[usize::from(choice) % MODES.len()].1;
    let coded = Coded { mode, payload: payload.to_vec(), kept: None, dropped: None };
    // A header out of the fuzzer's bytes, where they are one; a plain one otherwise.
    let header = Header::decode(payload).unwrap_or_default();
    let header = if header.channels.is_empty() { plain(rows) } else { header };
    let mut bytes = Vec::new();
    let Ok(mut writer) = Writer::start(&mut bytes, &header) else { return };
    let written = writer.block(0, 0, rows as usize, &Gaps::new(), Some(&coded)).and_then(|_| writer.finish());
    if written.is_ok() {
        follow(&bytes, Archive::open);
    }
}

fn plain(rows: u64) -> Header {
    let channel = endgrain::codec::ArchivedChannel {
        name: "a".to_owned(),
        unit: String::new(),
        cast: endgrain::codec::Cast::Double,
        bound: String::new(),
        error: None,
    };
    Header { rows, channels: vec![channel], ..Header::default() }
}

fn follow<'a>(bytes: &'a [u8], open: impl Fn(&'a [u8]) -> endgrain::error::Result<Archive<'a>>) {
    let Ok(archive) = open(bytes) else { return };
    let planner = Planner::new();
    // As many rows as a fuzzer has time for.
    let end = archive.header.rows.min(1 << 12);
    for stream in 0..archive.header.streams().min(8) {
        if let Ok(samples) = archive.samples(stream, 0, end, &planner) {
            assert_eq!(samples.len() as u64, end);
            assert!(samples.iter().all(|v| !v.is_infinite()));
        }
    }
}
