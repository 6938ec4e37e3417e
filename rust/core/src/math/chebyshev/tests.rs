use super::*;

/// A linear congruential generator (Knuth's MMIX constants), uniform in 0 to 1.
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn within(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.next()
    }
}

/// The series with these roots in u, times `scale`: multiplied up factor by factor,
/// (u − r) Σ c_k T_k with u T_k = (T_(k+1) + T_|k−1|) / 2.
fn with_roots<const N: usize>(roots: &[f64], scale: f64) -> Chebyshev<N> {
    let mut c = [0.0; N];
    c[0] = scale;
    for (degree, &r) in roots.iter().enumerate() {
        let mut product = [0.0; N];
        for k in 0..=degree {
            product[k + 1] += 0.5 * c[k];
            product[k.abs_diff(1)] += 0.5 * c[k];
            product[k] -= r * c[k];
        }
        c = product;
    }
    Chebyshev::new(-1.0, 1.0, c)
}

#[test]
fn clenshaw_is_as_exact_as_stated() {
    // Against T_k(cos θ) = cos kθ, summed from the smallest term; multiples of π/60 keep kθ exact enough.
    let mut random = Random(8);
    for degree in [0, 1, 2, 5, 12, 30] {
        for i in 0..=60 {
            let c: Vec<f64> = (0..=degree).map(|k| random.within(-1.0, 1.0) / f64::from(k + 1)).collect();
            let cosine = |k: usize| (std::f64::consts::PI * (k * i % 120) as f64 / 60.0).cos();
            let expected: f64 = c.iter().enumerate().rev().map(|(k, c)| c * cosine(k)).sum();
            let bound: f64 = c.iter().enumerate().map(|(k, c)| 2e-16 * (k + 1) as f64 * c.abs()).sum();
            // The argument is rounded as well, which the slope carries into the value.
            let (value, rate) = clenshaw_and_rate(&c, cosine(1));
            assert_eq!(value, clenshaw(&c, cosine(1)));
            let error = (value - expected).abs();
            assert!(
                error <= bound + 1.2e-16 * rate.abs(),
                "degree {degree}, {i}: {error:e} against {bound:e}"
            );
        }
    }
}

#[test]
fn fits_reach_rounding_and_rates_follow() {
    // Against the function itself and its analytic derivative.
    let series = Chebyshev::<24>::fit(2.0, 5.0, |x| (1.3 * x).sin() + 0.1 * x * x);
    for i in 0..=1000 {
        let x = 2.0 + 3.0 * f64::from(i) / 1000.0;
        let (value, rate) = series.value_and_rate(x);
        assert_eq!(value, series.value(x));
        assert!((value - ((1.3 * x).sin() + 0.1 * x * x)).abs() < 4e-15);
        assert!((rate - (1.3 * (1.3 * x).cos() + 0.2 * x)).abs() < 1e-13, "{:e}", rate);
        assert!((series.derivative().value(x) - rate).abs() < 1e-13);
    }
}

#[test]
fn the_tail_covers_the_error() {
    for (rate, shift) in [(0.7, 0.0), (1.0, 0.3), (2.0, 1.0), (3.0, 2.0)] {
        let f = |x: f64| (rate * x + shift).cos();
        let series = Chebyshev::<10>::fit(-1.0, 1.0, f);
        let worst = (0..=2000)
            .map(|i| f64::from(i) / 1000.0 - 1.0)
            .fold(0.0_f64, |w, x| w.max((series.value(x) - f(x)).abs()));
        assert!(
            worst < series.tail() + 1e-15 && worst > 1e-3 * series.tail(),
            "{worst:e} against {:e}",
            series.tail()
        );
    }
}

#[test]
fn products_and_combinations_are_those_of_the_values() {
    let vector = ChebyshevVector::<16, 3>::fit(0.0, 2.0, |x| [x.sin(), x.cos(), (0.5 * x).exp()]);
    let constant = [0.3, -0.8, 1.7];
    let scalar = vector.dot(constant).plus(-0.25);
    let mixed = scalar.combine(2.0, &vector.component(1), -3.0);
    for i in 0..=100 {
        let x = f64::from(i) / 50.0;
        let (v, r) = vector.value_and_rate(x);
        let expected = 0.3 * x.sin() - 0.8 * x.cos() + 1.7 * (0.5 * x).exp() - 0.25;
        assert!((scalar.value(x) - expected).abs() < 1e-14);
        assert!((mixed.value(x) - (2.0 * expected - 3.0 * x.cos())).abs() < 2e-14);
        assert!((v[0] - x.sin()).abs() < 2e-15 && (r[0] - x.cos()).abs() < 1e-13);
    }
    assert!(vector.tail().iter().all(|t| *t < 1e-13));
}

