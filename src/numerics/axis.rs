//! Coordinate axes of a grid: any order, any turn of longitude, the seam of a periodic axis.

/// A coordinate axis in increasing order, with the place of each value in its file.
#[derive(Debug, Clone, PartialEq)]
pub struct Axis {
    values: Vec<f64>,
    stored: Vec<usize>,
    period: Option<f64>,
}

/// Where a coordinate falls on an axis: two neighbours and the share of the second, 0 to 1. Both are the same node with
/// share 0 when the coordinate is a node's.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bracket {
    /// Stored index of the node at or before the coordinate.
    pub before: usize,
    /// Stored index of the node after it.
    pub after: usize,
    /// Share of the second.
    pub share: f64,
}

/// Why numbers are no axis.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum AxisError {
    /// No value at all.
    #[error("it has no values")]
    Empty,
    /// A value that is missing or infinite.
    #[error("value {index} is {value}; expected a finite number")]
    NotFinite {
        /// Place, from 0.
        index: usize,
        /// The value.
        value: f64,
    },
    /// A value twice.
    #[error("the value {value} is there twice")]
    Repeated {
        /// The value.
        value: f64,
    },
    /// Values that rise and fall.
    #[error("its values neither rise nor fall throughout (near value {index}, {value})")]
    NotMonotone {
        /// Place, from 0.
        index: usize,
        /// The value.
        value: f64,
    },
}

/// Steps of a periodic axis may differ from the seam by this share: float32 coordinates are rounded.
const SEAM_TOLERANCE: f64 = 0.01;

/// Node positions are recognised to this share of the local step: coordinates in float32 differ from their decimal text.
const NODE_TOLERANCE: f64 = 1e-9;

impl Axis {
    /// A plain axis; the values may rise or fall, in uneven steps.
    ///
    /// # Errors
    /// When there are no values, or they are not finite or not monotone.
    pub fn linear(stored: &[f64]) -> Result<Self, AxisError> {
        check_finite(stored)?;
        let falling = stored.len() > 1 && stored[1] < stored[0];
        let (values, order): (Vec<f64>, Vec<usize>) = if falling {
            (stored.iter().rev().copied().collect(), (0..stored.len()).rev().collect())
        } else {
            (stored.to_vec(), (0..stored.len()).collect())
        };
        check_rising(&values)?;
        Ok(Self { values, stored: order, period: None })
    }

    /// An axis of longitudes in degrees: unwrapped by turns of 360, periodic where its steps close the circle, and without
    /// a column that is stored twice (0 and 360).
    ///
    /// # Errors
    /// When there are no values, or they are not finite or not monotone even after unwrapping.
    pub fn longitude(stored: &[f64]) -> Result<Self, AxisError> {
        check_finite(stored)?;
        let mut unwrapped: Vec<f64> = Vec::with_capacity(stored.len());
        for value in stored {
            // From column to column the short way: a jump of more than half the circle is a seam.
            let next = match unwrapped.last() {
                Some(before) if (value - before).abs() > 180.0 => {
                    before + (value - before + 180.0).rem_euclid(360.0) - 180.0
                }
                _ => *value,
            };
            unwrapped.push(next);
        }
        let mut axis = Self::linear(&unwrapped)?;
        let count = axis.values.len();
        if count > 2 {
            let span = axis.values[count - 1] - axis.values[0];
            let step = span / (count - 1) as f64;
            if (span - 360.0).abs() <= SEAM_TOLERANCE * step {
                axis.values.pop();
                axis.stored.pop();
                axis.period = Some(360.0);
            } else if (360.0 - span - step).abs() <= SEAM_TOLERANCE * step {
                axis.period = Some(360.0);
            }
        }
        Ok(axis)
    }

    /// Least and greatest value.
    pub fn limits(&self) -> (f64, f64) {
        (self.values[0], self.values[self.values.len() - 1])
    }

    /// Number of nodes.
    pub fn len(&self) -> usize {
        self.values.len()
    }

    /// Whether there is no node; never so for an axis that was made.
    pub fn is_empty(&self) -> bool {
        self.values.is_empty()
    }

    /// Whether the axis closes on itself.
    pub fn is_periodic(&self) -> bool {
        self.period.is_some()
    }

    /// The coordinate of a node, by its stored index.
    pub fn value_at(&self, stored: usize) -> Option<f64> {
        // Values are kept in the stored order or in its reverse, so the place follows from the ends.
        let first = self.stored[0];
        let place = if self.stored[self.stored.len() - 1] >= first {
            stored.checked_sub(first)?
        } else {
            first.checked_sub(stored)?
        };
        self.values.get(place).copied()
    }

