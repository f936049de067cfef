//! How finely stamps are printed: the last digit shown at each magnitude.

/// Magnitudes kept: 10^-32 to 10^31.
const SPAN: i32 = 64;
/// Stamps of one magnitude that settle how it is printed; fewer may all happen to end in zeros that are not printed.
const SETTLED: u32 = 8;

/// For each power of ten, how many stamps have that magnitude and how many decimals the finest of them shows.
#[derive(Debug, Clone)]
pub(super) struct Decimals {
    counts: [u32; SPAN as usize],
    finest: [i16; SPAN as usize],
    overall: i16,
    /// Mantissas `low..high` with `decimals` decimals belong to `slot`: stamps mostly follow each other.
    low: u64,
    high: u64,
    decimals: i16,
    slot: usize,
}

impl Decimals {
    pub(super) fn new() -> Decimals {
        Decimals {
            counts: [0; SPAN as usize],
            finest: [i16::MIN; SPAN as usize],
            overall: i16::MIN,
            low: 1,
            high: 0,
            decimals: 0,
            slot: 0,
        }
    }

    /// Notes a stamp of `mantissa` x 10^-`decimals`.
    #[inline]
    pub(super) fn note(&mut self, mantissa: u64, decimals: i16) {
        if decimals != self.decimals || mantissa < self.low || mantissa >= self.high {
            self.enter(mantissa, decimals);
        } else {
            self.counts[self.slot] = self.counts[self.slot].saturating_add(1);
        }
    }

    fn enter(&mut self, mantissa: u64, decimals: i16) {
        self.overall = self.overall.max(decimals);
        if mantissa == 0 {
            return;
        }
        let power = mantissa.ilog10();
        self.low = 10_u64.pow(power);
        self.high = self.low.saturating_mul(10);
        self.decimals = decimals;
        self.slot = self.note_power(power as i32 - i32::from(decimals), decimals);
    }

    /// Notes a stamp between 10^`power` and 10^(`power` + 1).
    pub(super) fn note_power(&mut self, power: i32, decimals: i16) -> usize {
        let slot = (power + SPAN / 2).clamp(0, SPAN - 1) as usize;
        self.overall = self.overall.max(decimals);
        self.finest[slot] = self.finest[slot].max(decimals);
        self.counts[slot] = self.counts[slot].saturating_add(1);
        slot
    }

    /// Adds what another part of the column shows.
    pub(super) fn append(&mut self, other: &Decimals) {
        self.overall = self.overall.max(other.overall);
        for slot in 0..SPAN as usize {
            self.counts[slot] = self.counts[slot].saturating_add(other.counts[slot]);
            self.finest[slot] = self.finest[slot].max(other.finest[slot]);
        }
    }

    /// Decimals at the magnitude that shows the fewest, as print to a fixed number of significant digits does.
    pub(super) fn coarsest(&self) -> i16 {
        let settled = (0..SPAN as usize).filter(|&slot| self.counts[slot] >= SETTLED).map(|slot| self.finest[slot]);
        settled.min().unwrap_or(self.overall).max(-300)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn coarsest(stamps: &[&str]) -> i16 {
        let mut decimals = Decimals::new();
        for stamp in stamps {
            let count = stamp.split_once('.').map_or(0, |(_, tail)| tail.len());
            decimals.note(stamp.replace('.', "").parse().expect("a number"), count as i16);
        }
        decimals.coarsest()
    }

    #[test]
    fn the_coarsest_magnitude_counts() {
        let fixed: Vec<String> = (0..2000).map(|n| format!("{:.2}", f64::from(n) * 0.01)).collect();
        let shortest: Vec<String> = (0..2001).map(|n| format!("{}", f64::from(n) * 0.5)).collect();
        // Six significant digits, as C's %g prints (ISO C 7.21.6.1): 999.995 but 1000.01.
        let six: Vec<String> = (0..4000)
            .map(|n| 999.0 + f64::from(n) * 0.005)
            .map(|t| if t < 1000.0 { format!("{t:.3}") } else { format!("{t:.2}") })
            .collect();
        let text = |stamps: &[String]| coarsest(&stamps.iter().map(String::as_str).collect::<Vec<_>>());
        assert_eq!((text(&fixed), text(&shortest), text(&six)), (2, 1, 2));
    }
}
