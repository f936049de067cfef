//! Spectra of open records against what is published about them, and against figures recomputed with NumPy 2.4 and SciPy 1.17.

use std::path::{Path, PathBuf};

use endgrain::job;
use endgrain::read::Input;
use endgrain::report::{CoefficientReport, SpectrumReport, Trace};
use endgrain::settings::Settings;

fn open(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/open").join(name)
}

fn run(path: &Path, settings: &[(&str, &str)]) -> SpectrumReport {
    let mut wanted = Settings::default();
    for (key, value) in settings {
        wanted.set(key, value).expect("a setting");
    }
    job::spectrum(Input::Path(path.to_owned()), None, &wanted).expect("a spectrum")
}

fn only(report: &SpectrumReport) -> &Trace {
    &report.channels[0].traces[0]
}

/// Coefficients by energy in the periodic basis; the record has one sample a unit of time.
fn harmonics(path: &Path, more: &[(&str, &str)]) -> Vec<CoefficientReport> {
    let base = [("rate", "1Hz"), ("method", "basis"), ("extension", "periodic"), ("baseline", "trend:0")];
    let settings: Vec<(&str, &str)> =
        base.iter().filter(|(key, _)| !more.iter().any(|(other, _)| other == key)).chain(more).copied().collect();
    let report = run(path, &settings);
    only(&report).coefficients.as_ref().expect("coefficients").largest.clone()
}

/// Harmonics of the record by amplitude, largest first: cycles over the record and amplitude.
fn amplitudes(path: &Path, more: &[(&str, &str)]) -> Vec<(usize, f64)> {
    let base = [("rate", "1Hz"), ("method", "basis"), ("extension", "periodic"), ("baseline", "trend:0")];
    let settings: Vec<(&str, &str)> =
        base.iter().filter(|(key, _)| !more.iter().any(|(other, _)| other == key)).chain(more).copied().collect();
    let report = run(path, &settings);
    let series = only(&report).coefficients.as_ref().and_then(|c| c.series.as_ref()).expect("a series");
    let mut squares = vec![0.0; series.amplitude.len() / 2 + 1];
    for (k, a) in series.amplitude.iter().enumerate() {
        squares[k.div_ceil(2)] += a * a;
    }
    let mut found: Vec<(usize, f64)> = squares.into_iter().map(f64::sqrt).enumerate().collect();
    found.sort_by(|a, b| b.1.total_cmp(&a.1));
    found
}

fn values(name: &str) -> Vec<f64> {
    let text = std::fs::read_to_string(open(name)).expect("a record");
    text.lines().skip(1).map(|line| line.parse().expect("a number")).collect()
}

#[test]
fn lew_has_the_certified_moments_and_one_peak_at_0_3() {
    let path = open("lew_deflections.csv");
    // NIST StRD, Lew, certified values: mean, standard deviation (divisor n - 1), lag-1 autocorrelation.
    let report = run(&path, &[("rate", "1Hz"), ("method", "sine:3")]);
    let level = only(&report).level.expect("a level");
    let deviation = level.deviation * (200.0_f64 / 199.0).sqrt();
    assert!((level.mean / -177.435 - 1.0).abs() < 1e-12);
    assert!((deviation / 277.332168044316 - 1.0).abs() < 1e-12, "{deviation}");
    // Wiener and Khinchin: the autocorrelation from a periodogram on as many lines as there are samples is circular; the one
    // term that joins the ends is taken off again.
    let samples = values("lew_deflections.csv");
    let report = run(&path, &[("rate", "1Hz"), ("segment", "200"), ("window", "rectangular")]);
    let series = only(&report).density.as_ref().and_then(|d| d.series.as_ref()).expect("a series");
    let circular: f64 =
        series.frequency.iter().zip(&series.density).map(|(f, p)| p * (std::f64::consts::TAU * f).cos()).sum();
    let joint = (samples[0] - level.mean) * (samples[199] - level.mean);
    let total: f64 = samples.iter().map(|v| (v - level.mean).powi(2)).sum();
    assert!(((circular - joint) / total / -0.307304800605679 - 1.0).abs() < 1e-12, "{}", (circular - joint) / total);

    // e-Handbook 1.3.3.27.3: a single dominant peak at about 0.3 cycles an observation; 1.4.2.5.3 starts at 0.3025.
    assert_eq!(amplitudes(&path, &[])[0].0, 60);
    let even = harmonics(&path, &[("extension", "even"), ("baseline", "none")]);
    let first = even.iter().find(|c| c.frequency > 0.0).expect("a coefficient above zero");
    assert_eq!((first.index, first.half_cycles), (121, 121.0));
    assert!((first.frequency - 0.3025).abs() < 1e-12);

    // The least-squares sinusoid under the weights of the same window (SciPy 1.17.1, curve_fit): 0.30134480, 374.0305. Without
    // weights it is 0.30180704 and 343.2886: the ends of this record do not follow its middle.
    let line = only(&report).lines[0];
    assert!((line.frequency - 0.30134480).abs() < line.frequency_error, "{line:?}");
    assert!((line.amplitude - 374.0305).abs() < line.amplitude_error, "{line:?}");
    // e-Handbook 1.4.2.5.3: residual standard deviation 155.8 at its printed parameters, 196 degrees of freedom.
    let model = |t: f64| -178.786 - 361.766 * (std::f64::consts::TAU * 0.302596 * t + 1.46536).sin();
    let squares: f64 = samples.iter().enumerate().map(|(n, y)| (y - model(n as f64 + 1.0)).powi(2)).sum();
    assert!(((squares / 196.0).sqrt() - 155.829).abs() < 0.05, "{}", (squares / 196.0).sqrt());
    // 1.4.2.5.2: 200 values, median -162, from -579 to 300.
    let mut sorted = samples.clone();
    sorted.sort_by(f64::total_cmp);
    assert_eq!((sorted.len(), (sorted[99] + sorted[100]) / 2.0, level.low, level.high), (200, -162.0, -579.0, 300.0));
}

