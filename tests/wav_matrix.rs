//! WAV files as they are met: each case gets the right numbers, or a remark that says which guess was made, or an error that
//! says where.

use std::io::{Cursor, Read};

use endgrain::error::{Error, Kind};
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::{Layout, RawRecord, SampleType, StatedRate};
use proptest::prelude::*;

/// A stream that hands out a few bytes at a time, like a pipe.
struct Drip(Cursor<Vec<u8>>, usize);

impl Read for Drip {
    fn read(&mut self, buffer: &mut [u8]) -> std::io::Result<usize> {
        let end = buffer.len().min(self.1);
        self.0.read(&mut buffer[..end])
    }
}

fn try_read(bytes: &[u8], options: &ReadOptions) -> Result<RawRecord, Error> {
    let whole = read(Input::Stream(Box::new(Cursor::new(bytes.to_vec()))), options);
    let drip = read(Input::Stream(Box::new(Drip(Cursor::new(bytes.to_vec()), 7))), options);
    match (&whole, &drip) {
        (Ok(whole), Ok(drip)) => assert_eq!(values(whole), values(drip)),
        (Err(whole), Err(drip)) => assert_eq!(whole, drip),
        _ => panic!("a pipe reads differently: {whole:?} {drip:?}"),
    }
    whole
}

fn accept(bytes: &[u8]) -> RawRecord {
    let record = try_read(bytes, &ReadOptions::default()).unwrap();
    assert_eq!(record.source.bytes, bytes.len() as u64);
    record
}

fn silently(bytes: &[u8]) -> RawRecord {
    let record = accept(bytes);
    assert!(record.findings.is_empty(), "{:?}", record.findings);
    record
}

fn noted(bytes: &[u8], code: &str) -> RawRecord {
    let record = accept(bytes);
    let codes: Vec<&str> = record.findings.iter().map(|finding| finding.code).collect();
    assert_eq!(codes, [code], "{:?}", record.findings);
    record
}

fn refused(bytes: &[u8]) -> String {
    let error = try_read(bytes, &ReadOptions::default()).unwrap_err();
    assert_eq!(error.kind(), Kind::Malformed);
    let text = error.to_string();
    assert!(text.starts_with("-: "), "{text}");
    text
}

fn values(record: &RawRecord) -> Vec<Vec<f64>> {
    record.channels.iter().map(|channel| channel.values.clone()).collect()
}

fn chunk(id: &[u8; 4], content: &[u8]) -> Vec<u8> {
    let mut out = [&id[..], &(content.len() as u32).to_le_bytes(), content].concat();
    out.extend(vec![0; content.len() % 2]);
    out
}

fn riff(chunks: &[Vec<u8>]) -> Vec<u8> {
    let body = chunks.concat();
    [&b"RIFF"[..], &(body.len() as u32 + 4).to_le_bytes(), b"WAVE", &body].concat()
}

fn fmt(tag: u16, channels: u16, rate: u32, align: u16, bits: u16) -> Vec<u8> {
    let mut out = Vec::new();
    out.extend(tag.to_le_bytes());
    out.extend(channels.to_le_bytes());
    out.extend(rate.to_le_bytes());
    out.extend((rate.wrapping_mul(u32::from(align))).to_le_bytes());
    out.extend(align.to_le_bytes());
    out.extend(bits.to_le_bytes());
    out
}

fn extensible(tag: u16, channels: u16, align: u16, bits: u16, valid: u16) -> Vec<u8> {
    let mut out = fmt(0xfffe, channels, 8000, align, bits);
    out.extend([22, 0]);
    out.extend(valid.to_le_bytes());
    out.extend([0; 4]);
    out.extend(tag.to_le_bytes());
    out.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
    out
}

/// One channel at 8 kHz: format tag, bits, data.
fn mono(tag: u16, bits: u16, data: &[u8]) -> Vec<u8> {
    riff(&[chunk(b"fmt ", &fmt(tag, 1, 8000, bits.div_ceil(8), bits)), chunk(b"data", data)])
}

