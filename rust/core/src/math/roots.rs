//! Roots and extrema of one function in a bracket. No method here leaves its bracket, and each ends after
//! a bounded number of evaluations whatever the function does.

/// Newton steps before [`newton`] falls back on bisection for good.
const NEWTON_STEPS: usize = 64;
/// Bisections that take any bracket of doubles down to neighbours.
const BISECTIONS: usize = 1100;

/// The root of `f` in [`low`, `high`] by Newton's method, safeguarded by bisection. `f` gives value and derivative.
///
/// `None` unless the values at the ends differ in sign (or one is 0, and that end is the root).
/// Otherwise as [`newton_between`].
pub fn newton(mut f: impl FnMut(f64) -> (f64, f64), low: f64, high: f64, tolerance: f64) -> Option<f64> {
    let ((at_low, _), (at_high, _)) = (f(low), f(high));
    if at_low == 0.0 {
        return Some(low);
    }
    if at_high == 0.0 {
        return Some(high);
    }
    if !(at_low < 0.0 && at_high > 0.0 || at_low > 0.0 && at_high < 0.0) {
        return None;
    }
    // Start where the line through the ends crosses: for an almost straight f that is nearly the root.
    let guess = low + (high - low) * (at_low / (at_low - at_high));
    Some(newton_between(f, low, high, at_low < 0.0, guess, tolerance))
}

/// The same for a caller who knows the signs at the ends and a guess; the ends are not evaluated.
///
/// Returns when a Newton step is at most `tolerance` (not below the spacing of doubles at the farther end)
/// and takes that last step, so that where Newton converges the error is far below it. A step that would
/// leave the bracket, or that is not at least half as long as the one before, is replaced by a bisection;
/// after 64 evaluations there is bisection only. NaN when `f` gives NaN. If the signs at the ends
/// are not as promised, the result is still within the bracket, at an end of it or at a root.
#[inline]
pub fn newton_between(
    mut f: impl FnMut(f64) -> (f64, f64),
    low: f64,
    high: f64,
    rising: bool,
    guess: f64,
    tolerance: f64,
) -> f64 {
    let (mut low, mut high) = (low, high);
    let tolerance = tolerance.max(f64::EPSILON * low.abs().max(high.abs()));
    let mut x = if guess >= low && guess <= high { guess } else { middle(low, high) };
    let mut last_step = high - low;
    for _ in 0..NEWTON_STEPS {
        let (value, rate) = f(x);
        if value == 0.0 {
            return x;
        }
        if value.is_nan() {
            return f64::NAN;
        }
        if (value < 0.0) == rising {
            low = x;
        } else {
            high = x;
        }
        let step = -value / rate;
        let next = x + step;
        if step.abs() <= tolerance {
            return next.clamp(low, high);
        }
        let next =
            if step.abs() <= 0.5 * last_step && next > low && next < high { next } else { middle(low, high) };
        last_step = (next - x).abs();
        if next == x || high - low <= tolerance {
            return next;
        }
        x = next;
    }
    for _ in 0..BISECTIONS {
        let x = middle(low, high);
        if high - low <= tolerance || x <= low || x >= high {
            break;
        }
        let value = f(x).0;
        if value == 0.0 {
            return x;
        }
        if value.is_nan() {
            return f64::NAN;
        }
        if (value < 0.0) == rising { low = x } else { high = x }
    }
    middle(low, high)
}

#[inline(always)]
fn middle(low: f64, high: f64) -> f64 {
    low + 0.5 * (high - low)
}

