//! Text without room is dropped as whole lines, and that is said.

use outbox::Outbox;

#[test]
fn lines_arrive_in_order_and_lost_ones_are_told() {
    let mut out = Outbox::default();
    for number in 0..100 {
        out.say(format_args!("line {number:6}"));
    }
    let (mut text, mut offers) = (String::new(), 0);
    for _ in 0..2_000 {
        out.send(|byte| {
            // Every other byte is refused once.
            offers += 1;
            let takes = offers % 2 == 0;
            if takes {
                text.push(char::from(byte));
            }
            takes
        });
    }
    // 1024 bytes hold 78 lines of 13 and a part of another.
    let expected: String = (0..78).map(|number| format!("line {number:6}\r\n")).collect();
    assert_eq!(text, expected + "[text lost]\r\n");
}
