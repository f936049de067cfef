//! The operators of the trial, for a record of N samples: corner wavelengths as fractions of N.

use std::f64::consts::{LN_2, PI, TAU};

/// A gain with what its baseline carry needs.
pub struct Trial {
    pub name: &'static str,
    /// Shortest corner wavelength in samples.
    pub shortest: f64,
    /// Gain and second derivative of the gain with respect to angular frequency, both at 0.
    pub at_zero: [f64; 2],
    pub gain: Box<dyn Fn(f64) -> f64 + Send + Sync>,
}

#[derive(Clone, Copy)]
enum Kind {
    Gaussian,
    Butterworth,
    Brick,
    BandButterworth,
    BandGaussian,
    Displacement,
}

/// Name, kind and divisor of N that gives the shortest corner.
static TRIALS: &[(&str, Kind, f64)] = &[
    ("gauss/4", Kind::Gaussian, 4.0),
    ("gauss/8", Kind::Gaussian, 8.0),
    ("gauss/16", Kind::Gaussian, 16.0),
    ("butt/4", Kind::Butterworth, 4.0),
    ("butt/8", Kind::Butterworth, 8.0),
    ("butt/16", Kind::Butterworth, 16.0),
    ("brick/8", Kind::Brick, 8.0),
    ("brick/16", Kind::Brick, 16.0),
    ("band butt/32-8", Kind::BandButterworth, 32.0),
    ("band gauss/16-4", Kind::BandGaussian, 16.0),
    ("displ/4", Kind::Displacement, 4.0),
    ("displ/8", Kind::Displacement, 8.0),
];

/// The same kinds at corners far shorter than the record.
static FINE: &[(&str, Kind, f64)] = &[
    ("gauss/64", Kind::Gaussian, 64.0),
    ("gauss/256", Kind::Gaussian, 256.0),
    ("butt/64", Kind::Butterworth, 64.0),
    ("butt/256", Kind::Butterworth, 256.0),
    ("brick/64", Kind::Brick, 64.0),
    ("brick/256", Kind::Brick, 256.0),
    ("band butt/64-16", Kind::BandButterworth, 64.0),
    ("band butt/256-64", Kind::BandButterworth, 256.0),
    ("band gauss/64-16", Kind::BandGaussian, 64.0),
    ("band gauss/256-64", Kind::BandGaussian, 256.0),
    ("displ/64", Kind::Displacement, 64.0),
    ("displ/256", Kind::Displacement, 256.0),
];

/// The trials of a record of `len` samples whose shortest corner is at least four samples.
pub fn trials(len: usize, fine: bool) -> impl Iterator<Item = Trial> {
    let rows = if fine { FINE } else { TRIALS };
    rows.iter().map(move |&(name, kind, divisor)| trial(name, kind, len as f64 / divisor)).filter(|t| t.shortest >= 4.0)
}

fn trial(name: &'static str, kind: Kind, lam: f64) -> Trial {
    let gauss = |lam: f64| move |f: f64| (-LN_2 * (f * lam).powi(2)).exp();
    // Squared magnitude of order 4: gain 1/2 at the corner, all derivatives up to the seventh zero at 0.
    let butt = |lam: f64| move |f: f64| 1.0 / (1.0 + (f * lam).powi(8));
    let bend = |lam: f64| -LN_2 * lam * lam / (2.0 * PI * PI);
    let (at_zero, gain): ([f64; 2], Box<dyn Fn(f64) -> f64 + Send + Sync>) = match kind {
        Kind::Gaussian => ([1.0, bend(lam)], Box::new(gauss(lam))),
        Kind::Butterworth => ([1.0, 0.0], Box::new(butt(lam))),
        Kind::Brick => ([1.0, 0.0], Box::new(move |f| if f * lam <= 1.0 { 1.0 } else { 0.0 })),
        Kind::BandButterworth => {
            let (short, long) = (butt(lam), butt(4.0 * lam));
            ([0.0, 0.0], Box::new(move |f| short(f) - long(f)))
        }
        Kind::BandGaussian => {
            let (short, long) = (gauss(lam), gauss(4.0 * lam));
            ([0.0, bend(lam) - bend(4.0 * lam)], Box::new(move |f| short(f) - long(f)))
        }
        Kind::Displacement => {
            let low = butt(lam);
            let gain = move |f: f64| if f == 0.0 { 0.0 } else { -(1.0 - low(f)) / (TAU * f).powi(2) };
            ([0.0, 0.0], Box::new(gain))
        }
    };
    Trial { name, shortest: lam, at_zero, gain }
}
