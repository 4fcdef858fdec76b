//! How sure: a value and the interval that holds the truth at a stated level.

use crate::{Error, Result};
use statrs::distribution::{ChiSquared, Continuous, ContinuousCDF, Normal};

/// A value with its confidence interval.
///
/// `lower ≤ value ≤ upper`, all in the unit of `value`; `level` is the confidence level in `(0, 1)`.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Estimate {
    /// The estimate itself.
    pub value: f64,
    /// Lower end of the interval.
    pub lower: f64,
    /// Upper end of the interval.
    pub upper: f64,
    /// Confidence level, in `(0, 1)`.
    pub level: f64,
}

impl Estimate {
    /// Rate of a Poisson process, in events a second, from `count` events seen in `seconds`.
    ///
    /// ```text
    /// rate = n/T,   interval = [ χ²_{α/2}(2n), χ²_{1−α/2}(2n + 2) ] / (2T),   α = 1 − level
    /// ```
    ///
    /// The interval is exact (it holds the truth at least as often as `level`). With a dead time d after
    /// each event counts vary less than Poisson counts do, and for the rate of observed events the
    /// interval is then too wide, never too narrow. The rate r of the process underneath is another
    /// quantity, r/(1 − r·d), which this interval does not hold.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `seconds` is finite and above zero and `0 < level < 1`.
    ///
    /// # Source
    /// Garwood 1936, Biometrika 28:437–442.
    ///
    /// # Example
    /// ```
    /// let rate = fixational::Estimate::poisson_rate(90, 60.0, 0.95)?;
    /// assert_eq!(rate.value, 1.5);
    /// assert!((rate.lower - 1.206177).abs() < 5e-7 && (rate.upper - 1.843755).abs() < 5e-7);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn poisson_rate(count: usize, seconds: f64, level: f64) -> Result<Self> {
        crate::input::positive("seconds", seconds)?;
        check_level(level)?;
        if !(count as f64 / seconds).is_finite() {
            let allowed = "so long that the rate is a number";
            return Err(Error::Parameter { name: "seconds", value: seconds, allowed });
        }
        let tail = (1.0 - level) / 2.0;
        let n = count as f64;
        let lower = if count == 0 { 0.0 } else { chi_squared_quantile(2.0 * n, tail) };
        let upper = chi_squared_quantile(2.0 * n + 2.0, 1.0 - tail);
        Ok(Self {
            value: n / seconds,
            lower: lower / (2.0 * seconds),
            upper: upper / (2.0 * seconds),
            level,
        })
    }

    /// Proportion of `successes` in `trials`, with Wilson's score interval.
    ///
    /// ```text
    /// [ p̂ + z²/2n ± z √( p̂(1 − p̂)/n + z²/4n² ) ] / (1 + z²/n)
    /// ```
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `successes ≤ trials`, `trials > 0` and `0 < level < 1`.
    ///
    /// # Source
    /// Wilson 1927, Journal of the American Statistical Association 22:209–212.
    ///
    /// # Example
    /// ```
    /// let seen = fixational::Estimate::proportion(0, 10, 0.95)?;
    /// assert!(seen.value == 0.0 && seen.lower == 0.0 && (seen.upper - 0.2775).abs() < 5e-5);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn proportion(successes: usize, trials: usize, level: f64) -> Result<Self> {
        check_level(level)?;
        if trials == 0 {
            return Err(Error::Parameter { name: "trials", value: 0.0, allowed: "at least 1" });
        }
        if successes > trials {
            let (value, allowed) = (successes as f64, "at most the trials");
            return Err(Error::Parameter { name: "successes", value, allowed });
        }
        let (n, p) = (trials as f64, successes as f64 / trials as f64);
        let z = normal_quantile(0.5 + level / 2.0);
        let centre = p + z * z / (2.0 * n);
        let half = z * (p * (1.0 - p) / n + z * z / (4.0 * n * n)).sqrt();
        let scale = 1.0 + z * z / n;
        // At 0 and at n one end is exact; rounding must not move it.
        let lower = if successes == 0 { 0.0 } else { (centre - half) / scale };
        let upper = if successes == trials { 1.0 } else { (centre + half) / scale };
        Ok(Self { value: p, lower, upper, level })
    }
}

