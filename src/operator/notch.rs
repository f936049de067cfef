//! A notch: a narrow stop about one frequency or its harmonics, with the full width at half gain.

use std::f64::consts::LN_2;
use std::sync::Arc;

use crate::error::{Error, Result};

use super::corner::figure;
use super::edge::{BandStop, Edge, Rolloff};
use super::gain::{Gain, Series};
use super::range::{CentreWidth, Orders};
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};

#[derive(Debug)]
struct Notch(CentreWidth);

/// Reads the argument of `--notch`.
pub(super) fn notch(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Notch(CentreWidth::parse(text)?)))
}

impl Setting for Notch {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let corner = self.0.centre();
        let base = corner.resolve(&frame.option, frame.axis)?;
        let width = self.0.width().resolve_width(&frame.option, corner, frame.axis)?;
        let count = match self.0.orders() {
            Orders::UpTo(count) => count,
            // The last one whose width fits below the Nyquist frequency.
            Orders::All => (((0.5 - width / 2.0) / base).ceil() as u32).saturating_sub(1).clamp(1, MOST),
        };
        if count > 1 && width >= base {
            return Err(Error::usage(format!("{} {}: the notches of neighbouring orders meet", frame.option, self.0))
                .remedy(format!("choose a width below the base frequency for {}", frame.option)));
        }
        let parts = (1..=count).map(|order| self.order(frame, order, f64::from(order) * base, width));
        let findings = corner.note(&frame.option, frame.axis, frame.len).into_iter().collect();
        Ok(Effect { parts: parts.collect::<Result<_>>()?, findings, ..Effect::default() })
    }
}

/// Harmonics at most.
const MOST: u32 = 1000;

impl Notch {
    /// The notch at one order, in cycles per sample.
    fn order(&self, frame: &Frame<'_>, order: u32, centre: f64, width: f64) -> Result<Part> {
        let (option, axis) = (&frame.option, frame.axis);
        let (text, corner) = (self.0.text(), self.0.centre());
        if width >= 2.0 * centre || centre + width / 2.0 >= 0.5 {
            let which = if order > 1 { format!("order {order} of the notch") } else { "the notch".to_owned() };
            return Err(Error::unsupported(format!(
                "{option} {text}: {which} does not fit between zero and the Nyquist frequency of {} {}",
                figure(0.5 * axis.rate_base()),
                axis.frequency_label()
            ))
            .remedy(match order {
                1 => format!("choose a narrower width for {option}"),
                _ => format!("choose fewer orders or all for {option}"),
            }));
        }
        // Narrower than rounding of the centre's own frequency, the gain cannot be told from 1.
        if width < 1e-12 * centre {
            return Err(Error::unsupported(format!("{option} {text}: the notch is narrower than any record can show"))
                .remedy(format!("choose a wider width for {option}")));
        }
        let gain: Arc<dyn Gain> = match frame.shape.rolloff(option, centre, corner, axis)? {
            Rolloff::Butterworth { .. } => Arc::new(SquaredNotch { centre, width }),
            Rolloff::Gaussian => Arc::new(GaussianNotch { centre, width }),
            rolloff @ (Rolloff::Cosine { .. } | Rolloff::Brickwall) => {
                let (low, high) = (centre - width / 2.0, centre + width / 2.0);
                if let Rolloff::Cosine { half_width } = rolloff {
                    if 2.0 * half_width > width {
                        return Err(Error::usage(format!(
                            "{option} {text}: narrower than the transition of --shape {}, so nothing would be stopped",
                            frame.shape
                        ))
                        .remedy("choose a narrower transition for --shape"));
                    }
                    if half_width > low || high + half_width > 0.5 {
                        return Err(Error::unsupported(format!(
                            "--shape {}: the transitions about {option} {text} do not fit between zero and the Nyquist frequency",
                            frame.shape
                        ))
                        .remedy("choose a narrower transition for --shape"));
                    }
                }
                Arc::new(BandStop { low: Edge { corner: low, rolloff }, high: Edge { corner: high, rolloff } })
            }
        };
        let multiple = if order > 1 { format!("{order} x ") } else { String::new() };
        Ok(Part {
            kind: "notch",
            key: "notch",
            value: text.to_owned(),
            stage: Stage::Band,
            corners: vec![CornerPoint { text: format!("{multiple}{}", corner.text()), cycles: centre }],
            gain,
        })
    }
}

/// (f^2 - f0^2)^2/((f^2 - f0^2)^2 + (f bw)^2): the squared magnitude of the second-order notch, full width bw at 0.5.
#[derive(Debug)]
struct SquaredNotch {
    centre: f64,
    width: f64,
}

impl Gain for SquaredNotch {
    fn at(&self, f: f64) -> f64 {
        let apart = (f - self.centre) * (f + self.centre);
        let (stop, pass) = ((f * self.width).powi(2), apart * apart);
        // Both vanish only for f = 0 = centre, which is no notch; below the smallest number squares the gain is 1.
        if pass == 0.0 && stop == 0.0 { 1.0 } else { pass / (pass + stop) }
    }
    fn series(&self) -> Series {
        // 1 - y + y^2, y = (f bw)^2/(f^2 - f0^2)^2 = b f^2 (1 + 2 f^2/f0^2 + ...), b = bw^2/f0^4.
        let f2 = self.centre * self.centre;
        let b = (self.width / f2) * (self.width / f2);
        Series::of_cycles(1.0, -b, b * b - 2.0 * b / f2)
    }
    fn extent_samples(&self) -> f64 {
        2.2 / self.width
    }
    fn highest(&self) -> f64 {
        self.centre + self.width
    }
}

/// 1 - [g(f - f0) + g(f + f0)], g(d) = 2^-(2d/bw)^2: even about zero frequency, full width bw at 0.5.
#[derive(Debug)]
struct GaussianNotch {
    centre: f64,
    width: f64,
}

impl Gain for GaussianNotch {
    fn at(&self, f: f64) -> f64 {
        let exponent = |d: f64| -LN_2 * (2.0 * d / self.width).powi(2);
        -exponent(f - self.centre).exp_m1() - exponent(f + self.centre).exp()
    }
    fn series(&self) -> Series {
        // g(f - f0) + g(f + f0) = 2 exp(-a f0^2) exp(-a f^2) cosh(2 a f0 f), a = 4 ln 2/bw^2.
        let f2 = self.centre * self.centre;
        let a = 4.0 * LN_2 / (self.width * self.width);
        let bend = a * f2;
        let twice = 2.0 * (-bend).exp();
        if twice == 0.0 {
            return Series::ONE;
        }
        let c2 = twice * a * (2.0 * bend - 1.0);
        let c4 = twice * a * a * (0.5 - 2.0 * bend + 2.0 / 3.0 * bend * bend);
        Series::of_cycles(1.0 - twice, -c2, -c4)
    }
    fn extent_samples(&self) -> f64 {
        1.24 / self.width
    }
    fn highest(&self) -> f64 {
        self.centre + self.width
    }
}
