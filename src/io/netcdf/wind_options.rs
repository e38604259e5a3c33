//! What a study adds to what wind files say of themselves.

/// The sense of a direction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DirectionSense {
    /// Where the wind comes from.
    From,
    /// Where it goes to.
    To,
}

/// All that a study can say about gridded wind. Whatever is `None` is taken from the files or asked for.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct WindOptions {
    /// Variable of the component towards the east.
    pub eastward: Option<String>,
    /// Variable of the component towards the north.
    pub northward: Option<String>,
    /// Variable of the speed.
    pub speed: Option<String>,
    /// Variable of the direction.
    pub direction: Option<String>,
    /// Sense of the direction.
    pub direction_sense: Option<DirectionSense>,
    /// Whether components are along the grid's axes (true) or towards east and north (false).
    pub grid_relative: Option<bool>,
    /// Unit of speed or components: "m/s", "knots", "km/h".
    pub units: Option<String>,
    /// Height to choose, m.
    pub height_m: Option<f64>,
    /// Ensemble member to choose.
    pub member: Option<i64>,
    /// Time variable or dimension.
    pub time: Option<String>,
    /// Time units, such as "hours since 1900-01-01".
    pub time_units: Option<String>,
    /// Calendar by its CF name.
    pub calendar: Option<String>,
    /// Latitude variable.
    pub latitude: Option<String>,
    /// Longitude variable.
    pub longitude: Option<String>,
    /// Steps farther apart than this are a gap, ms; `None`: twice the usual step.
    pub max_gap_ms: Option<i64>,
}

/// What one unit of a speed is in m/s. `None` for what is no unit of speed.
pub(super) fn speed_unit_m_s(text: &str) -> Option<f64> {
    let plain: String = text.trim().to_lowercase().replace("**", "").replace('^', "");
    let plain = plain.split([' ', '.', '·', '*']).filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ");
    match plain.as_str() {
        "m s-1" | "m/s" | "m / s" | "ms-1" | "m sec-1" | "m/sec" | "meter/second" | "metre/second"
        | "meters/second" | "metres/second" | "meters per second" | "metres per second" | "meter second-1"
        | "metre second-1" | "meter s-1" | "metre s-1" | "mps" => Some(1.0),
        // One international knot is 1852 m an hour, exactly.
        "knot" | "knots" | "kt" | "kts" | "kn" => Some(1852.0 / 3600.0),
        "km/h" | "km h-1" | "kmh" | "km hr-1" | "km/hr" | "kph" | "kilometer/hour" | "kilometre/hour" => {
            Some(1.0 / 3.6)
        }
        "mph" | "mile/hour" | "miles per hour" => Some(0.447_04),
        "cm s-1" | "cm/s" => Some(0.01),
        _ => None,
    }
}
