//! Only this program logs through defmt, so only it is linked with defmt's sections.

fn main() {
    println!("cargo::rerun-if-changed=build.rs");
    if std::env::var_os("CARGO_CFG_TARGET_OS").is_some_and(|os| os == "none") {
        println!("cargo::rustc-link-arg-bins=-Tdefmt.x");
    }
}
