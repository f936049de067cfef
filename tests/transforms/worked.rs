//! Worked vectors that anyone can recompute.

use endgrain::ends::Ends;

use crate::{
    EVEN_ODD_WHOLE, EVEN_WHOLE, ODD_EVEN_WHOLE, ODD_WHOLE, assert_close, forward, inverse, noise, norm, unnormalised,
};

const X: [f64; 4] = [1.0, 2.0, 3.0, 4.0];

/// SciPy 1.17.1, scipy.fft.dct types 1 to 4 without normalisation.
#[test]
fn cosine_sums_of_one_to_four() {
    for (ends, expected) in [
        (EVEN_WHOLE, [15.0, -4.0, 0.0, -1.0]),
        (Ends::EVEN, [20.0, -6.308644059798, 0.0, -0.448341529168]),
        (EVEN_ODD_WHOLE, [11.999626276085, -9.102943217749, 2.617661843511, -1.514344901847]),
        (Ends::EVEN_ODD, [10.181592984263, -9.446695610036, 5.010298174943, -4.689564857457]),
    ] {
        // The source prints 12 decimals.
        assert_close(&unnormalised(ends, &X), &expected, 1e-11, ends.transform());
    }
}

/// SciPy 1.17.1, scipy.fft.dst types 1 to 4 without normalisation.
#[test]
fn sine_sums_of_one_to_four() {
    for (ends, expected) in [
        (ODD_WHOLE, [15.388417685876, -6.881909602356, 3.632712640027, -1.624598481165]),
        (Ends::ODD, [13.065629648764, -5.656854249492, 5.411961001462, -4.0]),
        (ODD_EVEN_WHOLE, [13.137071184544, -1.619914404422, 0.723231346086, -0.519783064948]),
        (Ends::ODD_EVEN, [15.447561493152, -0.446933378671, 1.003150694407, 0.408390933585]),
    ] {
        assert_close(&unnormalised(ends, &X), &expected, 1e-11, ends.transform());
    }
}

/// Ahmed, Natarajan and Rao 1974, IEEE Trans. Computers 23, 90 (scaling); values SciPy 1.17.1, norm="ortho".
#[test]
fn orthonormal_coefficients_of_one_to_four() {
    for (ends, expected) in [
        (Ends::EVEN, [5.0, -2.230442497388, 0.0, -0.158512667781]),
        (Ends::ODD, [4.619397662556, -2.0, 1.913417161825, -1.0]),
        (Ends::EVEN_ODD, [3.599736721227, -3.339911262831, 1.771407907635, -1.658011555761]),
        (Ends::ODD_EVEN, [5.461537742302, -0.158014811399, 0.354667329284, 0.144387999256]),
    ] {
        let c = forward(ends, &X);
        assert_close(&c, &expected, 1e-11, ends.transform());
        // 1 + 4 + 9 + 16, with a few roundings a coefficient.
        assert!((c.iter().map(|v| v * v).sum::<f64>() - 30.0).abs() < 30.0 * 16.0 * f64::EPSILON);
    }
}

/// Parseval in the weighted norm, by hand: 30 less half the square of each sample on an even mirror.
#[test]
fn weighted_energy_of_one_to_four() {
    for (ends, energy) in [(EVEN_WHOLE, 21.5), (EVEN_ODD_WHOLE, 29.5), (ODD_EVEN_WHOLE, 22.0), (ODD_WHOLE, 30.0)] {
        let sum: f64 = forward(ends, &X).iter().map(|v| v * v).sum();
        assert!((sum - energy).abs() < 30.0 * 16.0 * f64::EPSILON, "{}: {sum}", ends.transform());
    }
}

/// SciPy documentation, scipy.fft.dct, Examples.
#[test]
fn documented_cosine_example() {
    // Exact but for a few roundings of the largest sum.
    assert_close(&unnormalised(EVEN_WHOLE, &[4.0, 3.0, 5.0, 10.0]), &[30.0, -8.0, 6.0, -2.0], 1e-14, "DCT-I");
}

/// FFTW manual, sections 4.3.6, 4.8.3, 4.8.4: types II and III undo each other, I and IV themselves, up to the logical
/// size 2(n-1) for DCT-I, 2(n+1) for DST-I and 2n for all others.
#[test]
fn inverse_pairs_and_logical_sizes() {
    let pairs = [
        (EVEN_WHOLE, EVEN_WHOLE, -1.0),
        (ODD_WHOLE, ODD_WHOLE, 1.0),
        (Ends::EVEN, EVEN_ODD_WHOLE, 0.0),
        (EVEN_ODD_WHOLE, Ends::EVEN, 0.0),
        (Ends::ODD, ODD_EVEN_WHOLE, 0.0),
        (ODD_EVEN_WHOLE, Ends::ODD, 0.0),
        (Ends::EVEN_ODD, Ends::EVEN_ODD, 0.0),
        (Ends::ODD_EVEN, Ends::ODD_EVEN, 0.0),
    ];
    for n in [2, 3, 4, 15, 16, 17, 100] {
        let x = noise(n, 2);
        for (first, second, more) in pairs {
            let logical = 2.0 * (n as f64 + more);
            let back: Vec<f64> = unnormalised(second, &unnormalised(first, &x)).iter().map(|v| v / logical).collect();
            assert_close(&back, &x, 1e-13, &format!("{} then {}, n = {n}", first.transform(), second.transform()));
        }
    }
}

/// Makhoul 1980, IEEE Trans. Acoustics, Speech and Signal Processing 28, 27 (equation from memory): the DCT-II of
/// 1, 2, 3, 4 is 2 Re(exp(-i pi k/2N) V_k) with V the DFT of 1, 3, 4, 2.
#[test]
fn cosine_sums_from_a_reordered_real_transform() {
    let c = forward(Ends::Periodic, &[1.0, 3.0, 4.0, 2.0]);
    // Packed constant, cosine, sine, Nyquist: V_0 = sqrt(4) c_0, V_1 = sqrt(4/2)(c_1 - i c_2), V_2 = sqrt(4) c_3.
    let v = [(2.0 * c[0], 0.0), (2_f64.sqrt() * c[1], -2_f64.sqrt() * c[2]), (2.0 * c[3], 0.0)];
    let v = [v[0], v[1], v[2], (v[1].0, -v[1].1)];
    let sums: Vec<f64> = v
        .iter()
        .enumerate()
        .map(|(k, (re, im))| {
            let angle = std::f64::consts::PI * k as f64 / 8.0;
            2.0 * (angle.cos() * re + angle.sin() * im)
        })
        .collect();
    assert_close(&sums, &unnormalised(Ends::EVEN, &X), 1e-12, "Makhoul");
    assert_close(&sums, &[20.0, -6.308644059798, 0.0, -0.448341529168], 1e-11, "SciPy 1.17.1");
}

/// Definition of the DCT-II: half a cycle more over the record for each coefficient, f_k = k/(2 N dt).
#[test]
fn one_cosine_is_one_coefficient() {
    let n = 50;
    for k in 1..n {
        let x: Vec<f64> =
            (0..n).map(|i| (std::f64::consts::PI * (k as f64) * (i as f64 + 0.5) / n as f64).cos()).collect();
        let mut expected = vec![0.0; n];
        expected[k] = (n as f64 / 2.0).sqrt();
        assert_close(&forward(Ends::EVEN, &x), &expected, 1e-12, "one half cycle a step");
        assert_eq!(Ends::EVEN.frequency(n, k), k as f64 / (2.0 * n as f64));
        assert!((norm(&inverse(Ends::EVEN, &expected)) - expected[k]).abs() < 1e-13);
    }
}
