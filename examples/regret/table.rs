//! The tables.

use crate::rules::{HINDSIGHT, Score};

pub fn print(scores: &[Score]) {
    println!("{} cases", scores.len());
    let Some(first) = scores.first() else { return };
    println!("{:<18} {:>8} {:>8} {:>8}", "rule", "regret", "<=10 %", "<=25 %");
    for (at, (name, _)) in first.errors.iter().enumerate() {
        let regrets: Vec<f64> = scores.iter().map(|s| regret(s, at)).collect();
        let share = |limit: f64| regrets.iter().filter(|r| **r <= (1.0 + limit).ln()).count() as f64 / regrets.len() as f64;
        let mean = regrets.iter().sum::<f64>() / regrets.len() as f64;
        println!("{name:<18} {mean:>8.3} {:>8.3} {:>8.3}", share(0.10), share(0.25));
    }
    for factor in [1.6, 2.0, 2.25, 2.5, 3.0, 4.0] {
        for len in [64, 256, 1024] {
            let (mut n, mut covered, mut brick, mut brick_covered) = (0, 0, 0, 0);
            for s in scores.iter().filter(|s| s.len == len) {
                let ok = s.errors.last().is_some_and(|e| e.1 <= factor * s.predicted);
                if s.operator.starts_with("brick") { brick += 1; brick_covered += usize::from(ok) } else { n += 1; covered += usize::from(ok) }
            }
            println!("{factor} {len} {:.3} brick {:.3}", covered as f64 / n as f64, brick_covered as f64 / brick as f64);
        }
    }
}

fn regret(score: &Score, at: usize) -> f64 {
    let best = score.errors[..HINDSIGHT].iter().map(|e| e.1).fold(f64::INFINITY, f64::min);
    (score.errors[at].1 / best).ln()
}
