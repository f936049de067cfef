//! The tables.

use endgrain::verdict::{Adequacy, Level};

use crate::rules::{Chosen, HINDSIGHT, Score, TOLERANCE};

const CHOSEN: [&str; 3] = ["symmetric pick", "forecast", "auto"];

pub fn print(scores: &[Score]) {
    println!("{} cases", scores.len());
    let Some(first) = scores.first() else { return };
    println!("\n{:<18} {:>8} {:>8} {:>8}", "rule", "regret", "<=10 %", "<=25 %");
    for (at, (name, _)) in first.fixed.iter().enumerate() {
        regret_row(name, scores, |s| s.fixed[at].1);
    }
    for (at, name) in CHOSEN.iter().enumerate().filter(|(at, _)| *at != 1) {
        regret_row(name, scores, |s| s.chosen[at].error);
    }
    picks(scores);
    levels(scores);
    for (at, name) in CHOSEN.iter().enumerate() {
        adequacy(name, scores, at);
        trusted(name, scores, at);
        coverage(name, scores, at);
    }
    by_record(scores);
}

/// One line a case, comma-separated.
pub fn print_cases(scores: &[Score]) {
    println!(
        "file,group,operator,n,level,even_distance,forecast_error,deviation,best{}",
        CHOSEN.map(|c| format!(",{c} name,{c} error,{c} predicted,{c} bound")).concat()
    );
    for s in scores {
        let best = s.fixed[..HINDSIGHT].iter().map(|e| e.1).fold(f64::INFINITY, f64::min);
        let chosen = s
            .chosen
            .iter()
            .map(|c| format!(",{},{:e},{:e},{:e}", c.name, c.error, c.edge.predicted_error, c.edge.bound));
        println!(
            "{},{},{},{},{:?},{:e},{:e},{:e},{best:e}{}",
            s.file,
            s.group,
            s.operator,
            s.len,
            s.level,
            s.even_distance,
            s.chosen[1].edge.predicted_error,
            s.chosen[1].deviation,
            chosen.collect::<String>()
        );
    }
}

fn regret(score: &Score, error: f64) -> f64 {
    let best = score.fixed[..HINDSIGHT].iter().map(|e| e.1).fold(f64::INFINITY, f64::min);
    (error / best).ln()
}

fn regret_row(name: &str, scores: &[Score], error: impl Fn(&Score) -> f64) {
    let regrets: Vec<f64> = scores.iter().map(|s| regret(s, error(s))).collect();
    let within = |limit: f64| share(regrets.iter().map(|r| *r <= (1.0 + limit).ln()));
    println!("{name:<18} {:>8.3} {:>8.3} {:>8.3}", mean(regrets.iter().copied()), within(0.10), within(0.25));
}

fn picks(scores: &[Score]) {
    let count = |at: usize, name: &str| scores.iter().filter(|s| s.chosen[at].name == name).count();
    println!("\nauto takes periodic in {} cases, even in {}", count(2, "periodic"), count(2, "even"));
    for len in lengths(scores) {
        let of_len = || scores.iter().filter(|s| s.len == len);
        let row = |at: usize| mean(of_len().map(|s| regret(s, s.chosen[at].error)));
        println!("N = {len:<5} pick {:.3}  forecast {:.3}  auto {:.3}  ({})", row(0), row(1), row(2), of_len().count());
    }
}

fn levels(scores: &[Score]) {
    let candidates = endgrain::verdict::CANDIDATES.len();
    println!("\n{:<24} {:>6} {:>6} {:>10} {:>10}", "level", "cases", "share", "best of 7", "<=25 %");
    let rows = [Level::SupportedByStructure, Level::Supported, Level::Favoured, Level::NoClearWinner, Level::NotJudged];
    for level in rows {
        let of_level: Vec<&Score> = scores.iter().filter(|s| s.level == level).collect();
        let best = |s: &&Score| s.fixed[..candidates].iter().map(|e| e.1).fold(f64::INFINITY, f64::min);
        let within = |limit: f64| share(of_level.iter().map(|s| s.chosen[0].error <= limit * best(s)));
        let name = format!("{level:?}");
        let part = of_level.len() as f64 / scores.len() as f64;
        println!("{name:<24} {:>6} {part:>6.3} {:>10.3} {:>10.3}", of_level.len(), within(1.0 + 1e-9), within(1.25));
    }
    let immaterial: Vec<&Score> = scores.iter().filter(|s| s.choice_immaterial).collect();
    let right = share(immaterial.iter().map(|s| s.worst_tie <= TOLERANCE));
    println!(
        "choice immaterial        {:>6} {:>6.3} worst tie within tolerance {right:.3}",
        immaterial.len(),
        immaterial.len() as f64 / scores.len() as f64
    );
}

