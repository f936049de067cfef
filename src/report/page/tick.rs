//! Round numbers along an axis, and where a value stands on it.

use crate::report::page::Spacing;

/// An axis with limits.
#[derive(Debug, Clone, Copy)]
pub struct Scale {
    spacing: Spacing,
    low: f64,
    high: f64,
}

/// A mark: where, from 0 to 1, and its text.
#[derive(Debug, Clone, PartialEq)]
pub struct Tick {
    pub at: f64,
    pub text: String,
}

impl Scale {
    /// Over the finite values given (positive ones where logarithmic), widened by `margin` of the range on both sides.
    pub fn over(spacing: Spacing, values: impl Iterator<Item = f64>, margin: f64) -> Scale {
        let fits = |v: &f64| v.is_finite() && (spacing == Spacing::Linear || *v > 0.0);
        let mapped = values.filter(fits).map(|v| forward(spacing, v));
        let (low, high) = mapped.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(v), h.max(v)));
        if low > high {
            return Scale { spacing, low: 0.0, high: 1.0 };
        }
        // A line without height still needs an axis: a thousand-millionth of its value, or 1 around nothing. Seconds
        // counted from 1970 differ by no more within a short record.
        let least = if spacing == Spacing::Logarithmic { 0.5 } else { 1e-9 * low.abs().max(high.abs()) };
        let range = if high - low > least {
            high - low
        } else if least > 0.0 {
            least
        } else {
            1.0
        };
        let centre = 0.5 * (low + high);
        let half = 0.5 * (high - low).max(range) + margin * range;
        Scale { spacing, low: centre - half, high: centre + half }
    }

    /// The same axis no wider than `times` the range of another around it.
    pub fn within(self, other: Scale, times: f64) -> Scale {
        let allowed = times * (other.high - other.low);
        Scale { low: self.low.max(other.low - allowed), high: self.high.min(other.high + allowed), ..self }
    }

    /// Place of a value, 0 at the low end and 1 at the high end; `None` where it has none.
    pub fn at(&self, value: f64) -> Option<f64> {
        let mapped = forward(self.spacing, value);
        mapped.is_finite().then(|| (mapped - self.low) / (self.high - self.low))
    }

    /// The limits, mapped: values, or their decimal logarithms.
    pub fn limits(&self) -> [f64; 2] {
        [self.low, self.high]
    }

    /// A number to count from, where the stamps are long and differ only in their last digits.
    pub fn origin(&self) -> Option<f64> {
        let span = self.high - self.low;
        let far = self.spacing == Spacing::Linear && self.low.abs().max(self.high.abs()) > 2e4 * span;
        far.then(|| {
            let unit = 10.0_f64.powf(span.log10().ceil() + 1.0);
            (self.low / unit).floor() * unit
        })
    }

    /// About `count` round numbers, counted from `origin`.
    pub fn ticks(&self, count: usize, origin: f64) -> Vec<Tick> {
        match self.spacing {
            Spacing::Linear => self.even_ticks(count, origin),
            Spacing::Logarithmic => self.decades(count),
        }
    }

    fn even_ticks(&self, count: usize, origin: f64) -> Vec<Tick> {
        let (low, high) = (self.low - origin, self.high - origin);
        let raw = (high - low) / count.max(1) as f64;
        let power = raw.log10().floor();
        let unit = 10.0_f64.powf(power);
        let step = [1.0, 2.0, 5.0, 10.0].iter().map(|m| m * unit).find(|s| *s >= raw * (1.0 - 1e-9)).unwrap_or(raw);
        if !(step.is_finite() && step > 0.0) {
            return Vec::new();
        }
        let decimals = (-(step.log10() + 1e-9).floor()).max(0.0);
        let (first, last) = ((low / step - 1e-9).ceil() as i64, (high / step + 1e-9).floor() as i64);
        (first..=last)
            .take(20)
            .map(|k| {
                let value = k as f64 * step;
                let largest = low.abs().max(high.abs());
                let text = if decimals > 5.0 || largest >= 1e6 {
                    crate::report::text::figure(value, 4)
                } else {
                    format!("{value:.*}", decimals as usize)
                };
                Tick { at: (value - low) / (high - low), text: minus(&text) }
            })
            .collect()
    }

    /// Whole decades, about `count`; over a few decades 2 and 5 of them as well, where there is room.
    fn decades(&self, count: usize) -> Vec<Tick> {
        let (first, last) = (self.low.floor() as i64, self.high.ceil() as i64);
        let every = ((last - first) as usize / count.max(1)).max(1) as i64;
        let few = last - first <= 3;
        let mut ticks: Vec<Tick> = Vec::new();
        let multiples: &[f64] = if few { &[1.0, 2.0, 5.0] } else { &[1.0] };
        for multiple in multiples {
            for power in (first..=last).filter(|k| few || k.rem_euclid(every) == 0) {
                let value = multiple * 10.0_f64.powi(power as i32);
                let Some(at) = self.at(value).filter(|at| (-1e-9..=1.0 + 1e-9).contains(at)) else { continue };
                if ticks.iter().all(|tick| (tick.at - at).abs() >= ROOM) {
                    ticks.push(Tick { at, text: minus(&crate::report::text::figure(value, 3)) });
                }
            }
        }
        ticks.sort_by(|a, b| a.at.total_cmp(&b.at));
        ticks
    }
}

/// Share of the axis that a label takes on a narrow page.
const ROOM: f64 = 0.1;

fn forward(spacing: Spacing, value: f64) -> f64 {
    match spacing {
        Spacing::Linear => value,
        Spacing::Logarithmic => value.log10(),
    }
}

/// A typographic minus: a hyphen is easily overlooked.
fn minus(text: &str) -> String {
    text.replace('-', "\u{2212}")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn texts(spacing: Spacing, low: f64, high: f64) -> Vec<String> {
        Scale::over(spacing, [low, high].into_iter(), 0.0).ticks(5, 0.0).into_iter().map(|tick| tick.text).collect()
    }

    #[test]
    fn ticks_are_round() {
        assert_eq!(texts(Spacing::Linear, 0.0, 12.0), ["0", "5", "10"]);
        assert_eq!(texts(Spacing::Linear, -0.1, 0.1), ["\u{2212}0.10", "\u{2212}0.05", "0.00", "0.05", "0.10"]);
        assert_eq!(texts(Spacing::Logarithmic, 0.5, 60.0), ["0.5", "1", "2", "5", "10", "20", "50"]);
    }

    #[test]
    fn a_constant_has_an_axis() {
        for value in [0.0, 5.0, -1e300, 1e-300] {
            let scale = Scale::over(Spacing::Linear, [value].into_iter(), 0.05);
            let at = scale.at(value).expect("finite");
            assert!((at - 0.5).abs() < 1e-6, "{value}: {at}");
        }
    }

    #[test]
    fn long_stamps_are_counted_from_a_round_number() {
        let scale = Scale::over(Spacing::Linear, [1_764_000_000.0, 1_764_000_012.0].into_iter(), 0.0);
        assert_eq!(scale.origin(), Some(1_764_000_000.0));
        assert_eq!(Scale::over(Spacing::Linear, [0.0, 12.0].into_iter(), 0.0).origin(), None);
    }
}
