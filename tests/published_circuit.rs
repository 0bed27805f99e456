//! The main job against published figures of circuits: what a dielectric gives back, what an amplifier's offset and
//! bias do, what a feedback resistor forgets, what an opening switch leaves on a capacitor.

mod reference;

#[path = "published_circuit/absorption.rs"]
mod absorption;
#[path = "published_circuit/amplifier.rs"]
mod amplifier;
#[path = "published_circuit/bench.rs"]
mod bench;
#[path = "published_circuit/stabilised.rs"]
mod stabilised;
#[path = "published_circuit/switch_noise.rs"]
mod switch_noise;
#[path = "published_circuit/wrong_figures.rs"]
mod wrong_figures;
