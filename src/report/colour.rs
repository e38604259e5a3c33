//! The colours of all figures. They are told apart by lightness as well as by hue, so that they hold for colour-blind
//! readers and on a grey printer; marks and dashes differ too.

/// Text, axes and marks.
pub(crate) const INK: &str = "#1c2b36";
/// Second-rank text and ticks.
pub(crate) const MUTED: &str = "#566570";
/// Axis lines.
pub(crate) const RULE: &str = "#8a979f";
/// Grid lines.
pub(crate) const HAIR: &str = "#e2e7ea";
/// Shaded periods and bands of no data.
pub(crate) const SHADE: &str = "#e9e4dc";
/// The fitted curve.
pub(crate) const CURVE: &str = "#b3430b";
/// The saturation onset.
pub(crate) const ONSET: &str = "#5b2a73";
/// The floor.
pub(crate) const FLOOR: &str = "#1c2b36";
/// White.
pub(crate) const PAPER: &str = "#ffffff";

/// Up to six series, each a different lightness (CIE L* 20, 41, 59, 69, 32, 81).
pub(crate) const SERIES: [&str; 6] = ["#39255b", "#b13420", "#549898", "#cba514", "#7b3545", "#b3d682"];

/// Counts from few to many: lightness falls steadily, and stays light enough for marks on top.
pub(crate) const RAMP: [&str; 8] =
    ["#e9f0f3", "#d6e4ea", "#c1d7e0", "#aac9d6", "#92bacb", "#79aabf", "#5f99b2", "#4587a4"];

/// Wind classes, calm to strong: lightness falls with the wind.
pub(crate) const CLASSES: [&str; 7] = ["#8fbf9f", "#5fa8a6", "#3f87a6", "#3a669c", "#43458a", "#4a2a6c", "#3b1440"];

/// The colour of a series by its place; repeats after six, where marks and names tell them apart.
pub(crate) fn series(index: usize) -> &'static str {
    SERIES[index % SERIES.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn linear(hex: &str) -> [f64; 3] {
        let value = u32::from_str_radix(&hex[1..], 16).unwrap();
        [value >> 16, value >> 8, value].map(|v| {
            let c = f64::from(v & 255) / 255.0;
            if c <= 0.04045 { c / 12.92 } else { libm::pow((c + 0.055) / 1.055, 2.4) }
        })
    }

    /// CIE 1976 L*a*b* of linear sRGB under D65 (IEC 61966-2-1, CIE 15).
    fn lab(rgb: [f64; 3]) -> [f64; 3] {
        let row = |a: f64, b: f64, c: f64, white: f64| {
            let t = (a * rgb[0] + b * rgb[1] + c * rgb[2]) / white;
            if t > 216.0 / 24389.0 { libm::cbrt(t) } else { (24389.0 / 27.0 * t + 16.0) / 116.0 }
        };
        let (x, y, z) = (
            row(0.412_456_4, 0.357_576_1, 0.180_437_5, 0.950_47),
            row(0.212_672_9, 0.715_152_2, 0.072_175, 1.0),
            row(0.019_333_9, 0.119_192, 0.950_304_1, 1.088_83),
        );
        [116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)]
    }

    fn apply(matrix: [[f64; 3]; 3], rgb: [f64; 3]) -> [f64; 3] {
        matrix.map(|row| (row[0] * rgb[0] + row[1] * rgb[1] + row[2] * rgb[2]).clamp(0.0, 1.0))
    }

    /// Severity 1.0 matrices of Machado, Oliveira and Fernandes, IEEE Trans. Vis. Comput. Graphics 15 (2009), as the
    /// general library colorspacious 1.1.2 gives them (`machado_et_al_2009_matrix`).
    const VISION: [[[f64; 3]; 3]; 4] = [
        [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
        [[0.152_286, 1.052_583, -0.204_868], [0.114_503, 0.786_281, 0.099_216], [-0.003_882, -0.048_116, 1.051_998]],
        [[0.367_322, 0.860_646, -0.227_968], [0.280_085, 0.672_501, 0.047_413], [-0.011_82, 0.042_94, 0.968_881]],
        [[1.255_528, -0.076_749, -0.178_779], [-0.078_411, 0.930_809, 0.147_602], [0.004_733, 0.691_367, 0.303_9]],
    ];

    #[test]
    fn series_stay_apart_for_every_kind_of_sight() {
        for matrix in VISION {
            for (i, a) in SERIES.iter().enumerate() {
                for b in &SERIES[..i] {
                    let (p, q) = (lab(apply(matrix, linear(a))), lab(apply(matrix, linear(b))));
                    let apart = ((p[0] - q[0]).powi(2) + (p[1] - q[1]).powi(2) + (p[2] - q[2]).powi(2)).sqrt();
                    // About 2.3 is just noticeable side by side (from memory); lines need far more.
                    assert!(apart > 25.0, "{a} and {b}: {apart:.1}");
                }
            }
        }
    }

    /// Curve, onset, floor and the cells beneath them.
    #[test]
    fn marks_of_one_figure_stay_apart_for_every_kind_of_sight() {
        for matrix in VISION {
            for (a, b) in [(CURVE, ONSET), (CURVE, FLOOR), (CURVE, RAMP[7]), (ONSET, RAMP[7]), (CURVE, RAMP[3])] {
                let (p, q) = (lab(apply(matrix, linear(a))), lab(apply(matrix, linear(b))));
                let apart = ((p[0] - q[0]).powi(2) + (p[1] - q[1]).powi(2) + (p[2] - q[2]).powi(2)).sqrt();
                assert!(apart > 20.0, "{a} and {b}: {apart:.1}");
            }
        }
    }

    #[test]
    fn series_and_ramp_stay_apart_in_grey() {
        let lightness = |hex: &&str| lab(linear(hex))[0];
        let mut series: Vec<f64> = SERIES.iter().map(lightness).collect();
        series.sort_by(f64::total_cmp);
        assert!(series.windows(2).all(|pair| pair[1] - pair[0] > 7.0), "{series:?}");
        let ramp: Vec<f64> = RAMP.iter().map(lightness).collect();
        assert!(ramp.windows(2).all(|pair| pair[0] - pair[1] > 3.0), "{ramp:?}");
        let classes: Vec<f64> = CLASSES.iter().map(lightness).collect();
        assert!(classes.windows(2).all(|pair| pair[0] - pair[1] > 5.0), "{classes:?}");
        // The curve stays visible on the darkest cell.
        assert!(ramp[7] - lightness(&CURVE) > 8.0);
    }
}
