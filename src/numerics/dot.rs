//! Sums of products.

/// Sum of products in eight lanes: fast, and the same on every processor because the order of the additions is fixed. The
/// shorter slice counts.
#[inline]
pub fn dot(left: &[f64], right: &[f64]) -> f64 {
    let mut lanes = [0.0_f64; 8];
    let (left_chunks, left_rest) = left.as_chunks::<8>();
    let (right_chunks, right_rest) = right.as_chunks::<8>();
    for (a, b) in left_chunks.iter().zip(right_chunks) {
        for lane in 0..8 {
            lanes[lane] += a[lane] * b[lane];
        }
    }
    let rest: f64 = left_rest.iter().zip(right_rest).map(|(a, b)| a * b).sum();
    ((lanes[0] + lanes[4]) + (lanes[1] + lanes[5])) + ((lanes[2] + lanes[6]) + (lanes[3] + lanes[7])) + rest
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agrees_with_the_plain_sum() {
        let left: Vec<f64> = (0..29).map(f64::from).collect();
        let right: Vec<f64> = (0..29).map(|index| f64::from(index % 7) - 3.0).collect();
        let plain: f64 = left.iter().zip(&right).map(|(a, b)| a * b).sum();
        assert!((dot(&left, &right) - plain).abs() < 1e-12);
    }
}
