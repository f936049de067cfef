//! The smallest Fourier transforms, written out, for many signals side by side.

use super::lanes::{LANES, POINT};
use pulp::Simd;
use std::array::from_fn;

/// One complex number of each of several signals: real parts, imaginary parts.
pub type Point<S> = [<S as Simd>::f64s; 2];

/// a + b.
#[inline(always)]
pub fn add<S: Simd>(simd: S, a: Point<S>, b: Point<S>) -> Point<S> {
    [simd.add_f64s(a[0], b[0]), simd.add_f64s(a[1], b[1])]
}

/// a - b.
#[inline(always)]
pub fn sub<S: Simd>(simd: S, a: Point<S>, b: Point<S>) -> Point<S> {
    [simd.sub_f64s(a[0], b[0]), simd.sub_f64s(a[1], b[1])]
}

/// -i (a - b).
#[inline(always)]
fn sub_turned<S: Simd>(simd: S, a: Point<S>, b: Point<S>) -> Point<S> {
    [simd.sub_f64s(a[1], b[1]), simd.sub_f64s(b[0], a[0])]
}

/// a w.
#[inline(always)]
pub fn mul<S: Simd>(simd: S, a: Point<S>, w: Point<S>) -> Point<S> {
    [
        simd.negate_mul_add_e_f64s(a[1], w[1], simd.mul_f64s(a[0], w[0])),
        simd.mul_add_e_f64s(a[0], w[1], simd.mul_f64s(a[1], w[0])),
    ]
}

/// a times the conjugate of w.
#[inline(always)]
pub fn mul_conjugate<S: Simd>(simd: S, a: Point<S>, w: Point<S>) -> Point<S> {
    [
        simd.mul_add_e_f64s(a[1], w[1], simd.mul_f64s(a[0], w[0])),
        simd.negate_mul_add_e_f64s(a[0], w[1], simd.mul_f64s(a[1], w[0])),
    ]
}

/// Vector `h` of the point of all lanes.
#[inline(always)]
pub fn get<S: Simd>(_: S, point: &[f64; POINT], h: usize) -> Point<S> {
    let (vectors, _) = S::as_simd_f64s(point);
    [vectors[h], vectors[h + LANES / S::F64_LANES]]
}

/// Sets vector `h` of the point of all lanes.
#[inline(always)]
pub fn put<S: Simd>(_: S, point: &mut [f64; POINT], h: usize, value: Point<S>) {
    let (vectors, _) = S::as_mut_simd_f64s(point);
    [vectors[h], vectors[h + LANES / S::F64_LANES]] = value;
}

/// The same number for every signal.
#[inline(always)]
pub fn splat<S: Simd>(simd: S, w: [f64; 2]) -> Point<S> {
    [simd.splat_f64s(w[0]), simd.splat_f64s(w[1])]
}

/// Transform of two points.
#[inline(always)]
pub fn two<S: Simd>(simd: S, x: [Point<S>; 2]) -> [Point<S>; 2] {
    [add(simd, x[0], x[1]), sub(simd, x[0], x[1])]
}

/// Transform of four points.
#[inline(always)]
pub fn four<S: Simd>(simd: S, x: [Point<S>; 4]) -> [Point<S>; 4] {
    let (a, b) = (add(simd, x[0], x[2]), sub(simd, x[0], x[2]));
    let (c, d) = (add(simd, x[1], x[3]), sub_turned(simd, x[1], x[3]));
    [add(simd, a, c), add(simd, b, d), sub(simd, a, c), sub(simd, b, d)]
}

/// Transform of eight points: two of four, joined.
#[inline(always)]
pub fn eight<S: Simd>(simd: S, x: [Point<S>; 8]) -> [Point<S>; 8] {
    let even = four(simd, [x[0], x[2], x[4], x[6]]);
    let odd = four(simd, [x[1], x[3], x[5], x[7]]);
    let half = simd.splat_f64s(std::f64::consts::FRAC_1_SQRT_2);
    // (1 - i)/sqrt 2, -i and -(1 + i)/sqrt 2 by sums and one factor.
    let one = [
        simd.mul_f64s(half, simd.add_f64s(odd[1][0], odd[1][1])),
        simd.mul_f64s(half, simd.sub_f64s(odd[1][1], odd[1][0])),
    ];
    let three = [
        simd.mul_f64s(half, simd.sub_f64s(odd[3][1], odd[3][0])),
        simd.mul_f64s(half, simd.add_f64s(odd[3][0], odd[3][1])),
    ];
    let (b2, b6) = (
        [simd.add_f64s(even[2][0], odd[2][1]), simd.sub_f64s(even[2][1], odd[2][0])],
        [simd.sub_f64s(even[2][0], odd[2][1]), simd.add_f64s(even[2][1], odd[2][0])],
    );
    let (b3, b7) = (
        [simd.add_f64s(even[3][0], three[0]), simd.sub_f64s(even[3][1], three[1])],
        [simd.sub_f64s(even[3][0], three[0]), simd.add_f64s(even[3][1], three[1])],
    );
    [
        add(simd, even[0], odd[0]),
        add(simd, even[1], one),
        b2,
        b3,
        sub(simd, even[0], odd[0]),
        sub(simd, even[1], one),
        b6,
        b7,
    ]
}

/// Transform of an odd number of points by its symmetric and antisymmetric halves; `circle` holds (cosine, sine)
/// of k/R of a turn.
#[inline(always)]
pub fn odd<S: Simd, const R: usize>(simd: S, x: [Point<S>; R], circle: &[[f64; 2]; R]) -> [Point<S>; R] {
    let half = R / 2;
    let sums: [Point<S>; R] = from_fn(|k| if k == 0 { x[0] } else { add(simd, x[k], x[R - k]) });
    let gaps: [Point<S>; R] = from_fn(|k| if k == 0 { x[0] } else { sub(simd, x[k], x[R - k]) });
    let mut y = x;
    for k in 1..=half {
        y[0] = add(simd, y[0], sums[k]);
    }
    for i in 1..=half {
        let mut a = x[0];
        let mut b = [simd.splat_f64s(0.0); 2];
        for k in 1..=half {
            let [c, s] = circle[(i * k) % R];
            let (c, s) = (simd.splat_f64s(c), simd.splat_f64s(s));
            a = [simd.mul_add_e_f64s(c, sums[k][0], a[0]), simd.mul_add_e_f64s(c, sums[k][1], a[1])];
            b = if k == 1 {
                [simd.mul_f64s(s, gaps[k][0]), simd.mul_f64s(s, gaps[k][1])]
            } else {
                [simd.mul_add_e_f64s(s, gaps[k][0], b[0]), simd.mul_add_e_f64s(s, gaps[k][1], b[1])]
            };
        }
        y[i] = [simd.add_f64s(a[0], b[1]), simd.sub_f64s(a[1], b[0])];
        y[R - i] = [simd.sub_f64s(a[0], b[1]), simd.add_f64s(a[1], b[0])];
    }
    y
}

/// (cosine, sine) of k/R of a turn.
pub fn circle<const R: usize>() -> [[f64; 2]; R] {
    from_fn(|k| {
        let [c, s] = super::roots::root(k as u64, R as u64);
        [c, -s]
    })
}
