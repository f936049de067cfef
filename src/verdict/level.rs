//! How clearly the record's own past picks one symmetric extension.

use serde::Serialize;

use crate::metric::join::Join;

use super::candidate::{CANDIDATES, PERIODIC};
use super::edge::{Adequacy, Edge};

/// Candidates whose predicted error is within this factor of the best are ties.
const TIE: f64 = 1.25;
/// The runner-up must be this much worse for the best to be supported.
const SUPPORTED: f64 = 1.5;

/// Arbitrary joins must typically be this rough, or a smooth join proves nothing.
const POWER: f64 = 25.0;

/// How clearly one symmetric extension stands out.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Level {
    /// The ends join as smoothly as the interior runs: the record is closed.
    SupportedByStructure,
    /// The runner-up is at least half as bad again.
    Supported,
    /// The runner-up is at least a quarter worse.
    Favoured,
    /// The record does not tell the best ones apart, which does not mean that they agree.
    NoClearWinner,
    /// Too short, too coarse, or constant.
    NotJudged,
}

/// The pick among the symmetric extensions.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Pick {
    /// Its name.
    pub name: &'static str,
    /// How clearly it stands out.
    pub level: Level,
    /// All within a quarter of the best, simplest first.
    pub ties: Vec<&'static str>,
    /// Predicted error of the runner-up over that of the best.
    pub margin: Option<f64>,
    /// No clear winner, and every tie within tolerance.
    pub choice_immaterial: bool,
}

impl Pick {
    /// The pick when nothing can be judged.
    pub fn not_judged() -> Pick {
        let even = CANDIDATES[super::candidate::EVEN].name;
        Pick { name: even, level: Level::NotJudged, ties: vec![even], margin: None, choice_immaterial: false }
    }

    /// The pick among `edges`, one a row of `CANDIDATES`.
    pub(super) fn among(edges: &[Edge], periodic: Option<&Join>) -> Pick {
        let error = |k: usize| edges[k].predicted_error;
        let mut order: Vec<usize> = (0..edges.len()).collect();
        order.sort_by(|a, b| error(*a).total_cmp(&error(*b)));
        let (best, second) = (order[0], order[1]);
        let margin = error(second) / error(best);
        let tied: Vec<usize> = (0..edges.len()).filter(|k| error(*k) <= TIE * error(best)).collect();
        let ties = tied.iter().map(|k| CANDIDATES[*k].name).collect();
        let closed = periodic.is_some_and(|join| join.share <= 0.01 && join.ratio <= 2.0 && join.median >= POWER)
            && error(PERIODIC) <= SUPPORTED * error(best);
        let (pick, level) = if closed {
            (PERIODIC, Level::SupportedByStructure)
        } else if margin >= SUPPORTED {
            (best, Level::Supported)
        } else if margin >= TIE {
            (best, Level::Favoured)
        } else {
            (best, Level::NoClearWinner)
        };
        let choice_immaterial =
            level == Level::NoClearWinner && tied.iter().all(|k| edges[*k].adequacy == Adequacy::Within);
        Pick { name: CANDIDATES[pick].name, level, ties, margin: Some(margin), choice_immaterial }
    }
}