fn words(values: &[i16]) -> Vec<u8> {
    values.iter().flat_map(|v| v.to_le_bytes()).collect()
}

#[test]
fn case_1_integers_of_16_bits() {
    let record = silently(&riff(&[
        chunk(b"fmt ", &fmt(1, 2, 8000, 4, 16)),
        chunk(b"data", &words(&[0, 1, -32768, 32767, 16384, -1])),
    ]));
    assert_eq!(values(&record), [[0.0, -1.0, 0.5], [1.0 / 32768.0, 32767.0 / 32768.0, -1.0 / 32768.0]]);
    assert_eq!(record.channels[1].name, "ch2");
    assert_eq!(record.channels[1].unit.label(), "FS");
    assert_eq!(record.channels[1].full_scale, Some(1.0));
    let stated = record.stated_rate.unwrap();
    assert_eq!((stated.rate_base, stated.unit.label(), stated.given), (8000.0, "s", false));
    let Layout::Wave(layout) = record.layout else { panic!("no WAV layout") };
    assert_eq!((layout.rate_hz, layout.channels, layout.sample_type), (8000, 2, SampleType::Integer(16)));
}

#[test]
fn case_2_8_bits_are_offset_binary() {
    assert_eq!(values(&silently(&mono(1, 8, &[0, 128, 255, 64]))), [[-1.0, 0.0, 127.0 / 128.0, -0.5]]);
}

#[test]
fn case_3_odd_24_bits_with_pad() {
    let bytes = mono(1, 24, &[1, 0, 0, 0xff, 0xff, 0xff, 0, 0, 0x80]);
    assert_eq!(bytes.len() % 2, 0);
    assert_eq!(values(&silently(&bytes)), [[1.0 / 8388608.0, -1.0 / 8388608.0, -1.0]]);
}

#[test]
fn case_4_odd_24_bits_without_pad() {
    let mut bytes = mono(1, 24, &[0, 0, 0x40]);
    bytes.pop();
    assert_eq!(values(&noted(&bytes, "no_pad_byte")), [[0.5]]);
    // The next chunk follows at once.
    let mut bytes = mono(1, 24, &[0, 0, 0x40]);
    bytes.pop();
    bytes.extend(chunk(b"LIST", b"INFO"));
    let size = bytes.len() as u32 - 8;
    bytes[4..8].copy_from_slice(&size.to_le_bytes());
    assert_eq!(values(&noted(&bytes, "no_pad_byte")), [[0.5]]);
}

#[test]
fn cases_5_to_7_32_bits_and_floats() {
    let data: Vec<u8> = [i32::MIN, 1 << 30].iter().flat_map(|v| v.to_le_bytes()).collect();
    assert_eq!(values(&silently(&mono(1, 32, &data))), [[-1.0, 0.5]]);
    let data: Vec<u8> = [1.5_f32, -0.1].iter().flat_map(|v| v.to_le_bytes()).collect();
    let record = silently(&mono(3, 32, &data));
    assert_eq!(values(&record), [[1.5, f64::from(-0.1_f32)]]);
    assert_eq!(record.channels[0].full_scale, None);
    let data: Vec<u8> = [1e300, -0.1].iter().flat_map(|v: &f64| v.to_le_bytes()).collect();
    assert_eq!(values(&silently(&mono(3, 64, &data))), [[1e300, -0.1]]);
}

#[test]
fn cases_8_to_10_extensible() {
    let file = |format: Vec<u8>, data: &[u8]| riff(&[chunk(b"fmt ", &format), chunk(b"data", data)]);
    let record = silently(&file(extensible(1, 1, 3, 24, 24), &[0, 0, 0xc0, 0, 0, 0x20]));
    assert_eq!(values(&record), [[-0.5, 0.25]]);
    // 24 valid bits in 32: the upper ones.
    let record = silently(&file(extensible(1, 1, 4, 32, 24), &[0, 0xff, 0xff, 0x7f, 0, 1, 0, 0]));
    assert_eq!(values(&record), [[8388607.0 / 8388608.0, 1.0 / 8388608.0]]);
    let Layout::Wave(layout) = record.layout else { panic!("no WAV layout") };
    assert_eq!(layout.sample_type, SampleType::Integer(24));
    let data: Vec<u8> = [0.25_f32, -3.0].iter().flat_map(|v| v.to_le_bytes()).collect();
    assert_eq!(values(&silently(&file(extensible(3, 2, 8, 32, 32), &data))), [[0.25], [-3.0]]);
}

