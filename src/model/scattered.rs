//! Nodes whose latitude and longitude are no axes: curvilinear, rotated and projected grids, unstructured nodes, stations.

use crate::model::Layout;

/// Nodes in rows and columns, each with its own place. Unstructured nodes and stations are one row.
#[derive(Debug, Clone, PartialEq)]
pub struct Scattered {
    rows: usize,
    columns: usize,
    latitude_deg: Vec<f64>,
    longitude_deg: Vec<f64>,
    layout: Layout,
    /// Components are along rows and columns, not east and north: +1 where x grows with the column, -1 where it falls.
    grid_relative: Option<f64>,
    /// Unit vectors; NaN for nodes without a place.
    vectors: Vec<[f64; 3]>,
}

/// The unit vector of a place.
pub fn unit_vector(latitude_deg: f64, longitude_deg: f64) -> [f64; 3] {
    let (latitude, longitude) = (latitude_deg.to_radians(), longitude_deg.to_radians());
    let across = libm::cos(latitude);
    [across * libm::cos(longitude), across * libm::sin(longitude), libm::sin(latitude)]
}

/// The scalar product.
pub fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Unit vectors towards the east and the north at a place.
pub fn east_and_north(latitude_deg: f64, longitude_deg: f64) -> ([f64; 3], [f64; 3]) {
    let (latitude, longitude) = (latitude_deg.to_radians(), longitude_deg.to_radians());
    let (sin_lat, cos_lat) = (libm::sin(latitude), libm::cos(latitude));
    let (sin_lon, cos_lon) = (libm::sin(longitude), libm::cos(longitude));
    ([-sin_lon, cos_lon, 0.0], [-sin_lat * cos_lon, -sin_lat * sin_lon, cos_lat])
}

impl Scattered {
    /// Nodes row by row; as many latitudes as longitudes. `None` when the numbers do not fit or no node has a place.
    pub fn new(
        layout: Layout,
        (rows, columns): (usize, usize),
        latitude_deg: Vec<f64>,
        longitude_deg: Vec<f64>,
        grid_relative: Option<f64>,
    ) -> Option<Self> {
        if latitude_deg.len() != rows.checked_mul(columns)? || longitude_deg.len() != latitude_deg.len() {
            return None;
        }
        let vectors: Vec<[f64; 3]> = latitude_deg
            .iter()
            .zip(&longitude_deg)
            .map(|(latitude, longitude)| {
                let inside = latitude.abs() <= 90.001 && longitude.is_finite() && longitude.abs() <= 1080.0;
                if inside { unit_vector(latitude.clamp(-90.0, 90.0), *longitude) } else { [f64::NAN; 3] }
            })
            .collect();
        vectors.iter().any(|vector| vector[0].is_finite()).then_some(Self {
            rows,
            columns,
            latitude_deg,
            longitude_deg,
            layout,
            grid_relative,
            vectors,
        })
    }

    /// Rows and columns.
    pub fn size(&self) -> (usize, usize) {
        (self.rows, self.columns)
    }

    /// How the nodes lie.
    pub fn layout(&self) -> Layout {
        self.layout
    }

    /// Whether neighbours in rows and columns are neighbours on the globe, so that a site lies in a cell of four.
    pub fn has_cells(&self) -> bool {
        !matches!(self.layout, Layout::Nodes | Layout::Stations) && self.rows > 1 && self.columns > 1
    }

    /// Whether the components are along rows and columns.
    pub fn is_grid_relative(&self) -> bool {
        self.grid_relative.is_some()
    }

    /// Latitude and longitude of a node, degrees, longitude from -180 to 180.
    pub fn place(&self, row: usize, column: usize) -> Option<(f64, f64)> {
        let at = self.at(row, column)?;
        let longitude = (self.longitude_deg[at] + 180.0).rem_euclid(360.0) - 180.0;
        self.vectors[at][0].is_finite().then_some((self.latitude_deg[at].clamp(-90.0, 90.0), longitude))
    }

    /// The unit vector of a node.
    pub fn vector(&self, row: usize, column: usize) -> Option<[f64; 3]> {
        Some(self.vectors[self.at(row, column)?]).filter(|vector| vector[0].is_finite())
    }

    /// All nodes with a place: row, column, unit vector.
    pub fn nodes(&self) -> impl Iterator<Item = (usize, usize, [f64; 3])> + '_ {
        let placed = self.vectors.iter().enumerate().filter(|(_, vector)| vector[0].is_finite());
        placed.map(|(at, vector)| (at / self.columns, at % self.columns, *vector))
    }

    /// Least and greatest latitude, then longitude, of the nodes with a place, degrees.
    pub fn limits(&self) -> [f64; 4] {
        let mut limits = [f64::INFINITY, f64::NEG_INFINITY, f64::INFINITY, f64::NEG_INFINITY];
        for (row, column, _) in self.nodes() {
            let Some((latitude, longitude)) = self.place(row, column) else { continue };
            limits =
                [limits[0].min(latitude), limits[1].max(latitude), limits[2].min(longitude), limits[3].max(longitude)];
        }
        limits
    }

    /// Cosine and sine of the angle from east to the grid's x axis at a node, counter-clockwise; `None` where a neighbour
    /// that is needed has no place.
    pub fn x_axis(&self, row: usize, column: usize) -> Option<(f64, f64)> {
        let sign = self.grid_relative?;
        let node = |column: usize| self.vector(row, column);
        let minus = |a: [f64; 3], b: [f64; 3]| [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
        let along = if column > 0 && column + 1 < self.columns {
            minus(node(column + 1)?, node(column - 1)?)
        } else if self.columns >= 3 {
            // Second order at the edge: the axis bends.
            let (near, far, turn) = if column == 0 { (1, 2, 1.0) } else { (column - 1, column - 2, -1.0) };
            let (here, near, far) = (node(column)?, node(near)?, node(far)?);
            [0, 1, 2].map(|k| turn * (4.0 * near[k] - 3.0 * here[k] - far[k]))
        } else if self.columns == 2 {
            minus(node(1)?, node(0)?)
        } else {
            return None;
        };
        let (latitude, longitude) = self.place(row, column)?;
        let (east, north) = east_and_north(latitude, longitude);
        let (x, y) = (sign * dot(along, east), sign * dot(along, north));
        let length = (x * x + y * y).sqrt();
        (length > 0.0).then(|| (x / length, y / length))
    }

    fn at(&self, row: usize, column: usize) -> Option<usize> {
        (row < self.rows && column < self.columns).then(|| row * self.columns + column)
    }
}