/// Quantile of the standard normal distribution at `0 < p < 1`.
pub(crate) fn normal_quantile(p: f64) -> f64 {
    Normal::standard().inverse_cdf(p)
}

/// The χ² interval of a variance or power with `dof` equivalent degrees of freedom:
/// `[ν v/χ²_{1−α/2}(ν), ν v/χ²_{α/2}(ν)]`.
pub(crate) fn chi_squared_interval(value: f64, dof: f64, level: f64) -> Result<Estimate> {
    check_level(level)?;
    let tail = (1.0 - level) / 2.0;
    Ok(Estimate {
        value,
        lower: dof * value / chi_squared_quantile(dof, 1.0 - tail),
        upper: dof * value / chi_squared_quantile(dof, tail),
        level,
    })
}

/// A level whose tails a number can tell from nothing.
fn check_level(level: f64) -> Result<()> {
    if level > 0.0 && level < 1.0 && 1.0 - (1.0 - level) / 2.0 < 1.0 {
        Ok(())
    } else {
        Err(Error::Parameter { name: "level", value: level, allowed: "0 < level < 1" })
    }
}

/// Fisher's F with fractional degrees of freedom; an infinite second number makes it χ²/ν.
///
/// The library's distribution serves as a start only: its incomplete beta function stops its continued
/// fraction early, which above some ten thousand degrees of freedom leaves six digits.
pub(crate) mod f_distribution {
    use super::chi_squared_quantile;
    use statrs::distribution::{ContinuousCDF, FisherSnedecor};
    use statrs::function::gamma::ln_gamma;

    /// Quantile at `0 < p < 1` of F with `nu_1`, `nu_0` > 0 degrees of freedom: Newton steps, each tail by
    /// its own.
    pub(crate) fn quantile(nu_1: f64, nu_0: f64, p: f64) -> f64 {
        if nu_0.is_infinite() {
            return chi_squared_quantile(nu_1, p) / nu_1;
        }
        let Ok(start) = FisherSnedecor::new(nu_1, nu_0) else { return f64::NAN };
        let mut f = start.inverse_cdf(p);
        for _ in 0..8 {
            let at = Ratio::new(nu_1, nu_0, f);
            let excess = if p < 0.5 { at.below() - p } else { (1.0 - p) - at.above() };
            let step = f * excess / at.front();
            if !step.is_finite() || step >= f {
                break;
            }
            f -= step;
        }
        f
    }

    /// Probability of a value above `f`.
    pub(crate) fn upper_tail(nu_1: f64, nu_0: f64, f: f64) -> f64 {
        if f > 0.0 { Ratio::new(nu_1, nu_0, f).above() } else { 1.0 }
    }

    /// A value f as the beta variable x = ν₁f/(ν₁f + ν₀) with parameters a = ν₁/2, b = ν₀/2.
    struct Ratio {
        a: f64,
        b: f64,
        x: f64,
        /// 1 − x, with its own digits.
        y: f64,
    }

    impl Ratio {
        fn new(nu_1: f64, nu_0: f64, f: f64) -> Self {
            let whole = nu_1 * f + nu_0;
            Self { a: nu_1 / 2.0, b: nu_0 / 2.0, x: nu_1 * f / whole, y: nu_0 / whole }
        }

        /// xᵃ yᵇ / B(a, b); over f it is the density at f.
        fn front(&self) -> f64 {
            let ln_beta = ln_gamma(self.a) + ln_gamma(self.b) - ln_gamma(self.a + self.b);
            (self.a * self.x.ln() + self.b * self.y.ln() - ln_beta).exp()
        }

        fn below(&self) -> f64 {
            let Self { a, b, x, y } = *self;
            if x < (a + 1.0) / (a + b + 2.0) {
                self.front() * fraction(a, b, x) / a
            } else {
                1.0 - self.front() * fraction(b, a, y) / b
            }
        }