#[test]
fn valid_bits_in_the_lower_end_are_noted() {
    // The samples of hound 3.5.1, testsamples/waveformatextensible-24bit-4byte-48kHz-stereo.wav and its plain twin, with the
    // values that its own tests expect of them (src/read.rs).
    let data = [0xa0, 0xff, 0xff, 0, 0x0c, 0x5a, 0, 0, 0xff, 0xff, 0x7f, 0, 0x20, 0x6d, 0x80, 0];
    let expected = [[-96.0 / 8388608.0, 8388607.0 / 8388608.0], [23052.0 / 8388608.0, -8360672.0 / 8388608.0]];
    let bytes = riff(&[chunk(b"fmt ", &extensible(1, 2, 8, 32, 24)), chunk(b"data", &data)]);
    assert_eq!(values(&noted(&bytes, "right_aligned")), expected);
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 2, 48000, 8, 24)), chunk(b"data", &data)]);
    let record = accept(&bytes);
    assert_eq!(values(&record), expected);
    let codes: Vec<&str> = record.findings.iter().map(|finding| finding.code).collect();
    assert_eq!(codes, ["right_aligned", "container"]);
    // Neither end: the header cannot be right.
    let data = [0xa1, 0xff, 0xff, 0x12, 0x0d, 0x5a, 0x40, 0x33];
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 1, 48000, 4, 24)), chunk(b"data", &data)]);
    assert!(refused(&bytes).contains("contradict"));
    let bytes = riff(&[chunk(b"fmt ", &extensible(1, 1, 4, 32, 24)), chunk(b"data", &data)]);
    noted(&bytes, "valid_bits");
}

#[test]
fn cases_11_to_14_chunks_around_the_data() {
    let (format, data) = (chunk(b"fmt ", &fmt(1, 1, 8000, 2, 16)), chunk(b"data", &words(&[16384])));
    let odd_list = chunk(b"LIST", b"INFOICMT\x03\0\0\0abc");
    let (junk, bext) = (chunk(b"JUNK", &[7; 28]), chunk(b"bext", &[1; 603]));
    let cue = chunk(b"cue ", &[0; 4]);
    for chunks in [
        vec![format.clone(), odd_list.clone(), data.clone()],
        vec![junk, bext, format.clone(), data.clone()],
        vec![format.clone(), data.clone(), cue, odd_list.clone()],
    ] {
        assert_eq!(values(&silently(&riff(&chunks))), [[0.5]]);
    }
    // An odd chunk without its pad byte before the data.
    let mut unpadded = odd_list;
    unpadded.pop();
    assert_eq!(values(&noted(&riff(&[format, unpadded, data]), "no_pad_byte")), [[0.5]]);
    // Case 14: a plain tag in a long format chunk.
    let mut format = fmt(1, 1, 8000, 2, 16);
    format.extend([0; 24]);
    assert_eq!(values(&silently(&riff(&[chunk(b"fmt ", &format), chunk(b"data", &words(&[-16384]))]))), [[-0.5]]);
}

#[test]
fn cases_15_and_16_streamed_sizes() {
    for word in [0_u32, u32::MAX] {
        let mut bytes = mono(1, 16, &words(&[16384, -16384, 1]));
        bytes[4..8].copy_from_slice(&word.to_le_bytes());
        bytes[40..44].copy_from_slice(&word.to_le_bytes());
        assert_eq!(values(&noted(&bytes, "streamed")), [[0.5, -0.5, 1.0 / 32768.0]]);
    }
    // Written at the start and never again: the RIFF size covers the header alone.
    let mut bytes = mono(1, 16, &words(&[16384]));
    bytes[4..8].copy_from_slice(&36_u32.to_le_bytes());
    bytes[40..44].copy_from_slice(&0_u32.to_le_bytes());
    assert_eq!(values(&noted(&bytes, "streamed")), [[0.5]]);
}

