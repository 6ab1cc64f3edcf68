//! A root of a function of one variable between two points of opposite sign.

const STEPS_MAX: usize = 200;

/// The root of `f` in `[a, b]`, where `f(a)` and `f(b)` differ in sign, to the resolution of f64.
///
/// Brent, *Algorithms for Minimization without Derivatives*, 1973, ch. 4: inverse interpolation where it
/// helps, bisection otherwise. Where `f` jumps over zero, the place of the jump.
pub(crate) fn between(f: impl Fn(f64) -> f64, a: f64, b: f64) -> f64 {
    let (mut a, mut b) = (a, b);
    let (mut fa, mut fb) = (f(a), f(b));
    let (mut c, mut fc) = (a, fa);
    let (mut step, mut last) = (b - a, b - a);
    for _ in 0..STEPS_MAX {
        if (fb > 0.0) == (fc > 0.0) {
            (c, fc) = (a, fa);
            step = b - a;
            last = step;
        }
        if fc.abs() < fb.abs() {
            (a, b, c) = (b, c, b);
            (fa, fb, fc) = (fb, fc, fb);
        }
        let resolution = f64::EPSILON * b.abs() + f64::MIN_POSITIVE;
        let half = 0.5 * (c - b);
        if half.abs() <= resolution || fb == 0.0 {
            break;
        }
        if last.abs() >= resolution && fa.abs() > fb.abs() {
            let s = fb / fa;
            let (mut p, mut q) = if a == c {
                (2.0 * half * s, 1.0 - s)
            } else {
                let (q, r) = (fa / fc, fb / fc);
                (
                    s * (2.0 * half * q * (q - r) - (b - a) * (r - 1.0)),
                    (q - 1.0) * (r - 1.0) * (s - 1.0),
                )
            };
            if p > 0.0 {
                q = -q;
            } else {
                p = -p;
            }
            if 2.0 * p < (3.0 * half * q - (resolution * q).abs()).min((last * q).abs()) {
                last = step;
                step = p / q;
            } else {
                step = half;
                last = half;
            }
        } else {
            step = half;
            last = half;
        }
        (a, fa) = (b, fb);
        b += if step.abs() > resolution {
            step
        } else {
            resolution.copysign(half)
        };
        fb = f(b);
    }
    b
}

#[cfg(test)]
mod tests {
    use super::between;

    #[test]
    fn square_root_of_two_and_a_jump() {
        assert!((between(|x| x * x - 2.0, 0.0, 2.0) - 2f64.sqrt()).abs() < 4e-16);
        assert!((between(|x| if x < 0.3 { -1.0 } else { 2.0 }, 0.0, 1.0) - 0.3).abs() < 1e-15);
    }
}
