//! The tunings that come with trued, read by the same code as a player's own.

macro_rules! shipped {
    ($($name:literal),* $(,)?) => {
        &[$(($name, include_str!(concat!("../../config/tunings/", $name, ".yaml")))),*]
    };
}

/// Name and text of each: by letter first, then from the tonic, then neutral thirds on twelve keys.
pub const SHIPPED: &[(&str, &str)] = shipped![
    "equal-12",
    "pythagorean",
    "quarter-comma-meantone",
    "fifth-comma-meantone",
    "sixth-syntonic-meantone",
    "sixth-pythagorean-meantone",
    "two-sevenths-comma-meantone",
    "third-comma-meantone",
    "werckmeister-3",
    "kirnberger-2",
    "kirnberger-3",
    "vallotti",
    "young-1",
    "young-2",
    "neidhardt-1724-big-city",
    "kellner",
    "five-limit-scale",
    "seven-limit-scale",
    "harmonics-8-16",
    "bohlen-pierce",
    "equal-17",
    "equal-19",
    "equal-22",
    "equal-24",
    "equal-31",
    "equal-53",
    "partch-43",
    "urmawi-17",
    "rast-al-farabi",
    "rast-ibn-sina",
    "rast-53-arab",
    "rast-53-turkish",
];
