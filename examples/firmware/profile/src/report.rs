//! Prints the calls that tell most.

use std::cmp::Reverse;
use std::collections::HashMap;

use brimline::Mode;

use crate::calls::{Call, Kind, Share};

const ROWS: usize = 15;

pub(crate) fn print(calls: &[Call]) {
    let of = |kind: Kind| {
        let mut chosen: Vec<&Call> = calls.iter().filter(|call| call.kind == kind).collect();
        chosen.sort_by_key(|call| call.total);
        chosen
    };
    let integrate = of(Kind::Steady(Mode::Integrate));
    show("steady feed in Integrate (the median one)", median(&integrate));
    show("the dearest feed in Integrate: draws the line after a reset", integrate.last().copied());
    let zero = of(Kind::Steady(Mode::Zero));
    show("feed in Zero within a block (the median one)", median(&zero));
    let full: Vec<&Call> =
        zero.iter().copied().filter(|call| call.total > 3 * median(&zero).map_or(0, |c| c.total)).collect();
    show("feed in Zero that fills a block (the median one)", median(&full));
    show("the dearest feed in Zero", zero.last().copied());
    show("the dearest first feed in Integrate", of(Kind::First(Mode::Integrate)).last().copied());
    show("the dearest first feed in Reset: draws the line before it", of(Kind::First(Mode::Reset)).last().copied());
    show("the dearest first feed in Zero: ends a run", of(Kind::First(Mode::Zero)).last().copied());
    show("steady feed in Reset (the median one)", median(&of(Kind::Steady(Mode::Reset))));
    show("reading (the median one)", median(&of(Kind::Reading)));
    show("the dearest reading", of(Kind::Reading).last().copied());
}

fn median<'c>(sorted: &[&'c Call]) -> Option<&'c Call> {
    sorted.get(sorted.len() / 2).copied()
}

fn show(title: &str, call: Option<&Call>) {
    let Some(call) = call else { return };
    println!("\n{title}: {} instructions, row {}\n", call.total, call.row);
    table("function", &call.functions);
    table("line", &call.lines);
    let mut routines: Vec<_> = call.routines.iter().collect();
    routines.sort_by_key(|(name, count)| (Reverse(**count), *name));
    let routines: Vec<String> = routines.iter().take(10).map(|(name, count)| format!("{name} {count}")).collect();
    println!("Routines: {}", routines.join(", "));
}

fn table(heading: &str, shares: &HashMap<String, Share>) {
    println!("| {heading} | in all | own | in routines |\n| --- | ---: | ---: | ---: |");
    let mut shares: Vec<_> = shares.iter().collect();
    shares.sort_by_key(|(name, share)| (Reverse(share.own + share.called), *name));
    for (name, share) in shares.iter().take(ROWS) {
        println!("| {name} | {} | {} | {} |", share.own + share.called, share.own, share.called);
    }
    println!();
}
