//! Passing ships: visits that add power, coherent over the bands, and that know nothing of the wind.

use super::random::{Stream, purpose};
use super::settings::Settings;
use crate::units::{db_of_power, power_of_db};

/// How much quieter a ship is at the ends of its visit than at its nearest, dB.
const FADE_DB: f64 = 12.0;
/// Instants in a window at which the ships' power is taken for its mean.
const PARTS: usize = 12;

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

/// The ships of one site during so many hours.
pub fn simulate_ships(settings: &Settings, seed: u64, site: u64, hours: f64) -> Vec<ShipVisit> {
    let mut ships = Vec::new();
    if settings.ship_gap_h <= 0.0 {
        return ships;
    }
    let mut stream = Stream::new(seed, purpose::SHIPS, site, 0);
    let mut time_h = 0.0;
    loop {
        time_h += stream.exponential(settings.ship_gap_h);
        if time_h >= hours {
            return ships;
        }
        let half_h = 0.5 * settings.ship_duration_h * (0.7 + 0.6 * stream.uniform());
        let [low, high] = settings.ship_peak_db;
        ships.push(ShipVisit { at_h: time_h + half_h, half_h, peak_db: low + (high - low) * stream.uniform() });
        time_h += 2.0 * half_h;
    }
}

/// Level of the ships over the floor in the window [start, end) in hours since the start, dB: the mean of their power over
/// the window. Minus infinity without a ship.
pub fn ship_excess_db(ships: &[ShipVisit], start_h: f64, end_h: f64) -> f64 {
    // Visits follow one another, so ends and starts increase along the list.
    let from = ships.partition_point(|ship| ship.at_h + ship.half_h < start_h);
    let to = ships.partition_point(|ship| ship.at_h - ship.half_h < end_h);
    let mut power = 0.0;
    for ship in ships.get(from..to).unwrap_or_default() {
        for part in 0..PARTS {
            let time_h = start_h + (end_h - start_h) * (part as f64 + 0.5) / PARTS as f64;
            let away = (time_h - ship.at_h) / ship.half_h;
            if away.abs() <= 1.0 {
                power += power_of_db(ship.peak_db - FADE_DB * away * away) / PARTS as f64;
            }
        }
    }
    db_of_power(power)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_visit_is_loudest_at_its_nearest_and_silent_outside() {
        let ship = ShipVisit { at_h: 10.0, half_h: 2.0, peak_db: 15.0 };
        let at = |time_h: f64| ship_excess_db(&[ship], time_h, time_h + 1e-9);
        // Closed form: 12 dB down at the ends, a quarter of it half way.
        assert!((at(10.0) - 15.0).abs() < 1e-6 && (at(11.0) - 12.0).abs() < 1e-6 && (at(8.0001) - 3.0).abs() < 1e-2);
        assert!(at(7.9).is_infinite() && at(12.1).is_infinite());
        // A ship that fills half the window has half the mean power.
        let short = ShipVisit { at_h: 0.25, half_h: 0.25, peak_db: 10.0 };
        let half = ship_excess_db(&[short], 0.0, 1.0);
        let whole = ship_excess_db(&[short], 0.0, 0.5);
        assert!((whole - half - 3.0103).abs() < 0.2, "{whole} {half}");
    }

    #[test]
    fn visits_are_as_frequent_and_as_long_as_asked() {
        let settings = Settings { ship_gap_h: 10.0, ship_duration_h: 3.0, ..Settings::default() };
        let ships = simulate_ships(&settings, 3, 0, 50_000.0);
        // One visit each 10 + 3 hours on average.
        let expected = 50_000.0 / 13.0;
        assert!((ships.len() as f64 / expected - 1.0).abs() < 0.06, "{}", ships.len());
        assert!(ships.windows(2).all(|pair| pair[0].at_h + pair[0].half_h <= pair[1].at_h - pair[1].half_h));
    }
}
