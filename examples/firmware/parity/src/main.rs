//! Prints the log of the bundled traces. The same program runs on the host and on the targets, and the outputs must be
//! equal.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod target {
    use core::fmt;

    use emulated::io::{Stdout, Write, stdout};
    use emulated::{entry, process};

    struct Console(Stdout);

    impl fmt::Write for Console {
        fn write_str(&mut self, text: &str) -> fmt::Result {
            self.0.write_all(text.as_bytes()).map_err(|_| fmt::Error)
        }
    }

    #[entry]
    fn main() -> ! {
        let written = stdout().is_ok_and(|stdout| trace::write_logs(&mut Console(stdout)).is_ok());
        process::exit(i32::from(!written))
    }
}

#[cfg(not(target_os = "none"))]
fn main() -> Result<(), std::fmt::Error> {
    let mut log = String::new();
    trace::write_logs(&mut log)?;
    print!("{log}");
    Ok(())
}
