//! A share of a batch: record n belongs to shard n modulo N.

use std::fmt;
use std::str::FromStr;

use crate::error::{Error, Result};
use crate::place::escape;

/// Shard `index` of `count`, from 0.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Shard {
    index: u64,
    count: u64,
}

impl Shard {
    /// The whole batch.
    pub const WHOLE: Shard = Shard { index: 0, count: 1 };

    /// True for the records that belong to it.
    pub fn holds(self, record: u64) -> bool {
        record % self.count == self.index
    }

    /// Number of its records among `total`.
    pub fn share_of(self, total: u64) -> u64 {
        (total + self.count - 1 - self.index) / self.count
    }

    /// `shard-0-of-4`: how its result files begin.
    pub fn stem(self) -> String {
        format!("shard-{}-of-{}", self.index, self.count)
    }
}

impl FromStr for Shard {
    type Err = Error;

    /// From `K/N` with K from 0 to N - 1.
    fn from_str(text: &str) -> Result<Shard> {
        let wrong = || {
            Error::usage(format!("not a shard: \"{}\"", escape(text)))
                .remedy("write K/N with K from 0 to N-1, such as 0/4 to 3/4")
        };
        let (index, count) = text.split_once('/').ok_or_else(wrong)?;
        let (index, count): (u64, u64) = (index.parse().map_err(|_| wrong())?, count.parse().map_err(|_| wrong())?);
        if index >= count || count > 1_000_000_000 {
            return Err(wrong());
        }
        Ok(Shard { index, count })
    }
}

impl fmt::Display for Shard {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.index, self.count)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_record_belongs_to_one_shard() {
        for count in 1..6 {
            for total in 0..20 {
                let shards: Vec<Shard> = (0..count).map(|k| format!("{k}/{count}").parse().expect("a shard")).collect();
                for record in 0..total {
                    assert_eq!(shards.iter().filter(|shard| shard.holds(record)).count(), 1);
                }
                let shares: Vec<u64> = shards.iter().map(|shard| shard.share_of(total)).collect();
                let counted = |shard: &Shard| (0..total).filter(|&record| shard.holds(record)).count() as u64;
                assert_eq!(shares, shards.iter().map(counted).collect::<Vec<_>>(), "{total} over {count}");
            }
        }
    }

    #[test]
    fn what_is_out_of_range_is_refused() {
        for text in ["4/4", "0/0", "-1/4", "1", "1/", "a/b", "1/4/2", "0/99999999999"] {
            assert!(text.parse::<Shard>().is_err(), "{text}");
        }
    }
}
