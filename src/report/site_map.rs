//! A map of the sites and of the grid nodes that serve them: plain cylindrical, true at its middle latitude.

use super::axis::{Axis, Tick};
use super::colour::{INK, MUTED, RULE, series};
use super::figure::Figure;
use super::mark::{Sample, Shape, keys};
use super::number;
use super::panel::{MARGIN, Panel, TEXT_SIZE, header};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// A site, with its track when it moves.
#[derive(Debug, Clone, PartialEq)]
pub struct MapSite {
    /// Its id, written beside it.
    pub id: String,
    /// Degrees north.
    pub latitude_deg: f64,
    /// Degrees east, in any turn.
    pub longitude_deg: f64,
    /// Further positions (latitude, longitude) of a moving site; empty for a fixed one.
    pub track: Vec<(f64, f64)>,
}

/// Nodes of one source.
#[derive(Debug, Clone, PartialEq)]
pub struct MapNodes {
    /// The source's name in the key.
    pub name: String,
    /// Nodes whose values were used: latitude, longitude.
    pub used_deg: Vec<(f64, f64)>,
    /// Nodes around that were not used, such as land: latitude, longitude.
    pub unused_deg: Vec<(f64, f64)>,
}

/// What the map shows.
#[derive(Debug, Clone, PartialEq)]
pub struct SiteMap {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// The sites.
    pub sites: Vec<MapSite>,
    /// Nodes per source.
    pub nodes: Vec<MapNodes>,
}

/// Draws the map. It may lie across the 180 degree meridian: longitudes are turned to the side that keeps the map small.
pub fn site_map(input: &SiteMap) -> Figure {
    const WIDTH: f64 = 720.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + 10.0;
    let all: Vec<(f64, f64)> = points(input).collect();
    let Some(cut) = cut_longitude(&all) else {
        canvas.text((MARGIN, top + 20.0), "no data: no site has a position", Style::new(TEXT_SIZE, MUTED));
        return Figure::new(&input.title, WIDTH, top + 40.0, canvas);
    };
    let turned = |longitude: f64| cut + (longitude - cut).rem_euclid(360.0);
    let fold = |values: &mut dyn Iterator<Item = f64>| {
        values.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(v), b.max(v)))
    };
    let (south, north) = fold(&mut all.iter().map(|p| p.0));
    let (west, east) = fold(&mut all.iter().map(|p| turned(p.1)));
    let shrink = libm::cos(f64::midpoint(south, north).to_radians()).max(0.05);
    // Room around, at least a tenth of a degree, and never a strip.
    let span = (north - south).max((east - west) * shrink).max(0.1);
    let (half_height, half_width) =
        ((north - south).max(0.65 * span) * 0.62, (east - west).max(0.65 * span / shrink) * 0.62);
    let (middle_lat, middle_lon) = (f64::midpoint(south, north), f64::midpoint(west, east));
    let (south, north) = ((middle_lat - half_height).max(-90.0), (middle_lat + half_height).min(90.0));
    let (west, east) = (middle_lon - half_width, middle_lon + half_width);

    let lat_ticks = degree_ticks(south, north, 6.0, latitude_label);
    let left = MARGIN + lat_ticks.iter().map(|t| super::axis::label_width(&t.label)).fold(0.0, f64::max) + 12.0;
    let right = WIDTH - MARGIN - 12.0;
    let per_degree_lat = ((right - left) / ((east - west) * shrink)).min(460.0 / (north - south));
    let (width, height) = (per_degree_lat * shrink * (east - west), per_degree_lat * (north - south));
    // A narrow map stands in the middle of the page.
    let left = left + ((right - left) - width) / 2.0;
    let lon_ticks = degree_ticks(west, east, (width / 80.0).clamp(2.0, 7.0), longitude_label);
    let panel = Panel {
        x: Axis::with_ticks(west, east, left, left + width, lon_ticks),
        y: Axis::with_ticks(south, north, top + height, top, lat_ticks),
    };
    panel.grid(&mut canvas);
    for (i, nodes) in input.nodes.iter().enumerate() {
        draw_nodes(&mut canvas, &panel, nodes, i, &turned);
    }
    draw_sites(&mut canvas, &panel, input, &turned);
    panel.axes(&mut canvas, true);
    frame(&mut canvas, &panel);
    let taken: Vec<(f64, f64)> = all.iter().map(|p| panel.at(turned(p.1), p.0)).collect();
    scale_bar(&mut canvas, &panel, shrink, &taken);
    let bottom = keys(&mut canvas, panel.bottom() + 30.0, WIDTH - MARGIN, &key(input));
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

fn draw_nodes(canvas: &mut Canvas, panel: &Panel, nodes: &MapNodes, index: usize, turned: &dyn Fn(f64) -> f64) {
    let inside = |(lat, lon): (f64, f64)| {
        let at = panel.at(turned(lon), lat);
        (at.0 >= panel.left() - 0.5 && at.0 <= panel.right() + 0.5 && at.1.is_finite()).then_some(at)
    };
    for at in nodes.used_deg.iter().filter_map(|p| inside(*p)) {
        Shape::of(index + 1).draw(canvas, at, 3.2, series(index + 2), true);
    }
    for at in nodes.unused_deg.iter().filter_map(|p| inside(*p)) {
        Shape::of(index + 1).draw(canvas, at, 3.2, series(index + 2), false);
    }
}

