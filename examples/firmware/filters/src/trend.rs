//! The crate's own: an integer anchor, and the covariance as factors.

use brimline::estimate::{Trend, Walk};

use crate::{DT, LEVEL_WALK, RATE_PRIOR, RATE_WALK, READOUT, Visit};

pub(crate) fn visit(first: i32, visitor: &mut impl Visit) {
    let mut trend = Trend::new(first.into(), READOUT, 0.0, RATE_PRIOR);
    let walk = Walk { level: LEVEL_WALK, cross: 0.0, rate: RATE_WALK };
    visitor.filter("brimline's Trend", size_of::<Trend>(), &mut |counts| {
        trend.advance(DT, walk);
        trend.update(counts.into(), 0.0, READOUT);
        trend.rate()
    });
}
