//! The numerics for themselves.

use core::hint::black_box;

use brimline::estimate::{Line, NoiseFigures, Octaves, Point, Trend, Walk};

pub(crate) fn call() {
    line();
    trend();
    noise();
}

fn line() {
    let points = [Point { x: 0.0, y: 1.0, weight: 1.0 }; 5];
    let points = black_box(points.get(..black_box(5)).unwrap_or_default());
    if let Some(line) = Line::fit(points.iter().copied()) {
        black_box((line.at(black_box(1.0)), line.variance_at(black_box(1.0)), line.covariance_at(black_box(1.0))));
    }
}

fn trend() {
    let mut trend = Trend::new(black_box(0), black_box(1.0), black_box(0.0), black_box(1.0));
    loop {
        let walk = Walk::over(black_box(0.1), black_box(1.0), black_box(1.0));
        trend.advance(black_box(0.1), walk);
        black_box(trend.update(black_box(0), black_box(0.5), black_box(1.0)));
        trend.advance(black_box(0.1), Walk::of_flicker(black_box(1.0), black_box(1.0), black_box(1.0)));
        trend.advance(black_box(0.1), black_box(walk));
        trend.restart(black_box(0), black_box(0.5), black_box(1.0));
        trend.shift(black_box(0.5), black_box(0.5));
        trend.rest(black_box(1.0));
        trend.doubt_rate(black_box(1.0));
        black_box((trend.anchor(), trend.residual(), trend.rate()));
        black_box((trend.level_variance(), trend.covariance(), trend.rate_variance()));
        if black_box(true) {
            return;
        }
    }
}

fn noise() {
    let mut octaves = black_box(Octaves::<16>::new());
    octaves.feed(black_box(0));
    octaves.break_chain();
    octaves = black_box(octaves);
    if let Some(octave) = octaves.octave(black_box(3)) {
        black_box((octave.dof(), octave.allan_deviation(black_box(0.01)), octave.zero_and_run_u()));
    }
    if let Some(noise) = NoiseFigures::fit(&octaves, black_box(0.01)) {
        black_box((noise, noise.mean_square_at(black_box(10.0))));
    }
    black_box(Octaves::<3>::default());
}
