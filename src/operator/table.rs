//! The table of operators: options, recipe keys and help follow from its rows.

use super::step::Step;
use super::{band, despike, notch, resampling, sensor, smoothing, turn, weighting};

/// All operators, in the order of help texts.
pub static STEPS: &[Step] = &[
    Step {
        key: "despike",
        value: "HOW",
        example: "fill",
        help: "replace single samples that stand out, first of all: fill puts in what their neighbours make likely",
        read: despike::despike,
    },
    Step {
        key: "response",
        value: "TABLE",
        example: "sensor.csv",
        help: "divide by a measured response: a CSV table of frequency, gain (ratio, dB or %) and phase; at most 20 dB",
        read: sensor::response,
    },
    Step {
        key: "weighting",
        value: "NAME",
        example: "Wk",
        help: "weight for human vibration: Wb, Wc, Wd, We, Wf, Wh, Wj, Wk or Wm; reports running RMS, MTVV and VDV",
        read: weighting::read,
    },
    Step {
        key: "lowpass",
        value: "CORNER",
        example: "40Hz",
        help: "keep what is slower than a corner",
        read: band::lowpass,
    },
    Step {
        key: "highpass",
        value: "CORNER",
        example: "0.5Hz",
        help: "keep what is faster than a corner; last in the order of a run",
        read: band::highpass,
    },
    Step {
        key: "bandpass",
        value: "A..B",
        example: "2Hz..40Hz",
        help: "keep what lies between two corners: a low-pass times a high-pass",
        read: band::bandpass,
    },
    Step {
        key: "bandstop",
        value: "A..B",
        example: "45Hz..55Hz",
        help: "remove what lies between two corners: one minus the band-pass",
        read: band::bandstop,
    },
    Step {
        key: "notch",
        value: "CENTRE:WIDTH[:ORDERS]",
        example: "50Hz:2Hz",
        help: "remove one line, with the full width at half gain; 50Hz:2Hz:5 its first five harmonics, 50Hz:2Hz:all every one",
        read: notch::notch,
    },
    Step {
        key: "split",
        value: "CORNER",
        example: "0.8mm",
        help: "write what is longer than the corner (waviness) and what is left (roughness) as columns beside the record: Gaussian of ISO 16610-21",
        read: band::split,
    },
    Step {
        key: "integrate",
        value: "1|2",
        example: "2",
        help: "integrate once (acceleration to velocity) or twice (to displacement)",
        read: turn::integrate,
    },
    Step {
        key: "differentiate",
        value: "1|2",
        example: "1",
        help: "differentiate once or twice",
        read: turn::differentiate,
    },
    Step {
        key: "smooth",
        value: "STRENGTH",
        example: "auto",
        help: "penalised smoothing: auto (generalised cross-validation), a strength such as 100, or the corner of half gain such as 40Hz; :robust against outliers",
        read: smoothing::smooth,
    },
    Step {
        key: "resample",
        value: "RATE",
        example: "100Hz",
        help: "another sampling rate, such as 100Hz or 2/mm; the first stamp moves by half the difference of the steps, or stays with 100Hz:start",
        read: resampling::resample,
    },
    Step {
        key: "decimate",
        value: "COUNT",
        example: "4",
        help: "make this many steps one; as resample",
        read: resampling::decimate,
    },
];
