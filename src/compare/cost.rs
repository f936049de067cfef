//! What the continuation in use costs at the edges: a row of the verdict, or judged from its own output.

use crate::baseline::BaselineKind;
use crate::compare::{Chosen, Continuation, Judgement};
use crate::ends::{Ends, Parity, Seat};
use crate::verdict::{Auto, CANDIDATES, Candidate, Edge, ODD_ZERO, Unjudged};

impl Judgement {
    /// The row of the verdict that stands for what was chosen, where one does. The rows were judged on the seat of the run.
    pub fn row(&self, chosen: &Chosen) -> Option<&Edge> {
        let verdict = self.verdict.as_ref()?;
        match &chosen.continuation {
            Continuation::Given(ends) => {
                self.forecast.as_ref().filter(|forecast| *forecast == ends).and(verdict.edge(Auto::Forecast.name()))
            }
            Continuation::Symmetric(ends, baseline) => {
                let plain = ends.seated(Seat::Half);
                let row = CANDIDATES
                    .iter()
                    .chain([&ODD_ZERO])
                    .find(|candidate| candidate.ends == plain && is_same(candidate, *baseline))?;
                verdict.edge(row.name)
            }
        }
    }

    /// The edges of what was chosen: its row, or judged from the output it led to. `None` where nothing was judged.
    pub fn cost(&self, chosen: &Chosen, output: &[f64]) -> Option<Edge> {
        if let Some(row) = self.row(chosen) {
            return Some(row.clone());
        }
        let scene = self.verdict.as_ref()?.scene.as_ref()?;
        Some(scene.judge(chosen.label(), output, &self.foretold.as_ref()?.output))
    }

    /// Why nothing is known about the edges of what was chosen; `None` where they were judged.
    pub fn unjudged_under(&self, chosen: &Chosen, samples: &[f64]) -> Option<Unjudged> {
        match self.unjudged? {
            Unjudged::Constant if samples.iter().any(|v| *v != 0.0) && !chosen.keeps_constants() => {
                Some(Unjudged::ConstantTurned)
            }
            other => Some(other),
        }
    }
}

/// `level` without a side is the level at the odd end, which is what the mixed candidates have.
fn is_same(candidate: &Candidate, baseline: BaselineKind) -> bool {
    candidate.baseline == baseline
        || matches!((candidate.baseline, baseline), (BaselineKind::Level(Some(_)), BaselineKind::Level(None)))
}

impl Chosen {
    /// The name of a continuation that has no row, told apart from those that have: ends and baseline.
    fn label(&self) -> String {
        match &self.continuation {
            Continuation::Symmetric(ends, baseline) => format!("{} + {baseline}", ends.name()),
            Continuation::Given(_) => self.name.clone(),
        }
    }

    /// True where a constant record goes on as the same constant.
    fn keeps_constants(&self) -> bool {
        match &self.continuation {
            Continuation::Given([left, right]) => {
                let mut all = left.iter().chain(right);
                let first = all.next();
                all.all(|v| Some(v) == first)
            }
            Continuation::Symmetric(Ends::Periodic, _) => true,
            Continuation::Symmetric(Ends::Mirror { left, right, .. }, baseline) => {
                let takes_constants = !matches!(baseline, BaselineKind::None | BaselineKind::Slopes);
                takes_constants || (*left == Parity::Even && *right == Parity::Even)
            }
        }
    }
}