#[test]
fn case_17_truncated() {
    let whole = mono(1, 16, &words(&[16384, -16384, 1]));
    let options = ReadOptions { allow_truncated: true, ..ReadOptions::default() };
    for (cut, kept) in [(2, 2), (3, 1)] {
        let bytes = &whole[..whole.len() - cut];
        let text = refused(bytes);
        assert!(text.contains("cut short") && text.contains("--allow-truncated"), "{text}");
        assert!(text.starts_with(&format!("-: byte {}, chunk \"data\"", bytes.len())), "{text}");
        let record = try_read(bytes, &options).unwrap();
        assert_eq!(values(&record), [&[0.5, -0.5][..kept]]);
        assert_eq!(record.findings[0].code, "truncated");
        assert_eq!(record.findings.len(), 1 + cut % 2);
    }
    // Fewer than four bytes name no format at all.
    for length in 4..44 {
        let text = refused(&whole[..length]);
        assert!(!text.contains("cut short"), "{length}: {text}");
    }
}

#[test]
fn case_18_wrong_riff_size() {
    for word in [20_u32, 1000, 0, u32::MAX] {
        let mut bytes = mono(1, 16, &words(&[16384]));
        bytes[4..8].copy_from_slice(&word.to_le_bytes());
        assert_eq!(values(&noted(&bytes, "riff_size")), [[0.5]]);
    }
    let mut bytes = mono(1, 16, &words(&[16384]));
    bytes.extend(b"something else");
    let record = noted(&bytes, "riff_size");
    assert!(record.findings[0].text.contains("last 14 bytes were not read"));
}

#[test]
fn case_19_partial_last_frame() {
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 2, 8000, 4, 16)), chunk(b"data", &words(&[16384, 1, -16384]))]);
    assert_eq!(values(&noted(&bytes, "partial_frame")), [[0.5], [1.0 / 32768.0]]);
}

/// An RF64 file (EBU Tech 3306): sizes in `ds64`, -1 in the 32-bit words.
fn rf64(data_size: u64, data: &[u8]) -> Vec<u8> {
    let format = chunk(b"fmt ", &fmt(1, 1, 8000, 2, 16));
    let riff_size = 4 + 36 + format.len() as u64 + 8 + data_size;
    let sizes = [riff_size.to_le_bytes(), data_size.to_le_bytes(), (data_size / 2).to_le_bytes()].concat();
    let ds64 = chunk(b"ds64", &[&sizes[..], &[0; 4]].concat());
    [&b"RF64\xff\xff\xff\xffWAVE"[..], &ds64, &format, b"data\xff\xff\xff\xff", data].concat()
}

#[test]
fn case_20_rf64() {
    assert_eq!(values(&silently(&rf64(4, &words(&[16384, -16384])))), [[0.5, -0.5]]);
    // A chunk after the data.
    let mut bytes = rf64(2, &words(&[16384]));
    bytes.extend(chunk(b"LIST", b"INFO"));
    let size = bytes.len() as u64 - 8;
    bytes[20..28].copy_from_slice(&size.to_le_bytes());
    assert_eq!(values(&silently(&bytes)), [[0.5]]);
    // Five gigabytes are promised and four bytes there.
    let text = refused(&rf64(5_000_000_000, &words(&[1, 2])));
    assert!(text.contains("states 5000000000 bytes of data, 4 are there"), "{text}");
    let mut bytes = mono(1, 16, &words(&[1, 2]));
    bytes[40..44].copy_from_slice(&4_000_000_000_u32.to_le_bytes());
    assert!(refused(&bytes).contains("states 4000000000 bytes"));
}

