//! Magnitudes on a scale of quarter octaves, and what a mean magnitude makes likely before anything was learned.

/// The step of a magnitude in 1/256: 4 log2 of it, rounded down to quarters of its mantissa, 0 for less than one.
pub fn of(magnitude: u64) -> usize {
    if magnitude == 0 {
        return 0;
    }
    let octave = magnitude.ilog2() as usize;
    // Two bits below the top one.
    let quarter = (if octave >= 2 { magnitude >> (octave - 2) } else { magnitude << (2 - octave) }) as usize & 3;
    (4 * octave + quarter).min(159)
}

/// The bit length of a magnitude: 0 for zero, 1 for one, 2 for two and three.
pub fn length(value: i64) -> usize {
    64 - value.unsigned_abs().leading_zeros() as usize
}

/// The probability (of 65536) that a decision about a bit length is true at the start, where integers of the given mean
/// magnitude follow a two-sided geometric law.
pub fn first_guess(scale: usize, node: usize) -> u16 {
    match node {
        0 => 57000,
        1 => NOT_ZERO[scale.min(95)],
        2..=65 => LONGER[(scale + 8).saturating_sub(4 * node).min(95)],
        _ => 32768,
    }
}

/// 65536 x 2 r / (1 + r), with r the ratio of the law of mean magnitude 2^((i - 32) / 4 + 1/8), within 40..=65000.
#[rustfmt::skip]
static NOT_ZERO: [u16; 96] = [
    279, 331, 394, 468, 556, 661, 785, 932, 1107, 1315, 1560, 1851, 2195, 2602, 3082, 3649, 4315, 5097, 6013, 7083, 8327,
    9768, 11427, 13324, 15475, 17889, 20565, 23488, 26625, 29923, 33314, 36714, 40037, 43203, 46148, 48830, 51228, 53340,
    55178, 56763, 58120, 59277, 60259, 61090, 61792, 62385, 62884, 63305, 63660, 63958, 64209, 64420, 64597, 64747, 64872,
    64978, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000,
];

/// 65536 x r, within 600..=65000.
#[rustfmt::skip]
static LONGER: [u16; 96] = [
    600, 600, 600, 600, 600, 600, 600, 600, 600, 664, 789, 939, 1116, 1327, 1578, 1876, 2231, 2652, 3151, 3744, 4446,
    5277, 6259, 7416, 8773, 10358, 12196, 14308, 16706, 19388, 22333, 25499, 28822, 32222, 35613, 38911, 42048, 44971,
    47647, 50061, 52212, 54109, 55768, 57209, 58453, 59523, 60439, 61221, 61887, 62454, 62934, 63341, 63685, 63976, 64221,
    64429, 64604, 64751, 64875, 64980, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000,
];
