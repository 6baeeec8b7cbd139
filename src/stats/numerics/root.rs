//! Root of a monotone function, by a bracket that is never lost.

/// The x in [`least`, `most`] where the monotone `f` crosses zero, to the last digits of x.
///
/// The bracket grows from `start` in steps that double from `step`; then Chandrupatla's method (T. R. Chandrupatla,
/// Adv. Eng. Software 28, 1997) narrows it: inverse quadratic interpolation where that is safe, else halving. Without a
/// crossing the nearer end of the range is the answer.
pub fn root(f: impl Fn(f64) -> f64, increasing: bool, start: f64, step: f64, (least, most): (f64, f64)) -> f64 {
    let f = |x: f64| if increasing { f(x) } else { -f(x) };
    let mut near = start.clamp(least, most);
    let mut f_near = f(near);
    if f_near == 0.0 {
        return near;
    }
    let upwards = f_near < 0.0;
    let mut step = if upwards { step } else { -step };
    let (far, f_far) = loop {
        let far = (near + step).clamp(least, most);
        let f_far = f(far);
        if (f_far < 0.0) != upwards {
            break (far, f_far);
        }
        if far == least || far == most {
            return far;
        }
        (near, f_near, step) = (far, f_far, 2.0 * step);
    };
    narrow(f, (far, f_far), (near, f_near))
}

fn narrow(f: impl Fn(f64) -> f64, a: (f64, f64), b: (f64, f64)) -> f64 {
    let ((mut a, mut fa), (mut b, mut fb)) = (a, b);
    let mut t = 0.5;
    loop {
        let x = a + t * (b - a);
        let fx = f(x);
        let (c, fc);
        if (fx < 0.0) == (fa < 0.0) {
            (c, fc) = (a, fa);
        } else {
            (c, fc) = (b, fb);
            (b, fb) = (a, fa);
        }
        (a, fa) = (x, fx);
        let best = if fa.abs() < fb.abs() { a } else { b };
        let tolerance = 2.0 * f64::EPSILON * best.abs() + f64::MIN_POSITIVE;
        let limit = tolerance / (b - a).abs();
        if limit >= 0.5 || fa == 0.0 || fb == 0.0 {
            return best;
        }
        let (xi, phi) = ((a - b) / (c - b), (fa - fb) / (fc - fb));
        let smooth = phi * phi < xi && (1.0 - phi) * (1.0 - phi) < 1.0 - xi;
        t = if smooth {
            fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        } else {
            0.5
        };
        t = if t.is_finite() { t.clamp(limit, 1.0 - limit) } else { 0.5 };
    }
}

#[cfg(test)]
mod tests {
    use super::root;

    #[test]
    fn finds_known_roots_from_far_away_and_stops_at_the_range() {
        let range = (-700.0, 700.0);
        let two = root(|x| x.exp() - 2.0, true, 0.0, 1e-6, range);
        assert!((two - std::f64::consts::LN_2).abs() < 4e-16, "{two}");
        let flat = root(|x| -(x - 3.0).powi(5), false, -600.0, 1.0, range);
        assert!((flat - 3.0).abs() < 1e-12, "{flat}");
        assert_eq!(root(|_| 1.0, true, 0.0, 1.0, range), -700.0);
        assert_eq!(root(|_| 1.0, false, 0.0, 1.0, range), 700.0);
        let infinite = root(|x| if x < 1.0 { f64::NEG_INFINITY } else { x - 1.5 }, true, -5.0, 0.5, range);
        assert!((infinite - 1.5).abs() < 1e-15, "{infinite}");
    }
}