#[test]
fn the_pressure_of_the_southern_oscillation_has_its_three_cycles() {
    let path = open("enso_pressure.csv");
    let found = amplitudes(&path, &[]);
    // NIST StRD, ENSO: annual cycle strongest, cycles of about 44 and 26 months. 168 months hold 14 years exactly.
    assert_eq!(found[0].0, 14);
    assert!((found[0].1 - 3.09042).abs() < 0.001 * 3.09042, "{}", found[0].1);
    let certified = 3.0762128085_f64.hypot(0.53280138227);
    assert!((found[0].1 / certified - 1.0).abs() < 0.015);
    let next: Vec<usize> = found[1..4].iter().map(|f| f.0).collect();
    assert_eq!(next, [4, 6, 5], "42, 28 and 34 months");
    let line = run(&path, &[("rate", "1Hz")]);
    let line = only(&line).lines[0];
    assert!(
        (1.0 / line.frequency - 12.0).abs() < 0.1 && (line.amplitude - certified).abs() < 2.0 * line.amplitude_error
    );
    // The certified fit itself: residual sum of squares at the certified parameters.
    let b = [
        10.510749193,
        3.0762128085,
        0.53280138227,
        44.311088700,
        -1.6231428586,
        0.52554493756,
        26.887614440,
        0.21232288488,
        1.4966870418,
    ];
    let turn = std::f64::consts::TAU;
    let model = |x: f64| {
        b[0] + b[1] * (turn * x / 12.0).cos()
            + b[2] * (turn * x / 12.0).sin()
            + b[4] * (turn * x / b[3]).cos()
            + b[5] * (turn * x / b[3]).sin()
            + b[7] * (turn * x / b[6]).cos()
            + b[8] * (turn * x / b[6]).sin()
    };
    let squares: f64 =
        values("enso_pressure.csv").iter().enumerate().map(|(n, y)| (y - model(n as f64 + 1.0)).powi(2)).sum();
    assert!((squares / 788.53978668 - 1.0).abs() < 1e-9, "{squares}");
}

#[test]
fn sunspots_return_every_eleven_years() {
    let text = std::fs::read_to_string(open("sunspots_yearly.csv")).expect("a record");
    let counts: Vec<&str> = text.lines().skip(1).map(|line| line.rsplit(',').next().expect("a field")).collect();
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("sunspots.csv");
    std::fs::write(&path, format!("spots\n{}\n", counts.join("\n"))).expect("a file");
    let found = amplitudes(&path, &[]);
    let top: Vec<usize> = found[..3].iter().map(|f| f.0).collect();
    // Recomputed with NumPy: bins 28, 31, 29 are 11.036, 9.968 and 10.655 years; SILSO: about 11 years.
    assert_eq!(top, [28, 31, 29]);
    let even = harmonics(&path, &[("extension", "even"), ("baseline", "mean")]);
    assert_eq!(even[0].index, 56);
    assert!((even[0].wavelength.expect("a period") - 11.036).abs() < 0.001);
    let report = run(&path, &[("rate", "1Hz")]);
    assert!((only(&report).level.expect("a level").mean - 49.75210356).abs() < 1e-8);
    let line = only(&report).lines[0];
    assert!((1.0 / line.frequency - 11.0).abs() < 0.3, "{line:?}");
}

