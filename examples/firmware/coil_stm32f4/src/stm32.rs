//! The STM32F411 and what is wired to it.

use brimline::{Mode, Switches};
use coil_stm32f4::{Board, CONVERSIONS, Fault, Outbox, PERIOD_TICKS, TICK_HZ, Taken};
use cortex_m::peripheral::{DWT, SCB};
use embedded_hal_nb::serial::Write;
use stm32f4xx_hal::adc::Adc;
use stm32f4xx_hal::adc::config::{AdcConfig, Clock, SampleTime};
use stm32f4xx_hal::gpio::{Analog, AnyPin, Input, Output, PA0, PA1};
use stm32f4xx_hal::pac;
use stm32f4xx_hal::prelude::*;
use stm32f4xx_hal::rcc::Config;
use stm32f4xx_hal::serial::Tx;
use stm32f4xx_hal::timer::{CounterUs, SysDelay};
use stm32f4xx_hal::watchdog::IndependentWatchdog;

const CRYSTAL_HZ: u32 = 25_000_000;
const BREAK_NS: u32 = 2_000;

/// High closes its switch. Pins float while the chip starts: each needs a resistor to ground.
type Line = AnyPin<Output>;

/// The chip on its board.
pub(crate) struct BlackPill {
    adc: Adc<pac::ADC1>,
    level: PA1<Analog>,
    switches: Switches<Line, Line, Line>,
    button: PA0<Input>,
    serial: Tx<pac::USART1>,
    delay: SysDelay,
    timer: CounterUs<pac::TIM3>,
    watchdog: IndependentWatchdog,
    /// Cycle counter at the latest sample.
    latest: u32,
}

impl BlackPill {
    /// Sets the chip up; `None` if something in it does not start.
    pub(crate) fn start() -> Option<Self> {
        let (chip, mut core) = (pac::Peripherals::take()?, cortex_m::Peripherals::take()?);
        // First of all, so that a crystal that does not start ends in a restart.
        let mut watchdog = IndependentWatchdog::new(chip.IWDG);
        watchdog.start(100.millis());
        let mut rcc = chip.RCC.freeze(Config::hse(CRYSTAL_HZ.Hz()).sysclk(TICK_HZ.Hz()));
        let (a, b) = (chip.GPIOA.split(&mut rcc), chip.GPIOB.split(&mut rcc));
        let switches = Switches::new(
            b.pb12.into_push_pull_output().erase(),
            b.pb13.into_push_pull_output().erase(),
            b.pb14.into_push_pull_output().erase(),
            BREAK_NS,
        );
        // 24 MHz: the converter bears no more than 36.
        let adc = Adc::new(chip.ADC1, true, AdcConfig::default().clock(Clock::Pclk2_div_4), &mut rcc);
        let serial = chip.USART1.tx(a.pa9, 115_200.bps(), &mut rcc).ok()?;
        let mut timer = chip.TIM3.counter_us(&mut rcc);
        timer.start(1.millis()).ok()?;
        let delay = core.SYST.delay(&rcc.clocks);
        core.DCB.enable_trace();
        core.DWT.enable_cycle_counter();
        let (level, button) = (a.pa1.into_analog(), a.pa0.into_pull_up_input());
        let latest = DWT::cycle_count();
        Some(Self { adc, level, switches, button, serial, delay, timer, watchdog, latest })
    }
}

impl Board for BlackPill {
    fn switch(&mut self, mode: Mode) -> Result<(), Fault> {
        self.switches.set(mode, &mut self.delay).map_err(|_| Fault::Pin)
    }

    fn pace(&mut self) {
        // A period that is over already does not count.
        let _ = self.timer.wait();
        self.latest = DWT::cycle_count();
    }

    fn wait(&mut self, out: &mut Outbox) -> Result<(), Fault> {
        while self.timer.wait().is_err() {
            out.send(|byte| self.serial.write(byte).is_ok());
        }
        self.watchdog.feed();
        let now = DWT::cycle_count();
        let passed = now.wrapping_sub(core::mem::replace(&mut self.latest, now));
        if passed < PERIOD_TICKS * 2 { Ok(()) } else { Err(Fault::Late) }
    }

    /// The sum of the conversions, stamped in their middle.
    fn sample(&mut self) -> Taken {
        let start = DWT::cycle_count();
        let conversions = (0..CONVERSIONS).map(|_| self.adc.convert(&self.level, SampleTime::Cycles_84));
        let counts = conversions.map(i32::from).sum();
        let length = DWT::cycle_count().wrapping_sub(start);
        Taken { tick: start.wrapping_add(length / 2), counts, button: self.button.is_low() }
    }

    fn restart(&mut self) -> ! {
        SCB::sys_reset()
    }
}
