//! A simulator of wind and levels that shares no code with the fit: powers are added in linear units and all variables are
//! drawn by autoregression.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Exp, Normal, Uniform};

/// How levels scatter.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Scatter {
    /// Whole level: first-order autoregression with this e-folding time (h) and standard deviation 2.5 dB, white noise 1 dB.
    Total { memory_h: f64 },
    /// As `Total` with 8 h, and 5 % clustered upward outliers.
    Outliers,
    /// Floor with 4 dB and 12 h, wind part with 1.5 dB and 8 h, added in power.
    RandomFloor,
    /// As `Total` with 8 h, and visits of ships of about 3 h, peaks 5 to 20 dB over the floor, added in power.
    Ships,
}

/// Law of the wind part.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Law {
    /// Slope, onset (m/s; infinite for none) and slope above the onset.
    Knee { slope: f64, onset_m_s: f64, post_slope: f64 },
    /// Quadratic in log10 of the wind: 30 x - 25 x^2 about the crossover.
    Curve,
    /// (U - 3.7)^3.
    Whitecap,
}

/// Whether there is a floor at all.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Floor {
    Present,
    Absent,
    /// This much higher in the first half and lower in the second, dB; the second half is windier.
    Seasonal(f64),
}

/// What is true.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Truth {
    pub(crate) floor_db: f64,
    /// Wind at which wind part and floor are equal, m/s.
    pub(crate) crossover_m_s: f64,
    pub(crate) law: Law,
    pub(crate) scatter: Scatter,
    /// Weibull scale of the wind, m/s (shape 2.2), and its e-folding time, h.
    pub(crate) wind_scale_m_s: f64,
    pub(crate) wind_memory_h: f64,
    /// Added to all levels of the second half, which is then also windier.
    pub(crate) gain_step_db: f64,
    pub(crate) floor: Floor,
}

impl Default for Truth {
    fn default() -> Self {
        Self {
            floor_db: 60.0,
            crossover_m_s: 3.5,
            law: Law::Knee { slope: 30.0, onset_m_s: 12.0, post_slope: 0.0 },
            scatter: Scatter::Total { memory_h: 8.0 },
            wind_scale_m_s: 8.0,
            wind_memory_h: 24.0,
            gain_step_db: 0.0,
            floor: Floor::Present,
        }
    }
}

#[derive(Debug, Clone)]
pub(crate) struct Simulated {
    pub(crate) times_ms: Vec<i64>,
    pub(crate) wind_m_s: Vec<f64>,
    pub(crate) level_db: Vec<f64>,
    pub(crate) deployment: Vec<u32>,
}

fn power(db: f64) -> f64 {
    10_f64.powf(db / 10.0)
}

/// Autoregression of unit variance with an e-folding time in steps.
fn autoregression(random: &mut ChaCha8Rng, count: usize, memory: f64) -> Vec<f64> {
    let normal = Normal::new(0.0, 1.0).unwrap();
    let keep = (-1.0 / memory).exp();
    let mut state: f64 = normal.sample(random);
    (0..count)
        .map(|_| {
            let now = state;
            state = keep * state + (1.0 - keep * keep).sqrt() * normal.sample(random);
            now
        })
        .collect()
}

/// Upper tail of the normal distribution: integral of the density by Simpson's rule from |z| to |z| + 10.
fn normal_tail(z: f64) -> f64 {
    let steps = 200;
    let width = 10.0 / f64::from(steps);
    let density = |t: f64| (-0.5 * t * t).exp() / (2.0 * std::f64::consts::PI).sqrt();
    let sum: f64 = (0..=steps)
        .map(|step| {
            let weight = if step == 0 || step == steps {
                1.0
            } else if step % 2 == 1 {
                4.0
            } else {
                2.0
            };
            weight * density(z.abs() + width * f64::from(step))
        })
        .sum();
    let tail = sum * width / 3.0;
    if z >= 0.0 { tail } else { 1.0 - tail }
}

fn wind(random: &mut ChaCha8Rng, count: usize, scale_m_s: f64, memory_h: f64) -> Vec<f64> {
    autoregression(random, count, memory_h)
        .into_iter()
        .map(|z| (scale_m_s * (-normal_tail(z).max(1e-300).ln()).powf(1.0 / 2.2)).max(0.05))
        .collect()
}

/// Wind part, dB.
fn wind_part_db(truth: &Truth, wind_m_s: f64) -> f64 {
    let decades = |wind: f64| (wind.max(0.05) / truth.crossover_m_s).log10();
    match truth.law {
        Law::Knee { slope, onset_m_s, post_slope } => {
            let above = (wind_m_s.max(0.05) / onset_m_s).log10().max(0.0);
            truth.floor_db + slope * decades(wind_m_s.min(onset_m_s)) + post_slope * above
        }
        Law::Curve => {
            let x = (wind_m_s.max(0.5) / 10.0).log10();
            truth.floor_db - 30.0 * (truth.crossover_m_s / 10.0).log10() + 30.0 * x - 25.0 * x * x
        }
        Law::Whitecap => {
            let at_12 = truth.floor_db + 30.0 * decades(12.0);
            at_12 + 30.0 * ((wind_m_s - 3.7).max(1e-6) / 8.3).log10()
        }
    }
}