        fn above(&self) -> f64 {
            let Self { a, b, x, y } = *self;
            if x < (a + 1.0) / (a + b + 2.0) {
                1.0 - self.front() * fraction(a, b, x) / a
            } else {
                self.front() * fraction(b, a, y) / b
            }
        }
    }

    /// Continued fraction of the incomplete beta function (Lentz's method; Press et al., Numerical
    /// Recipes, section 6.4). Needs about √max(a, b) rounds.
    fn fraction(a: f64, b: f64, x: f64) -> f64 {
        const TINY: f64 = 1e-300;
        let away = |v: f64| if v.abs() < TINY { TINY } else { v };
        let mut c = 1.0;
        let mut d = 1.0 / away(1.0 - (a + b) * x / (a + 1.0));
        let mut value = d;
        for round in 1..100_000_u32 {
            let m = f64::from(round);
            let even = m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m));
            d = 1.0 / away(1.0 + even * d);
            c = away(1.0 + even / c);
            value *= d * c;
            let odd = -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0));
            d = 1.0 / away(1.0 + odd * d);
            c = away(1.0 + odd / c);
            value *= d * c;
            if (d * c - 1.0).abs() < 1e-15 {
                break;
            }
        }
        value
    }

    #[cfg(test)]
    mod tests {
        use super::*;

        /// F₀.₉₅, the handbook table's value to four decimals, and F₁₋α(ν₁, ν₀) F₁₋β(ν₀, ν₁) at α = 0.05,
        /// β = 0.05 and 0.20, derived from such quantiles.
        #[test]
        fn quantiles_equal_the_printed_table() {
            for (nu_1, nu_0, f95, both, loose) in [
                (10.0, 10.0, 2.9782, 8.8699, 5.1571),
                (20.0, 20.0, 2.1242, 4.5120, 3.1131),
                (60.0, 60.0, 1.5343, 2.3541, 1.9089),
                (60.0, 120.0, 1.4290, 2.0967, 1.7394),
                (120.0, 120.0, 1.3519, 1.8276, 1.5770),
                (200.0, 200.0, 1.2626, 1.5942, 1.4224),
            ] {
                let critical = quantile(nu_1, nu_0, 0.95);
                assert!((critical - f95).abs() <= 5e-5, "{nu_1} {nu_0}: {critical}");
                let limit = critical * quantile(nu_0, nu_1, 0.95);
                assert!((limit - both).abs() <= 5e-5, "{nu_1} {nu_0}: {limit}");
                let limit = critical * quantile(nu_0, nu_1, 0.80);
                assert!((limit - loose).abs() <= 5e-5, "{nu_1} {nu_0}: {limit}");
                assert!((upper_tail(nu_1, nu_0, critical) - 0.05).abs() < 1e-12);
                assert!(
                    (quantile(nu_1, nu_0, 0.05) * quantile(nu_0, nu_1, 0.95) - 1.0).abs() < 1e-10
                );
            }
        }

        /// ν/χ² at 95 % for ν = 60, from χ² quantiles: 0.720308, 1.482149.
        #[test]
        fn an_infinite_second_number_is_chi_squared() {
            let infinite = f64::INFINITY;
            assert!((1.0 / quantile(60.0, infinite, 0.975) - 0.720308).abs() < 5e-7);
            assert!((1.0 / quantile(60.0, infinite, 0.025) - 1.482149).abs() < 5e-7);
        }
    }
}

