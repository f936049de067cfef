//! Weightings against the printed tables of the standards and against the formula written out a second time.

use super::*;

fn magnitude(name: &str, hz: f64) -> f64 {
    WEIGHTINGS.iter().find(|row| row.name == name).expect(name).response(hz).norm()
}

/// The exact one-third-octave mid-frequency that a nominal one stands for: 10^(n/10) Hz (IEC 61260-1, base ten).
fn mid(nominal: f64) -> f64 {
    10_f64.powf((10.0 * nominal.log10()).round() / 10.0)
}

fn agrees(name: &str, rows: &[(f64, f64)], percent: f64) {
    for &(nominal, printed) in rows {
        let found = 1000.0 * magnitude(name, mid(nominal));
        let off = 100.0 * (found / printed - 1.0);
        assert!(off.abs() <= percent, "{name} at {nominal} Hz: {found} against {printed}, {off} %");
    }
}

#[test]
fn wk_is_that_of_table_3() {
    // ISO 2631-1:1997, Table 3, factors x 1000.
    let printed = [
        (0.5, 418.0),
        (0.63, 459.0),
        (0.8, 477.0),
        (1.0, 482.0),
        (1.25, 484.0),
        (1.6, 494.0),
        (2.0, 531.0),
        (2.5, 631.0),
        (3.15, 804.0),
        (4.0, 967.0),
        (5.0, 1039.0),
        (6.3, 1054.0),
        (8.0, 1036.0),
        (10.0, 988.0),
        (12.5, 902.0),
        (16.0, 768.0),
        (20.0, 636.0),
        (25.0, 513.0),
        (31.5, 405.0),
        (40.0, 314.0),
        (50.0, 246.0),
        (63.0, 186.0),
        (80.0, 132.0),
    ];
    agrees("Wk", &printed, 1.5);
    // The formula at exact mid-frequencies, evaluated elsewhere from the parameters of Table A.1.
    let formula = [
        (1.0, 482.47),
        (2.0, 530.75),
        (4.0, 964.78),
        (6.3, 1054.36),
        (8.0, 1037.35),
        (10.0, 988.41),
        (16.0, 774.28),
        (31.5, 403.11),
        (80.0, 133.87),
    ];
    agrees("Wk", &formula, 0.004); // the last digit given
}

#[test]
fn wd_is_that_of_table_3_but_for_its_misprint() {
    // ISO 2631-1:1997, Table 3. At 10 Hz it prints 212 where its own formula gives 201.7: a known misprint, left out.
    let printed = [
        (1.0, 1011.0),
        (1.25, 1008.0),
        (1.6, 968.0),
        (2.0, 890.0),
        (2.5, 776.0),
        (4.0, 512.0),
        (8.0, 253.0),
        (16.0, 125.0),
        (31.5, 63.2),
        (80.0, 21.1),
    ];
    agrees("Wd", &printed, 1.3);
    agrees("Wd", &[(10.0, 201.7)], 0.03);
}

#[test]
fn wf_is_that_of_table_3() {
    // ISO 2631-1:1997, Table 3: the print from memory, and the formula evaluated elsewhere.
    let printed = [
        (0.1, 695.0),
        (0.125, 895.0),
        (0.16, 1006.0),
        (0.2, 992.0),
        (0.25, 854.0),
        (0.315, 619.0),
        (0.4, 384.0),
        (0.5, 224.0),
    ];
    agrees("Wf", &printed, 1.3);
    let formula = [
        (0.1, 695.1),
        (0.125, 900.0),
        (0.16, 1004.1),
        (0.2, 992.8),
        (0.25, 850.1),
        (0.315, 614.9),
        (0.4, 388.4),
        (0.5, 222.5),
    ];
    agrees("Wf", &formula, 0.02);
}

#[test]
fn wm_is_that_of_its_standard() {
    // ISO 2631-2:2003, Annex A.
    let rows = [
        (1.0, 832.9),
        (2.0, 931.9),
        (4.0, 818.4),
        (8.0, 581.9),
        (16.0, 337.5),
        (31.5, 176.0),
        (63.0, 83.4),
        (80.0, 60.4),
    ];
    agrees("Wm", &rows, 1.0);
}

