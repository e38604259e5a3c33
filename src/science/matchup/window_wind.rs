//! The wind in a window: the mean over [start, end) of the series that is linear between model steps.
//!
//! Components: exact (trapezoids). Speed: exact as well. Between two steps the vector runs along a straight line, so its
//! length is `sqrt(A (t - t0)^2 + C)`, whose integral is elementary:
//! `1/2 [ s sqrt(A s^2 + C) + C/sqrt(A) asinh(s sqrt(A/C)) ]`, with `s = t - t0`, `A` the squared rate of change, `C` the
//! squared distance of the line from calm (any table of integrals). No quadrature step has to be chosen.
//! A window of length zero is the instant.

use crate::model::{Conditions, Flag, FlagSet, Missing, Sampled, WindSeries, WindowWind};
use crate::units::{Instant, Window};

/// Wind over each of a site's windows.
pub fn wind_over_windows(series: &WindSeries, windows: &[Window]) -> Conditions {
    let valid = ValidSteps::of(series);
    let mut conditions = Conditions::empty(series.source.clone(), series.site.clone(), windows.len());
    conditions.nearest_node_km = series.nodes.iter().map(|node| node.distance_km).fold(f64::NAN, f64::min);
    for (k, window) in windows.iter().enumerate() {
        let sampled = valid.mean(*window);
        conditions.flags[k] = sampled.flags();
        conditions.missing[k] = sampled.missing();
        conditions.wind[k] = sampled.value().copied();
    }
    conditions
}

/// Wind in one window.
pub fn wind_in_window(series: &WindSeries, window: Window) -> Sampled<WindowWind> {
    ValidSteps::of(series).mean(window)
}

/// Wind at an instant: linear between steps.
pub fn wind_at(series: &WindSeries, instant: Instant) -> Sampled<WindowWind> {
    wind_in_window(series, Window { start: instant, end: instant })
}

/// The steps of a series that have a value.
struct ValidSteps<'a> {
    series: &'a WindSeries,
    has_components: bool,
    /// Indices into the series.
    index: Vec<usize>,
}

/// Integrals over a span of time, in m/s times s.
#[derive(Default, Clone, Copy)]
struct Integrals {
    eastward: f64,
    northward: f64,
    speed: f64,
    scalar_speed: f64,
}

impl<'a> ValidSteps<'a> {
    fn of(series: &'a WindSeries) -> Self {
        let has_components = series.has_components();
        let index = (0..series.steps.len())
            .filter(|&k| {
                if has_components {
                    series.eastward_m_s[k].is_finite() && series.northward_m_s[k].is_finite()
                } else {
                    series.scalar_speed_m_s[k].is_finite()
                }
            })
            .collect();
        Self { series, has_components, index }
    }

    fn time(&self, position: usize) -> Instant {
        self.series.steps[self.index[position]]
    }

    /// Position of the last valid step at or before the instant.
    fn at_or_before(&self, instant: Instant) -> Option<usize> {
        self.index.partition_point(|&k| self.series.steps[k] <= instant).checked_sub(1)
    }

    /// Why there is nothing here: the reason of a missing step in or beside the window, else the gap or the end of the series.
    fn reason(&self, window: Window, otherwise: Missing) -> Missing {
        let steps = &self.series.steps;
        let from = steps.partition_point(|step| *step <= window.start).saturating_sub(1);
        let to = (steps.partition_point(|step| *step < window.end) + 1).min(steps.len());
        let inside_time =
            steps.first().is_some_and(|s| *s <= window.start) && steps.last().is_some_and(|s| *s >= window.end);
        if !inside_time {
            return Missing::OutsideTime;
        }
        self.series.missing[from..to].iter().find_map(|why| *why).unwrap_or(otherwise)
    }

