//! Axes: from values to pixels, and which ticks to label.

use super::font::{self, Weight};
use super::number;

/// Size of tick labels, pixels.
pub(crate) const TICK_SIZE: f64 = 11.0;
/// Least free room between two tick labels along a horizontal axis, pixels.
const LABEL_GAP: f64 = 9.0;
/// Least distance of labelled ticks along a vertical axis, pixels.
const ROW_GAP: f64 = 26.0;
/// A range so empty or strange that no more ticks than this make sense.
const MOST_TICKS: f64 = 60.0;

/// How values map to lengths.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    Linear,
    Log,
}

/// How tick numbers are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Labels {
    Plain,
    /// 1000 as `1k`, for frequencies.
    Kilo,
}

/// A labelled tick.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Tick {
    pub value: f64,
    pub label: String,
}

/// One axis of a panel: `low` is drawn at `from`, `high` at `to` (pixels; `to` may be less than `from`).
#[derive(Debug, Clone)]
pub(crate) struct Axis {
    pub kind: Kind,
    pub low: f64,
    pub high: f64,
    pub from: f64,
    pub to: f64,
    pub ticks: Vec<Tick>,
    /// Unlabelled small ticks.
    pub minor: Vec<f64>,
}

impl Axis {
    /// A linear axis; without ticks when an end is not finite (no data). A vertical one is known by `to < from`.
    pub(crate) fn linear(low: f64, high: f64, from: f64, to: f64) -> Self {
        let known = low.is_finite() && high.is_finite();
        let (low, high) = usable(low, high);
        let ticks = if known { linear_ticks(low, high, from, to) } else { Vec::new() };
        Self { kind: Kind::Linear, low, high, from, to, ticks, minor: Vec::new() }
    }

    /// A logarithmic axis; both ends must be positive, else they are set to 1 and 10.
    pub(crate) fn log(low: f64, high: f64, from: f64, to: f64, labels: Labels) -> Self {
        let fine = low.is_finite() && high.is_finite() && low > 0.0 && high > low * (1.0 + 1e-9);
        let (low, high) = if fine { (low, high) } else { (1.0, 10.0) };
        let mut axis = Self { kind: Kind::Log, low, high, from, to, ticks: Vec::new(), minor: Vec::new() };
        axis.minor = log_values(low, high, &[1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0], 1);
        if axis.minor.len() > 60 {
            axis.minor = log_values(low, high, &[1.0], 1);
        }
        axis.ticks = axis.choose_log_ticks(labels);
        axis
    }

    /// A linear axis with given ticks, for hours, directions and dates.
    pub(crate) fn with_ticks(low: f64, high: f64, from: f64, to: f64, ticks: Vec<Tick>) -> Self {
        let (low, high) = usable(low, high);
        Self { kind: Kind::Linear, low, high, from, to, ticks, minor: Vec::new() }
    }

    /// The pixel of a value; NaN when a log axis cannot show it.
    pub(crate) fn px(&self, value: f64) -> f64 {
        let share = match self.kind {
            Kind::Linear => (value - self.low) / (self.high - self.low),
            Kind::Log => {
                (libm::log10(value) - libm::log10(self.low)) / (libm::log10(self.high) - libm::log10(self.low))
            }
        };
        self.from + share * (self.to - self.from)
    }

    /// Whether the value lies on the axis.
    pub(crate) fn holds(&self, value: f64) -> bool {
        let slack = 1e-9 * (self.high - self.low).abs();
        value >= self.low - slack && value <= self.high + slack
    }

    /// The widest tick label, pixels.
    pub(crate) fn label_width(&self) -> f64 {
        self.ticks.iter().map(|t| label_width(&t.label)).fold(0.0, f64::max)
    }

    /// The densest set of round numbers whose labels do not touch.
    fn choose_log_ticks(&self, labels: Labels) -> Vec<Tick> {
        const SETS: [(&[f64], i32); 8] = [
            (&[1.0, 2.0, 3.0, 5.0, 7.0], 1),
            (&[1.0, 2.0, 5.0], 1),
            (&[1.0, 3.0], 1),
            (&[1.0], 1),
            (&[1.0], 2),
            (&[1.0], 3),
            (&[1.0], 5),
            (&[1.0], 10),
        ];
        for (mantissas, every) in SETS {
            let ticks: Vec<Tick> = log_values(self.low, self.high, mantissas, every)
                .into_iter()
                .map(|value| Tick { value, label: log_label(value, labels) })
                .collect();
            if self.fits(&ticks) {
                if ticks.len() >= 2 {
                    return ticks;
                }
                break;
            }
        }
        // Less than a factor of about two: round numbers of a linear scale, at their logarithmic places.
        let ticks = linear_ticks(self.low, self.high, self.from, self.to);
        if self.fits(&ticks) { ticks } else { ticks.into_iter().step_by(2).collect() }
    }