/// The root of `f` in [`low`, `high`] without derivatives, to within `tolerance`.
///
/// `None` unless the values at the ends differ in sign (or one is 0, and that end is the root). NaN when `f` gives NaN.
///
/// Ridders 1979, IEEE Trans. Circuits Syst. 26, 979 [from memory]: an exponential factor straightens the
/// function through the ends and the middle, and the straight line's root is the next point. The bracket at least halves
/// with every pair of evaluations, and the number of good digits about doubles. The result is one end of a bracket
/// no wider than `tolerance` (at least two spacings of doubles at the farther end), closed by a probe beyond the
/// estimate. At most 2 + 3 log₂((high − low) / tolerance), rounded up, evaluations; 8 to 16 where the function is smooth.
pub fn ridders(mut f: impl FnMut(f64) -> f64, low: f64, high: f64, tolerance: f64) -> Option<f64> {
    let (mut a, mut b) = ((low, f(low)), (high, f(high)));
    if a.1 == 0.0 {
        return Some(a.0);
    }
    if b.1 == 0.0 {
        return Some(b.0);
    }
    if !(a.1 < 0.0 && b.1 > 0.0 || a.1 > 0.0 && b.1 < 0.0) {
        return None;
    }
    let rising = a.1 < 0.0;
    let tolerance = tolerance.max(2.0 * f64::EPSILON * low.abs().max(high.abs()));
    let mut estimate = f64::INFINITY;
    while b.0 - a.0 > tolerance {
        let centre = middle(a.0, b.0);
        let at_centre = f(centre);
        // Ratios to one value, so that no product overflows; the second is negative.
        let (ratio, ratio_ends) = (at_centre / a.1, b.1 / a.1);
        let straightened = centre + (centre - a.0) * ratio / (ratio * ratio - ratio_ends).sqrt();
        let settled = (straightened - estimate).abs() <= tolerance;
        estimate = straightened;
        for turn in 0..3 {
            let x = match turn {
                0 => centre,
                1 => estimate,
                // Once the estimate stands still, a probe just beyond it closes the bracket from the other side.
                _ if !settled => break,
                _ if b.0 == estimate => estimate - 0.75 * tolerance,
                _ => estimate + 0.75 * tolerance,
            };
            if x <= a.0 || x >= b.0 {
                continue;
            }
            let value = if turn == 0 { at_centre } else { f(x) };
            if value == 0.0 {
                return Some(x);
            }
            if value.is_nan() {
                return Some(f64::NAN);
            }
            if (value < 0.0) == rising { a = (x, value) } else { b = (x, value) }
        }
    }
    Some(if a.1.abs() < b.1.abs() { a.0 } else { b.0 })
}

/// The place of the smallest value of `f` in [`low`, `high`], and that value, without derivatives: golden sections, and
/// a parabola through the three best points where it is trustworthy.
///
/// After Brent 1973, *Algorithms for Minimization without Derivatives*, chapter 5 [idea, from memory; the bookkeeping
/// is ours]. Where `f` has several minima, one of them; the ends count. At a smooth minimum values alone fix the place
/// to about 1e-8 of its scale and no better, so that `tolerance` is at least 1e-8 of the bracket; with a
/// derivative at hand use [`newton`] on it instead. At most 200 evaluations. For a maximum, negate `f`.
pub fn minimum(mut f: impl FnMut(f64) -> f64, low: f64, high: f64, tolerance: f64) -> (f64, f64) {
    // The shorter part of a golden section.
    const SECTION: f64 = 0.381_966_011_250_105_1;
    let tolerance = tolerance.max(1e-8 * (high - low));
    let (at_low, at_high) = (f(low), f(high));
    let (mut a, mut b) = (low, high);
    // The best point so far, the second, and the third.
    let mut best = (a + SECTION * (b - a), 0.0);
    best.1 = f(best.0);
    let (mut second, mut third) = (best, best);
    let (mut step, mut step_before) = (b - a, b - a);
    for _ in 0..200 {
        let centre = middle(a, b);
        if (best.0 - centre).abs() + 0.5 * (b - a) <= 2.0 * tolerance {
            break;
        }
        let target = parabola(best, second, third)
            .filter(|x| *x > a + tolerance && *x < b - tolerance && (x - best.0).abs() < 0.5 * step_before);
        step_before = step;
        let mut x = target.unwrap_or_else(|| {
            // A golden section of the longer side.
            let side = if best.0 < centre { b } else { a };
            step_before = (side - best.0).abs();
            best.0 + SECTION * (side - best.0)
        });
        if (x - best.0).abs() < tolerance {
            x = best.0 + tolerance.copysign(if x == best.0 { centre - best.0 } else { x - best.0 });
        }
        step = (x - best.0).abs();
        let new = (x, f(x));
        if new.1 <= best.1 {
            // The old best becomes the wall on its side.
            if x < best.0 {
                b = best.0
            } else {
                a = best.0
            }
            (third, second, best) = (second, best, new);
        } else {
            if x < best.0 {
                a = x
            } else {
                b = x
            }
            if new.1 <= second.1 || second.0 == best.0 {
                (third, second) = (second, new);
            } else if new.1 <= third.1 || third.0 == best.0 || third.0 == second.0 {
                third = new;
            }
        }
    }
    for end in [(low, at_low), (high, at_high)] {
        if end.1 < best.1 {
            best = end;
        }
    }
    best
}

