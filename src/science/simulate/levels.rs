//! Levels from stated laws. Everything that sounds adds in power; noise of the measured level comes after.

use super::law::{BandLaw, law_level_db};
use super::random::{Stream, purpose};
use super::settings::Settings;
use super::ships::{ShipVisit, ship_excess_db};
use crate::units::{HOUR_MS, Instant, db_of_power, power_of_db};

/// Least excess of an outlier, dB.
const OUTLIER_LEAST_DB: f64 = 5.0;
/// Shortest and mean further length of a gap, h.
const GAP_H: [f64; 2] = [2.0, 10.0];

/// The windows of a level table: equal, one after the other.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Windows {
    /// Start of the first.
    pub start: Instant,
    /// Length of each, ms.
    pub length_ms: i64,
    /// How many.
    pub count: usize,
}

impl Windows {
    /// Start of a window.
    pub fn start_of(&self, window: usize) -> Instant {
        self.start.plus_ms(window as i64 * self.length_ms)
    }

    /// Length of a window, h.
    pub fn length_h(&self) -> f64 {
        self.length_ms as f64 / HOUR_MS as f64
    }

    /// Length of all windows, h.
    pub fn total_h(&self) -> f64 {
        self.length_h() * self.count as f64
    }
}

/// What the levels of one band at one sensor are made from.
#[derive(Debug, Clone, Copy)]
pub struct LevelSeries<'a> {
    /// The law, with the floor of the site.
    pub law: &'a BandLaw,
    /// The windows.
    pub windows: Windows,
    /// Mean wind speed of each window, m/s; NaN where there is none.
    pub speeds_m_s: &'a [f64],
    /// Ships of the site.
    pub ships: &'a [ShipVisit],
    /// Number of the sensor: its own random numbers.
    pub sensor: u64,
    /// Number of the band: its own random numbers.
    pub band: u64,
}

/// Levels, one a window, dB re 1 uPa^2; NaN where there is no wind. The law is taken at the mean wind speed of the window;
/// ships add their mean power; fluctuations of the whole level come last.
pub fn simulate_levels(settings: &Settings, seed: u64, series: &LevelSeries<'_>) -> Vec<f64> {
    let LevelSeries { law, windows, speeds_m_s, ships, sensor, band } = *series;
    let length_h = windows.length_h();
    let count = speeds_m_s.len();
    let fluctuation =
        |what: u64, scale_h: f64| Stream::new(seed, what, sensor, band).autoregressive(count, scale_h / length_h);
    let floor = fluctuation(purpose::FLOOR, settings.floor_h);
    let slow = fluctuation(purpose::SLOW_NOISE, settings.slow_noise_h);
    let mut white = Stream::new(seed, purpose::WHITE_NOISE, sensor, band);
    let mut outliers = Stream::new(seed, purpose::OUTLIERS, sensor, band);
    (0..count)
        .map(|k| {
            let noise = settings.slow_noise_sd_db * slow[k] + settings.white_noise_sd_db * white.normal();
            let (hit, excess) =
                (outliers.uniform() < settings.outlier_share, outliers.exponential(settings.outlier_mean_db));
            let outlier = if hit { OUTLIER_LEAST_DB + excess } else { 0.0 };
            let start_h = k as f64 * length_h;
            let ship = law.floor_db + law.ship_gain_db + ship_excess_db(ships, start_h, start_h + length_h);
            let quiet = law_level_db(law, law.floor_db + settings.floor_sd_db * floor[k], speeds_m_s[k]);
            if speeds_m_s[k].is_nan() {
                f64::NAN
            } else {
                db_of_power(power_of_db(quiet) + power_of_db(ship)) + noise + outlier
            }
        })
        .collect()
}

/// Windows that are lost, in runs of a few hours to days; the same for all bands of a sensor.
pub fn lost_windows(settings: &Settings, seed: u64, sensor: u64, windows: Windows) -> Vec<bool> {
    let count = windows.count;
    let mut lost = vec![false; count];
    let mut stream = Stream::new(seed, purpose::GAPS, sensor, 0);
    let wanted = (settings.gap_share * count as f64) as usize;
    let mut done = 0;
    while done < wanted {
        let start = (stream.uniform() * count as f64) as usize;
        let length_h = GAP_H[0] + stream.exponential(GAP_H[1]);
        let length = ((length_h / windows.length_h()) as usize).max(1);
        for window in &mut lost[start..(start + length).min(count)] {
            if !*window && done < wanted {
                *window = true;
                done += 1;
            }
        }
    }
    lost
}

