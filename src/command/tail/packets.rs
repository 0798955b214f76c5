//! `coneproof tail` for the packets of the catalogue: each has its own parameters and shares all other options.

use super::{Answer, TailArguments};
use crate::error::Error;
use crate::quantities::catalogue;
use clap::Args;
use serde::Deserialize;
use std::collections::BTreeMap;
use std::fs;
use std::path::PathBuf;

/// The parameters that were given, by the names of the command line.
type Parameters = BTreeMap<String, String>;

fn parameters(list: &[(&str, &Option<String>)]) -> Parameters {
    let given = |(name, text): &(&str, &Option<String>)| text.as_ref().map(|text| ((*name).to_owned(), text.clone()));
    list.iter().filter_map(given).collect()
}

fn answer(kind: &str, parameters: &Parameters, common: &TailArguments) -> Result<Answer, Error> {
    common.answer(catalogue::packet(kind, parameters)?)
}

const COSINE_HELP: &str = concat!(
    "\
Example:
  coneproof tail cosine --half-width 20 --time 20

",
    exit_codes!()
);

/// `coneproof tail cosine`.
#[derive(Args)]
#[command(after_help = COSINE_HELP)]
pub(super) struct CosineArguments {
    /// Half of the packet's length, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    half_width: Option<String>,
    /// Mode number n of the hard-wall eigenstate, from 1 [default: 1]
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    mode: Option<String>,
    /// Mean momentum k [default: 0]
    #[arg(long, value_name = "K", allow_hyphen_values = true)]
    momentum: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

impl CosineArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let list = [("half-width", &self.half_width), ("mode", &self.mode), ("momentum", &self.momentum)];
        answer("cosine", &parameters(&list), &self.common)
    }
}

const BSPLINE_HELP: &str = concat!(
    "\
Example:
  coneproof tail bspline --half-width 1 --order 2 --time 1

",
    exit_codes!()
);

/// `coneproof tail bspline`.
#[derive(Args)]
#[command(after_help = BSPLINE_HELP)]
pub(super) struct BsplineArguments {
    /// Half of the packet's length, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    half_width: Option<String>,
    /// Order of the spline, from 1: 1 is the box, 2 the triangle
    #[arg(long, value_name = "P", allow_hyphen_values = true)]
    order: Option<String>,
    /// Mean momentum k [default: 0]
    #[arg(long, value_name = "K", allow_hyphen_values = true)]
    momentum: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

impl BsplineArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let list = [("half-width", &self.half_width), ("order", &self.order), ("momentum", &self.momentum)];
        answer("bspline", &parameters(&list), &self.common)
    }
}

const PIECEWISE_HELP: &str = concat!(
    "\
Between the knots x_i and x_(i+1) the amplitude is the sum of c_n (x - x_i)^n. Coefficients of a piece are separated by
commas, pieces by semicolons; numbers are exact, also complex ones such as 1/2-3i. The packet is normalised, and
distances count from the middle of its support. A file holds the same texts:

  knots  = \"-1, 0, 1\"
  pieces = \"0, 1; 1, -1\"

Examples:
  coneproof tail piecewise --knots \"-1, 0, 1\" --pieces \"0, 1; 1, -1\" --time 1
  coneproof tail piecewise --file packet.toml --time 1

",
    exit_codes!()
);

/// `coneproof tail piecewise`.
#[derive(Args)]
#[command(after_help = PIECEWISE_HELP)]
pub(super) struct PiecewiseArguments {
    /// Places where the pieces meet, increasing
    #[arg(long, value_name = "LIST", allow_hyphen_values = true, conflicts_with = "file")]
    knots: Option<String>,
    /// Coefficients of the pieces
    #[arg(long, value_name = "LISTS", allow_hyphen_values = true, conflicts_with = "file")]
    pieces: Option<String>,
    /// TOML file with knots and pieces
    #[arg(long, value_name = "FILE")]
    file: Option<PathBuf>,
    #[command(flatten)]
    common: TailArguments,
}

/// A packet file.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct PacketFile {
    knots: String,
    pieces: String,
}

impl PiecewiseArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let Some(path) = &self.file else {
            return answer("piecewise", &parameters(&[("knots", &self.knots), ("pieces", &self.pieces)]), &self.common);
        };
        let text = fs::read_to_string(path).map_err(|error| Error::file("read", path.display(), error))?;
        let file: PacketFile = toml::from_str(&text).map_err(|error| Error::file("read", path.display(), error))?;
        let list = [("knots", &Some(file.knots)), ("pieces", &Some(file.pieces))];
        answer("piecewise", &parameters(&list), &self.common)
    }
}

const BALL_HELP: &str = concat!(
    "\
Example:
  coneproof tail ball --radius 1 --mass 0 --time 37/5

",
    exit_codes!()
);

/// `coneproof tail ball`.
#[derive(Args)]
#[command(after_help = BALL_HELP)]
pub(super) struct BallArguments {
    /// Radius of the ball in three dimensions, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    radius: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

impl BallArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        answer("ball", &parameters(&[("radius", &self.radius)]), &self.common)
    }
}

const WELL_HELP: &str = concat!(
    "\
Example:
  coneproof tail well --radius 1 --mode 2 --time 1

",
    exit_codes!()
);

/// `coneproof tail well`.
#[derive(Args)]
#[command(after_help = WELL_HELP)]
pub(super) struct WellArguments {
    /// Radius of the spherical well, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    radius: Option<String>,
    /// Mode number n of the radial sine, from 1 [default: 1]
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    mode: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

impl WellArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        answer("well", &parameters(&[("radius", &self.radius), ("mode", &self.mode)]), &self.common)
    }
}

const GAUSSIAN_HELP: &str = concat!(
    "\
The packet has no edge, so the region has to be given: --beyond R stands for |x| > R. The routes are called lattice
and contour.

Example:
  coneproof tail gaussian --sigma 1/2 --time 5 --beyond 12

",
    exit_codes!()
);

/// `coneproof tail gaussian`.
#[derive(Args)]
#[command(after_help = GAUSSIAN_HELP)]
pub(super) struct GaussianArguments {
    /// Standard deviation of |psi|^2 at time 0, above 0
    #[arg(long, value_name = "S", allow_hyphen_values = true)]
    sigma: Option<String>,
    /// Mean momentum k [default: 0]
    #[arg(long, value_name = "K", allow_hyphen_values = true)]
    momentum: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

impl GaussianArguments {
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        answer("gaussian", &parameters(&[("sigma", &self.sigma), ("momentum", &self.momentum)]), &self.common)
    }
}

/// `coneproof tail box --momentum K`.
pub(super) fn moving_box(
    half_width: &Option<String>,
    momentum: &Option<String>,
    common: &TailArguments,
) -> Result<Answer, Error> {
    answer("box", &parameters(&[("half-width", half_width), ("momentum", momentum)]), common)
}
