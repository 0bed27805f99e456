//! minikalman's filter for microcontrollers, with all its buffers on the stack.
#![allow(non_snake_case, reason = "its macros name buffers by their matrices")]

use minikalman::prelude::*;
use minikalman::regular::{RegularKalmanBuilder, RegularObservationBuilder};

use crate::{DT, LEVEL_WALK, RATE_PRIOR, RATE_WALK, READOUT, Visit};

pub(crate) fn visit(first: i32, visitor: &mut impl Visit) {
    impl_buffer_x!(mut x, 2, f32, 0.0);
    impl_buffer_A!(mut A, 2, f32, 0.0);
    impl_buffer_P!(mut P, 2, f32, 0.0);
    impl_buffer_Q_direct!(mut Q, 2, f32, 0.0);
    impl_buffer_temp_x!(mut temp_x, 2, f32, 0.0);
    impl_buffer_temp_P!(mut temp_P, 2, f32, 0.0);
    let mut filter = RegularKalmanBuilder::new::<2, f32>(A, x, P, Q, temp_x, temp_P);

    impl_buffer_z!(mut z, 1, f32, 0.0);
    impl_buffer_H!(mut H, 1, 2, f32, 0.0);
    impl_buffer_R!(mut R, 1, f32, 0.0);
    impl_buffer_y!(mut y, 1, f32, 0.0);
    impl_buffer_S!(mut S, 1, f32, 0.0);
    impl_buffer_K!(mut K, 2, 1, f32, 0.0);
    impl_buffer_temp_S_inv!(mut temp_S_inv, 1, f32, 0.0);
    impl_buffer_temp_HP!(mut temp_HP, 1, 2, f32, 0.0);
    impl_buffer_temp_PHt!(mut temp_PHt, 2, 1, f32, 0.0);
    impl_buffer_temp_KHP!(mut temp_KHP, 2, f32, 0.0);
    let mut sample =
        RegularObservationBuilder::new::<2, 1, f32>(H, z, R, y, S, K, temp_S_inv, temp_HP, temp_PHt, temp_KHP);

    filter.state_vector_mut().apply(|x| x.set_row(0, first as f32));
    filter.state_transition_mut().apply(|A| {
        A.make_identity();
        A.set_at(0, 1, DT);
    });
    filter.estimate_covariance_mut().apply(|P| {
        P.set_at(0, 0, READOUT);
        P.set_at(1, 1, RATE_PRIOR);
    });
    filter.direct_process_noise_mut().apply(|Q| {
        Q.set_at(0, 0, LEVEL_WALK);
        Q.set_at(1, 1, RATE_WALK);
    });
    sample.observation_matrix_mut().apply(|H| H.set_at(0, 0, 1.0));
    sample.measurement_noise_covariance_mut().apply(|R| R.set_at(0, 0, READOUT));

    let bytes = size_of_val(&filter) + size_of_val(&sample);
    visitor.filter("minikalman 0.8, f32", bytes, &mut |counts| {
        sample.measurement_vector_mut().apply(|z| z.set_row(0, counts as f32));
        filter.predict();
        filter.correct(&mut sample);
        filter.state_vector().get_row(1)
    });
}