    fn fits(&self, ticks: &[Tick]) -> bool {
        let vertical = self.to < self.from;
        ticks.windows(2).all(|pair| {
            let apart = (self.px(pair[1].value) - self.px(pair[0].value)).abs();
            let needed = if vertical {
                TICK_SIZE + 3.0
            } else {
                f64::midpoint(label_width(&pair[0].label), label_width(&pair[1].label)) + LABEL_GAP
            };
            apart >= needed
        })
    }
}

/// The range of some values with a margin on both sides; NaN when there are none.
pub(crate) fn padded_range(values: impl Iterator<Item = f64>, margin: f64) -> (f64, f64) {
    let (low, high) = values
        .filter(|v| v.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| (low.min(v), high.max(v)));
    if low > high {
        return (f64::NAN, f64::NAN);
    }
    let (low, high) = usable(low, high);
    let pad = (high - low) * margin;
    (low - pad, high + pad)
}

/// The largest of 1, 2, 3, 5, 7 times a power of ten that is not above the value, or the smallest not below it.
pub(crate) fn round_log(value: f64, up: bool) -> f64 {
    let mut steps = log_values(value / 11.0, value * 11.0, &[1.0, 2.0, 3.0, 5.0, 7.0], 1);
    if up {
        steps.retain(|s| *s >= value * (1.0 - 1e-9));
        steps.first().copied().unwrap_or(value)
    } else {
        steps.retain(|s| *s <= value * (1.0 + 1e-9));
        steps.last().copied().unwrap_or(value)
    }
}

pub(crate) fn label_width(label: &str) -> f64 {
    font::width(label, TICK_SIZE, Weight::Regular)
}

/// A range with a positive, finite length.
fn usable(low: f64, high: f64) -> (f64, f64) {
    if !low.is_finite() || !high.is_finite() || !(high - low).is_finite() {
        return (0.0, 1.0);
    }
    let (low, high) = if low <= high { (low, high) } else { (high, low) };
    let least = 1e-6 * low.abs().max(high.abs()).max(1e-3);
    if high - low > least {
        return (low, high);
    }
    let half = if low.abs() < 1e-9 { 1.0 } else { (0.02 * low.abs()).max(0.5 * least).max(0.5) };
    (low - half, high + half)
}

fn linear_ticks(low: f64, high: f64, from: f64, to: f64) -> Vec<Tick> {
    let length = (to - from).abs();
    let vertical = to < from;
    let mut step = libm::pow(10.0, libm::floor(libm::log10((high - low) / MOST_TICKS)));
    for round in 0..40 {
        let decimals = (-libm::floor(libm::log10(step) + 1e-9)).clamp(0.0, 15.0) as usize;
        let first = libm::ceil(low / step - 1e-9);
        let last = libm::floor(high / step + 1e-9);
        let ticks: Vec<Tick> = if last - first > MOST_TICKS {
            Vec::new()
        } else {
            (0..=(last - first).max(-1.0) as i64)
                .map(|i| (first + i as f64) * step)
                .map(|value| Tick { value, label: number::tick(value, decimals) })
                .collect()
        };
        let spacing = length * step / (high - low);
        let widest = ticks.iter().map(|t| label_width(&t.label)).fold(0.0, f64::max);
        let needed = if vertical { ROW_GAP } else { (widest + LABEL_GAP + 6.0).max(36.0) };
        if spacing >= needed && last - first <= MOST_TICKS {
            return ticks;
        }
        step *= if round % 3 == 1 { 2.5 } else { 2.0 };
    }
    Vec::new()
}

/// Round numbers of a log scale from low to high.
fn log_values(low: f64, high: f64, mantissas: &[f64], every: i32) -> Vec<f64> {
    let (first, last) = (libm::floor(libm::log10(low)) as i32 - 1, libm::ceil(libm::log10(high)) as i32 + 1);
    let mut values = Vec::new();
    for exponent in first..=last {
        if exponent.rem_euclid(every) != 0 {
            continue;
        }
        for mantissa in mantissas {
            let value = mantissa * power_of_ten(exponent);
            if value >= low * (1.0 - 1e-9) && value <= high * (1.0 + 1e-9) {
                values.push(value);
            }
        }
    }
    values
}

