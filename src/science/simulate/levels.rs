//! Levels from stated laws. Everything adds in power.

use super::random::Stream;
use super::settings::{BandLaw, Settings};
use crate::units::{db_of_power, power_of_db};

/// A passing ship.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ShipVisit {
    /// Nearest approach, hours since the start.
    pub at_h: f64,
    /// Half its duration, h.
    pub half_h: f64,
    /// Level over the floor at its nearest, dB, in a band of ship gain 0.
    pub peak_db: f64,
}

/// Level that the law gives at a wind speed, dB, with this floor.
pub fn law_level_db(law: &BandLaw, floor_db: f64, wind_speed_m_s: f64) -> f64 {
    db_of_power(power_of_db(floor_db) + power_of_db(wind_part_db(law, wind_speed_m_s)))
}

fn wind_part_db(law: &BandLaw, wind_speed_m_s: f64) -> f64 {
    let decades = |speed: f64| libm::log10(speed.max(0.1) / law.crossover_m_s);
    let onset = law.onset_m_s.unwrap_or(f64::INFINITY);
    let below = law.floor_db + law.slope_db_per_decade * decades(wind_speed_m_s.min(onset));
    if wind_speed_m_s > onset {
        below + law.post_onset_slope_db_per_decade * (decades(wind_speed_m_s) - decades(onset))
    } else {
        below
    }
}

/// The ships of one site. They do not depend on the wind.
pub fn simulate_ships(settings: &Settings, seed: u64, site: u64, hours: usize) -> Vec<ShipVisit> {
    let mut ships = Vec::new();
    if settings.ship_gap_h <= 0.0 {
        return ships;
    }
    let mut stream = Stream::new(seed, 1000 + site);
    let mut time_h = 0.0;
    loop {
        time_h += stream.exponential(settings.ship_gap_h);
        if time_h >= hours as f64 {
            return ships;
        }
        let half_h = 0.5 * settings.ship_duration_h * (0.7 + 0.6 * stream.uniform());
        let [low, high] = settings.ship_peak_db;
        ships.push(ShipVisit { at_h: time_h + half_h, half_h, peak_db: low + (high - low) * stream.uniform() });
        time_h += 2.0 * half_h;
    }
}

/// Level of the ships over the floor in the hour that starts at `hour`, dB; minus infinity without ship. A passage rises and
/// falls by 12 dB.
fn ship_db(ships: &[ShipVisit], hour: usize) -> f64 {
    let middle = hour as f64 + 0.5;
    let power: f64 = ships
        .iter()
        .map(|ship| {
            let away = (middle - ship.at_h) / ship.half_h;
            if away.abs() <= 1.0 { power_of_db(ship.peak_db - 12.0 * away * away) } else { 0.0 }
        })
        .sum();
    db_of_power(power)
}

/// Levels of one band at one site, one an hour, dB re 1 uPa^2; NaN in gaps. `site` and `band` number the random streams.
pub fn simulate_levels(
    settings: &Settings, seed: u64, site: u64, band: u64, law: &BandLaw, speeds_m_s: &[f64], ships: &[ShipVisit],
) -> Vec<f64> {
    let hours = speeds_m_s.len();
    let purpose = 100_000 + site * 1000 + band;
    let floor = Stream::new(seed, purpose).autoregressive(hours, settings.floor_h);
    let slow = Stream::new(seed, 10_000_000 + purpose).autoregressive(hours, settings.slow_noise_h);
    let mut white = Stream::new(seed, 20_000_000 + purpose);
    let gaps = gaps(settings, seed, site, hours);
    // Only ships near an hour matter to it.
    let longest = settings.ship_duration_h * 1.3;
    (0..hours)
        .map(|hour| {
            let noise = settings.slow_noise_sd_db * slow[hour] + settings.white_noise_sd_db * white.normal();
            if gaps[hour] || speeds_m_s[hour].is_nan() {
                return f64::NAN;
            }
            let floor_db = law.floor_db + settings.floor_sd_db * floor[hour];
            let from = ships.partition_point(|ship| ship.at_h < hour as f64 - longest);
            let to = ships.partition_point(|ship| ship.at_h < hour as f64 + 1.0 + longest);
            let ship = floor_db + law.ship_gain_db + ship_db(&ships[from..to], hour);
            let quiet = law_level_db(law, floor_db, speeds_m_s[hour]);
            db_of_power(power_of_db(quiet) + power_of_db(ship)) + noise
        })
        .collect()
}

/// Hours that are lost, in runs of a few hours to days; the same for all bands of a site.
fn gaps(settings: &Settings, seed: u64, site: u64, hours: usize) -> Vec<bool> {
    let mut lost = vec![false; hours];
    let mut stream = Stream::new(seed, 2000 + site);
    let wanted = (settings.gap_share * hours as f64) as usize;
    let mut done = 0;
    while done < wanted {
        let start = (stream.uniform() * hours as f64) as usize;
        let length = (2.0 + stream.exponential(10.0)) as usize;
        for hour in start..(start + length).min(hours) {
            if !lost[hour] && done < wanted {
                lost[hour] = true;
                done += 1;
            }
        }
    }
    lost
}

#[cfg(test)]
mod tests {
    use super::*;

    fn law() -> BandLaw {
        BandLaw {
            centre_hz: 1000.0,
            floor_db: 70.0,
            slope_db_per_decade: 30.0,
            crossover_m_s: 4.0,
            onset_m_s: Some(12.0),
            post_onset_slope_db_per_decade: 0.0,
            ship_gain_db: 0.0,
        }
    }

    #[test]
    fn equal_powers_add_three_decibels_and_the_law_stops_at_its_onset() {
        // 10 log10 2 = 3.0103 dB at the crossover; closed forms.
        assert!((law_level_db(&law(), 70.0, 4.0) - 73.010_299_956_6).abs() < 1e-9);
        assert!((law_level_db(&law(), 70.0, 20.0) - law_level_db(&law(), 70.0, 12.0)).abs() < 1e-12);
        let high = law_level_db(&law(), -200.0, 8.0) - law_level_db(&law(), -200.0, 4.0);
        assert!((high - 30.0 * 2f64.log10()).abs() < 1e-9);
    }

    #[test]
    fn ships_never_lower_a_level() {
        let quiet = Settings { gap_share: 0.0, ..Settings::default() };
        let busy = Settings { ship_gap_h: 8.0, ..quiet.clone() };
        let speeds = vec![6.0; 2000];
        let ships = simulate_ships(&busy, 1, 0, 2000);
        assert!(ships.len() > 100);
        let without = simulate_levels(&quiet, 1, 0, 0, &law(), &speeds, &[]);
        let with = simulate_levels(&busy, 1, 0, 0, &law(), &speeds, &ships);
        assert!(without.iter().zip(&with).all(|(a, b)| b >= a));
        assert!(without.iter().zip(&with).filter(|(a, b)| *b > &(*a + 3.0)).count() > 100);
    }

    #[test]
    fn gaps_take_their_share() {
        let settings = Settings { gap_share: 0.1, ..Settings::default() };
        let levels = simulate_levels(&settings, 1, 0, 0, &law(), &vec![6.0; 5000], &[]);
        assert_eq!(levels.iter().filter(|level| level.is_nan()).count(), 500);
    }
}