/// Level without any scatter, dB.
pub(crate) fn mean_level_db(truth: &Truth, wind_m_s: f64) -> f64 {
    10.0 * (power(truth.floor_db) + power(wind_part_db(truth, wind_m_s))).log10()
}

fn total_noise(random: &mut ChaCha8Rng, count: usize, memory_h: f64) -> Vec<f64> {
    let white = Normal::new(0.0, 1.0).unwrap();
    autoregression(random, count, memory_h).into_iter().map(|slow| 2.5 * slow + white.sample(random)).collect()
}

fn ship_power(random: &mut ChaCha8Rng, count: usize, floor_db: f64) -> Vec<f64> {
    let mut powers = vec![0.0; count];
    let gap = Exp::new(0.1).unwrap();
    let length = Uniform::new(2.1, 3.9).unwrap();
    let peak = Uniform::new(5.0, 20.0).unwrap();
    let mut start = 0.0;
    loop {
        start += gap.sample(random);
        if start >= count as f64 {
            return powers;
        }
        let (duration, excess) = (length.sample(random), peak.sample(random));
        let end = count.min((start + duration) as usize + 1);
        for (hour, sum) in powers.iter_mut().enumerate().take(end).skip(start as usize) {
            let off = (hour as f64 + 0.5 - start - 0.5 * duration) / (0.5 * duration);
            if off.abs() <= 1.0 + 1.0 / duration {
                *sum += power(floor_db + excess - 12.0 * off * off);
            }
        }
        start += duration;
    }
}

/// Hourly wind and levels.
pub(crate) fn record(truth: Truth, count: usize, seed: u64) -> Simulated {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let half = count / 2;
    let halves_differ = truth.gain_step_db.abs() > 0.0 || matches!(truth.floor, Floor::Seasonal(_));
    let wind_m_s: Vec<f64> = if halves_differ {
        let mut first = wind(&mut random, half, 0.8 * truth.wind_scale_m_s, truth.wind_memory_h);
        first.extend(wind(&mut random, count - half, 1.2 * truth.wind_scale_m_s, truth.wind_memory_h));
        first
    } else {
        wind(&mut random, count, truth.wind_scale_m_s, truth.wind_memory_h)
    };
    let mut floor_off = vec![0.0; count];
    let mut wind_off = vec![0.0; count];
    let mut total = vec![0.0; count];
    let mut ships = vec![0.0; count];
    match truth.scatter {
        Scatter::Total { memory_h } => total = total_noise(&mut random, count, memory_h),
        Scatter::Outliers => {
            total = total_noise(&mut random, count, 8.0);
            add_outliers(&mut random, &mut total);
        }
        Scatter::RandomFloor => {
            floor_off = autoregression(&mut random, count, 12.0).into_iter().map(|z| 4.0 * z).collect();
            wind_off = autoregression(&mut random, count, 8.0).into_iter().map(|z| 1.5 * z).collect();
        }
        Scatter::Ships => {
            total = total_noise(&mut random, count, 8.0);
            ships = ship_power(&mut random, count, truth.floor_db);
        }
    }
    let deployment: Vec<u32> = (0..count).map(|index| u32::from(index >= half)).collect();
    let level_db = (0..count)
        .map(|index| {
            let floor = match truth.floor {
                Floor::Present => power(truth.floor_db + floor_off[index]),
                Floor::Absent => 0.0,
                Floor::Seasonal(by) => {
                    power(truth.floor_db + floor_off[index] + by * (1.0 - 2.0 * f64::from(deployment[index])))
                }
            };
            let sum = floor + power(wind_part_db(&truth, wind_m_s[index]) + wind_off[index]) + ships[index];
            10.0 * sum.log10() + total[index] + truth.gain_step_db * f64::from(deployment[index])
        })
        .collect();
    Simulated { times_ms: (0..count as i64).map(|hour| hour * 3_600_000).collect(), wind_m_s, level_db, deployment }
}

/// Five percent of the samples, in clusters of about three, 5 dB and an exponential 8 dB too high.
fn add_outliers(random: &mut ChaCha8Rng, level: &mut [f64]) {
    let unit = Uniform::new(0.0, 1.0).unwrap();
    let excess = Exp::new(1.0 / 8.0).unwrap();
    let mut left = 0;
    for value in level {
        if left == 0 && unit.sample(random) < 0.05 / 3.0 {
            left = 2;
            while unit.sample(random) < 0.5 {
                left += 1;
            }
        }
        if left > 0 {
            *value += 5.0 + excess.sample(random);
            left -= 1;
        }
    }
}

#[test]
fn the_simulated_wind_has_its_distribution() {
    // Closed form: the median of a Weibull variable is scale * ln(2)^(1/shape).
    let simulated = record(Truth::default(), 60_000, 1);
    let mut wind = simulated.wind_m_s;
    wind.sort_by(f64::total_cmp);
    let median = 8.0 * 2_f64.ln().powf(1.0 / 2.2);
    assert!((wind[30_000] / median - 1.0).abs() < 0.04, "{}", wind[30_000]);
}
