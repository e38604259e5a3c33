//! Invented weather: lows and highs that drift eastward, and fronts at which the wind veers.
//!
//! The wind follows a stream function, a sum of many waves of random heading, length and pace, so that it turns around
//! lows and highs and calms lie in their centres. Its components are then close to normal and of equal variance, so half
//! the squared length `r` is exponentially distributed, and `scale (r^2/2)^(1/shape)` has a Weibull distribution (closed
//! form). Fronts turn the wind and leave its speed alone.

use super::random::{Stream, purpose};
use super::settings::Settings;
use std::f64::consts::{PI, TAU};

/// Waves in the sum.
const WAVES: usize = 60;
/// Pace at which weather drifts eastward, km/h.
const DRIFT_KM_H: f64 = 35.0;
/// Shortest and longest wave, in units of drift times time scale times a full turn.
const LENGTHS: [f64; 2] = [0.35, 1.6];
/// Periods shorter than this are left out of a wave's own life, h.
const SHORTEST_PERIOD_H: f64 = 8.0;
/// Time within which a front turns the wind, h.
const FRONT_H: f64 = 0.7;
/// Time over which the wind backs before a front and comes back after it, h.
const FRONT_MEMORY_H: f64 = 12.0;

/// One wave; angles in radians, places in km, times in hours.
struct Wave {
    along_x: f64,
    along_y: f64,
    per_hour: f64,
    phase: f64,
    eastward: f64,
    northward: f64,
}

/// A front: a line that crosses the region.
struct Front {
    /// When it crosses the origin, h.
    at_h: f64,
    /// Hours for a km, along x and y.
    delay_x: f64,
    delay_y: f64,
    /// Turn of the wind, radians clockwise.
    veer: f64,
}

impl Front {
    /// Angle by which it turns the wind at a place and time, radians clockwise.
    fn turn(&self, x_km: f64, y_km: f64, time_h: f64) -> f64 {
        let since_h = time_h - self.at_h - self.delay_x * x_km - self.delay_y * y_km;
        0.5 * self.veer * libm::tanh(since_h / FRONT_H) * libm::exp(-since_h.abs() / FRONT_MEMORY_H)
    }
}

/// The weather of a region and a span of time.
pub struct Weather {
    waves: Vec<Wave>,
    fronts: Vec<Front>,
    scale_m_s: f64,
    shape: f64,
}

impl std::fmt::Debug for Weather {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(formatter, "Weather of {} waves and {} fronts", self.waves.len(), self.fronts.len())
    }
}

/// A place with what the waves need there, computed once.
#[derive(Debug)]
pub struct Place {
    x_km: f64,
    y_km: f64,
    sine_cosine: Vec<(f64, f64)>,
}

/// An instant with what the waves need then, computed once.
#[derive(Debug)]
pub struct Moment {
    time_h: f64,
    sine_cosine: Vec<(f64, f64)>,
}

impl Weather {
    /// Invents the weather of so many hours.
    pub fn invent(settings: &Settings, seed: u64, hours: f64) -> Self {
        let mut stream = Stream::new(seed, purpose::WAVES, 0, 0);
        let scale_h = settings.wind_time_scale_h;
        let usual_km = TAU * DRIFT_KM_H * scale_h;
        let amplitude = 2.0 / (WAVES as f64).sqrt();
        let waves = (0..WAVES)
            .map(|k| {
                // Headings spread evenly, so that both components have the same variance.
                let heading = TAU * (k as f64 + stream.uniform()) / WAVES as f64;
                let length_km = usual_km * LENGTHS[0] * libm::pow(LENGTHS[1] / LENGTHS[0], stream.uniform());
                let number = TAU / length_km;
                let (along_x, along_y) = (number * libm::cos(heading), number * libm::sin(heading));
                // Paces of a Cauchy distribution: the correlation in time falls exponentially (its Fourier transform).
                let fastest = TAU / SHORTEST_PERIOD_H;
                let own = libm::tan(PI * (stream.uniform() - 0.5)) / scale_h;
                let own = if own.abs() < fastest { own } else { fastest * (2.0 * stream.uniform() - 1.0) };
                Wave {
                    along_x,
                    along_y,
                    per_hour: along_x * DRIFT_KM_H + 0.5 * own,
                    phase: TAU * stream.uniform(),
                    // The stream function's derivatives across and along, at equal amplitude for all waves.
                    eastward: amplitude * libm::sin(heading),
                    northward: -amplitude * libm::cos(heading),
                }
            })
            .collect();
        let scale_m_s = settings.median_wind_m_s / libm::pow(std::f64::consts::LN_2, 1.0 / settings.weibull_shape);
        Self { waves, fronts: fronts(settings, seed, hours), scale_m_s, shape: settings.weibull_shape }
    }

    /// Prepares a place, km east and north of the origin.
    pub fn place(&self, x_km: f64, y_km: f64) -> Place {
        let sine_cosine = self
            .waves
            .iter()
            .map(|wave| libm::sincos(wave.along_x * x_km + wave.along_y * y_km + wave.phase))
            .collect();
        Place { x_km, y_km, sine_cosine }
    }

    /// Prepares an instant, hours since the start.
    pub fn moment(&self, time_h: f64) -> Moment {
        Moment { time_h, sine_cosine: self.waves.iter().map(|wave| libm::sincos(wave.per_hour * time_h)).collect() }
    }