#[test]
fn bounds_hold_and_the_hull_is_tighter() {
    let mut random = Random(11);
    let mut tighter = 0;
    for _ in 0..500 {
        let c: [f64; 12] = std::array::from_fn(|k| random.within(-1.0, 1.0) * 0.4_f64.powi(k as i32));
        let series = Chebyshev::new(-3.0, 7.0, c);
        let (loose, tight) = (series.loose_bounds(), series.bounds());
        tighter += usize::from(tight.1 - tight.0 < 0.95 * (loose.1 - loose.0));
        for i in 0..=400 {
            let value = series.value(-3.0 + f64::from(i) / 40.0);
            assert!(value >= tight.0 - 1e-15 && value <= tight.1 + 1e-15);
            assert!(loose.0 <= tight.0 && tight.1 <= loose.1);
        }
    }
    assert!(tighter > 250, "{tighter} of 500");
}

#[test]
fn every_root_of_random_polynomials_is_found() {
    let mut random = Random(1);
    for trial in 0..3000 {
        // Up to 11 roots inside and outside of the interval.
        let mut roots: Vec<f64> = (0..trial % 12).map(|_| random.within(-1.5, 1.5)).collect();
        roots.sort_by(f64::total_cmp);
        if roots.windows(2).any(|p| p[1] - p[0] < 1e-3) || roots.iter().any(|r| (r.abs() - 1.0).abs() < 1e-6)
        {
            continue;
        }
        let scale = if trial % 2 == 0 { 1.0 } else { -1.0 };
        let found = with_roots::<14>(&roots, scale).crossings();
        let inside: Vec<f64> = roots.iter().copied().filter(|r| r.abs() < 1.0).collect();
        assert_eq!(found.len(), inside.len(), "trial {trial}: {roots:?}");
        for (crossing, root) in found.iter().zip(&inside) {
            let above = roots.iter().filter(|r| *r > root).count();
            assert_eq!(crossing.rising, (above % 2 == 0) == (scale > 0.0));
            assert!((crossing.at - root).abs() < 1e-6);
        }
    }
}

#[test]
fn roots_of_exactly_known_polynomials_are_exact_to_rounding() {
    // Up to eight roots in 32nds: the coefficients are exact in 53 bits, so that all error is the solver's.
    let mut random = Random(4);
    let (mut worst, mut at_start, mut at_stop) = (0.0_f64, 0, 0);
    for trial in 0..5000 {
        let mut roots: Vec<f64> = (0..trial % 9).map(|_| random.within(-40.0, 40.0).round() / 32.0).collect();
        roots.sort_by(f64::total_cmp);
        roots.dedup();
        let series = with_roots::<9>(&roots, 1.0);
        let inside: Vec<f64> = roots.iter().copied().filter(|r| (-1.0..1.0).contains(r)).collect();
        at_start += usize::from(inside.first() == Some(&-1.0));
        at_stop += usize::from(roots.contains(&1.0));
        let found = series.crossings();
        assert_eq!(found.len(), inside.len(), "trial {trial}: {roots:?} {:?}", &*found);
        let size = series.coefficients().iter().map(|c| c.abs()).sum::<f64>();
        for (crossing, root) in found.iter().zip(&inside) {
            let slope = series.value_and_rate(*root).1.abs();
            worst = worst.max((crossing.at - root).abs() / (f64::EPSILON * (1.0 + size / slope)));
        }
    }
    assert!(at_start > 100 && at_stop > 100);
    assert!(worst < 4.0, "{worst} roundings");
}