#[test]
fn case_21_coded_formats_are_named() {
    // Tags of RFC 2361.
    for (tag, name) in [(6, "A-law"), (7, "mu-law"), (2, "Microsoft ADPCM"), (0x11, "IMA ADPCM"), (0x55, "layer 3")] {
        let text = refused(&mono(tag, 8, &[0; 8]));
        assert!(text.contains(name) && text.contains(&format!("0x{tag:04x}")), "{text}");
        assert!(text.contains("byte 12, chunk \"fmt \""), "{text}");
    }
    let bytes = riff(&[chunk(b"fmt ", &extensible(6, 1, 1, 8, 8)), chunk(b"data", &[0; 8])]);
    assert!(refused(&bytes).contains("A-law"));
    let mut format = extensible(1, 1, 2, 16, 16);
    format[39] = 0;
    assert!(refused(&riff(&[chunk(b"fmt ", &format), chunk(b"data", &[0; 8])])).contains("sub-format"));
}

#[test]
fn cases_22_and_23_no_format_no_channels() {
    assert!(refused(&riff(&[chunk(b"data", &[0; 8])])).contains("no format chunk"));
    assert!(refused(&riff(&[chunk(b"fmt ", &fmt(1, 0, 8000, 2, 16)), chunk(b"data", &[0; 8])])).contains("0 channels"));
    assert!(refused(&riff(&[chunk(b"fmt ", &fmt(1, 1, 8000, 2, 16))])).contains("no data chunk"));
    assert!(refused(&riff(&[chunk(b"fmt ", &[1; 14])])).contains("14 bytes"));
}

#[test]
fn case_24_wrong_block_align() {
    for align in [0, 1, 3, 16] {
        let bytes = riff(&[chunk(b"fmt ", &fmt(1, 2, 8000, align, 16)), chunk(b"data", &words(&[16384, -16384]))]);
        assert_eq!(values(&noted(&bytes, "block_align")), [[0.5], [-0.5]]);
    }
}

#[test]
fn case_25_floats_that_are_not_finite() {
    for fault in [f32::NAN, f32::INFINITY, f32::NEG_INFINITY] {
        let data: Vec<u8> = [0.0, 1.0, 2.0, fault, fault, 1.0].iter().flat_map(|v| v.to_le_bytes()).collect();
        let bytes = riff(&[chunk(b"fmt ", &fmt(3, 2, 8000, 8, 32)), chunk(b"data", &data)]);
        let text = refused(&bytes);
        assert!(text.contains("channel \"ch2\", sample 1:"), "{text}");
        assert!(text.contains("byte 56,") && text.contains("2 of them"), "{text}");
    }
    let data: Vec<u8> = [0.0, f64::NAN].iter().flat_map(|v: &f64| v.to_le_bytes()).collect();
    let bytes = riff(&[chunk(b"fmt ", &fmt(3, 2, 8000, 16, 64)), chunk(b"data", &data)]);
    refused(&bytes);
    // A channel that is not asked for may hold anything.
    let only = ["ch1".to_owned()];
    let record = try_read(&bytes, &ReadOptions { channels: Some(only.to_vec()), ..ReadOptions::default() }).unwrap();
    assert_eq!(values(&record), [[0.0]]);
}

#[test]
fn a_rate_of_0_needs_one_given() {
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 1, 0, 2, 16)), chunk(b"data", &words(&[16384]))]);
    assert!(refused(&bytes).contains("--rate"));
    let record =
        try_read(&bytes, &ReadOptions { rate: Some(StatedRate::parse("100Hz").unwrap()), ..ReadOptions::default() })
            .unwrap();
    assert_eq!((values(&record), record.stated_rate.unwrap().rate_base), (vec![vec![0.5]], 100.0));
}

