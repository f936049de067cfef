//! What corners are understood and refused, with the full text of each refusal.

use proptest::prelude::*;

use super::*;
use crate::record::RateSource;

fn time_axis(rate_hz: f64, len: usize) -> Axis {
    Axis::from_rate_hz(rate_hz, len, RateSource::Given).unwrap()
}

fn length_axis(step_mm: f64, len: usize) -> Axis {
    Axis::new(Unit::parse("mm"), 0.0, step_mm, len, RateSource::Given).unwrap()
}

#[test]
fn corners_with_units_are_understood() {
    use Measure::{Frequency, Period, SpatialFrequency, Wavelength};
    for (text, measure, frequency) in [
        ("40Hz", Frequency, 40.0),
        ("40 Hz", Frequency, 40.0),
        ("40hz", Frequency, 40.0),
        (" 1.5kHz ", Frequency, 1500.0),
        ("2e2Hz", Frequency, 200.0),
        ("2E+2Hz", Frequency, 200.0),
        ("+2.Hz", Frequency, 2.0),
        (".5Hz", Frequency, 0.5),
        ("30mHz", Frequency, 0.03),
        ("1MHz", Frequency, 1e6),
        ("60/min", Frequency, 1.0),
        ("3/s", Frequency, 3.0),
        ("2.5s", Period, 0.4),
        ("20ms", Period, 50.0),
        ("2min", Period, 1.0 / 120.0),
        ("0.8mm", Wavelength, 1250.0),
        ("2m", Wavelength, 0.5),
        ("50um", Wavelength, 20_000.0),
        ("50µm", Wavelength, 20_000.0),
        ("0.1/m", SpatialFrequency, 0.1),
        ("0.1 1/m", SpatialFrequency, 0.1),
        ("2/mm", SpatialFrequency, 2000.0),
    ] {
        let corner = Corner::parse(text).unwrap_or_else(|e| panic!("{text}: {e}"));
        assert_eq!(corner.measure(), measure, "{text}");
        // One product and one division.
        assert!((corner.frequency() / frequency - 1.0).abs() < 4.0 * f64::EPSILON, "{text}");
        assert_eq!(corner.text(), text.trim());
        let json = serde_json::to_string(&corner).unwrap();
        assert_eq!(json, format!("{:?}", text.trim()));
        assert_eq!(serde_json::from_str::<Corner>(&json).unwrap(), corner);
    }
}

#[test]
fn refusals_tell_what_was_found_and_show_an_example() {
    let example = "write a number above zero with its unit, as in 40Hz, 2.5s (period), 0.8mm (wavelength) or 0.1/m";
    for (text, what) in [
        ("40", "\"40\": a corner without a unit"),
        ("-40Hz", "\"-40Hz\": not a finite number above zero"),
        ("0Hz", "\"0Hz\": not a finite number above zero"),
        ("-0Hz", "\"-0Hz\": not a finite number above zero"),
        ("1e999Hz", "\"1e999Hz\": not a finite number above zero"),
        ("1e-999Hz", "\"1e-999Hz\": not a finite number above zero"),
        ("1e-320s", "\"1e-320s\": not a finite number above zero"),
        ("1e308kHz", "\"1e308kHz\": not a finite number above zero"),
        ("infHz", "\"infHz\": does not begin with a number"),
        ("NaNHz", "\"NaNHz\": does not begin with a number"),
        ("NaN", "\"NaN\": does not begin with a number"),
        ("Hz", "\"Hz\": does not begin with a number"),
        (".Hz", "\".Hz\": does not begin with a number"),
        ("+Hz", "\"+Hz\": does not begin with a number"),
        ("", "\"\": does not begin with a number"),
        ("40 furlong", "\"40 furlong\": unknown unit \"furlong\""),
        ("40g", "\"40g\": unknown unit \"g\""),
        ("40%", "\"40%\": unknown unit \"%\""),
        ("40/g", "\"40/g\": unknown unit \"/g\""),
        ("4e", "\"4e\": unknown unit \"e\""),
        ("1,5kHz", "\"1,5kHz\": unknown unit \",5kHz\""),
        ("0x10Hz", "\"0x10Hz\": unknown unit \"x10Hz\""),
        ("4\u{1b}[31mHz", "\"4\\u{1b}[31mHz\": not a corner"),
        ("٤Hz", "\"٤Hz\": does not begin with a number"),
    ] {
        let error = Corner::parse(text).expect_err(text);
        assert_eq!(error.kind(), crate::error::Kind::Usage, "{text}");
        assert_eq!(error.to_string(), format!("{what}; {example}"));
        assert!(serde_json::from_value::<Corner>(serde_json::json!(text)).is_err(), "{text}");
    }
    let long = Corner::parse(&"9".repeat(10_000)).expect_err("ten thousand digits").to_string();
    assert!(long.len() < 300, "{long}");
}

