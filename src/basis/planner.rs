//! Plans kept for reuse: one per choice of ends and length.

use std::collections::HashMap;
use std::sync::{Arc, LazyLock, Mutex, PoisonError};

use super::Plan;
use crate::ends::Ends;
use crate::error::Result;

/// Makes plans and keeps them. Shared between threads by reference.
#[derive(Debug, Default)]
pub struct Planner {
    plans: Plans,
}

type Plans = Mutex<HashMap<(Ends, usize), Arc<Plan>>>;

/// Short plans are kept for the whole process: many small logs ask for the same few.
static SHORT_PLANS: LazyLock<Plans> = LazyLock::new(Plans::default);

/// The longest of them, and how many are kept; together a few MB.
const SHORT: usize = 4096;
const KEPT: usize = 64;

impl Planner {
    /// A planner without plans.
    pub fn new() -> Self {
        Self::default()
    }

    /// The plan for records of `len` samples with these ends.
    ///
    /// # Errors
    /// [`crate::error::Kind::Unsupported`] when `len` is 0.
    pub fn plan(&self, ends: Ends, len: usize) -> Result<Arc<Plan>> {
        let store = if len <= SHORT { &*SHORT_PLANS } else { &self.plans };
        let known = store.lock().unwrap_or_else(PoisonError::into_inner).get(&(ends, len)).cloned();
        if let Some(plan) = known {
            return Ok(plan);
        }
        // Made outside the lock, so that a long plan does not hold up other lengths; the first one stored is kept.
        let made = Arc::new(Plan::new(ends, len)?);
        let mut plans = store.lock().unwrap_or_else(PoisonError::into_inner);
        if len <= SHORT && plans.len() >= KEPT {
            plans.clear();
        }
        Ok(plans.entry((ends, len)).or_insert(made).clone())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::error::Kind;

    #[test]
    fn a_plan_is_made_once_and_an_empty_record_has_none() {
        let planner = Planner::new();
        for ends in Ends::all() {
            let first = planner.plan(ends, 12).unwrap();
            assert_eq!((first.ends(), first.len()), (ends, 12));
            let long = planner.plan(ends, SHORT + 1).unwrap();
            assert!(Arc::ptr_eq(&long, &planner.plan(ends, SHORT + 1).unwrap()));
            assert_eq!(planner.plan(ends, 0).unwrap_err().kind(), Kind::Unsupported);
        }
    }

    #[test]
    fn short_plans_are_shared_and_few_are_kept() {
        for len in 1..=3 * KEPT {
            Planner::new().plan(Ends::EVEN, len).unwrap();
            assert!(SHORT_PLANS.lock().unwrap().len() <= KEPT);
        }
    }

    #[test]
    fn threads_share_one_planner() {
        fn shared<T: Send + Sync>() {}
        shared::<Planner>();
        shared::<Plan>();
    }
}