    /// Stored index and coordinate of every node, in increasing order of the coordinate.
    pub fn nodes(&self) -> impl DoubleEndedIterator<Item = (usize, f64)> + '_ {
        self.stored.iter().copied().zip(self.values.iter().copied())
    }

    /// The nodes whose coordinate is between two values, both included.
    pub fn between(&self, low: f64, high: f64) -> impl Iterator<Item = (usize, f64)> + '_ {
        let from = self.values.partition_point(|value| *value < low);
        let to = self.values.partition_point(|value| *value <= high).max(from);
        self.stored[from..to].iter().copied().zip(self.values[from..to].iter().copied())
    }

    /// The nodes of an axis of longitudes that are within so many degrees of a longitude, on whichever turn.
    pub fn around_longitude(&self, longitude_deg: f64, degrees: f64) -> Vec<(usize, f64)> {
        if degrees >= 180.0 {
            return self.nodes().collect();
        }
        let (low, high) = self.limits();
        let first = ((low - degrees - longitude_deg) / 360.0).ceil() as i64;
        let last = ((high + degrees - longitude_deg) / 360.0).floor() as i64;
        (first..=last)
            .map(|turn| longitude_deg + 360.0 * turn as f64)
            .flat_map(|centre| self.between(centre - degrees, centre + degrees))
            .collect()
    }

    /// Where a coordinate falls; `None` outside the axis.
    pub fn bracket(&self, coordinate: f64) -> Option<Bracket> {
        let count = self.values.len();
        let after = self.values.partition_point(|value| *value <= coordinate);
        let node = |k: usize| Bracket { before: self.stored[k], after: self.stored[k], share: 0.0 };
        // Rounding in the last digit of a coordinate does not make it another place.
        for k in [after.saturating_sub(1), after.min(count - 1)] {
            if (self.values[k] - coordinate).abs() <= NODE_TOLERANCE * self.local_step(k) {
                return Some(node(k));
            }
        }
        if after == 0 || after == count {
            let period = self.period?;
            let (last, first) = (count - 1, 0);
            let from = if after == 0 { self.values[last] - period } else { self.values[last] };
            let to = if after == 0 { self.values[first] } else { self.values[first] + period };
            let share = (coordinate - from) / (to - from);
            return ((0.0..=1.0).contains(&share)).then_some(Bracket {
                before: self.stored[last],
                after: self.stored[first],
                share,
            });
        }
        let (from, to) = (self.values[after - 1], self.values[after]);
        Some(Bracket {
            before: self.stored[after - 1],
            after: self.stored[after],
            share: (coordinate - from) / (to - from),
        })
    }

    /// Where a longitude falls, whichever turn it is given in.
    pub fn bracket_longitude(&self, longitude_deg: f64) -> Option<Bracket> {
        let (low, high) = self.limits();
        let first = low + (longitude_deg - low).rem_euclid(360.0);
        // The turn just below serves longitudes at the axis' first node that rounding put a turn above it.
        [first, first - 360.0, first + 360.0]
            .into_iter()
            .filter(|candidate| *candidate >= low - 1.0 && (self.is_periodic() || *candidate <= high + 1.0))
            .find_map(|candidate| self.bracket(candidate))
    }

    fn local_step(&self, k: usize) -> f64 {
        match (k.checked_sub(1).map(|b| self.values[k] - self.values[b]), self.values.get(k + 1)) {
            (Some(step), _) => step,
            (None, Some(next)) => next - self.values[k],
            (None, None) => 1.0,
        }
    }
}

fn check_finite(values: &[f64]) -> Result<(), AxisError> {
    if values.is_empty() {
        return Err(AxisError::Empty);
    }
    match values.iter().position(|value| !value.is_finite()) {
        Some(index) => Err(AxisError::NotFinite { index, value: values[index] }),
        None => Ok(()),
    }
}