/// Exact where an f64 can be.
fn power_of_ten(exponent: i32) -> f64 {
    if exponent >= 0 { libm::pow(10.0, f64::from(exponent)) } else { 1.0 / libm::pow(10.0, f64::from(-exponent)) }
}

fn log_label(value: f64, labels: Labels) -> String {
    if labels == Labels::Kilo && (1000.0..1e6).contains(&value) {
        return format!("{}k", number::fixed(value / 1000.0, 0));
    }
    let decimals = (-libm::floor(libm::log10(value) + 1e-9)).clamp(0.0, 15.0) as usize;
    number::tick(value, decimals)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(axis: &Axis) -> Vec<&str> {
        axis.ticks.iter().map(|t| t.label.as_str()).collect()
    }

    #[test]
    fn wind_axis_has_its_trade_labels() {
        let axis = Axis::log(1.0, 30.0, 60.0, 700.0, Labels::Plain);
        assert_eq!(labels(&axis), ["1", "2", "3", "5", "7", "10", "20", "30"]);
        assert!((axis.px(1.0) - 60.0).abs() < 1e-9 && (axis.px(30.0) - 700.0).abs() < 1e-9);
        assert!(axis.px(0.0).is_infinite() && axis.px(-1.0).is_nan());
    }

    #[test]
    fn frequency_axis_thins_out_with_room() {
        let wide = Axis::log(10.0, 50_000.0, 0.0, 640.0, Labels::Kilo);
        assert_eq!(labels(&wide), ["10", "20", "50", "100", "200", "500", "1k", "2k", "5k", "10k", "20k", "50k"]);
        let narrow = Axis::log(10.0, 50_000.0, 0.0, 120.0, Labels::Kilo);
        assert_eq!(labels(&narrow), ["10", "100", "1k", "10k"]);
        let huge = Axis::log(1e-9, 1e12, 0.0, 300.0, Labels::Plain);
        assert!(huge.ticks.len() > 2 && huge.ticks.len() < 12, "{:?}", labels(&huge));
    }

    #[test]
    fn linear_ticks_are_round_and_do_not_touch() {
        let axis = Axis::linear(42.3, 91.0, 300.0, 0.0);
        assert_eq!(labels(&axis), ["45", "50", "55", "60", "65", "70", "75", "80", "85", "90"]);
        assert_eq!(labels(&Axis::linear(-0.3, 0.31, 100.0, 0.0)), ["−0.2", "0.0", "0.2"]);
        for (low, high) in [(0.0, 1.0), (-1e9, 1e9), (1e-9, 3e-9), (5.0, 5.0), (0.0, 1e300)] {
            let axis = Axis::linear(low, high, 0.0, 300.0);
            assert!((2..20).contains(&axis.ticks.len()), "{low} {high}: {:?}", labels(&axis));
            for pair in axis.ticks.windows(2) {
                let room = axis.px(pair[1].value) - axis.px(pair[0].value);
                assert!(room > f64::midpoint(label_width(&pair[0].label), label_width(&pair[1].label)));
            }
        }
    }

    #[test]
    fn a_short_log_axis_still_has_labels() {
        let axis = Axis::log(8.0, 9.5, 0.0, 300.0, Labels::Plain);
        assert!(axis.ticks.len() >= 2, "{:?}", labels(&axis));
        assert!(axis.ticks.iter().all(|t| axis.holds(t.value)));
    }

    #[test]
    fn ranges_and_rounding() {
        assert!(padded_range([f64::NAN].into_iter(), 0.1).0.is_nan());
        assert!(Axis::linear(f64::NAN, f64::NAN, 0.0, 100.0).ticks.is_empty());
        assert_eq!(padded_range([1.0, 3.0].into_iter(), 0.5), (0.0, 4.0));
        let (low, high) = padded_range([60.0].into_iter(), 0.0);
        assert!(low < 60.0 && high > 60.0);
        assert!((round_log(0.6, false) - 0.5).abs() < 1e-12 && (round_log(21.0, true) - 30.0).abs() < 1e-9);
        assert!((round_log(10.0, true) - 10.0).abs() < 1e-9);
    }
}