#[cfg(test)]
mod tests {
    use super::super::ships::simulate_ships;
    use super::*;

    fn law() -> BandLaw {
        BandLaw {
            centre_hz: 1000.0,
            floor_db: 70.0,
            slope_db_per_decade: 30.0,
            crossover_m_s: 4.0,
            onset_m_s: None,
            post_onset_slope_db_per_decade: 0.0,
            ship_gain_db: 0.0,
        }
    }

    fn hourly(count: usize) -> Windows {
        Windows { start: Instant(0), length_ms: HOUR_MS, count }
    }

    fn levels(settings: &Settings, speeds_m_s: &[f64], ships: &[ShipVisit]) -> Vec<f64> {
        let windows = hourly(speeds_m_s.len());
        simulate_levels(settings, 1, &LevelSeries { law: &law(), windows, speeds_m_s, ships, sensor: 0, band: 0 })
    }

    fn silent() -> Settings {
        Settings { slow_noise_sd_db: 0.0, white_noise_sd_db: 0.0, ..Settings::default() }
    }

    // Closed form: floor, wind part and ship of equal power are 10 log10 3 = 4.7712 dB above one of them.
    #[test]
    fn floor_wind_and_ship_add_in_power() {
        let ship = ShipVisit { at_h: 0.5, half_h: 1e6, peak_db: 0.0 };
        let level = levels(&silent(), &[4.0], &[ship])[0];
        assert!((level - (70.0 + 4.771_212_547_196_6)).abs() < 1e-9, "{level}");
        assert!((levels(&silent(), &[4.0], &[])[0] - 73.010_299_956_6).abs() < 1e-9);
    }

    #[test]
    fn ships_never_lower_a_level() {
        let busy = Settings { ship_gap_h: 8.0, ..Settings::default() };
        let speeds = vec![6.0; 2000];
        let ships = simulate_ships(&busy, 1, 0, 2000.0);
        assert!(ships.len() > 100);
        let (without, with) = (levels(&busy, &speeds, &[]), levels(&busy, &speeds, &ships));
        assert!(without.iter().zip(&with).all(|(a, b)| b >= a));
        assert!(without.iter().zip(&with).filter(|(a, b)| *b > &(*a + 3.0)).count() > 100);
    }

    #[test]
    fn the_noise_has_its_size_and_its_memory() {
        let settings = Settings { slow_noise_sd_db: 2.0, slow_noise_h: 8.0, white_noise_sd_db: 0.0, ..silent() };
        let noise: Vec<f64> = levels(&settings, &vec![4.0; 200_000], &[]).iter().map(|level| level - 73.0103).collect();
        let mean_product =
            |lag: usize| noise.iter().zip(&noise[lag..]).map(|(a, b)| a * b).sum::<f64>() / (noise.len() - lag) as f64;
        assert!((mean_product(0).sqrt() - 2.0).abs() < 0.1, "{}", mean_product(0));
        // Closed form: correlation exp(-lag / 8 h) of a first-order autoregressive series.
        for lag in [4, 8, 16] {
            let correlation = mean_product(lag) / mean_product(0);
            assert!((correlation - (-(lag as f64) / 8.0).exp()).abs() < 0.05, "{lag}: {correlation}");
        }
    }

    #[test]
    fn outliers_and_gaps_take_their_share() {
        let settings = Settings { outlier_share: 0.05, ..silent() };
        let high = levels(&settings, &vec![4.0; 20_000], &[]).iter().filter(|level| **level > 78.0).count();
        assert!((high as f64 / 20_000.0 - 0.05).abs() < 0.006, "{high}");
        let settings = Settings { gap_share: 0.1, ..silent() };
        let lost = lost_windows(&settings, 1, 0, hourly(5000));
        assert_eq!(lost.iter().filter(|lost| **lost).count(), 500);
    }
}