#[test]
fn corners_become_cycles_per_sample() {
    let axis = time_axis(1000.0, 5000);
    for (text, cycles) in [("40Hz", 0.04), ("25ms", 0.04), ("499Hz", 0.499)] {
        let found = Corner::parse(text).unwrap().resolve("--lowpass", &axis).unwrap();
        assert!((found / cycles - 1.0).abs() < 1e-15, "{text}: {found}");
    }
    let profile = length_axis(0.01, 4000);
    for (text, cycles) in [("0.8mm", 0.0125), ("2/mm", 0.02), ("80um", 0.125), ("100/m", 0.001)] {
        let found = Corner::parse(text).unwrap().resolve("--lowpass", &profile).unwrap();
        assert!((found / cycles - 1.0).abs() < 1e-14, "{text}: {found}");
    }
}

#[test]
fn corners_that_the_axis_cannot_hold_are_refused_in_full() {
    let refuse = |text: &str, axis: &Axis| Corner::parse(text).unwrap().resolve("--lowpass", axis).unwrap_err();
    let axis = time_axis(1000.0, 5000);
    for (text, message) in [
        (
            "600Hz",
            "--lowpass 600Hz: at or above the Nyquist frequency of 500 Hz; choose a corner below 500 Hz for --lowpass",
        ),
        (
            "500Hz",
            "--lowpass 500Hz: at or above the Nyquist frequency of 500 Hz; choose a corner below 500 Hz for --lowpass",
        ),
        (
            "1ms",
            "--lowpass 1ms = 1000 Hz: at or above the Nyquist frequency of 500 Hz; choose a corner below 500 Hz for --lowpass",
        ),
        (
            "1e14s",
            "--lowpass 1e14s: a corner of 1e17 samples is beyond any record; choose a corner that the record can show for --lowpass",
        ),
    ] {
        let error = refuse(text, &axis);
        assert_eq!(error.kind(), crate::error::Kind::Unsupported);
        assert_eq!(error.to_string(), message);
    }
    for (text, axis, message) in [
        (
            "0.8mm",
            &axis,
            "--lowpass 0.8mm: a corner in length, but the record's axis is time in s; give --lowpass as in 40Hz or 2.5s",
        ),
        (
            "40Hz",
            &length_axis(0.01, 100),
            "--lowpass 40Hz: a corner in time, but the record's axis is length in mm; give --lowpass as in 0.8mm or 0.1/m",
        ),
    ] {
        let error = refuse(text, axis);
        assert_eq!(error.kind(), crate::error::Kind::Usage);
        assert_eq!(error.to_string(), message);
    }
    // 0.5 cycles per sample however the rate was rounded.
    let third = Axis::new(Unit::parse("ms"), 0.0, 1.0 / 3.0, 10, RateSource::Stamps).unwrap();
    assert!(Corner::parse("1.5kHz").unwrap().resolve("--lowpass", &third).is_err());
    assert!(Corner::parse("1.4999kHz").unwrap().resolve("--lowpass", &third).is_ok());
}

#[test]
fn a_corner_longer_than_the_record_is_noted() {
    let axis = time_axis(1000.0, 5000);
    let note = |text: &str| Corner::parse(text).unwrap().note("--highpass", &axis, 5000);
    assert!(note("5s").is_none());
    let finding = note("0.1Hz").unwrap();
    assert_eq!(finding.code, "corner_longer_than_record");
    assert_eq!(
        finding.text,
        "--highpass 0.1Hz: one cycle takes 10000 samples and the record holds 5000; what lies beyond the ends decides"
    );
}

#[test]
fn widths_follow_the_measure_of_their_centre() {
    let axis = length_axis(0.01, 4000);
    let width = |width: &str, centre: &str| {
        Corner::parse(width).unwrap().resolve_width("--shape", &Corner::parse(centre).unwrap(), &axis)
    };
    assert!((width("0.5/mm", "0.8mm").unwrap() / 0.005 - 1.0).abs() < 1e-14);
    // 1/0.7 - 1/0.9 per mm, 0.01 mm a sample.
    assert!((width("0.2mm", "0.8mm").unwrap() / ((1.0 / 0.7 - 1.0 / 0.9) * 0.01) - 1.0).abs() < 1e-13);
    assert!(width("1.6mm", "0.8mm").is_err());
    assert_eq!(
        width("0.2mm", "1.25/mm").unwrap_err().to_string(),
        "--shape: the width 0.2mm is no difference of frequencies, but the corner 1.25/mm is a frequency; write the width of --shape in 1/m"
    );
}

proptest! {
    #[test]
    fn no_text_panics(text in ".{0,80}", near in "[-+]?[0-9.]{0,4}[eE]?[-+]?[0-9]{0,4} ?(Hz|kHz|s|ms|mm|um|µm|m|/m|1/|/){0,2}") {
        for text in [text, near] {
            if let Ok(corner) = Corner::parse(&text) {
                prop_assert!(corner.frequency() > 0.0 && corner.frequency().is_finite());
                prop_assert_eq!(Corner::parse(corner.text()).unwrap(), corner.clone());
                for axis in [time_axis(1000.0, 10), length_axis(0.1, 10)] {
                    let _ = corner.note("--lowpass", &axis, 10);
                    let _ = corner.resolve_width("--lowpass", &corner, &axis);
                    if let Ok(cycles) = corner.resolve("--lowpass", &axis) {
                        prop_assert!(cycles > 0.0 && cycles < 0.5);
                    }
                }
            }
        }
    }
}