fn draw_sites(canvas: &mut Canvas, panel: &Panel, input: &SiteMap, turned: &dyn Fn(f64) -> f64) {
    let style = Style::new(TEXT_SIZE, INK).bold();
    let mut taken: Vec<(f64, f64, f64)> = Vec::new();
    for site in &input.sites {
        let track: Vec<(f64, f64)> = site.track.iter().map(|p| panel.at(turned(p.1), p.0)).collect();
        canvas.polyline(&track, Stroke::solid(series(1), 1.4));
        let at = panel.at(turned(site.longitude_deg), site.latitude_deg);
        Shape::Circle.draw(canvas, at, 4.6, series(1), true);
        // To the right, else to the left, else one line lower: never on another name.
        let width = style.width(&site.id);
        let places = [(9.0, 4.0), (-9.0 - width, 4.0), (9.0, 18.0), (9.0, -11.0), (-9.0 - width, 18.0)];
        let free = |x: f64, y: f64| {
            x > panel.left()
                && x + width < panel.right() + 10.0
                && taken.iter().all(|t| (t.1 - y).abs() > 13.0 || x > t.0 + t.2 || x + width < t.0)
        };
        let (dx, dy) = places.into_iter().find(|p| free(at.0 + p.0, at.1 + p.1)).unwrap_or(places[0]);
        taken.push((at.0 + dx, at.1 + dy, width));
        canvas.text((at.0 + dx, at.1 + dy), &site.id, style.over_data());
    }
}

fn frame(canvas: &mut Canvas, panel: &Panel) {
    let rule = Stroke::solid(RULE, 1.0);
    let corners = [(panel.left(), panel.top()), (panel.right(), panel.top()), (panel.right(), panel.bottom())];
    canvas.polyline(&corners, rule);
}

/// A bar of a round length, true at the middle latitude (one degree of latitude taken as 111.2 km, the mean sphere).
fn scale_bar(canvas: &mut Canvas, panel: &Panel, shrink: f64, taken: &[(f64, f64)]) {
    const KM_PER_DEGREE: f64 = 111.195;
    let km_per_px = (panel.x.high - panel.x.low) * shrink * KM_PER_DEGREE / panel.width();
    let length_km = super::axis::round_log(km_per_px * panel.width() * 0.25, false);
    let px = length_km / km_per_px;
    // In the first corner without a site or node; none on a map so large that no length is true.
    if panel.y.high - panel.y.low > 40.0 {
        return;
    }
    let corners = [
        (panel.right() - 14.0, panel.bottom() - 14.0),
        (panel.left() + 14.0 + px, panel.bottom() - 14.0),
        (panel.right() - 14.0, panel.top() + 26.0),
        (panel.left() + 14.0 + px, panel.top() + 26.0),
    ];
    let covers = |(right, y): (f64, f64)| {
        taken.iter().any(|p| p.0 > right - px - 14.0 && p.0 < right + 14.0 && p.1 > y - 28.0 && p.1 < y + 18.0)
    };
    let (right, y) = corners.into_iter().find(|c| !covers(*c)).unwrap_or(corners[0]);
    let text = number::quantity(length_km, usize::from(length_km < 1.0), "km");
    canvas.rect((right - px - 8.0, y - 18.0), (px + 16.0, 26.0), "#ffffff", 0.82);
    canvas.polyline(&[(right - px, y - 4.0), (right - px, y), (right, y), (right, y - 4.0)], Stroke::solid(INK, 1.4));
    canvas.text((right - px / 2.0, y - 6.0), &text, Style::new(11.0, INK).at(Anchor::Middle));
}

fn key(input: &SiteMap) -> Vec<(Sample, String)> {
    let mut entries = vec![(Sample::Mark(Shape::Circle, series(1), true), "site".to_owned())];
    if input.sites.iter().any(|s| s.track.len() > 1) {
        entries.push((Sample::Line(Stroke::solid(series(1), 1.4)), "track".to_owned()));
    }
    for (i, nodes) in input.nodes.iter().enumerate() {
        let text = format!("node used, {}", nodes.name);
        entries.push((Sample::Mark(Shape::of(i + 1), series(i + 2), true), text));
        if !nodes.unused_deg.is_empty() {
            let text = format!("node not used, {}", nodes.name);
            entries.push((Sample::Mark(Shape::of(i + 1), series(i + 2), false), text));
        }
    }
    entries
}

/// All positions that can be drawn.
fn points(input: &SiteMap) -> impl Iterator<Item = (f64, f64)> {
    let sites = input
        .sites
        .iter()
        .flat_map(|s| std::iter::once((s.latitude_deg, s.longitude_deg)).chain(s.track.iter().copied()));
    let nodes = input.nodes.iter().flat_map(|n| n.used_deg.iter().chain(&n.unused_deg).copied());
    sites.chain(nodes).filter(|p| p.0.is_finite() && p.1.is_finite() && p.0.abs() <= 90.0)
}