fn check_rising(values: &[f64]) -> Result<(), AxisError> {
    for (index, pair) in values.windows(2).enumerate() {
        if pair[0].total_cmp(&pair[1]).is_eq() {
            return Err(AxisError::Repeated { value: pair[0] });
        }
        if pair[0] > pair[1] {
            return Err(AxisError::NotMonotone { index: index + 1, value: pair[1] });
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(bracket: Option<Bracket>, before: usize, after: usize, share: f64) {
        let bracket = bracket.expect("inside");
        assert_eq!((bracket.before, bracket.after), (before, after), "{bracket:?}");
        assert!((bracket.share - share).abs() < 1e-9, "{bracket:?}");
    }

    #[test]
    fn a_falling_axis_keeps_its_stored_places() {
        let axis = Axis::linear(&[52.6, 52.35, 51.0]).unwrap();
        close(axis.bracket(52.0), 2, 1, 1.0 / 1.35);
        assert!(axis.bracket(53.0).is_none());
        close(axis.bracket(52.6), 0, 0, 0.0);
    }

    #[test]
    fn the_seam_of_a_periodic_axis_is_a_cell_like_any_other() {
        let axis = Axis::longitude(&(0..36).map(|k| f64::from(k) * 10.0).collect::<Vec<_>>()).unwrap();
        assert!(axis.is_periodic());
        close(axis.bracket_longitude(355.0), 35, 0, 0.5);
        close(axis.bracket_longitude(-5.0), 35, 0, 0.5);
        close(axis.bracket_longitude(720.0), 0, 0, 0.0);
    }

    #[test]
    fn a_column_stored_twice_is_one_column() {
        let axis = Axis::longitude(&(0..=36).map(|k| f64::from(k) * 10.0).collect::<Vec<_>>()).unwrap();
        assert_eq!(axis.len(), 36);
        close(axis.bracket_longitude(357.5), 35, 0, 0.75);
    }

    #[test]
    fn a_regional_axis_is_not_periodic() {
        let axis = Axis::longitude(&(0..=30).map(|k| f64::from(k) * 10.0).collect::<Vec<_>>()).unwrap();
        assert!(!axis.is_periodic());
        assert!(axis.bracket_longitude(330.0).is_none());
        assert!(axis.bracket_longitude(-20.0).is_none());
    }

    #[test]
    fn an_axis_across_the_antimeridian_is_unwrapped() {
        let axis = Axis::longitude(&[178.0, 179.0, -180.0, -179.0]).unwrap();
        close(axis.bracket_longitude(179.5), 1, 2, 0.5);
        close(axis.bracket_longitude(-179.5), 2, 3, 0.5);
        close(axis.bracket_longitude(180.5), 2, 3, 0.5);
        let above = Axis::longitude(&[21.0, 200.0, 379.0]).unwrap();
        close(above.bracket_longitude(10.0), 1, 2, 170.0 / 179.0);
    }

    #[test]
    fn two_columns_across_the_seam_are_a_narrow_cell() {
        for stored in [[359.75, 0.0], [179.75, -180.0], [-180.0, 179.75]] {
            let axis = Axis::longitude(&stored).unwrap();
            let (low, high) = axis.limits();
            assert!((high - low - 0.25).abs() < 1e-9, "{stored:?}");
            assert!(axis.bracket_longitude(90.0).is_none(), "{stored:?}");
            assert!(axis.bracket_longitude(stored[0].max(stored[1]) + 0.1).is_some(), "{stored:?}");
        }
    }

    #[test]
    fn noise_of_float32_does_not_open_the_circle() {
        let stored: Vec<f64> = (0..1440).map(|k| f64::from((k as f32) * 0.25_f32 + 1e-5)).collect();
        assert!(Axis::longitude(&stored).unwrap().is_periodic());
    }

    #[test]
    fn nodes_around_a_longitude_are_found_on_every_turn() {
        let axis = Axis::longitude(&(0..36).map(|k| f64::from(k) * 10.0).collect::<Vec<_>>()).unwrap();
        let columns = |longitude, degrees| {
            let mut columns: Vec<usize> =
                axis.around_longitude(longitude, degrees).into_iter().map(|(column, _)| column).collect();
            columns.sort_unstable();
            columns
        };
        assert_eq!(columns(-2.0, 12.5), [0, 1, 35]);
        assert_eq!(columns(358.0, 12.5), [0, 1, 35]);
        assert_eq!(columns(95.0, 5.0), [9, 10]);
        assert_eq!(columns(95.0, 4.9), [0_usize; 0]);
        assert_eq!(columns(0.0, 180.0).len(), 36);
    }

    #[test]
    fn a_value_is_found_by_its_stored_index_whichever_way_the_axis_runs() {
        let falling = Axis::longitude(&[360.0, 240.0, 120.0, 0.0]).unwrap();
        assert_eq!((falling.len(), falling.value_at(0)), (3, None), "the column stored twice is dropped");
        assert_eq!((falling.value_at(1), falling.value_at(3), falling.value_at(4)), (Some(240.0), Some(0.0), None));
        let rising = Axis::linear(&[3.0, 4.0]).unwrap();
        assert_eq!((rising.value_at(0), rising.value_at(1), rising.value_at(2)), (Some(3.0), Some(4.0), None));
    }

    #[test]
    fn broken_axes_are_refused() {
        assert_eq!(Axis::linear(&[]), Err(AxisError::Empty));
        assert_eq!(Axis::linear(&[1.0, 1.0]), Err(AxisError::Repeated { value: 1.0 }));
        assert!(matches!(Axis::linear(&[1.0, 3.0, 2.0]), Err(AxisError::NotMonotone { .. })));
        assert!(matches!(Axis::linear(&[1.0, f64::NAN]), Err(AxisError::NotFinite { index: 1, .. })));
    }

    proptest::proptest! {
        #[test]
        fn a_full_turn_changes_nothing(longitude in -180.0..180.0f64, turns in -2i32..3) {
            let axis = Axis::longitude(&(0..72).map(|k| f64::from(k) * 5.0 - 180.0).collect::<Vec<_>>()).unwrap();
            let here = axis.bracket_longitude(longitude).unwrap();
            let there = axis.bracket_longitude(longitude + 360.0 * f64::from(turns)).unwrap();
            let at = |b: Bracket| (b.before as f64 * (1.0 - b.share) + if b.after < b.before { 72.0 } else { b.after as f64 } * b.share).rem_euclid(72.0);
            let apart = (at(here) - at(there)).abs();
            proptest::prop_assert!(apart < 1e-7 || (apart - 72.0).abs() < 1e-7);
        }
    }
}