/// Quantile of χ² with `dof > 0` degrees of freedom at `0 < p < 1`.
///
/// The library's inverse stops at about ten digits; Newton steps on its distribution function, each
/// tail by its own, bring the rest.
fn chi_squared_quantile(dof: f64, p: f64) -> f64 {
    // `new` refuses only a `dof` that is not above zero, which no caller here can pass.
    let Ok(chi_squared) = ChiSquared::new(dof) else { return f64::NAN };
    let mut x = chi_squared.inverse_cdf(p);
    for _ in 0..3 {
        let excess = if p < 0.5 { chi_squared.cdf(x) - p } else { (1.0 - p) - chi_squared.sf(x) };
        let step = excess / chi_squared.pdf(x);
        if step.is_finite() && step < x {
            x -= step;
        }
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;

    /// χ² quantiles of SciPy 1.17 (`stats.chi2.ppf`), divided by 2T.
    #[test]
    fn garwood_interval_equals_the_library() -> Result<()> {
        let close = |got: f64, expected: f64| (got - expected).abs() <= 1e-12 * expected;
        let rate = Estimate::poisson_rate(90, 60.0, 0.95)?;
        assert!(close(rate.lower, 1.206177135518433), "{}", rate.lower);
        assert!(close(rate.upper, 1.8437546631651072), "{}", rate.upper);
        let none = Estimate::poisson_rate(0, 60.0, 0.95)?;
        assert!(none.lower == 0.0 && close(none.upper, 0.061481324235232254), "{}", none.upper);
        let one_sided = Estimate::poisson_rate(0, 60.0, 0.90)?;
        assert!(close(one_sided.upper, 0.049928871225899826), "{}", one_sided.upper);
        Ok(())
    }

    /// χ² and F against SciPy and multi-precision arithmetic (`tests/reference/quantiles.json`), at
    /// degrees of freedom from 1 up and tails down to 1e-4. The file goes on to 0.5 and 1e-6; what lies
    /// beyond is not checked here.
    #[test]
    fn quantiles_equal_the_library() {
        let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/reference/quantiles.json");
        let file: serde_json::Value =
            serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
        let list = |value: &serde_json::Value| -> Vec<f64> {
            value.as_array().unwrap().iter().map(|v| v.as_f64().unwrap()).collect()
        };
        let mut checked = 0;
        for case in file["cases"].as_array().unwrap() {
            let relative = case["tolerance"]["relative"].as_f64().unwrap();
            let ask: Box<dyn Fn(usize, f64) -> Option<f64>> = match case["name"].as_str().unwrap() {
                "chi_squared_quantile" => {
                    let dof = list(&case["input"]["dof"]);
                    Box::new(move |i, p| (dof[i] >= 1.0).then(|| chi_squared_quantile(dof[i], p)))
                }
                "f_quantile" => {
                    let input = &case["input"];
                    let (one, two) = (list(&input["dof1"]), list(&input["dof2"]));
                    Box::new(move |i, p| {
                        let asked = one[i] >= 1.0 && two[i] >= 1.0;
                        asked.then(|| f_distribution::quantile(one[i], two[i], p))
                    })
                }
                _ => continue,
            };
            let input = &case["input"];
            let p = list(&input["p"]);
            for (i, row) in case["expected"]["quantile"].as_array().unwrap().iter().enumerate() {
                for (&p, expected) in p.iter().zip(list(row)) {
                    let Some(found) = ask(i, p).filter(|_| (1e-4..=1.0 - 1e-4).contains(&p)) else {
                        continue;
                    };
                    let name = &case["name"];
                    let off = (found - expected).abs();
                    assert!(
                        off <= relative * expected,
                        "{name} row {i}, p = {p}: {found}, {expected}"
                    );
                    checked += 1;
                }
            }
        }
        assert!(checked > 200, "{checked}");
    }

    #[test]
    fn absurd_settings_are_refused() {
        for (seconds, level) in
            [(0.0, 0.95), (f64::NAN, 0.95), (-1.0, 0.95), (1.0, 0.0), (1.0, 1.0)]
        {
            assert!(Estimate::poisson_rate(1, seconds, level).is_err(), "{seconds} {level}");
        }
        assert!(Estimate::poisson_rate(1, 1.0, f64::NAN).is_err());
        let nearly_one = 1.0 - f64::EPSILON / 2.0;
        assert!(Estimate::poisson_rate(1, 1.0, nearly_one).is_err());
        assert!(Estimate::poisson_rate(1, 1e-310, 0.95).is_err());
        for (successes, trials, level) in
            [(0, 0, 0.95), (2, 1, 0.95), (1, 2, 0.0), (1, 2, nearly_one)]
        {
            assert!(Estimate::proportion(successes, trials, level).is_err());
        }
    }
}