fn adequacy(name: &str, scores: &[Score], at: usize) {
    println!("\n{name}: {:<14} {:>6} {:>10} {:>10}", "adequacy", "share", "<= tol", "<= 2 tol");
    for word in [Adequacy::Within, Adequacy::Borderline, Adequacy::Outside] {
        let of_word: Vec<&Chosen> = scores.iter().map(|s| &s.chosen[at]).filter(|c| c.edge.adequacy == word).collect();
        let within = |limit: f64| share(of_word.iter().map(|c| c.error <= limit * c.deviation));
        let part = of_word.len() as f64 / scores.len() as f64;
        println!(
            "{:<30} {part:>6.3} {:>10.3} {:>10.3}",
            format!("{word:?}"),
            within(TOLERANCE),
            within(2.0 * TOLERANCE)
        );
    }
}

fn trusted(name: &str, scores: &[Score], at: usize) {
    let sides = || scores.iter().flat_map(|s| s.chosen[at].sides);
    let by_len: Vec<String> = lengths(scores)
        .iter()
        .map(|len| {
            format!(
                "N={len} {:.3}",
                share(scores.iter().filter(|s| s.len == *len).flat_map(|s| s.chosen[at].sides).map(|s| s.1))
            )
        })
        .collect();
    println!(
        "{name}: trusted span without violation on {:.3} of sides ({}), trimmed share of the reach {:.3}",
        share(sides().map(|s| s.1)),
        by_len.join(", "),
        mean(sides().map(|s| s.0))
    );
}

fn coverage(name: &str, scores: &[Score], at: usize) {
    let covered = |s: &Score| s.chosen[at].error <= s.chosen[at].edge.bound;
    println!("{name}: bound covers {:.3}", share(scores.iter().map(covered)));
    for len in lengths(scores) {
        println!("  N = {len:<5} {:.3}", share(scores.iter().filter(|s| s.len == len).map(covered)));
    }
    let mut operators: Vec<&str> = scores.iter().map(|s| s.operator).collect();
    operators.dedup();
    operators.sort_unstable();
    operators.dedup();
    for operator in operators {
        let of = || scores.iter().filter(move |s| s.operator == operator);
        let width = mean(of().map(|s| (s.chosen[at].edge.bound / s.chosen[at].deviation).ln())).exp();
        let ratios = sorted(of().map(|s| s.chosen[at].error / s.chosen[at].edge.predicted_error));
        let quantile = ratios[(0.95 * (ratios.len() - 1) as f64) as usize];
        println!(
            "  {operator:<18} {:.3}  width {width:.3} of output s.d.; true/predicted 95 %: {quantile:.2}  regret {:.3}",
            share(of().map(covered)),
            mean(of().map(|s| regret(s, s.chosen[at].error)))
        );
    }
}

fn by_record(scores: &[Score]) {
    let mut files: Vec<&str> = scores.iter().map(|s| s.file.as_str()).collect();
    files.sort_unstable();
    files.dedup();
    println!(
        "\n{:<28} {:>6} {:>8} {:>8} {:>8} {:>8} {:>8}",
        "record", "cases", "even", "pick", "forecast", "auto", "covered"
    );
    for file in files {
        let of = || scores.iter().filter(move |s| s.file == file);
        let row = |at: usize| mean(of().map(|s| regret(s, s.chosen[at].error)));
        let even = mean(of().map(|s| regret(s, s.fixed[0].1)));
        let covered = share(of().map(|s| s.chosen[2].error <= s.chosen[2].edge.bound));
        println!(
            "{file:<28} {:>6} {even:>8.3} {:>8.3} {:>8.3} {:>8.3} {covered:>8.3}",
            of().count(),
            row(0),
            row(1),
            row(2)
        );
    }
}

fn lengths(scores: &[Score]) -> Vec<usize> {
    let mut lengths: Vec<usize> = scores.iter().map(|s| s.len).collect();
    lengths.sort_unstable();
    lengths.dedup();
    lengths
}

fn sorted(values: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut values: Vec<f64> = values.collect();
    values.sort_by(f64::total_cmp);
    values
}

fn mean(values: impl Iterator<Item = f64>) -> f64 {
    let (count, total) = values.fold((0, 0.0), |(c, t), v| (c + 1, t + v));
    total / f64::from(count)
}

fn share(truths: impl Iterator<Item = bool>) -> f64 {
    mean(truths.map(|t| if t { 1.0 } else { 0.0 }))
}