#[test]
fn chunks_out_of_number_or_order_are_refused_by_name() {
    let (format, data) = (chunk(b"fmt ", &fmt(1, 1, 8000, 2, 16)), chunk(b"data", &words(&[1])));
    let text = refused(&riff(&[format.clone(), data.clone(), data.clone()]));
    assert!(text.contains("byte 46, chunk \"data\"") && text.contains("second data chunk"), "{text}");
    let other = chunk(b"fmt ", &fmt(1, 2, 8000, 4, 16));
    assert!(refused(&riff(&[format, other, data])).contains("second format chunk"));
    let bytes = riff(&[chunk(b"data", &words(&[1])), chunk(b"fmt ", &fmt(1, 1, 8000, 2, 16))]);
    let text = refused(&bytes);
    assert!(text.contains("byte 12, chunk \"data\"") && text.contains("before the format chunk"), "{text}");
}

#[test]
fn rifx_is_big_endian_throughout() {
    let mut bytes =
        b"RIFX\0\0\0\x28WAVEfmt \0\0\0\x10\0\x01\0\x02\0\0\x1f\x40\0\0\x7d\0\0\x04\0\x10data\0\0\0\x04".to_vec();
    bytes.extend([0x40, 0, 0x80, 0]);
    let record = silently(&bytes);
    assert_eq!(values(&record), [[0.5], [-1.0]]);
    assert_eq!(record.stated_rate.unwrap().rate_base, 8000.0);
}

#[test]
fn channels_without_end_in_sixty_bytes() {
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 65535, 8000, 65534, 16)), chunk(b"data", &[0; 16])]);
    assert_eq!(bytes.len(), 60);
    assert!(refused(&bytes).contains("takes 131070 bytes, the data chunk has 16"));
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 65535, 8000, 65535, 8)), chunk(b"data", &[192; 65535])]);
    assert_eq!(silently(&bytes).channels.len(), 65535);
}

#[test]
fn what_is_no_wav_file_is_named() {
    assert!(refused(b"").contains("empty"));
    assert!(refused(b"RIFF\x04\0\0\0AVI ").contains("kind \"AVI \""));
    // Only the name says that it is one.
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.wav");
    for (content, shown) in [("t,ax\n0,1\n", "t,ax"), ("\u{1b}[31m", "\\u{1b}[31")] {
        std::fs::write(&path, content).unwrap();
        let error = read(Input::Path(path.clone()), &ReadOptions::default()).unwrap_err();
        assert!(error.to_string().contains(&format!("starts with \"{shown}\"")), "{error}");
    }
    let error = try_read(&mono(1, 16, &[]), &ReadOptions::default()).unwrap_err();
    assert_eq!(error.kind(), Kind::Unsupported);
}

#[test]
fn only_wanted_channels_are_kept_in_file_order() {
    let bytes = riff(&[chunk(b"fmt ", &fmt(1, 3, 8000, 6, 16)), chunk(b"data", &words(&[1, 2, 3, 4, 5, 6]))]);
    let wanted = ["#3".to_owned(), "ch1".to_owned()];
    let record = try_read(&bytes, &ReadOptions { channels: Some(wanted.to_vec()), ..ReadOptions::default() }).unwrap();
    let names: Vec<&str> = record.channels.iter().map(|channel| channel.name.as_str()).collect();
    assert_eq!(names, ["ch1", "ch3"]);
    assert_eq!(values(&record)[1], [3.0 / 32768.0, 6.0 / 32768.0]);
    for wrong in ["ch4", "ch0", "ch01", "ax"] {
        let wanted = [wrong.to_owned()];
        let error =
            try_read(&bytes, &ReadOptions { channels: Some(wanted.to_vec()), ..ReadOptions::default() }).unwrap_err();
        assert_eq!(error.kind(), Kind::Usage);
        assert!(error.to_string().contains("ch1 to ch3"));
    }
}

