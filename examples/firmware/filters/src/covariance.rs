//! The textbook's: estimate and covariance, written out for two states.

use crate::{DT, LEVEL_WALK, RATE_PRIOR, RATE_WALK, READOUT, Visit};

macro_rules! textbook {
    ($visit:ident, $float:ident, $name:literal) => {
        pub(crate) fn $visit(first: i32, visitor: &mut impl Visit) {
            const DT_S: $float = DT as $float;
            let (mut level, mut rate) = (first as $float, 0.0);
            // Variances of level and rate, and their covariance.
            let (mut ll, mut lr, mut rr) = (READOUT as $float, 0.0, RATE_PRIOR as $float);
            visitor.filter($name, 5 * size_of::<$float>(), &mut |counts| {
                level += rate * DT_S;
                ll += DT_S * (2.0 * lr + DT_S * rr) + LEVEL_WALK as $float;
                lr += DT_S * rr;
                rr += RATE_WALK as $float;

                let share = 1.0 / (ll + READOUT as $float);
                let (level_gain, rate_gain) = (ll * share, lr * share);
                let residual = counts as $float - level;
                level += level_gain * residual;
                rate += rate_gain * residual;
                rr -= rate_gain * lr;
                lr -= level_gain * lr;
                ll -= level_gain * ll;
                rate as f32
            });
        }
    };
}

textbook!(visit_f32, f32, "textbook covariance, f32");
textbook!(visit_f64, f64, "textbook covariance, f64");
