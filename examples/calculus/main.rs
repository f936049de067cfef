//! Tables of errors of integrals and derivatives on invented records, with a plain script beside the library.
//!
//! `cargo run --release --example calculus`: errors in percent. Integration: of the peak displacement, largest | at the end
//! | RMS of the inner 80 %, median of 12 seeds. Differentiation: of the RMS slope or curvature, largest within 3 % of the
//! ends | RMS of the inner 80 %.

mod differentiation;
mod integration;
mod plain;

fn main() {
    integration::table();
    differentiation::table();
}

/// SplitMix64 (Steele, Lea, Flood 2014), and normal numbers by Box and Muller 1958.
pub struct Random(pub u64);

impl Random {
    /// Uniform in 0..1.
    pub fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Normal with variance 1.
    pub fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.uniform()).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.uniform()).cos()
    }
}

/// Three significant digits.
pub fn short(value: f64) -> String {
    if value >= 1000.0 {
        format!("{value:.1e}")
    } else if value >= 100.0 {
        format!("{value:.0}")
    } else if value >= 1.0 {
        format!("{value:.1}")
    } else if value >= 0.01 {
        format!("{value:.2}")
    } else {
        format!("{value:.0e}")
    }
}

/// The middle value, or the mean of the middle two.
pub fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let middle = values.len() / 2;
    if values.len() % 2 == 1 { values[middle] } else { (values[middle - 1] + values[middle]) / 2.0 }
}
