//! Which variable is which: by standard name, then by units and meaning, then by the short names of the trade.

use super::error::NetcdfError;
use super::header::{Header, Variable};
use super::time_axis::looks_like_time;
use super::wind_options::WindOptions;

/// A quantity that is looked for.
pub(super) struct Role {
    pub(super) wanted: &'static str,
    pub(super) key: &'static str,
    pub(super) standard_names: &'static [&'static str],
    pub(super) short_names: &'static [&'static str],
    /// Short names that carry their height as a number: u10, u100.
    pub(super) numbered: &'static [&'static str],
    /// Words of a long name, all of which must be there.
    pub(super) long_words: &'static [&'static str],
}

pub(super) const EASTWARD: Role = Role {
    wanted: "the eastward wind",
    key: "wind.eastward",
    standard_names: &["eastward_wind", "x_wind", "grid_eastward_wind"],
    short_names: &[
        "u10",
        "10u",
        "u10m",
        "u10n",
        "uas",
        "uwnd",
        "ugrd",
        "ugrd10m",
        "ugrd_10maboveground",
        "xwnd",
        "u_10m",
        "u",
        "uwind",
    ],
    numbered: &["u", "u_"],
    long_words: &["metre u wind"],
};
pub(super) const NORTHWARD: Role = Role {
    wanted: "the northward wind",
    key: "wind.northward",
    standard_names: &["northward_wind", "y_wind", "grid_northward_wind"],
    short_names: &[
        "v10",
        "10v",
        "v10m",
        "v10n",
        "vas",
        "vwnd",
        "vgrd",
        "vgrd10m",
        "vgrd_10maboveground",
        "ywnd",
        "v_10m",
        "v",
        "vwind",
    ],
    numbered: &["v", "v_"],
    long_words: &["metre v wind"],
};
pub(super) const SPEED: Role = Role {
    wanted: "the wind speed",
    key: "wind.speed",
    standard_names: &["wind_speed"],
    short_names: &["wspd", "si10", "10si", "ws10", "wind", "sfcwind", "wind_speed", "windspeed", "ff", "wnd"],
    numbered: &["ws", "si", "wspd"],
    long_words: &["wind speed"],
};
pub(super) const DIRECTION: Role = Role {
    wanted: "the wind direction",
    key: "wind.direction",
    standard_names: &["wind_from_direction", "wind_to_direction"],
    short_names: &["wdir", "wd10", "wind_direction", "winddir", "dd", "wnddir"],
    numbered: &["wd", "wdir"],
    long_words: &["wind", "direction"],
};

/// Variables that could be a wind: numbers with at least a time or two dimensions, no coordinates.
fn fields(header: &Header) -> impl Iterator<Item = &Variable> {
    header.variables.iter().filter(|variable| {
        variable.number_type().is_some()
            && !variable.dimensions.is_empty()
            && (variable.dimensions.len() != 1 || header.dimensions[variable.dimensions[0]].name != variable.name)
            && !looks_like_time(variable)
    })
}

/// Names of the variables that could be a wind, for messages.
pub(super) fn candidates(header: &Header) -> String {
    let names: Vec<&str> = fields(header).map(|variable| variable.name.as_str()).collect();
    if names.is_empty() { "none".to_owned() } else { names.join(", ") }
}

impl Role {
    /// The variable of this role in a file, if there is one.
    pub(super) fn find<'a>(
        &self,
        header: &'a Header,
        named: Option<&str>,
        options: &WindOptions,
    ) -> Result<Option<&'a Variable>, NetcdfError> {
        if let Some(name) = named {
            return Ok(header.variable(name));
        }
        let standard: Vec<&Variable> = fields(header)
            .filter(|variable| variable.text("standard_name").is_some_and(|name| self.standard_names.contains(&name)))
            .collect();
        let found = if standard.is_empty() {
            fields(header).filter(|variable| !is_something_else(variable) && self.is_named(variable)).collect()
        } else {
            standard
        };
        match found[..] {
            [] => Ok(None),
            [one]
                if options.height_m.is_none() || height_in_name_m(one).is_none_or(|m| Some(m) == options.height_m) =>
            {
                Ok(Some(one))
            }
            _ => self.of_height(header, &found, options).map(Some),
        }
    }

    /// Whether a variable has one of the role's short names or its long name.
    fn is_named(&self, variable: &Variable) -> bool {
        let name = variable.name.to_lowercase();
        let long = variable.text("long_name").unwrap_or_default().to_lowercase();
        let numbered = self.numbered.iter().any(|start| {
            let number = name.strip_prefix(start).map(|rest| rest.trim_end_matches('m'));
            number.is_some_and(|number| !number.is_empty() && number.bytes().all(|byte| byte.is_ascii_digit()))
        });
        numbered
            || self.short_names.contains(&name.as_str())
            || (!long.is_empty() && self.long_words.iter().all(|word| long.contains(word)))
    }

    /// Of several variables the one at the height that is wanted, 10 m unless the study says another.
    fn of_height<'a>(
        &self,
        header: &Header,
        found: &[&'a Variable],
        options: &WindOptions,
    ) -> Result<&'a Variable, NetcdfError> {
        let wanted_m = options.height_m.unwrap_or(10.0);
        let at: Vec<&Variable> =
            found.iter().copied().filter(|variable| height_in_name_m(variable) == Some(wanted_m)).collect();
        if let [one] = at[..] {
            return Ok(one);
        }
        let names: Vec<&str> = found.iter().map(|variable| variable.name.as_str()).collect();
        Err(NetcdfError::NoVariable {
            path: header.path.clone(),
            wanted: self.wanted,
            candidates: names.join(", "),
            key: self.key,
        })
    }
}

/// Whether a variable's standard name says that it is another quantity than its short name suggests: `u` may be a current,
/// `wind` a single component. Some converters write "unknown", which says nothing.
fn is_something_else(variable: &Variable) -> bool {
    let Some(standard) = variable.text("standard_name").map(str::to_lowercase) else { return false };
    let of_a_role =
        [&EASTWARD, &NORTHWARD, &SPEED, &DIRECTION].iter().any(|role| role.standard_names.contains(&standard.as_str()));
    of_a_role || !(standard.contains("wind") || standard == "unknown")
}

/// Whether a variable is recognised as a speed.
pub(super) fn is_speed(variable: &Variable) -> bool {
    SPEED.is_named(variable) || DIRECTION.is_named(variable)
}

/// The height that a variable's name or long name carries: u10 is at 10 m, "100 metre U wind component" at 100 m.
pub(super) fn height_in_name_m(variable: &Variable) -> Option<f64> {
    let long = variable.text("long_name").unwrap_or_default().to_lowercase();
    let first = long.split([' ', '_', '-']).next().unwrap_or_default();
    let says_metres = ["metre", "meter", " m "].iter().any(|word| long.contains(word));
    if let (Ok(height), true) = (first.trim_end_matches('m').parse(), says_metres) {
        return Some(height);
    }
    let digits: String =
        variable.name.chars().skip_while(|c| !c.is_ascii_digit()).take_while(char::is_ascii_digit).collect();
    digits.parse().ok()
}