/// The number that `bits` valid bits hold, stored left-aligned in the fewest bytes: the definition, bit by bit.
fn stored(number: i64, bits: u32, big: bool) -> Vec<u8> {
    let bytes = bits.div_ceil(8) as usize;
    let mut shifted = i128::from(number) << (8 * bytes as u32 - bits);
    if bytes == 1 {
        shifted += 128;
    }
    let mut cell = shifted.to_le_bytes()[..bytes].to_vec();
    if big {
        cell.reverse();
    }
    cell
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn any_count_of_valid_bits(bits in 1_u32..=64, numbers in prop::collection::vec(any::<i64>(), 1..20), big in any::<bool>()) {
        let numbers: Vec<i64> = numbers.iter().map(|n| n >> (64 - bits)).collect();
        let data: Vec<u8> = numbers.iter().flat_map(|&n| stored(n, bits, big)).collect();
        let mut bytes = mono(1, bits as u16, &data);
        if big {
            // The same header with every word turned round.
            bytes[..4].copy_from_slice(b"RIFX");
            for (at, len) in [(4, 4), (16, 4), (20, 2), (22, 2), (24, 4), (28, 4), (32, 2), (34, 2), (40, 4)] {
                bytes[at..at + len].reverse();
            }
        }
        let record = if bits > 54 { noted(&bytes, "rounded") } else { silently(&bytes) };
        let expected: Vec<f64> = numbers.iter().map(|&n| n as f64 / 2_f64.powi(bits as i32 - 1)).collect();
        prop_assert_eq!(values(&record), [expected]);
    }

    #[test]
    fn no_input_panics(bytes in prop::collection::vec(any::<u8>(), 0..120), at in 0_usize..60, word in any::<u32>()) {
        let _ = try_read(&bytes, &ReadOptions::default());
        let _ = try_read(&[b"RIFF\xff\xff\xff\xffWAVE", &bytes[..]].concat(), &ReadOptions::default());
        let mut file = rf64(12, &words(&[1, 2, 3, 4, 5, 6]));
        file[at..at + 4].copy_from_slice(&word.to_le_bytes());
        let _ = try_read(&file, &ReadOptions { allow_truncated: true, ..ReadOptions::default() });
    }

    /// hound 3.5.1 writes and reads: two readers, one file.
    #[test]
    fn agrees_with_an_independent_reader(
        numbers in prop::collection::vec(any::<i32>(), 1..60), channels in 1_u16..5, width in 0_usize..5, rate in 1_u32..200_000,
    ) {
        let (bits, sample_format) = [
            (8, hound::SampleFormat::Int), (16, hound::SampleFormat::Int), (24, hound::SampleFormat::Int),
            (32, hound::SampleFormat::Int), (32, hound::SampleFormat::Float),
        ][width];
        let spec = hound::WavSpec { channels, sample_rate: rate, bits_per_sample: bits, sample_format };
        let mut bytes = Vec::new();
        let mut writer = hound::WavWriter::new(Cursor::new(&mut bytes), spec).unwrap();
        let whole = numbers.len().next_multiple_of(usize::from(channels));
        for &number in numbers.iter().cycle().take(whole) {
            match sample_format {
                hound::SampleFormat::Int => writer.write_sample(number >> (32 - bits)).unwrap(),
                hound::SampleFormat::Float => writer.write_sample(number as f32 / 3.0).unwrap(),
            }
        }
        writer.finalize().unwrap();
        let mut reader = hound::WavReader::new(Cursor::new(&bytes)).unwrap();
        let flat: Vec<f64> = match sample_format {
            hound::SampleFormat::Int => {
                reader.samples::<i32>().map(|s| f64::from(s.unwrap()) / 2_f64.powi(i32::from(bits) - 1)).collect()
            }
            hound::SampleFormat::Float => reader.samples::<f32>().map(|s| f64::from(s.unwrap())).collect(),
        };
        let record = try_read(&bytes, &ReadOptions::default()).unwrap();
        prop_assert!(record.findings.iter().all(|finding| finding.code == "no_pad_byte"));
        for (index, channel) in record.channels.iter().enumerate() {
            let expected: Vec<f64> = flat.iter().skip(index).step_by(usize::from(channels)).copied().collect();
            prop_assert_eq!(&channel.values, &expected);
        }
        prop_assert_eq!(record.stated_rate.unwrap().rate_base, f64::from(rate));
    }
}
