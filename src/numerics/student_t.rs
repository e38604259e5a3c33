//! Student's t and the chi-squared distribution.

/// Quantile of Student's t distribution for a probability in (0, 1), found by bisection of the distribution function
/// (accurate to about 1e-12). `degrees` is above 0.
pub fn student_t_quantile(probability: f64, degrees: f64) -> f64 {
    if (probability - 0.5).abs() < 1e-16 {
        return 0.0;
    }
    if probability < 0.5 {
        return -student_t_quantile(1.0 - probability, degrees);
    }
    let mut high = 2.0;
    while student_t_cumulative(high, degrees) < probability && high < 1e12 {
        high *= 2.0;
    }
    let mut low = 0.0;
    for _ in 0..100 {
        let middle = 0.5 * (low + high);
        if student_t_cumulative(middle, degrees) < probability {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}

/// Distribution function of Student's t: `1 - I_x(v/2, 1/2) / 2` with `x = v / (v + t^2)` for t >= 0 (Abramowitz and
/// Stegun 1964, 26.7.1).
pub fn student_t_cumulative(t: f64, degrees: f64) -> f64 {
    let tail = 0.5 * incomplete_beta(0.5 * degrees, 0.5, degrees / (degrees + t * t));
    if t >= 0.0 { 1.0 - tail } else { tail }
}

/// Upper tail of the chi-squared distribution, from the regularised incomplete gamma function.
pub fn chi_squared_tail(value: f64, degrees: f64) -> f64 {
    if value <= 0.0 {
        return 1.0;
    }
    let (a, x) = (0.5 * degrees, 0.5 * value);
    let front = libm::exp(a * libm::log(x) - x - libm::lgamma(a));
    if x < a + 1.0 {
        // Series of the lower function (Abramowitz and Stegun 1964, 6.5.29).
        let mut term = 1.0 / a;
        let mut sum = term;
        for index in 1..1000 {
            term *= x / (a + f64::from(index));
            sum += term;
            if term < sum * 1e-16 {
                break;
            }
        }
        (1.0 - front * sum).clamp(0.0, 1.0)
    } else {
        // Continued fraction of the upper function (Abramowitz and Stegun 1964, 6.5.31), by Lentz's method.
        let mut b = x + 1.0 - a;
        let mut c = 1e300;
        let mut d = 1.0 / b;
        let mut product = d;
        for index in 1..1000 {
            let an = -f64::from(index) * (f64::from(index) - a);
            b += 2.0;
            d = 1.0 / guard(an * d + b);
            c = guard(b + an / c);
            product *= d * c;
            if (d * c - 1.0).abs() < 1e-16 {
                break;
            }
        }
        (front * product).clamp(0.0, 1.0)
    }
}

/// Regularised incomplete beta function (Abramowitz and Stegun 1964, 26.5.8), continued fraction by Lentz's method.
fn incomplete_beta(a: f64, b: f64, x: f64) -> f64 {
    if x <= 0.0 {
        return 0.0;
    }
    if x >= 1.0 {
        return 1.0;
    }
    if x > (a + 1.0) / (a + b + 2.0) {
        return 1.0 - incomplete_beta(b, a, 1.0 - x);
    }
    let front =
        libm::exp(libm::lgamma(a + b) - libm::lgamma(a) - libm::lgamma(b) + a * libm::log(x) + b * libm::log(1.0 - x));
    let mut c = 1.0;
    let mut d = 1.0 / guard(1.0 - (a + b) * x / (a + 1.0));
    let mut product = d;
    for index in 1..1000 {
        let m = f64::from(index);
        let even = m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m));
        d = 1.0 / guard(1.0 + even * d);
        c = guard(1.0 + even / c);
        product *= d * c;
        let odd = -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0));
        d = 1.0 / guard(1.0 + odd * d);
        c = guard(1.0 + odd / c);
        product *= d * c;
        if (d * c - 1.0).abs() < 1e-16 {
            break;
        }
    }
    front * product / a
}

fn guard(value: f64) -> f64 {
    if value.abs() < 1e-300 { 1e-300 } else { value }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantiles_agree_with_tables() {
        // scipy 1.17.1, scipy.stats.t.ppf.
        for (probability, degrees, expected) in [
            (0.975, 2.0, 4.302_652_729_749_462),
            (0.975, 10.0, 2.228_138_851_986_274),
            (0.995, 37.3, 2.714_230_645_090_715),
            (0.975, 1000.0, 1.962_339_080_826_408_3),
        ] {
            let found = student_t_quantile(probability, degrees);
            assert!((found - expected).abs() < 1e-9, "{found} {expected}");
        }
        assert!((student_t_quantile(0.025, 2.0) + 4.302_652_729_749_462).abs() < 1e-9);
    }

    #[test]
    fn chi_squared_tail_agrees_with_closed_forms() {
        // Two degrees of freedom: exp(-x/2).
        for value in [0.1, 1.0, 3.0, 12.0] {
            assert!((chi_squared_tail(value, 2.0) - libm::exp(-0.5 * value)).abs() < 1e-13);
        }
        // Four: (1 + x/2) exp(-x/2).
        assert!((chi_squared_tail(5.0, 4.0) - 3.5 * libm::exp(-2.5)).abs() < 1e-13);
    }
}