#[test]
fn close_pairs_are_told_apart() {
    let mut random = Random(2);
    let mut checked = 0;
    for trial in 0..2000 {
        // A pair at 1e-3 down to 1e-6 of the interval apart, among other roots.
        let gap = 2.0 * 10f64.powf(-3.0 - f64::from(trial % 4));
        let at = random.within(-0.99, 0.99);
        let mut roots = vec![at - 0.5 * gap, at + 0.5 * gap];
        for _ in 0..trial % 5 {
            roots.push(random.within(-1.3, 1.3));
        }
        if roots[2..].iter().any(|r| (r - at).abs() < 0.05 || (r.abs() - 1.0).abs() < 1e-3) {
            continue;
        }
        let series = with_roots::<12>(&roots, 1.0);
        // How far the polynomial passes zero between the two, against what is promised to be seen.
        let depth = series.value(at).abs();
        let size = series.bernstein().iter().fold(0.0_f64, |m, b| m.max(b.abs()));
        if depth < 2e-15 * size {
            assert!(gap < 1.9e-5, "a pair at 1e-5 of the interval stands clear of rounding");
            continue;
        }
        let found = series.crossings();
        assert_eq!(found.len(), roots.iter().filter(|r| r.abs() < 1.0).count(), "gap {gap:e}: {roots:?}");
        for root in &roots[..2] {
            let nearest = found.iter().map(|c| (c.at - root).abs()).fold(9.0, f64::min);
            // The slope at either is 4 depth / gap; the test's own coefficients are rounded too.
            assert!(nearest < 1e-15 * size * gap / depth, "gap {gap:e}: {nearest:e}");
        }
        checked += 1;
    }
    assert!(checked > 1000);
}

#[test]
fn one_second_out_of_a_day() {
    // A smooth bump that stands above its threshold for one second of 86,400.
    let half = 0.5_f64 / 86400.0;
    let bump = |t: f64| (6.0 * (t - 0.37)).cos() - (6.0 * half).cos();
    let series = Chebyshev::<20>::fit(0.0, 1.0, bump);
    let found = series.crossings();
    // cos crosses upwards and downwards at 0.37 ∓ half, and never else within the day (the next is at 1.417).
    assert_eq!(found.len(), 2);
    assert!(found[0].rising && !found[1].rising);
    // A rounding of the fit of 2e-15 over the slope there: 1e-11 of a day is a microsecond.
    let rounding = 2e-15 / (36.0 * half);
    eprintln!("{:e} {:e} {rounding:e}", found[0].at - (0.37 - half), found[1].at - (0.37 + half));
    assert!((found[0].at - (0.37 - half)).abs() < rounding && (found[1].at - (0.37 + half)).abs() < rounding);
}

#[test]
fn ends_are_half_open() {
    let crossings = |c: [f64; 4]| Chebyshev::new(10.0, 20.0, c).crossings().to_vec();
    // u + 1 crosses at the start, u − 1 at the stop, (u + 1)² = 3/2 + 2u + T₂/2 touches the start.
    assert_eq!(crossings([1.0, 1.0, 0.0, 0.0]), [Crossing { at: 10.0, rising: true }]);
    assert_eq!(crossings([-1.0, -1.0, 0.0, 0.0]), [Crossing { at: 10.0, rising: false }]);
    assert_eq!(crossings([-1.0, 1.0, 0.0, 0.0]), []);
    assert_eq!(crossings([1.5, 2.0, 0.5, 0.0]), []);
    // (u + 1)³ = 5/2 + 15/4 u + 3/2 T₂ + 1/4 T₃ crosses the start; u² − 1 = T₂/2 − 1/2 falls through it.
    assert_eq!(crossings([2.5, 3.75, 1.5, 0.25]), [Crossing { at: 10.0, rising: true }]);
    assert_eq!(crossings([-0.5, 0.0, 0.5, 0.0]), [Crossing { at: 10.0, rising: false }]);
    // A root at the middle, where the first division falls, is found once.
    assert_eq!(crossings([0.0, 1.0, 0.0, 0.0]), [Crossing { at: 15.0, rising: true }]);
    // u² = (1 + T₂) / 2 touches there and u³ = (3u + T₃) / 4 crosses.
    assert_eq!(crossings([0.5, 0.0, 0.5, 0.0]), []);
    let cube = crossings([0.0, 0.75, 0.0, 0.25]);
    assert!(cube.len() == 1 && cube[0].rising && (cube[0].at - 15.0).abs() < 1e-4);
    // Spans that are joined lose and double nothing.
    let line = |a, b| Chebyshev::<2>::fit(a, b, |x| x - 3.0).crossings().len();
    assert_eq!(line(2.0, 3.0) + line(3.0, 4.0), 1);
}

