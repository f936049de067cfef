//! Conditions finite records (accelerometer logs, measured profiles) with the assumption at their two ends made explicit.
//!
//! The main job in ten lines:
//!
//! ```
//! # fn main() -> endgrain::error::Result<()> {
//! # let folder = std::env::temp_dir().join(format!("endgrain-doc-{}", std::process::id()));
//! # std::fs::create_dir_all(&folder)?;
//! # let clean = folder.join("clean.csv");
//! use endgrain::{job, read::Input, settings::Settings, write::Overwrite};
//!
//! let mut settings = Settings::default();
//! for (key, value) in [("lowpass", "12Hz"), ("extension", "odd"), ("baseline", "line")] {
//!     settings.set(key, value)?;
//! }
//! let target = job::Target::file(&clean, None, Overwrite::Refuse);
//! let report = job::condition(Input::Path("fixtures/hoist.csv".into()), target, &settings)?;
//! assert_eq!(report.channels.len(), 3);
//! # std::fs::remove_dir_all(&folder)?;
//! # Ok(())
//! # }
//! ```
//!
//! The order of the modules below is the order of the data and of permitted imports.

pub mod place;
pub mod error;
pub mod unit;
pub mod numeric;
pub mod record;
pub mod read;
pub mod audit;
pub mod regularise;
pub mod ends;
pub mod baseline;
pub mod basis;
pub mod spectrum;
pub mod operator;
pub mod forecast;
pub mod integral;
pub mod condition;
pub mod metric;
pub mod verdict;
pub mod compare;
pub mod codec;
pub mod settings;
pub mod report;
pub mod write;
pub mod job;
pub mod fleet;
