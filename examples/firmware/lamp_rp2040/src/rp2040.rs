//! The RP2040 and what is wired to it.

use brimline::{Mode, Switches};
use embedded_hal_nb::serial::Write;
use lamp_rp2040::{Board, CONVERSIONS, Fault, Outbox, PERIOD_US};
use rp2040_hal::adc::AdcPin;
use rp2040_hal::clocks::init_clocks_and_plls;
use rp2040_hal::fugit::{ExtU32, RateExtU32};
use rp2040_hal::gpio::bank0::{Gpio0, Gpio1, Gpio26};
use rp2040_hal::gpio::{DynPinId, FunctionNull, FunctionSioOutput, FunctionUart, Pin, Pins, PullDown, PullNone};
use rp2040_hal::uart::{DataBits, Enabled, StopBits, UartConfig, UartPeripheral};
use rp2040_hal::{Adc, Clock, Sio, Timer, Watchdog, pac};

const CRYSTAL_HZ: u32 = 12_000_000;
const BREAK_NS: u32 = 2_000;

/// High closes its switch. The pull-down, which holds from power-up on, opens it whenever nothing drives the pin.
type Line = Pin<DynPinId, FunctionSioOutput, PullDown>;
type Level = AdcPin<Pin<Gpio26, FunctionNull, PullNone>>;
type Serial =
    UartPeripheral<Enabled, pac::UART0, (Pin<Gpio0, FunctionUart, PullNone>, Pin<Gpio1, FunctionUart, PullDown>)>;

/// The chip on its board.
pub(crate) struct Pico {
    adc: Adc,
    level: Level,
    switches: Switches<Line, Line, Line>,
    serial: Serial,
    timer: Timer,
    watchdog: Watchdog,
    /// Counter value at which the next sample is due, us.
    due: u32,
}

impl Pico {
    /// Sets the chip up; `None` if a clock does not start.
    pub(crate) fn start() -> Option<Self> {
        let mut chip = pac::Peripherals::take()?;
        let sio = Sio::new(chip.SIO);
        let pins = Pins::new(chip.IO_BANK0, chip.PADS_BANK0, sio.gpio_bank0, &mut chip.RESETS);
        let switches = Switches::new(
            pins.gpio2.into_push_pull_output().into_dyn_pin(),
            pins.gpio3.into_push_pull_output().into_dyn_pin(),
            pins.gpio4.into_push_pull_output().into_dyn_pin(),
            BREAK_NS,
        );
        let mut watchdog = Watchdog::new(chip.WATCHDOG);
        let clocks = init_clocks_and_plls(
            CRYSTAL_HZ,
            chip.XOSC,
            chip.CLOCKS,
            chip.PLL_SYS,
            chip.PLL_USB,
            &mut chip.RESETS,
            &mut watchdog,
        )
        .ok()?;
        let uart_pins = (pins.gpio0.reconfigure(), pins.gpio1.reconfigure());
        let serial = UartPeripheral::new(chip.UART0, uart_pins, &mut chip.RESETS)
            .enable(UartConfig::new(115_200.Hz(), DataBits::Eight, None, StopBits::One), clocks.peripheral_clock.freq())
            .ok()?;
        let timer = Timer::new(chip.TIMER, &mut chip.RESETS, &clocks);
        let adc = Adc::new(chip.ADC, &mut chip.RESETS);
        let level = AdcPin::new(pins.gpio26.reconfigure()).ok()?;
        watchdog.start(100.millis());
        let due = timer.get_counter_low();
        Some(Self { adc, level, switches, serial, timer, watchdog, due })
    }

    fn convert(&mut self) -> Result<i32, Fault> {
        let code = self.adc.read(&mut self.level).or_else(|_| self.adc.read(&mut self.level));
        code.map(i32::from).map_err(|_| Fault::Converter)
    }
}

impl Board for Pico {
    fn switch(&mut self, mode: Mode) -> Result<(), Fault> {
        self.switches.set(mode, &mut self.timer).map_err(|_| Fault::Pin)
    }

    fn pace(&mut self) {
        self.due = self.timer.get_counter_low().wrapping_add(PERIOD_US);
    }

    fn wait(&mut self, out: &mut Outbox) -> Result<(), Fault> {
        let late = loop {
            out.send(|byte| self.serial.write(byte).is_ok());
            let since_due = self.timer.get_counter_low().wrapping_sub(self.due);
            if since_due.cast_signed() >= 0 {
                break since_due;
            }
        };
        self.watchdog.feed();
        self.due = self.due.wrapping_add(PERIOD_US);
        if late < PERIOD_US { Ok(()) } else { Err(Fault::Late) }
    }

    /// The sum of the conversions, stamped in their middle.
    fn sample(&mut self) -> Result<(u32, i32), Fault> {
        let start = self.timer.get_counter_low();
        let mut sum = 0;
        for _ in 0..CONVERSIONS {
            sum += self.convert()?;
        }
        let length = self.timer.get_counter_low().wrapping_sub(start);
        Ok((start.wrapping_add(length / 2), sum))
    }

    fn restart(&mut self) -> ! {
        rp2040_hal::reset()
    }
}