#[test]
fn a_trend_hides_the_year_until_it_is_taken_off() {
    // CO2 at Mauna Loa under a quadratic baseline, recomputed with NumPy: 2.7708 and 0.7459 ppm.
    let found = amplitudes(&open("co2_monthly.csv"), &[("baseline", "trend:2")]);
    let at = |bin: usize| found.iter().find(|f| f.0 == bin).expect("a bin").1;
    assert!((at(42) / 2.7708 - 1.0).abs() < 0.01 && (at(84) / 0.7459 - 1.0).abs() < 0.01, "{} {}", at(42), at(84));
    let report = run(&open("co2_monthly.csv"), &[("rate", "12Hz"), ("detrend", "quadratic")]);
    let lines = &only(&report).lines;
    let year = lines.iter().find(|line| (line.frequency - 1.0).abs() < 0.02).expect("a yearly line");
    assert!((year.amplitude / 2.7708 - 1.0).abs() < 0.02, "{year:?}");

    // Passengers: logarithm, linear baseline: 0.15016 and 0.08188.
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("log.csv");
    let logarithms: Vec<String> = values("airline_passengers.csv").iter().map(|v| v.ln().to_string()).collect();
    std::fs::write(&path, format!("log\n{}\n", logarithms.join("\n"))).expect("a file");
    let found = amplitudes(&path, &[("baseline", "trend:1")]);
    let at = |bin: usize| found.iter().find(|f| f.0 == bin).expect("a bin").1;
    assert!((at(12) - 0.15016).abs() < 1e-3 && (at(24) - 0.08188).abs() < 1e-3, "{} {}", at(12), at(24));
}

#[test]
fn short_real_records_read_as_they_are() {
    // UEA archive, BasicMotions: first value, mean and deviation of the first case (recomputed), running at 1.2 Hz.
    let report = run(&open("watch_standing.csv"), &[("rate", "10Hz"), ("detrend", "none")]);
    assert_eq!(report.channels.len(), 6);
    let level = only(&report).level.expect("a level");
    assert!((level.mean + 0.08618429).abs() < 1e-8 && (level.deviation - 0.31443825).abs() < 1e-8);
    let running = run(&open("watch_running.csv"), &[("rate", "10Hz"), ("segment", "100"), ("window", "rectangular")]);
    for channel in &running.channels {
        let series = channel.traces[0].density.as_ref().and_then(|d| d.series.as_ref()).expect("a series");
        let top = (0..series.density.len()).max_by(|&a, &b| series.density[a].total_cmp(&series.density[b]));
        assert!((series.frequency[top.expect("a line")] - 1.2).abs() < 1e-9, "{}", channel.name);
    }
    // MIT-BIH by way of PyWavelets; Cobb 1978.
    let heart = run(&open("ecg.csv"), &[("rate", "360Hz")]);
    assert_eq!(only(&heart).level.expect("a level").mean, -56.3046875);
    assert_eq!(values("ecg.csv")[..4], [-86.0, -87.0, -87.0, -89.0]);
    // MIT-BIH by way of sktime: 7501 lines with the heading, two columns.
    let labelled = run(&open("ecg_labelled.csv"), &[("rate", "360Hz")]);
    assert_eq!((labelled.input.samples, labelled.channels.len()), (7500, 2));
    assert_eq!(values("nile_flow.csv")[..2], [1120.0, 1160.0]);
    assert_eq!(run(&open("nile_flow.csv"), &[("rate", "1Hz")]).input.samples, 100);
    // NOAA sea temperatures, 61 years of 12 months: the year is the strongest cycle.
    let found = amplitudes(&open("elnino_temperature.csv"), &[]);
    assert_eq!((found[0].0, values("elnino_temperature.csv")[0]), (61, 23.11));
}