    fn mean(&self, window: Window) -> Sampled<WindowWind> {
        let (Some(first), Some(last)) = (self.at_or_before(window.start), self.index.len().checked_sub(1)) else {
            return Sampled::Missing(self.reason(window, Missing::OutsideTime));
        };
        if self.time(last) < window.end {
            return Sampled::Missing(self.reason(window, Missing::OutsideTime));
        }
        let mut flags = FlagSet::default();
        if window.length_ms() == 0 && self.time(first) == window.start {
            let k = self.index[first];
            return Sampled::with_flags(self.finish(self.value(k), 0.0), self.series.flags[k]);
        }
        let mut sum = Integrals::default();
        let mut longest_ms = 0;
        let mut position = first;
        loop {
            let (k0, k1) = (self.index[position], self.index[position + 1]);
            let step_ms = self.series.steps[k1].0 - self.series.steps[k0].0;
            if step_ms > self.series.max_gap_ms {
                return Sampled::Missing(self.reason(window, Missing::TimeGap));
            }
            if k1 - k0 > 1 {
                flags.insert(Flag::BridgedMissingStep);
            }
            flags = flags.union(self.series.flags[k0]).union(self.series.flags[k1]);
            longest_ms = longest_ms.max(step_ms);
            if window.length_ms() == 0 {
                let share = (window.start.0 - self.series.steps[k0].0) as f64 / step_ms as f64;
                return Sampled::with_flags(self.finish(self.between(k0, k1, share), longest_ms as f64 / 1e3), flags);
            }
            sum = self.add(sum, k0, k1, window);
            position += 1;
            if self.time(position) >= window.end {
                break;
            }
        }
        let length_s = window.length_ms() as f64 / 1e3;
        let mean = Integrals {
            eastward: sum.eastward / length_s,
            northward: sum.northward / length_s,
            speed: sum.speed / length_s,
            scalar_speed: sum.scalar_speed / length_s,
        };
        Sampled::with_flags(self.finish(mean, longest_ms as f64 / 1e3), flags)
    }

    fn value(&self, k: usize) -> Integrals {
        let (u, v, scalar) =
            (self.series.eastward_m_s[k], self.series.northward_m_s[k], self.series.scalar_speed_m_s[k]);
        let speed = if self.has_components { libm::hypot(u, v) } else { scalar };
        Integrals { eastward: u, northward: v, speed, scalar_speed: scalar }
    }

    fn between(&self, k0: usize, k1: usize, share: f64) -> Integrals {
        let (a, b) = (self.value(k0), self.value(k1));
        let mix = |x: f64, y: f64| x + share * (y - x);
        let (eastward, northward) = (mix(a.eastward, b.eastward), mix(a.northward, b.northward));
        let scalar_speed = mix(a.scalar_speed, b.scalar_speed);
        let speed = if self.has_components { libm::hypot(eastward, northward) } else { scalar_speed };
        Integrals { eastward, northward, speed, scalar_speed }
    }

    fn add(&self, sum: Integrals, k0: usize, k1: usize, window: Window) -> Integrals {
        let (t0, t1) = (self.series.steps[k0].0, self.series.steps[k1].0);
        let (from, to) = (t0.max(window.start.0), t1.min(window.end.0));
        let step_s = (t1 - t0) as f64 / 1e3;
        let length_s = (to - from) as f64 / 1e3;
        let a = self.between(k0, k1, (from - t0) as f64 / 1e3 / step_s);
        let b = self.between(k0, k1, (to - t0) as f64 / 1e3 / step_s);
        let trapezoid = |x: f64, y: f64| 0.5 * (x + y) * length_s;
        let speed = if self.has_components {
            length_of_line(a.eastward, a.northward, b.eastward, b.northward) * length_s
        } else {
            trapezoid(a.speed, b.speed)
        };
        Integrals {
            eastward: sum.eastward + trapezoid(a.eastward, b.eastward),
            northward: sum.northward + trapezoid(a.northward, b.northward),
            speed: sum.speed + speed,
            scalar_speed: sum.scalar_speed + trapezoid(a.scalar_speed, b.scalar_speed),
        }
    }

