//! Site lists and tracks: hazard P1.

use super::support::{scratch, short};
use underwind::io::sites::{SiteOptions, find_site, read_sites, read_track};
use underwind::model::{Site, Track};
use underwind::units::Instant;

fn sites(content: impl AsRef<[u8]>) -> Vec<Site> {
    let file = scratch("sites.csv", content);
    read_sites(&file.path, &SiteOptions::default()).unwrap().sites
}

fn refusal(content: impl AsRef<[u8]>) -> String {
    let file = scratch("sites.csv", content);
    short(&read_sites(&file.path, &SiteOptions::default()).unwrap_err().to_string(), &file)
}

fn place(site: &Site) -> (f64, f64) {
    let point = site.track.nominal().unwrap();
    (point.latitude_deg(), point.longitude_deg())
}

#[test]
fn all_ways_of_writing_positions() {
    // Expected: degrees + minutes/60 + seconds/3600, by hand.
    let text = "\u{feff} ID , Lat , Lon , Depth\n\
                A,48.25,-129.5,120\n\
                B,48 15.0 N,129 30.0 W,\n\
                C,\"48\u{b0}15'00\"\"N\",\"129\u{b0}30'00\"\"W\",120 m\n\
                D,48.25N,230.5,0\n\
                E,\"48,25\",\"-129,5\",\"120,5\"\n\
                \n\
                F,48:15,129-30.0W,1\n";
    let sites = sites(text);
    assert_eq!(sites.len(), 6);
    for site in &sites {
        let (latitude, longitude) = place(site);
        assert!((latitude - 48.25).abs() < 1e-12 && (longitude + 129.5).abs() < 1e-12, "{site:?}");
    }
    let depths: Vec<Option<f64>> = sites.iter().map(|site| site.sensors[0].depth_m).collect();
    assert_eq!(depths, [Some(120.0), None, Some(120.0), Some(0.0), Some(120.5), Some(1.0)]);
}

#[test]
fn header_names_of_the_trade() {
    for header in [
        "site,latitude,longitude",
        "SITE_ID,LATITUDE,LONGITUDE",
        "station,lat_deg,lon_deg",
        "Name,Latitude (deg),Longitude (deg)",
        "id,Lat,Long",
        "mooring,latitude_degrees_north,longitude_degrees_east",
    ] {
        let found = sites(format!("{header}\nA,10,20\n"));
        assert_eq!((found[0].id.as_str(), place(&found[0])), ("A", (10.0, 20.0)), "{header}");
    }
    let file = scratch("sites.csv", "site,lat,lon_w\nA,10,20\n");
    let list = read_sites(&file.path, &SiteOptions::default()).unwrap();
    assert_eq!(place(&list.sites[0]), (10.0, -20.0));
    assert_eq!(list.notes, ["column `lon_w` counts degrees west"]);
}

#[test]
fn sensors_and_deployments_gather_under_their_site() {
    let text = "site,latitude,longitude,depth_m,sensor,deployment,start,end\n\
                A,10,20,50,low,one,2031-01-01,2031-06-01T12:00:00Z\n\
                A,10,20,55,high,,,\n\
                A,10,20,50,low,,2031-06-01T12:00:00Z,\n\
                B,11,21,,,,,\n";
    let sites = sites(text);
    assert_eq!(sites.len(), 2);
    let names: Vec<&str> = sites[0].sensors.iter().map(|sensor| sensor.id.as_str()).collect();
    assert_eq!(names, ["low", "high"]);
    let deployments = &sites[0].sensors[0].deployments;
    assert_eq!((deployments[0].id.as_str(), deployments[1].id.as_str()), ("one", "2"));
    assert_eq!(deployments[0].window.end.iso(), "2031-06-01T12:00:00Z");
    assert!(deployments[1].window.end > Instant::parse("2200-01-01").unwrap());
    assert_eq!(sites[1].sensors[0].id, "1");
}

