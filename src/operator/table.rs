//! The table of operators: options, recipe keys and help follow from its rows.

use super::step::Step;
use super::{band, notch, turn};

/// All operators, in the order of help texts.
pub static STEPS: &[Step] = &[
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
        value: "CENTRE:WIDTH",
        example: "50Hz:2Hz",
        help: "remove one line, with the full width at half gain",
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
];
