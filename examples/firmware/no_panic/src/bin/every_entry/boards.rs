//! Set-ups, worked out at run time.

use core::fmt::Write;
use core::hint::black_box;

use brimline::{
    Absorption, Charge, Circuit, Converter, Flux, Integral, Linearity, Noise, Policy, Setup, SetupError, SoakageBranch,
    TemperatureLaw,
};

static POINTS: [(i32, f64); 3] = [(0, 0.0), (30_000, 2.0), (65_535, 0.0)];
static BENT: Linearity = Linearity::new(&POINTS);

/// Set-ups of both kinds; where the values are none, the loop ends here.
pub(crate) fn call() -> (Setup<Charge>, Setup<Flux>) {
    let points: &[(i32, f64)] = black_box(&POINTS);
    if let Err(e) = black_box(Linearity::try_new(black_box(points.get(..black_box(3)).unwrap_or_default()))) {
        tell(&e);
    }
    let absorption = black_box(Absorption { per_decade: 0.001 });
    black_box(absorption.rate_v_per_s(black_box(2.0), black_box(10.0)));
    black_box(absorption.wait_s(black_box(2.0), black_box(1e-5)));
    (setup(), setup())
}

fn setup<Q: Integral>() -> Setup<Q> {
    let branch = SoakageBranch { share: 0.001, time_constant_s: 1.0 };
    let circuit = black_box(Circuit {
        soakage: [branch; 4],
        temperature_law: TemperatureLaw::Junction { doubling_k: 10.0 },
        ..Circuit::DEFAULT
    });
    let converter = black_box(Converter { linearity: Some(&BENT), ..Converter::DEFAULT });
    loop {
        match Setup::try_new(circuit, converter, black_box(Noise::NONE), black_box(Policy::DEFAULT)) {
            Ok(setup) => {
                ask(&setup);
                return black_box(setup);
            }
            Err(e) => tell(&e),
        }
    }
}

fn ask<Q: Integral>(setup: &Setup<Q>) {
    let setup = black_box(setup);
    black_box(setup.min_on_time_s());
    black_box(setup.noise());
    black_box(setup.policy());
    let (circuit, converter) = (setup.circuit(), setup.converter());
    black_box((circuit.gain(), circuit.drift_limit_v_per_s()));
    black_box(circuit.settling_time_s(black_box(5.0), black_box(1e-5)));
    black_box((converter.volts(black_box(7)), converter.code(black_box(1.0))));
    black_box(*setup == black_box(*setup));
}

/// The message goes to an output that may fail.
fn tell(e: &SetupError) {
    struct Output;
    impl Write for Output {
        fn write_str(&mut self, text: &str) -> core::fmt::Result {
            black_box(text);
            if black_box(true) { Ok(()) } else { Err(core::fmt::Error) }
        }
    }
    let _ = black_box(write!(Output, "{e}"));
    black_box((e.parameter, e.allowed, *e == black_box(*e)));
}