#[test]
fn wrong_rows_are_refused_by_their_line() {
    for (rows, expected) in [
        (
            "A,10,20\nB,-129.4,48.2\n",
            "sites.csv: line 3: latitude is -129.4, expected -90 to 90 degrees north (are latitude -129.4 and longitude 48.2 swapped?)",
        ),
        ("A,10,400\n", "sites.csv: line 2: longitude is 400, expected -180 to 360 degrees east"),
        (
            "A,129.4 W,48.2 N\n",
            "sites.csv: line 2: latitude `129.4 W` has a letter of the other axis; are latitude and longitude swapped?",
        ),
        ("A,,20\n", "sites.csv: line 2: latitude `` is empty; expected degrees in every row"),
        (
            "A,nan,20\n",
            "sites.csv: line 2: latitude `nan` is no coordinate; expected degrees such as -129.4, 129.4 W, 129 24.0 W or 129 24 00 W",
        ),
        (
            "A,10 75 N,20\n",
            "sites.csv: line 2: latitude `10 75 N` has minutes or seconds of 60 or more; expected less than 60",
        ),
        (",10,20\n", "sites.csv: line 2: the site name is empty; expected a name in every row"),
        (
            "A,10,20\nB,11,21\nA,10,20\n",
            "sites.csv: line 4: site `A`, sensor `1` was already in line 2; expected each once (several sensors of a site need a sensor column, several deployments a start and an end)",
        ),
        (
            "A,10,20\nA,11,20\n",
            "sites.csv: line 3: site `A` is at 11 N 20 E, but at 10 N 20 E in line 2; expected one position for a site (use two names, or a track)",
        ),
        (
            "A,48,-129\nB,49,-130\nC,48.5,129.5\n",
            "sites.csv: line 4: the position 48.5 N 129.5 E lies 100 degrees from the other sites, which the other sign of the longitude would not; expected a site near the others (set `sites.check_signs` to false if it is right)",
        ),
    ] {
        assert_eq!(refusal(format!("site,latitude,longitude\n{rows}")), expected, "{rows}");
    }
    for depth in ["-120", "12000", "deep", "nan"] {
        assert_eq!(
            refusal(format!("site,latitude,longitude,depth_m\nA,10,20,{depth}\n")),
            format!(
                "sites.csv: line 2: the depth is `{depth}`; expected metres below the surface, 0 to 11000, positive down"
            )
        );
    }
    assert_eq!(
        refusal("site,latitude,longitude,start,end\nA,10,20,2031-06-01,2031-01-01\n"),
        "sites.csv: line 2: the end of the deployment is `2031-01-01`; expected a time after its start"
    );
    assert_eq!(
        refusal("place,north,east\nA,10,20\n"),
        "sites.csv: no column is recognised as the site (`site`, `site_id`, `id`); the columns are `place`, `north`, `east`; set `sites.site`"
    );
}

#[test]
fn the_sign_check_can_be_switched_off() {
    let file = scratch("sites.csv", "site,latitude,longitude\nA,48,-129\nB,49,-130\nC,48.5,129.5\n");
    let options = SiteOptions { check_signs: false, ..SiteOptions::default() };
    assert_eq!(read_sites(&file.path, &options).unwrap().sites.len(), 3);
}

#[test]
fn one_site_is_looked_up_beside_wrong_rows() {
    let file = scratch("sites.csv", "site,latitude,longitude,depth_m\nnorth,60 30 N,5 E,100\nsouth,95,5,100\n");
    let options = SiteOptions::default();
    let (site, notes) = find_site(&file.path, &options, "north").unwrap();
    assert_eq!((place(&site), site.sensors[0].depth_m), ((60.5, 5.0), Some(100.0)));
    assert_eq!(notes, ["1 rows of other sites cannot be read"]);
    let error = short(&find_site(&file.path, &options, "south").unwrap_err().to_string(), &file);
    assert_eq!(
        error,
        "sites.csv: line 3: latitude is 95, expected -90 to 90 degrees north (are latitude 95 and longitude 5 swapped?)"
    );
    let error = short(&find_site(&file.path, &options, "nort").unwrap_err().to_string(), &file);
    assert_eq!(error, "sites.csv: there is no site `nort` (did you mean `north`?); the sites are `north`, `south`");
}

#[test]
fn tracks_are_sorted_merged_and_cross_the_antimeridian() {
    let file = scratch(
        "track.csv",
        "time,latitude,longitude\n2031-01-01T02:00:00Z,0.2,-179.9\n2031-01-01T00:00:00Z,0,179.9\n2031-01-01T00:00:00Z,0,179.9\n",
    );
    let list = read_track(&file.path, &SiteOptions::default()).unwrap();
    assert_eq!(
        list.notes,
        [
            "the rows of the track are not in order of time; they were sorted",
            "1 rows of the track repeat a time and its position; they count once"
        ]
    );
    let Track::Moving(positions) = &list.track else { panic!("a moving track") };
    assert_eq!(positions.len(), 2);
    let middle = list.track.at(Instant::parse("2031-01-01T01:00:00Z").unwrap()).unwrap();
    assert!((middle.longitude_deg() + 180.0).abs() < 1e-9 && (middle.latitude_deg() - 0.1).abs() < 1e-9, "{middle:?}");
}

#[test]
fn impossible_tracks_are_refused_by_their_line() {
    let refusal = |rows: &str| {
        let file = scratch("track.csv", format!("time,latitude,longitude\n{rows}"));
        short(&read_track(&file.path, &SiteOptions::default()).unwrap_err().to_string(), &file)
    };
    assert_eq!(
        refusal("2031-01-01T00:00:00Z,10,20\n2031-01-01T00:00:00Z,11,20\n"),
        "track.csv: line 3: the track at 2031-01-01T00:00:00Z is at 11 N 20 E, but at 10 N 20 E in line 2; expected one position at a time"
    );
    // 40 degrees of longitude at 10 N: 2 x 6371 km x asin(cos 10 sin 20) = 4377 km (haversine, by hand).
    assert_eq!(
        refusal("2031-01-01T00:00:00Z,10,20\n2031-01-01T00:10:00Z,10,-20\n"),
        "track.csv: line 3: the track moves 4377 km in 600 s before this row; expected less than 100 m/s (a lost sign, or swapped columns?)"
    );
    assert_eq!(
        refusal("2031-01-01T00:00:00Z,10,20\n01/02/2031,10,20\n"),
        "track.csv: line 3, column `time`: `01/02/2031` is no time; expected a time whose day and month are sure: \"dmy\" or \"mdy\" (set `sites.date_order`)"
    );
}