    fn finish(&self, mean: Integrals, step_bridged_s: f64) -> WindowWind {
        WindowWind {
            eastward_mean_m_s: mean.eastward,
            northward_mean_m_s: mean.northward,
            speed_mean_m_s: mean.speed,
            speed_of_mean_m_s: if self.has_components { libm::hypot(mean.eastward, mean.northward) } else { f64::NAN },
            scalar_speed_mean_m_s: mean.scalar_speed,
            step_bridged_s,
        }
    }
}

/// Mean length of a vector that runs at constant pace along the straight line from a to b.
fn length_of_line(au: f64, av: f64, bu: f64, bv: f64) -> f64 {
    let (du, dv) = (bu - au, bv - av);
    let rate = du * du + dv * dv;
    let (length_a, length_b) = (libm::hypot(au, av), libm::hypot(bu, bv));
    // A change too small to bend the length: the trapezoid is exact to rounding.
    if rate <= 1e-16 * length_a.max(length_b).powi(2) || rate == 0.0 {
        return 0.5 * (length_a + length_b);
    }
    let root = rate.sqrt();
    // Path parameter s runs from s0 to s0 + 1; s = 0 is the point nearest to calm, at the distance `near`.
    let s0 = (au * du + av * dv) / rate;
    let near = (au * dv - av * du).abs() / root;
    let primitive = |s: f64, length: f64| {
        let bent = if near > 0.0 { near * near / root * libm::asinh(s * root / near) } else { 0.0 };
        0.5 * (s * length + bent)
    };
    primitive(s0 + 1.0, length_b) - primitive(s0, length_a)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::SourceId;
    use crate::units::HOUR_MS;

    fn series(hours: &[f64], u: &[f64], v: &[f64]) -> WindSeries {
        WindSeries {
            source: SourceId("model".into()),
            site: "A".into(),
            steps: hours.iter().map(|h| Instant((h * HOUR_MS as f64) as i64)).collect(),
            eastward_m_s: u.to_vec(),
            northward_m_s: v.to_vec(),
            scalar_speed_m_s: u.iter().zip(v).map(|(u, v)| u.hypot(*v)).collect(),
            flags: vec![FlagSet::default(); u.len()],
            missing: u.iter().map(|u| u.is_nan().then_some(Missing::LandOrMissing)).collect(),
            nodes: Vec::new(),
            height_m: Some(10.0),
            max_gap_ms: 2 * HOUR_MS,
        }
    }

    fn hours(start: f64, end: f64) -> Window {
        let ms = |hours: f64| Instant((hours * HOUR_MS as f64) as i64);
        Window { start: ms(start), end: ms(end) }
    }

    #[test]
    fn a_wind_through_calm_averages_to_half_its_end_speed() {
        // u from -8 to 8 m/s along a line through calm: mean speed 4, speed of the mean 0 (closed form).
        let wind = wind_in_window(&series(&[0.0, 1.0], &[-8.0, 8.0], &[0.0, 0.0]), hours(0.0, 1.0));
        let wind = wind.value().unwrap();
        assert!((wind.speed_mean_m_s - 4.0).abs() < 1e-12);
        assert!(wind.speed_of_mean_m_s.abs() < 1e-12 && wind.eastward_mean_m_s.abs() < 1e-12);
    }

    #[test]
    fn a_turning_wind_has_the_closed_form_of_a_hyperbola() {
        // From (3, 3) to (3, -3): speed 3 sqrt(1 + s^2), s from 1 to -1; mean = 3/2 (sqrt 2 + asinh 1).
        let expected = 1.5 * (2f64.sqrt() + 1f64.asinh());
        let wind = wind_in_window(&series(&[0.0, 1.0], &[3.0, 3.0], &[3.0, -3.0]), hours(0.0, 1.0));
        assert!((wind.value().unwrap().speed_mean_m_s - expected).abs() < 1e-12);
    }

    #[test]
    fn components_over_a_part_of_three_steps_are_exact() {
        // u = t on [0, 1], 1 + 3 (t - 1) on [1, 2]; integral from 0.5 to 1.5 = 0.375 + 0.875 = 1.25.
        let wind = wind_in_window(&series(&[0.0, 1.0, 2.0], &[0.0, 1.0, 4.0], &[0.0; 3]), hours(0.5, 1.5));
        assert!((wind.value().unwrap().eastward_mean_m_s - 1.25).abs() < 1e-12);
    }

    #[test]
    fn a_window_of_length_zero_is_the_instant() {
        let wind = wind_in_window(&series(&[0.0, 1.0], &[0.0, 4.0], &[2.0, 2.0]), hours(0.25, 0.25));
        let wind = wind.value().unwrap();
        assert!((wind.eastward_mean_m_s - 1.0).abs() < 1e-12 && (wind.speed_mean_m_s - 5f64.sqrt()).abs() < 1e-12);
    }

    #[test]
    fn gaps_longer_than_the_limit_are_never_bridged_but_their_edges_answer() {
        let gappy = series(&[0.0, 1.0, 4.0, 5.0], &[1.0; 4], &[0.0; 4]);
        assert_eq!(wind_in_window(&gappy, hours(0.5, 1.5)).missing(), Some(Missing::TimeGap));
        assert!(wind_in_window(&gappy, hours(1.0, 1.0)).value().is_some());
        assert!(wind_in_window(&gappy, hours(0.0, 1.0)).value().is_some());
        assert_eq!(wind_in_window(&gappy, hours(4.5, 5.5)).missing(), Some(Missing::OutsideTime));
        assert_eq!(wind_in_window(&gappy, hours(-1.0, 0.5)).missing(), Some(Missing::OutsideTime));
    }

    #[test]
    fn a_missing_step_is_bridged_with_a_flag_or_named() {
        let masked = series(&[0.0, 1.0, 2.0, 3.0], &[1.0, f64::NAN, 3.0, 3.0], &[0.0, f64::NAN, 0.0, 0.0]);
        let wind = wind_in_window(&masked, hours(0.5, 1.5));
        assert!(wind.flags().has(Flag::BridgedMissingStep));
        assert!((wind.value().unwrap().eastward_mean_m_s - 2.0).abs() < 1e-12);
        let long = series(&[0.0, 1.0, 2.0, 3.0], &[1.0, f64::NAN, f64::NAN, 3.0], &[0.0, f64::NAN, f64::NAN, 0.0]);
        assert_eq!(wind_in_window(&long, hours(0.5, 1.5)).missing(), Some(Missing::LandOrMissing));
    }

    #[test]
    fn a_source_without_direction_gives_speed_alone() {
        let mut speed_only = series(&[0.0, 1.0], &[f64::NAN; 2], &[f64::NAN; 2]);
        speed_only.scalar_speed_m_s = vec![4.0, 8.0];
        speed_only.missing = vec![None; 2];
        let wind = wind_in_window(&speed_only, hours(0.0, 1.0));
        let wind = wind.value().unwrap();
        assert!((wind.speed_mean_m_s - 6.0).abs() < 1e-12 && wind.speed_of_mean_m_s.is_nan());
    }

    proptest::proptest! {
        #[test]
        fn the_closed_form_agrees_with_a_fine_sum(au in -20.0..20.0f64, av in -20.0..20.0f64, bu in -20.0..20.0f64, bv in -20.0..20.0f64) {
            let n = 20_000;
            let sum: f64 = (0..n).map(|k| {
                let s = (f64::from(k) + 0.5) / f64::from(n);
                (au + s * (bu - au)).hypot(av + s * (bv - av))
            }).sum::<f64>() / f64::from(n);
            proptest::prop_assert!((length_of_line(au, av, bu, bv) - sum).abs() < 1e-6);
        }
    }
}
