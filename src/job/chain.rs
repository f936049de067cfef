//! The chain of a run, with the end conditions of an integral checked against what the record does at its ends.

use crate::audit::endstate::EndState;
use crate::error::{Error, Finding, Result};
use crate::operator::{Chain, Conditions, Needs};
use crate::place::Place;
use crate::record::{Channel, Record};
use crate::settings::Settings;

/// Below this end-state ratio a record is at rest at its ends: at-rest records measured 0.05 to 0.07.
const AT_REST: f64 = 0.15;
/// Above this it is moving: steady records measured 0.57 to 1.9.
const MOVING: f64 = 0.3;

/// Resolves the operators for a record.
///
/// # Errors
/// As `Chain::resolve`; `Usage` for an integral without end conditions, and for those without an integral; `Unsupported`
/// for end conditions that the motion at the record's ends speaks against, unless they are insisted on.
pub fn of(record: &Record, settings: &Settings) -> Result<(Chain, Vec<Finding>)> {
    let (chain, findings) = Chain::resolve(&settings.requests, &settings.shape, record.axis(), record.len())?;
    if chain.turns() != 0 && settings.requests.iter().any(|request| request.step().key == "split") {
        return Err(Error::usage("--split parts the record itself, not its derivative or integral")
            .remedy("leave out --split, or run it on the result"));
    }
    if chain.treatments().resampling.is_some() && !settings.beside.is_empty() {
        return Err(Error::usage("--beside stands on the record's own rows, and the rate changes")
            .remedy("leave --beside out, or change the rate afterwards"));
    }
    if chain.turns() >= 0 {
        let stray = [("conditions", settings.conditions.is_some()), ("offset", settings.offset.is_some())];
        let stray = stray.into_iter().chain([("beside", !settings.beside.is_empty())]).find(|(_, given)| *given);
        return match stray {
            Some((option, _)) => Err(Error::usage(format!("--{option} goes with an integral, and none is asked for"))
                .remedy(format!("add --integrate 1 or 2, or leave --{option} out"))),
            None => Ok((chain, findings)),
        };
    }
    let Some(conditions) = &settings.conditions else { return Err(missing(&chain, record)) };
    let filtered = chain.high_pass().is_some();
    for channel in record.channels() {
        let state = EndState::of(channel.samples);
        if let Some(objection) = state.and_then(|state| objection(conditions, state, filtered)).filter(|o| o.grave)
            && !settings.insist
        {
            return Err(Error::unsupported(objection.text)
                .at(Place::channel(channel.name))
                .remedy(format!("use --conditions {}, or add --insist", objection.instead)));
        }
    }
    Ok((chain.with_conditions(conditions.clone(), settings.offset.clone()), findings))
}

/// What the record says against end conditions.
pub struct Objection {
    /// In words, with the ratio.
    pub text: String,
    /// Whether they have to be insisted on.
    pub grave: bool,
    instead: &'static str,
}

/// What the end state says against conditions; `filtered` is true where a high-pass follows the integral, which takes out
/// what a wrong fit about a fixed place would leave.
pub fn objection(conditions: &Conditions, state: EndState, filtered: bool) -> Option<Objection> {
    let both = state.first_ratio.max(state.last_ratio);
    let (ratio, place) = match conditions.row().needs {
        Needs::RestAtStart => (state.first_ratio, "start"),
        Needs::RestAtBothEnds if state.first_ratio >= state.last_ratio => (state.first_ratio, "start"),
        Needs::RestAtBothEnds => (state.last_ratio, "end"),
        Needs::Motion if both < AT_REST && !filtered => {
            return Some(Objection {
                text: format!(
                    "--conditions {conditions} supposes motion about a fixed place, but the record is at rest at its \
                     ends (end-state ratio {both:.2}, at rest below {AT_REST}): a displacement that stays would be lost"
                ),
                grave: true,
                instead: "rest, rest-to=D or start-rest",
            });
        }
        _ => return None,
    };
    (ratio > AT_REST).then(|| Objection {
        text: format!(
            "--conditions {conditions} supposes rest, but the record is moving at its {place} (end-state ratio {ratio:.2}, \
             at rest below {AT_REST})"
        ),
        grave: ratio > MOVING,
        instead: "steady, or pinned=D or still=A..B where they are known",
    })
}

fn missing(chain: &Chain, record: &Record) -> Error {
    let largest = |channel: &Channel<'_>| {
        EndState::of(channel.samples).map_or(0.0, |state| state.first_ratio.max(state.last_ratio))
    };
    let judged = record.channels().max_by(|a, b| largest(a).total_cmp(&largest(b)));
    let what = format!("--integrate {}: the end conditions are not given, and there is no default", -chain.turns());
    let Some((channel, state)) = judged.and_then(|channel| Some((channel, EndState::of(channel.samples)?))) else {
        return Error::usage(what).remedy(format!("add --conditions with one of {}", Conditions::examples()));
    };
    let ratio = state.first_ratio.max(state.last_ratio);
    let (state, choices) = if ratio < AT_REST {
        ("at rest", "start-rest, rest, rest-to=D or start-rest-to=D")
    } else if ratio > MOVING {
        ("moving", "steady, or pinned=D or still=A..B where they are known")
    } else {
        (
            "neither clearly at rest nor moving",
            "steady, rest, start-rest, pinned=D or still=A..B, as you know the motion to be",
        )
    };
    Error::usage(what)
        .at(Place::channel(channel.name))
        .remedy(format!("the record is {state} at its ends (end-state ratio {ratio:.2}): add --conditions {choices}"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::audit::endstate::Motion;

    fn state(first_ratio: f64, last_ratio: f64) -> EndState {
        EndState { first_ratio, last_ratio, motion: Motion::Between }
    }

    #[test]
    fn the_end_state_decides_what_needs_insistence() {
        let grave = |text: &str, first, last, filtered| {
            let conditions: Conditions = text.parse().expect("known");
            objection(&conditions, state(first, last), filtered).map(|objection| objection.grave)
        };
        for rest in ["rest", "rest-to=1m"] {
            assert_eq!(grave(rest, 0.05, 0.07, false), None);
            assert_eq!(grave(rest, 0.05, 0.2, false), Some(false));
            assert_eq!(grave(rest, 0.6, 0.07, true), Some(true));
        }
        // Rest at the start asks nothing of the end.
        assert_eq!(grave("start-rest", 0.05, 0.9, false), None);
        assert_eq!(grave("start-rest-to=1m", 0.9, 0.05, false), Some(true));
        assert_eq!(grave("steady", 0.05, 0.07, false), Some(true));
        assert_eq!(grave("steady", 0.05, 0.07, true), None);
        assert_eq!(grave("steady:offset", 0.05, 0.2, false), None);
        assert_eq!(grave("still=0s..1s", 0.9, 0.9, false), None);
        assert_eq!(grave("pinned", 0.9, 0.9, false), None);
    }
}
