//! The textbook's equations in nalgebra's matrices of fixed size.

use nalgebra::{Matrix2, RowVector2, Vector2};

use crate::{DT, LEVEL_WALK, RATE_PRIOR, RATE_WALK, READOUT, Visit};

pub(crate) fn visit(first: i32, visitor: &mut impl Visit) {
    let step = Matrix2::new(1.0, DT, 0.0, 1.0);
    let walk = Matrix2::new(LEVEL_WALK, 0.0, 0.0, RATE_WALK);
    let seen = RowVector2::new(1.0, 0.0);
    let mut state = Vector2::new(first as f32, 0.0);
    let mut covariance = Matrix2::new(READOUT, 0.0, 0.0, RATE_PRIOR);
    let bytes = size_of_val(&state) + size_of_val(&covariance);
    visitor.filter("nalgebra 0.35, f32", bytes, &mut |counts| {
        state = step * state;
        covariance = step * covariance * step.transpose() + walk;

        let variance = (seen * covariance * seen.transpose()).x + READOUT;
        let gain = covariance * seen.transpose() / variance;
        state += gain * (counts as f32 - (seen * state).x);
        covariance = (Matrix2::identity() - gain * seen) * covariance;
        state.y
    });
}