    /// Wind components (m/s, towards east and towards north) at a place and an instant.
    pub fn wind_m_s(&self, place: &Place, moment: &Moment) -> (f64, f64) {
        let (mut eastward, mut northward) = (0.0, 0.0);
        for ((wave, (place_sine, place_cosine)), (time_sine, time_cosine)) in
            self.waves.iter().zip(&place.sine_cosine).zip(&moment.sine_cosine)
        {
            // sin(place - time).
            let sine = place_sine * time_cosine - place_cosine * time_sine;
            eastward += wave.eastward * sine;
            northward += wave.northward * sine;
        }
        let length = libm::hypot(eastward, northward);
        if length < 1e-9 {
            return (0.0, 0.0);
        }
        let speed_m_s = self.scale_m_s * libm::pow(0.5 * length * length, 1.0 / self.shape);
        let near = |front: &&Front| {
            let since_h = moment.time_h - front.at_h - front.delay_x * place.x_km - front.delay_y * place.y_km;
            since_h.abs() < 8.0 * FRONT_MEMORY_H
        };
        let turn: f64 =
            self.fronts.iter().filter(near).map(|front| front.turn(place.x_km, place.y_km, moment.time_h)).sum();
        let (sine, cosine) = libm::sincos(turn);
        let factor = speed_m_s / length;
        // Clockwise.
        (factor * (eastward * cosine + northward * sine), factor * (northward * cosine - eastward * sine))
    }
}

fn fronts(settings: &Settings, seed: u64, hours: f64) -> Vec<Front> {
    let mut fronts = Vec::new();
    if settings.front_gap_h <= 0.0 {
        return fronts;
    }
    let mut stream = Stream::new(seed, purpose::FRONTS, 0, 0);
    let mut at_h = -FRONT_MEMORY_H;
    loop {
        at_h += stream.exponential(settings.front_gap_h);
        if at_h > hours + FRONT_MEMORY_H {
            return fronts;
        }
        // They come from the western half of the compass.
        let heading = PI / 3.0 * (2.0 * stream.uniform() - 1.0);
        let pace_km_h = 30.0 + 20.0 * stream.uniform();
        let veer = (40.0 + 60.0 * stream.uniform()).to_radians();
        fronts.push(Front {
            at_h,
            delay_x: libm::cos(heading) / pace_km_h,
            delay_y: libm::sin(heading) / pace_km_h,
            veer,
        });
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn speeds(weather: &Weather, hours: usize) -> Vec<f64> {
        let place = weather.place(50.0, -20.0);
        (0..hours)
            .map(|hour| {
                let (eastward, northward) = weather.wind_m_s(&place, &weather.moment(hour as f64));
                eastward.hypot(northward)
            })
            .collect()
    }

    // Closed form: a Weibull quantile is scale (-ln(1 - q))^(1/shape).
    #[test]
    fn the_wind_speed_has_the_distribution_that_was_asked_for() {
        let settings =
            Settings { median_wind_m_s: 8.0, weibull_shape: 2.2, wind_time_scale_h: 12.0, ..Settings::default() };
        let mut speeds: Vec<f64> =
            (0..6).flat_map(|seed| speeds(&Weather::invent(&settings, seed, 9000.0), 9000)).collect();
        speeds.sort_unstable_by(f64::total_cmp);
        let scale = 8.0 / 2f64.ln().powf(1.0 / 2.2);
        for q in [0.1, 0.5, 0.9, 0.99] {
            let (found, expected) =
                (speeds[(q * speeds.len() as f64) as usize], scale * (-(1.0 - q).ln()).powf(1.0 / 2.2));
            assert!((found / expected - 1.0).abs() < 0.1, "{q}: {found} {expected}");
        }
    }

    #[test]
    fn the_wind_is_continuous_and_a_front_turns_it_without_a_change_of_speed() {
        let settings = Settings { front_gap_h: 48.0, ..Settings::default() };
        let (with, without) = (
            Weather::invent(&settings, 4, 2000.0),
            Weather::invent(&Settings { front_gap_h: 0.0, ..settings }, 4, 2000.0),
        );
        let mut most_turn = 0f64;
        for minute in 0..20_000 {
            let moment = with.moment(f64::from(minute) / 10.0);
            let later = with.moment(f64::from(minute) / 10.0 + 1e-4);
            let place = with.place(10.0, 10.0);
            let (a, b, c) =
                (with.wind_m_s(&place, &moment), without.wind_m_s(&place, &moment), with.wind_m_s(&place, &later));
            assert!((a.0.hypot(a.1) - b.0.hypot(b.1)).abs() < 1e-9);
            assert!((a.0 - c.0).abs() < 0.05 && (a.1 - c.1).abs() < 0.05, "{minute}");
            most_turn = most_turn.max((a.0 * b.1 - a.1 * b.0).atan2(a.0 * b.0 + a.1 * b.1).abs());
        }
        assert!(most_turn > 0.3, "{most_turn}");
    }

    #[test]
    fn neighbours_have_nearly_the_same_wind() {
        let weather = Weather::invent(&Settings::default(), 7, 1000.0);
        let (here, there) = (weather.place(0.0, 0.0), weather.place(20.0, 0.0));
        let (mut difference, mut size) = (0.0, 0.0);
        for hour in 0..1000 {
            let moment = weather.moment(f64::from(hour));
            let (a, b) = (weather.wind_m_s(&here, &moment), weather.wind_m_s(&there, &moment));
            difference += (a.0 - b.0).powi(2) + (a.1 - b.1).powi(2);
            size += a.0 * a.0 + a.1 * a.1;
        }
        assert!(difference / size < 0.02, "{}", difference / size);
    }
}
