//! quick
use brimline::*;
fn run<Q: Integral>(name: &str, setup: &Setup<Q>, show: impl Fn(Measured<Q>)) {
    let mut ch = Channel::new(setup);
    let text = std::fs::read_to_string(format!("tests/traces/{name}.csv")).unwrap();
    println!("== {name}");
    for l in text.lines().skip(1) {
        let f: Vec<&str> = l.split(',').collect();
        let mode = match f[2] { "zero" => Mode::Zero, "integrate" => Mode::Integrate, "hold" => Mode::Hold, _ => Mode::Reset };
        let s = ch.feed(Sample { tick: f[0].parse().unwrap(), counts: f[1].parse().unwrap(), mode, temperature: None });
        for n in s.notices.iter() { println!("  {n:?}"); }
    }
    let r = ch.reading().unwrap();
    show(r.at_stop.integral);
    if let Some(c) = r.closed { show(c.integral); }
    println!("{r:#?}");
    println!("{:?}", ch.drift());
}
#[test]
fn quick() {
    let conv = Converter { code_zero_v: -2.5, lsb_v: 5.0/65536.0, code_min: 0, code_max: 65535, tick_hz: 1e6 };
    let c = Circuit { rail_low_v: -2.45, rail_high_v: 2.45, offset_limit_v: 2e-3, bias_limit_a: 1e-10, ..Circuit::DEFAULT };
    let hat = Setup::<Charge>::new(Circuit { capacitance_f: 4.7e-7, source_resistance_ohm: 5e9, ..c }, conv, Noise { readout_counts: 0.9, input_density: 1.5e-12, offset_wander: 0.0 }, Policy { worst_input: Some(2e-7), ..Policy::DEFAULT });
    for n in ["hatchery", "tick_wrap", "stuck_switch"] { run(n, &hat, |m| { let e = m.value.as_coulombs() - 3.420221817663503e-06; println!("err {e:e} u {:e} err/u {}", m.u.as_coulombs(), e/m.u.as_coulombs()) }); }
    let dim = Setup::<Charge>::new(Circuit { capacitance_f: 2.2e-8, source_resistance_ohm: 2e10, ..c }, conv, Noise { readout_counts: 1.1, input_density: 8e-14, offset_wander: 0.0 }, Policy { worst_input: Some(1e-9), ..Policy::DEFAULT });
    run("dim_lamp", &dim, |m| { let e = m.value.as_coulombs() - 3.5979995419571443e-09; println!("err {e:e} u {:e} err/u {}", m.u.as_coulombs(), e/m.u.as_coulombs()) });
    let wan = Setup::<Flux>::new(Circuit { capacitance_f: 2.2e-7, input_resistance_ohm: Some(47e3), ..c }, conv, Noise { readout_counts: 1.0, input_density: 1.5e-6, offset_wander: 6e-6 }, Policy::DEFAULT);
    run("wandering_offset", &wan, |m| { let e = m.value.as_volt_seconds() - 0.0; println!("err {e:e} u {:e} err/u {}", m.u.as_volt_seconds(), e/m.u.as_volt_seconds()) });
    let conv = Converter { code_zero_v: -5.0, lsb_v: 10.0/262144.0, code_min: 0, code_max: 262143, tick_hz: 1e6 };
    let coil = Setup::<Flux>::new(Circuit { capacitance_f: 1e-6, input_resistance_ohm: Some(22e3), ..c }, conv, Noise { readout_counts: 1.4, input_density: 4e-8, offset_wander: 0.0 }, Policy::DEFAULT);
    run("search_coil", &coil, |m| { let e = m.value.as_volt_seconds() + 1.0634723105489198e-2; println!("err {e:e} u {:e} err/u {}", m.u.as_volt_seconds(), e/m.u.as_volt_seconds()) });
}