#[test]
fn joined_spans_lose_and_double_nothing() {
    // Two unequal spans, each with its own fit; roots on and about the joint, where the fits disagree by rounding.
    let mut random = Random(5);
    let mut wrong = 0;
    for trial in 0..2000 {
        let root = 0.5 + [0.0, 1e-17, 1e-16, 1e-15, 1e-13][trial % 5] * random.within(-1.0, 1.0);
        let sign = if trial % 2 == 0 { 1.0 } else { -1.0 };
        let f = |t: f64| sign * ((6.3 * (t - root)).sin() + 0.3 * (1.7 * (t - root)).sin());
        let (a, b) = (Chebyshev::<18>::fit(0.2, 0.5, f), Chebyshev::<18>::fit(0.5, 0.9, f));
        wrong += usize::from(a.crossings().len() + b.crossings().len() != 1);
        let positive = |t: f64| f(t) > 0.0;
        let before = a.crossings_between(positive(0.2), positive(0.5));
        let after = b.crossings_between(positive(0.5), positive(0.9));
        let both: Vec<_> = before.iter().chain(after.iter()).collect();
        assert_eq!(both.len(), 1, "root {root:e}: {both:?}");
        assert!((both[0].at - 0.5).abs() < 1e-12 && both[0].rising == (sign > 0.0));
        assert!(before.iter().all(|c| c.at < 0.5) && after.iter().all(|c| c.at >= 0.5));
    }
    // Without the signs some are not found exactly once: that is why they are asked for.
    assert!(wrong > 50, "{wrong} of 2000");
}

#[test]
fn signs_that_agree_change_nothing() {
    let wave = Chebyshev::<24>::fit(0.0, 1.0, |t| (9.0 * t + 0.3).sin());
    assert_eq!(*wave.crossings_between(true, (9.3_f64).sin() > 0.0), *wave.crossings());
    let constant = Chebyshev::new(0.0, 1.0, [1.0, 0.0, 0.0]);
    assert!(constant.crossings_between(true, true).is_empty());
    // Of one sign throughout, though its Bernstein coefficients are not: the Sun of a polar night.
    for sign in [1.0, -1.0] {
        let polar = Chebyshev::<24>::fit(0.0, 1.0, |t| sign * (0.3 + 0.29 * (6.3 * t).cos()));
        assert!(polar.bernstein().iter().any(|&b| b * sign < 0.0));
        assert!(polar.crossings_between(sign > 0.0, sign > 0.0).is_empty());
    }
    // A sign that is plainly contradicted still alternates.
    let forced = constant.crossings_between(false, false);
    assert_eq!(forced.len(), 2);
    assert!(forced[0].at == 0.0 && forced[0].rising && forced[1].at < 1.0 && !forced[1].rising);
}

#[test]
fn tangents_and_nothing() {
    let mut random = Random(3);
    for _ in 0..300 {
        // A double root, in a place where rounding leaves it a double root, a pair or none.
        let at = random.within(-0.9, 0.9);
        let found = with_roots::<8>(&[at, at, 1.4], 1.0).crossings();
        assert!(found.len().is_multiple_of(2) && found.iter().all(|c| (c.at - at).abs() < 1e-7));
        // A triple one: one crossing, or three within rounding; always alternating.
        let found = with_roots::<8>(&[at, at, at], 1.0).crossings();
        assert!(!found.len().is_multiple_of(2) && found.iter().all(|c| (c.at - at).abs() < 1e-4));
        assert!(found.iter().enumerate().all(|(i, c)| c.rising == (i % 2 == 0)));
    }
    assert!(Chebyshev::new(0.0, 1.0, [0.0; 9]).crossings().is_empty());
    assert!(Chebyshev::new(0.0, 1.0, [f64::NAN; 9]).crossings().is_empty());
    assert!(Chebyshev::new(0.0, 1.0, [2.0]).crossings().is_empty());
    assert_eq!(Chebyshev::new(0.0, 1.0, [0.0, 1.0]).first_crossing().unwrap().at, 0.5);
}

#[test]
fn a_near_miss_stays_a_miss_between_known_signs() {
    // Negative throughout, with positive coefficients in the Bernstein basis.
    let series = Chebyshev::<9>::fit(0.0, 1.0, |x| -1e-6 - (x - 0.5).powi(2));
    assert!(series.bernstein().iter().any(|&b| b > 0.0));
    assert!(series.crossings_between(false, false).is_empty());
}
