//! Quantities, the units made from them, and approximations for a display.

use core::hint::black_box;

use brimline::approximate::{bar, decade, decibels, root_sum_square};
use brimline::unit::Photodetector;
use brimline::{Charge, Current, Flux, Measured, RadiantExposure, Temperature, Voltage, VoltageRate};

pub(crate) fn call() {
    let x = || black_box(1.0);
    black_box(Current::from_amperes(x()).as_amperes());
    black_box(Flux::from_volt_seconds(x()).as_volt_seconds());
    black_box(Voltage::from_volts(x()).as_volts());
    black_box(VoltageRate::from_volts_per_second(x()).as_volts_per_second());
    let exposure = RadiantExposure::from_joules_per_square_metre(x());
    black_box((exposure.as_joules_per_square_metre(), exposure.partial_cmp(&black_box(exposure))));

    let temperature = Temperature::from_millidegrees_celsius(black_box(25_000));
    black_box(temperature.since(black_box(temperature)));
    black_box(temperature.as_millidegrees_celsius());

    let charge = Measured::new(Charge::from_coulombs(x()), Charge::from_coulombs(x()));
    black_box(charge.expanded(x()).as_coulombs());
    if let Ok(detector) = Photodetector::try_new(x(), x(), x(), x()) {
        black_box(detector.radiant_exposure(black_box(charge)));
    }

    let x = || black_box(1.0_f32);
    black_box((root_sum_square(x(), x()), decibels(x(), x()), decade(x())));
    black_box(bar(x(), x(), black_box(3), black_box(20)));
}
