//! Finding the channels that a user names, with a suggestion for a near miss.

use crate::error::{Error, Result};
use crate::place::escape;

/// A column or channel that can be asked for.
#[derive(Debug, Clone)]
pub(super) struct Candidate {
    /// Name, unique.
    pub(super) name: String,
    /// Name as the header prints it, unit and all, before it was made unique.
    pub(super) header: String,
    /// Field or channel number in the file, from 1.
    pub(super) number: usize,
}

/// Index into `candidates` of the one that `wanted` names: by name, by the header's full text, or as `#number`.
///
/// # Errors
/// `Usage` when there is none, or when the header prints that name more than once.
pub(super) fn find(wanted: &str, candidates: &[Candidate], option: &str) -> Result<usize> {
    if let Some(number) = wanted.strip_prefix('#').and_then(|digits| digits.parse::<usize>().ok()) {
        return candidates.iter().position(|c| c.number == number).ok_or_else(|| {
            Error::usage(format!("{option} {}: there is no such column", escape(wanted))).remedy(offer(candidates))
        });
    }
    let matching = |matches: &dyn Fn(&Candidate) -> bool| -> Vec<usize> {
        (0..candidates.len()).filter(|&index| matches(&candidates[index])).collect()
    };
    let mut found = matching(&|c| c.name == wanted);
    if found.is_empty() {
        found = matching(&|c| c.header == wanted);
    } else {
        found.extend(matching(&|c| c.name != wanted && suffixed(&c.name, wanted)));
    }
    match found[..] {
        [only] => Ok(only),
        [_, _, ..] => {
            let numbers: Vec<String> = found.iter().map(|&index| format!("#{}", candidates[index].number)).collect();
            Err(Error::usage(format!("{option} {}: the name stands for {} columns", escape(wanted), found.len()))
                .remedy(format!("choose by number: {}", numbers.join(", "))))
        }
        [] => {
            let near = candidates
                .iter()
                .map(|c| (strsim::jaro_winkler(&c.name.to_lowercase(), &wanted.to_lowercase()), c))
                .filter(|(likeness, _)| *likeness > 0.8)
                .max_by(|a, b| a.0.total_cmp(&b.0));
            let error = Error::usage(format!("{option} {}: there is no such column", escape(wanted)));
            Err(match near {
                Some((_, c)) => error.remedy(format!("did you mean \"{}\"?", escape(&c.name))),
                None => error.remedy(offer(candidates)),
            })
        }
    }
}

/// Positions in `candidates` that were asked for, ascending and once each; all when nothing was asked for.
///
/// # Errors
/// As `find`.
pub(super) fn select(wanted: Option<&[String]>, candidates: &[Candidate]) -> Result<Vec<usize>> {
    let Some(wanted) = wanted else { return Ok((0..candidates.len()).collect()) };
    let mut chosen = wanted.iter().map(|name| find(name, candidates, "--channel")).collect::<Result<Vec<_>>>()?;
    chosen.sort_unstable();
    chosen.dedup();
    Ok(chosen)
}

/// True for the names that doubled columns get: `ax#2` of `ax`.
fn suffixed(name: &str, bare: &str) -> bool {
    name.strip_prefix(bare).and_then(|rest| rest.strip_prefix('#')).is_some_and(|n| n.parse::<usize>().is_ok())
}

/// A short list of what there is.
fn offer(candidates: &[Candidate]) -> String {
    let names: Vec<String> = candidates.iter().take(12).map(|c| escape(&c.name)).collect();
    let more = if candidates.len() > 12 { ", ..." } else { "" };
    format!("there are: {}{more}", names.join(", "))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn candidates() -> Vec<Candidate> {
        [("t", "t [s]"), ("ax", "ax"), ("ax#2", "ax"), ("speed", "speed (mm/s)")]
            .iter()
            .enumerate()
            .map(|(i, (name, header))| Candidate { name: (*name).into(), header: (*header).into(), number: i + 1 })
            .collect()
    }

    #[test]
    fn names_numbers_and_header_texts_are_found() {
        for (wanted, index) in [("t", 0), ("#2", 1), ("ax#2", 2), ("speed (mm/s)", 3)] {
            assert_eq!(find(wanted, &candidates(), "--channel"), Ok(index), "{wanted}");
        }
    }

    #[test]
    fn a_doubled_name_is_ambiguous_and_a_near_miss_is_offered() {
        let text = |wanted| find(wanted, &candidates(), "--channel").map_err(|e| e.to_string()).unwrap_err();
        assert_eq!(text("ax"), "--channel ax: the name stands for 2 columns; choose by number: #2, #3");
        assert_eq!(text("sped"), "--channel sped: there is no such column; did you mean \"speed\"?");
        assert_eq!(text("#9"), "--channel #9: there is no such column; there are: t, ax, ax#2, speed");
    }
}
