//! Results as WAV files: every encoding reads back, nothing is clipped, and what the form cannot hold is refused.

use std::io::Cursor;

use endgrain::error::Kind;
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::{Axis, Format, RateSource, Record};
use endgrain::unit::Unit;
use endgrain::write::{Content, Extra, WAVE_ENCODINGS, WaveEncoding, writer};
use ndarray::Array2;
use proptest::prelude::*;

fn record(rate_hz: f64, channels: &[Vec<f64>]) -> Record {
    let axis = Axis::from_rate_hz(rate_hz, channels[0].len(), RateSource::Given).unwrap();
    with_axis(axis, channels)
}

fn with_axis(axis: Axis, channels: &[Vec<f64>]) -> Record {
    let names = (1..=channels.len()).map(|n| format!("ch{n}")).collect();
    let samples = Array2::from_shape_fn((channels.len(), axis.len()), |(c, n)| channels[c][n]);
    Record::new(axis, names, vec![Unit::full_scale(); channels.len()], samples).unwrap()
}

fn write(record: &Record, encoding: WaveEncoding) -> Vec<u8> {
    let content = Content { encoding, ..Content::new(record) };
    let mut out = Vec::new();
    assert!((writer(Format::Wav).check)(&content).unwrap().is_empty());
    (writer(Format::Wav).write)(&content, &mut out).unwrap();
    out
}

fn refusal(record: &Record, encoding: WaveEncoding) -> String {
    let content = Content { encoding, ..Content::new(record) };
    let error = (writer(Format::Wav).check)(&content).unwrap_err();
    assert_eq!(error.kind(), Kind::Unsupported);
    error.to_string()
}

#[test]
fn nothing_is_clipped() {
    let beyond = record(1000.0, &[vec![0.0, 0.5], vec![0.5, -1.0, 1.0, 1.5][..2].to_vec()]);
    write(&beyond, WaveEncoding::Pcm16);
    let beyond = record(1000.0, &[vec![0.0; 4], vec![0.5, -1.0, 1.0, -1.5]]);
    for encoding in [WaveEncoding::Pcm16, WaveEncoding::Pcm24, WaveEncoding::Pcm32] {
        let text = refusal(&beyond, encoding);
        assert!(text.starts_with("channel \"ch2\", sample 2: 1 is beyond full scale"), "{text}");
        assert!(text.contains("the peak is 1.5") && text.contains("--encoding float32"), "{text}");
    }
    // The largest 16-bit number is 32767: what rounds to 32768 does not fit.
    assert!(refusal(&record(1000.0, &[vec![32767.6 / 32768.0]]), WaveEncoding::Pcm16).contains("pcm16"));
    write(&record(1000.0, &[vec![32767.4 / 32768.0, -32768.4 / 32768.0]]), WaveEncoding::Pcm16);
    assert!(refusal(&record(1000.0, &[vec![1e39]]), WaveEncoding::Float32).contains("float64"));
    write(&record(1000.0, &[vec![1e39]]), WaveEncoding::Float64);
}

#[test]
fn halves_round_to_even() {
    let record = record(1000.0, &[vec![0.5 / 32768.0, 1.5 / 32768.0, -2.5 / 32768.0]]);
    let bytes = write(&record, WaveEncoding::Pcm16);
    let mut reader = hound::WavReader::new(Cursor::new(&bytes)).unwrap();
    let numbers: Vec<i16> = reader.samples().map(Result::unwrap).collect();
    assert_eq!(numbers, [0, 2, -2]);
}