/// Where to cut the circle of longitudes: at the end of its widest empty arc, so that the map is as narrow as can be.
fn cut_longitude(points: &[(f64, f64)]) -> Option<f64> {
    let mut longitudes: Vec<f64> = points.iter().map(|p| p.1.rem_euclid(360.0)).collect();
    longitudes.sort_by(f64::total_cmp);
    let (first, last) = (*longitudes.first()?, *longitudes.last()?);
    let mut best = (first + 360.0 - last, first);
    for pair in longitudes.windows(2) {
        if pair[1] - pair[0] > best.0 {
            best = (pair[1] - pair[0], pair[1]);
        }
    }
    // Back to the usual turn, -180 to 180. A hair less, so that the cut itself stays on the map.
    let cut = best.1 - 1e-9;
    Some(if cut >= 180.0 { cut - 360.0 } else { cut })
}

/// Round degrees, at most about `most` of them.
fn degree_ticks(low: f64, high: f64, most: f64, label: fn(f64, usize) -> String) -> Vec<Tick> {
    const STEPS: [f64; 16] =
        [0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 15.0, 30.0, 60.0];
    let step = STEPS.into_iter().find(|s| (high - low) / s <= most).unwrap_or(90.0);
    let decimals = (-libm::floor(libm::log10(step) + 1e-9)).max(0.0) as usize;
    let first = libm::ceil(low / step) as i64;
    let last = libm::floor(high / step) as i64;
    (first..=last).map(|i| i as f64 * step).map(|v| Tick { value: v, label: label(v, decimals) }).collect()
}

fn latitude_label(degrees: f64, decimals: usize) -> String {
    hemisphere(degrees, decimals, "N", "S")
}

fn longitude_label(degrees: f64, decimals: usize) -> String {
    // -180 to 180, whatever the turn.
    let turned = (degrees + 180.0).rem_euclid(360.0) - 180.0;
    if (turned.abs() - 180.0).abs() < 1e-9 {
        return "180°".to_owned();
    }
    hemisphere(turned, decimals, "E", "W")
}

fn hemisphere(degrees: f64, decimals: usize, plus: &str, minus: &str) -> String {
    let text = number::fixed(degrees.abs(), decimals);
    if degrees.abs() < 1e-9 {
        return "0°".to_owned();
    }
    format!("{text}° {}", if degrees > 0.0 { plus } else { minus })
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn site(id: &str, latitude_deg: f64, longitude_deg: f64) -> MapSite {
        MapSite { id: id.to_owned(), latitude_deg, longitude_deg, track: Vec::new() }
    }

    #[test]
    fn a_map_across_the_date_line_stays_small() {
        let cut = cut_longitude(&[(0.0, 179.0), (0.0, -178.0), (0.0, 181.0)]).unwrap();
        assert!((cut - 179.0).abs() < 1e-6);
        let map = SiteMap {
            title: "map".to_owned(),
            notes: Vec::new(),
            sites: vec![site("a", -17.0, 179.0), site("b", -18.0, -178.0)],
            nodes: Vec::new(),
        };
        let svg = site_map(&map).svg();
        assert!(svg.contains("180°") && svg.contains("179° E") && svg.contains("179° W"), "{svg}");
        assert!(!svg.contains("90° E"));
    }

    #[test]
    fn labels_name_the_hemisphere() {
        assert_eq!(latitude_label(-12.5, 1), "12.5° S");
        assert_eq!(latitude_label(0.0, 0), "0°");
        assert_eq!(longitude_label(190.0, 0), "170° W");
        assert_eq!(longitude_label(-180.0, 0), "180°");
        assert_eq!(longitude_label(360.0, 0), "0°");
    }

    #[test]
    fn one_site_alone_and_none_are_drawn() {
        let mut map =
            SiteMap { title: "map".into(), notes: vec![], sites: vec![site("only", 89.99, 0.0)], nodes: vec![] };
        assert!(site_map(&map).svg().contains(">only<"));
        map.sites[0].latitude_deg = f64::NAN;
        assert!(site_map(&map).svg().contains("no data"));
    }

    #[test]
    fn crowded_and_tall_maps_are_drawn() {
        let nodes = MapNodes {
            name: "hindcast".into(),
            used_deg: vec![(50.0, 10.0), (50.25, 10.0), (f64::NAN, 3.0)],
            unused_deg: vec![(60.0, 10.0), (50.0, f64::INFINITY)],
        };
        let sites = (0..30).map(|i| site(&format!("site number {i}"), 50.1 + 0.001 * f64::from(i), 10.1)).collect();
        let map = SiteMap { title: "map".into(), notes: vec![], sites, nodes: vec![nodes] };
        let svg = assert_sound(&site_map(&map));
        assert!(svg.contains("node used, hindcast") && svg.contains("node not used, hindcast"));
    }
}
