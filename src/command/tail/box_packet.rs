//! `coneproof tail box`.

use super::{Answer, TailArguments, fields, packets};
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::quantities::boosted_tail::observer;
use crate::quantities::tail::TailRequest;
use clap::Args;

#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct BoxArguments {
    /// Half of the box's length, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    half_width: Option<String>,
    /// Mean momentum k [default: 0]
    #[arg(long, value_name = "K", allow_hyphen_values = true)]
    momentum: Option<String>,
    /// Rapidity of a moving observer, whose time and region are meant; the region may also be "contracted"
    #[arg(long, value_name = "THETA", allow_hyphen_values = true)]
    rapidity: Option<String>,
    /// Velocity of a moving observer as a fraction of c, instead of the rapidity
    #[arg(long, value_name = "V", allow_hyphen_values = true)]
    boost_velocity: Option<String>,
    #[command(flatten)]
    common: TailArguments,
}

const AFTER_HELP: &str = concat!(
    "\
Numbers are read exactly: 2, 0.1 (one tenth), 2.5e-9, 1/3, or an interval \"[0.99, 1.01]\".
Units have hbar = c = 1; only mass * half-width, time / half-width and R / half-width matter.

Examples:
  coneproof tail box --half-width 1 --mass 1 --time 1 --digits 30
  coneproof tail box --half-width 1/2 --mass 0 --time -3 --side right
  coneproof tail box --half-width 1 --time 1 --beyond 12 --certificate tail.json
  coneproof tail box --half-width 1 --time 1 --digits 1000 --time-limit 2.5 --format json
  coneproof tail box --half-width 1 --time 1 --scout
  coneproof tail box --half-width 1/2 --momentum 2 --time 2 --digits 25
  coneproof tail box --half-width 5 --rapidity 1/2 --time 0 --beyond 5

",
    exit_codes!(),
    "

The numbers describe an idealised free particle; do not base decisions about hardware or safety on
them alone."
);

impl BoxArguments {
    /// The answer.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        if self.rapidity.is_some() || self.boost_velocity.is_some() {
            return self.for_observer();
        }
        if self.momentum.is_some() {
            return packets::moving_box(&self.half_width, &self.momentum, &self.common);
        }
        let request = self.request()?;
        if self.common.scout { self.common.estimate(&request) } else { self.common.certify(&request) }
    }

    /// The answer for a moving observer.
    fn for_observer(&self) -> Result<Answer, Error> {
        if let Some(momentum) = &self.momentum {
            let wanted = "a moving observer of a moving packet is not offered; leave one of the two out";
            return Err(Error::bad_input("momentum", momentum, wanted));
        }
        let read = |field: &str, text: &Option<String>| text.as_deref().map(|t| fields::exact(field, t)).transpose();
        let (rapidity, velocity) = (read("rapidity", &self.rapidity)?, read("boost-velocity", &self.boost_velocity)?);
        let Some((boost, boost_read)) = observer(rapidity.as_ref(), velocity.as_ref())? else {
            return Err(Error::Internal { found: "an observer without a boost".to_owned() });
        };
        let half_width = fields::required("half-width", self.half_width.as_deref(), "--half-width 1")?;
        self.common.answer_for_observer(half_width, boost, boost_read)
    }

    /// The request, with every field checked.
    fn request(&self) -> Result<TailRequest, Error> {
        let half_width = fields::required("half-width", self.half_width.as_deref(), "--half-width 1")?;
        let packet = BoxPacket::new(half_width)?;
        let mass = fields::exact("mass", &self.common.mass)?;
        let time = fields::required("time", self.common.time.as_deref(), "--time 1")?;
        self.common.complete(TailRequest::new(packet, mass, time)?)
    }
}