#[test]
fn what_a_wav_file_cannot_hold_is_refused() {
    let text = refusal(&record(99.5, &[vec![0.0]]), WaveEncoding::Float32);
    assert!(text.contains("99.5 Hz") && text.contains("--resample"), "{text}");
    assert!(refusal(&record(5e9, &[vec![0.0]]), WaveEncoding::Float32).contains("whole number"));
    let length = Axis::new(Unit::parse("mm"), 0.0, 0.5, 1, RateSource::Given).unwrap();
    assert!(refusal(&with_axis(length, &[vec![0.0]]), WaveEncoding::Float32).contains("--format csv"));
    let many = record(100.0, &vec![vec![0.0]; 9000]);
    assert!(refusal(&many, WaveEncoding::Float64).contains("8191 channels"));
    let one = record(100.0, &[vec![0.0]]);
    let extra = [Extra { name: "trusted", cells: endgrain::write::Cells::Flags(&[Some(true)]) }];
    let error = (writer(Format::Wav).check)(&Content { extra: &extra, ..Content::new(&one) }).unwrap_err();
    assert_eq!(error.kind(), Kind::Unsupported);
}

#[test]
fn what_a_wav_file_does_not_carry_is_said() {
    let axis = Axis::new(Unit::parse("s"), 2.0, 0.01, 1, RateSource::Given).unwrap();
    let record = Record::new(axis, vec!["ax".to_owned()], vec![Unit::parse("m/s2")], Array2::zeros((1, 1))).unwrap();
    let findings = (writer(Format::Wav).check)(&Content::new(&record)).unwrap();
    let codes: Vec<&str> = findings.iter().map(|finding| finding.code).collect();
    assert_eq!(codes, ["wav_start", "wav_unit"]);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, failure_persistence: None, ..ProptestConfig::default() })]

    /// hound 3.5.1 and our own reader agree on what was written, in every encoding that hound knows.
    #[test]
    fn every_encoding_reads_back(
        values in prop::collection::vec(-0.999_f64..0.999, 1..80), channels in 1_usize..6, rate in 1_u32..400_000,
    ) {
        let len = values.len();
        let columns: Vec<Vec<f64>> = (0..channels).map(|c| values.iter().map(|v| v / (c + 1) as f64).collect()).collect();
        let record = record(f64::from(rate), &columns);
        for &(name, encoding) in WAVE_ENCODINGS {
            let bytes = write(&record, encoding);
            prop_assert_eq!(bytes.len() % 2, 0);
            let back = read(Input::Stream(Box::new(Cursor::new(bytes.clone()))), &ReadOptions::default()).unwrap();
            prop_assert!(back.findings.is_empty(), "{}: {:?}", name, back.findings);
            prop_assert_eq!(back.stated_rate.unwrap().rate_base, f64::from(rate));
            // Half a step of an integer, half a unit in the last place of a 32-bit float, nothing for 64 bits.
            let error = |v: f64| match encoding {
                WaveEncoding::Float32 => v.abs() * 2_f64.powi(-24) + 2_f64.powi(-150),
                WaveEncoding::Float64 => 0.0,
                integers => 2_f64.powi(-8 * integers.bytes() as i32),
            };
            for (read, written) in back.channels.iter().zip(&columns) {
                prop_assert_eq!(read.values.len(), len);
                for (&read, &written) in read.values.iter().zip(written) {
                    prop_assert!((read - written).abs() <= error(written), "{}: {} {}", name, read, written);
                }
            }
            if encoding == WaveEncoding::Float64 {
                continue; // hound reads floats of 32 bits only
            }
            let mut reader = hound::WavReader::new(Cursor::new(&bytes)).unwrap();
            let bits = 8 * encoding.bytes() as i32;
            prop_assert_eq!(reader.spec().channels as usize, channels);
            prop_assert_eq!(reader.spec().sample_rate, rate);
            let flat: Vec<f64> = if encoding.is_float() {
                reader.samples::<f32>().map(|s| f64::from(s.unwrap())).collect()
            } else {
                reader.samples::<i32>().map(|s| f64::from(s.unwrap()) / 2_f64.powi(bits - 1)).collect()
            };
            prop_assert_eq!(flat.len(), channels * len);
            for (index, &value) in flat.iter().enumerate() {
                prop_assert_eq!(value, back.channels[index % channels].values[index / channels]);
            }
        }
    }
}