#[test]
fn wh_wc_and_we_are_those_of_their_tables() {
    // ISO 5349-1:2001, Table A.2, and ISO 2631-1:1997, Table 4: values from memory.
    let hand = [
        (6.3, 727.0),
        (8.0, 873.0),
        (10.0, 951.0),
        (12.5, 958.0),
        (16.0, 896.0),
        (20.0, 782.0),
        (25.0, 647.0),
        (31.5, 519.0),
        (40.0, 411.0),
        (50.0, 324.0),
        (63.0, 256.0),
        (80.0, 202.0),
        (100.0, 160.0),
        (125.0, 127.0),
        (160.0, 101.0),
        (200.0, 79.9),
        (250.0, 63.4),
        (315.0, 50.3),
        (400.0, 39.8),
        (500.0, 31.4),
        (630.0, 24.5),
        (800.0, 18.6),
        (1000.0, 13.5),
        (1250.0, 8.94),
    ];
    agrees("Wh", &hand, 1.5);
    let back = [
        (0.5, 843.0),
        (0.63, 929.0),
        (0.8, 972.0),
        (1.0, 991.0),
        (2.0, 1012.0),
        (4.0, 1024.0),
        (6.3, 974.0),
        (8.0, 891.0),
        (10.0, 776.0),
        (12.5, 647.0),
        (16.0, 512.0),
        (31.5, 256.0),
    ];
    agrees("Wc", &back, 2.0);
    agrees(
        "We",
        &[(0.5, 862.0), (0.63, 939.0), (0.8, 941.0), (1.0, 880.0), (2.0, 512.0), (4.0, 253.0), (8.0, 125.0)],
        2.0,
    );
}

#[test]
fn wb_and_wj_keep_to_their_asymptotes() {
    // BS 6841:1987 draws Wb by straight lines, from memory: 0.4 up to 2 Hz, f/5 up to 5 Hz, 1 up to 16 Hz, 16/f above. The
    // realisable filter departs from their corners, and by under 15 % elsewhere.
    for (hz, line) in [(1.0, 0.4), (8.0, 1.0), (10.0, 1.0), (40.0, 0.4), (50.0, 0.32)] {
        assert!((magnitude("Wb", hz) / line - 1.0).abs() < 0.15, "{hz}: {}", magnitude("Wb", hz));
    }
    // The step of Wj leads from (3.75/5.32)^2 to 1.
    let low = (3.75_f64 / 5.32).powi(2);
    assert!((magnitude("Wj", 1.0) / low - 1.0).abs() < 0.05 && (magnitude("Wj", 20.0) - 1.0).abs() < 0.05);
}

#[test]
fn phases_lead_below_the_band_and_lag_above() {
    // Far below the band the two zeros at the origin give +180 degrees, far above it the poles of the low-pass and of the
    // transition together -270 degrees.
    for row in WEIGHTINGS {
        let low = row.response(row.band[0] * 1e-3);
        assert!(low.re < 0.0 && low.im.abs() < 0.02 * low.norm(), "{}: {low}", row.name);
    }
    let high = WEIGHTINGS.iter().find(|row| row.name == "Wd").expect("Wd").response(1e5);
    assert!(high.im > 0.0 && high.re.abs() < 0.02 * high.norm(), "{high}");
}

#[test]
fn the_series_at_zero_is_the_response_there() {
    // H(i w) from its own Taylor polynomial, far below the lowest corner, where the sixth power is below rounding.
    for row in WEIGHTINGS {
        let rate_hz = 50.0 * row.band[1];
        let gain = Weighed::new(row, rate_hz);
        let series = gain.series();
        let f = 1e-3 * row.band[0] / rate_hz;
        let p = Complex::new(0.0, TAU * f);
        let even = p * p * -series.s2 + p.powi(4) * series.s4 + series.s0;
        let odd = p * series.odd[0] + p.powi(3) * series.odd[1] + p.powi(5) * series.odd[2];
        let exact = gain.response(f);
        assert!((even + odd - exact).norm() < 1e-9 * exact.norm(), "{}: {} {exact}", row.name, even + odd);
    }
}
