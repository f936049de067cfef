//! What `auto` takes: the forecast, unless the record proves to be closed.

use serde::Serialize;

use crate::metric::join::Join;

/// The extension that `auto` takes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Auto {
    /// The record's own past continues it.
    Forecast,
    /// The record is closed: it repeats.
    Periodic,
    /// Both ends join their own reflection, or nothing could be judged.
    Even,
}

impl Auto {
    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            Auto::Forecast => "forecast",
            Auto::Periodic => "periodic",
            Auto::Even => "even",
        }
    }
}

/// Joins that were tested; `None` for records too short.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct Structure {
    /// The end to the start.
    pub periodic: Option<Join>,
    /// The left end to its reflection.
    pub even_left: Option<Join>,
    /// The right end to its reflection.
    pub even_right: Option<Join>,
}

impl Structure {
    /// A closed record: its ends join as its interior runs, few arbitrary joins do as well, and typical arbitrary joins
    /// are far rougher, so that the test had power. `distance` is the RMS distance from the forecast over the zones.
    pub(super) fn is_closed(&self, distance: f64, forecast_error: f64) -> bool {
        let smooth = |join: &Join| join.ratio <= 2.0 && join.share <= 0.03 && join.median >= 25.0;
        self.periodic.as_ref().is_some_and(smooth) && distance <= 3.0 * forecast_error
    }

    /// Both ends flat. Supported weakly: on real records it has never been seen to be right.
    pub(super) fn is_flat(&self, distance: f64, forecast_error: f64) -> bool {
        let (Some(left), Some(right)) = (&self.even_left, &self.even_right) else { return false };
        // Probability that the product of two uniform shares is as small.
        let product = left.share * right.share;
        let combined = product * (1.0 - product.ln());
        let smooth = |join: &Join| join.ratio <= 2.0 && join.median >= 6.0;
        smooth(left) && smooth(right) && combined <= 0.05 && distance <= forecast_error
    }
}