/// The vertex of the parabola through three points, if they are apart and it opens upwards.
fn parabola(p: (f64, f64), q: (f64, f64), r: (f64, f64)) -> Option<f64> {
    let slope_q = (q.1 - p.1) / (q.0 - p.0);
    let slope_r = (r.1 - p.1) / (r.0 - p.0);
    let curvature = (slope_q - slope_r) / (q.0 - r.0);
    // Newton's form about p: p.1 + (x − p)(slope_q + curvature (x − q)); a NaN fails the comparison.
    (curvature > 0.0 && curvature.is_finite()).then(|| 0.5 * (p.0 + q.0 - slope_q / curvature))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A name, a function with its derivative, and its root in 0 to 4.
    type Case = (&'static str, fn(f64) -> (f64, f64), f64);

    /// Functions that are hard in different ways.
    fn cases() -> Vec<Case> {
        vec![
            ("line", |x| (2.0 * x - 3.0, 2.0), 1.5),
            ("falling cosine", |x| (x.cos(), -x.sin()), std::f64::consts::FRAC_PI_2),
            // x = exp(−x): the omega constant, OEIS A030178.
            ("omega", |x| (x - (-x).exp(), 1.0 + (-x).exp()), 0.567_143_290_409_783_9),
            // x³ − 2x − 5 = 0, Wallis's equation, OEIS A007493.
            ("Wallis", |x| (x * x * x - 2.0 * x - 5.0, 3.0 * x * x - 2.0), 2.094_551_481_542_326_6),
            ("flat then steep", |x| (x.powi(20) - 1.0, 20.0 * x.powi(19)), 1.0),
            ("triple", |x| ((x - 1.25).powi(3), 3.0 * (x - 1.25).powi(2)), 1.25),
            // Newton alone diverges from almost everywhere.
            ("arctangent", |x| ((40.0 * (x - 3.0)).atan(), 40.0 / (1.0 + (40.0 * (x - 3.0)).powi(2))), 3.0),
            ("step", |x| (if x < 0.7 { -1.0 } else { 1.0 }, 0.0), 0.7),
            ("wrong derivative", |x| (x - 2.2, -1.0), 2.2),
            ("cube root", |x| ((x - 1.1).cbrt(), (x - 1.1).cbrt().powi(-2) / 3.0), 1.1),
        ]
    }

    #[test]
    fn newton_finds_every_root_within_its_bracket() {
        for (name, f, root) in cases() {
            let mut evaluations = 0;
            let x = newton(
                |x| {
                    assert!((0.0..=4.0).contains(&x), "{name} leaves its bracket: {x}");
                    evaluations += 1;
                    f(x)
                },
                0.0,
                4.0,
                0.0,
            )
            .unwrap();
            assert!(
                (x - root).abs() < 2e-15 || name == "triple" && (x - root).abs() < 1e-12,
                "{name}: {x} not {root}"
            );
            assert!(evaluations < 130, "{name}: {evaluations}");
            if ["omega", "Wallis", "falling cosine"].contains(&name) {
                assert!(evaluations < 14, "{name}: {evaluations}");
            }
        }
    }

    #[test]
    fn ridders_keeps_its_promise_of_evaluations() {
        for tolerance in [1e-3, 1e-9, 1e-14] {
            for (name, f, root) in cases() {
                let mut evaluations = 0;
                let x = ridders(
                    |x| {
                        assert!((0.0..=4.0).contains(&x), "{name} leaves its bracket: {x}");
                        evaluations += 1;
                        f(x).0
                    },
                    0.0,
                    4.0,
                    tolerance,
                )
                .unwrap();
                assert!((x - root).abs() <= tolerance + 4.5e-16, "{name}: {x} not {root} to {tolerance}");
                let halvings = (4.0 / tolerance).log2().ceil() as usize;
                assert!(evaluations <= 2 + 3 * halvings, "{name}: {evaluations} against {halvings} halvings");
                if tolerance == 1e-14 && ["omega", "Wallis", "falling cosine"].contains(&name) {
                    assert!(evaluations <= 16, "{name}: {evaluations}");
                }
            }
        }
    }

    #[test]
    fn ends_signs_and_nan() {
        let line = |x: f64| (x - 1.0, 1.0);
        assert_eq!(newton(line, 1.0, 2.0, 0.0), Some(1.0));
        assert_eq!(newton(line, 0.0, 1.0, 0.0), Some(1.0));
        assert_eq!(newton(line, 2.0, 3.0, 0.0), None);
        assert_eq!(newton(|_| (f64::NAN, 1.0), 0.0, 1.0, 0.0), None);
        let hole = |x: f64| {
            if x == 0.0 {
                -1.0
            } else if x == 1.0 {
                1.0
            } else {
                f64::NAN
            }
        };
        assert!(newton(|x| (hole(x), 1.0), 0.0, 1.0, 0.0).unwrap().is_nan());
        assert!(ridders(hole, 0.0, 1.0, 0.0).unwrap().is_nan());
        assert_eq!(ridders(|x| x - 1.0, 1.0, 2.0, 0.0), Some(1.0));
        assert_eq!(ridders(|x| x - 1.0, 0.0, 1.0, 0.0), Some(1.0));
        assert_eq!(ridders(|x| x - 1.0, 2.0, 3.0, 0.0), None);
        // A bracket whose signs are not as promised still gives something within it.
        assert_eq!(newton_between(line, 2.0, 3.0, true, 2.5, 0.0), 2.0);
    }

    #[test]
    fn a_tiny_and_a_huge_bracket_end() {
        for (low, high) in [(-1e-300, 2e-300), (-1e300, 2e300), (0.0, 5e-324)] {
            let middle = 0.25 * (low + high);
            let x = newton(|x| (x - middle, 0.0), low, high, 0.0);
            assert!(x.is_none_or(|x| (low..=high).contains(&x)));
        }
    }

    #[test]
    fn minima_are_found_within_the_bracket() {
        type Case = (&'static str, fn(f64) -> f64, f64);
        let cases: [Case; 6] = [
            ("parabola", |x| (x - 1.3) * (x - 1.3), 1.3),
            ("cosine", f64::cos, std::f64::consts::PI),
            // x^x has its minimum at 1/e.
            ("x to the x", |x: f64| if x > 0.0 { x.powf(x) } else { 1.0 }, 1.0 / std::f64::consts::E),
            ("corner", |x| (x - 2.7).abs(), 2.7),
            ("low end", |x| x, 0.0),
            ("high end", |x| -x, 4.0),
        ];
        for (name, f, place) in cases {
            let mut evaluations = 0;
            let (x, value) = minimum(
                |x| {
                    assert!((0.0..=4.0).contains(&x));
                    evaluations += 1;
                    f(x)
                },
                0.0,
                4.0,
                1e-7,
            );
            assert!((x - place).abs() < 2e-7, "{name}: {x} not {place}");
            assert_eq!(value, f(x));
            assert!(evaluations < 60, "{name}: {evaluations}");
        }
        let constant = minimum(|_| 3.0, 0.0, 4.0, 1e-7);
        assert!(constant.1 == 3.0 && (0.0..=4.0).contains(&constant.0));
    }
}
