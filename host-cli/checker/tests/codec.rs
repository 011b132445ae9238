//! Proofs as text and as bytes, there and back, and whatever is no proof.

mod common;

use balk_checker::proof::{Item, Proof, Span};
use balk_checker::{Malformed, binary, text};
use common::{HEADER, STEPS, TARGET, proof, text_of};
use sha2::{Digest, Sha256};

/// Every rule and every form of quantity and claim once.
const ALL: &str = "split 1 at -0.000000000001
split 255 at 9223372.036854775807
step t@2+.x >= -9223372.036854775808 by turn.x 1 t
step x@1-.y <= 0.5 by turn.y 1 x
step o2@b.z in [-0.5, 0.25] by turn.z 1 o2
step a12@e.s in [0, 0] by back.x 12 a12
step k3@d.x >= 0 by back.y 1 k3
step y@200+.z >= 1 by turn.s 200 y
step t@2.r >= 1 by plane- 2 t
step t.p1 >= 1 by plane+ 2 t
step z.g20 >= 1 by height- 2 z
step u1 >= 1 by height+ 1 t
step q1 >= 1 by dot 1 t
step c1 >= 1 by cross 1 t
step s1 >= 1 by circle 1
step s1 >= 1 by slide.x 1 t
step s1 >= 1 by slide.y 1 t
step s1 >= 1 by slide.z 1 t
step s1 >= 1 by length 1- t
step s1 >= 1 by length e t
step s1 >= 1 by out.x 0 t
step s1 >= 1 by out.y 0 t
step s1 >= 1 by out.z 0 t
step s1 >= 1 by in.x 0 t
step s1 >= 1 by in.y 0 t
step s1 >= 1 by in.z 0 t
step s1 >= 1 by far 1 t
step s1 >= 1 by near 1 t
step s1 >= 1 by shift.x t
step s1 >= 1 by shift.y t
step s1 >= 1 by shift.z t
step s1 >= 1 by close.x t
step s1 >= 1 by close.y t
step s1 >= 1 by close.z t
step s1 >= 1 by open.x t
step s1 >= 1 by open.y t
step s1 >= 1 by open.z t
step s1 >= 1 by rigid t
step s1 >= 1 by pair.s 1 2
step s1 >= 1 by pair.z 1 2
step s1 >= 1 by trace
step s1 >= 1 by cone 1
step s1 >= 1 by along 1 t
step s1 >= 1 by along.d 1 t
step s1 >= 1 by aim 1 t
step s1 >= 1 by sum 3 out.x 1 o2 -9223372036854775808 trace 7 length b x
step s1 >= 1 by cosine 1
step s1 >= 1 by sine 1
step s1 >= 1 by angle 1 t
step s1 >= 1 by angle.c 1
step s1 >= 1 by sector 1 t
step s1 >= 1 by spread t
step s1 >= 1 by spread.k 1 t
step s1 none by tilt 1
step * none by sum
step * none by sum -1 turn.x 1 t
";

fn text_read(text: &str) -> Result<Proof, Malformed> {
    text::read(text).map_err(|error| error.reason)
}

/// `bytes` with a digest that fits.
fn sealed(body: &[u8]) -> Vec<u8> {
    [body, &Sha256::digest(body)].concat()
}

#[test]
fn there_and_back() {
    for items in [
        STEPS.to_owned(),
        ALL.to_owned(),
        format!("split 1 at 0\n{STEPS}{STEPS}"),
    ] {
        let written = text_of(TARGET, HEADER, &items);
        let proof = text::read(&written).expect("well written");
        assert_eq!(text::write(&proof).as_deref(), Ok(written.as_str()));
        let bytes = binary::write(&proof).expect("a closed tree");
        assert_eq!(binary::read(&bytes).as_ref(), Ok(&proof));
    }
    let plain = binary::write(&proof(HEADER, STEPS)).expect("a closed tree");
    let written = text_of(TARGET, HEADER, STEPS);
    assert!(plain.len() < written.len() / 2);
}

#[test]
fn names_with_any_character() {
    let mut proof = proof(HEADER, STEPS);
    proof.tip = "a \"#\"\n\\ tip \u{e9}\u{1f9f2}".to_owned();
    proof.target = "{\"id\":\"# \\\" #\",\"xyz\":[ 1,2 ,3],\t\"xyz_within\":0}".to_owned();
    let written = text::write(&proof).expect("can be written");
    assert_eq!(text::read(&written).as_ref(), Ok(&proof));
    let bytes = binary::write(&proof).expect("can be written");
    assert_eq!(binary::read(&bytes).as_ref(), Ok(&proof));
    proof.target.push('\n');
    assert_eq!(text::write(&proof), Err(Malformed::Text));
    assert_eq!(binary::write(&proof), Err(Malformed::Text));
}

#[test]
fn comments_and_blank_lines() {
    let written = text_of(TARGET, HEADER, STEPS);
    let commented = written.replace('\n', "   # a remark \"quoted\"\n\n# more\n");
    assert_eq!(text_read(&commented), Ok(proof(HEADER, STEPS)));
}

#[test]
fn texts_that_are_no_proof() {
    let good = text_of(TARGET, HEADER, STEPS);
    for (from, to, why) in [
        ("balk-proof 1", "balk-proof 2", Malformed::Version),
        ("end\n", "", Malformed::Short),
        ("end\n", "end\nend\n", Malformed::Trailing),
        ("end\n", "end 1\n", Malformed::Trailing),
        ("machine ", "machine 0", Malformed::Number),
        ("machine ", "machin ", Malformed::Unknown),
        ("tip \"cup\"", "tip cup", Malformed::Text),
        ("root 2", "root 3", Malformed::Unknown),
        ("frame 1 1 0 0 0 0\n", "frame 1 1 0 0 0\n", Malformed::Short),
        (
            "frame 1 1 0 0 0 0\n",
            "frame 1 1.5 0 0 0 0\n",
            Malformed::Number,
        ),
        ("in [0.3, 0.3]", "in [0.3 0.3]", Malformed::Unknown),
        ("in [0.3, 0.3]", "in [0.3, 0.2]", Malformed::Reversed),
        ("in [0.3, 0.3]", "= 0.3", Malformed::Unknown),
        ("<= 0.3", "<= 0.3000000000001", Malformed::Number),
        ("<= 0.3", "<= .3", Malformed::Number),
        ("<= 0.3", "<= 3e-1", Malformed::Number),
        ("<= 0.3", "<= 9223372.036854775808", Malformed::Number),
        ("<= 0.3", "<=", Malformed::Number),
        ("t@2-.x", "t@2-", Malformed::Unknown),
        ("t@2-.x", "t@0-.x", Malformed::Number),
        ("t@2-.x", "t@02-.x", Malformed::Number),
        ("t@2-.x", "w@2-.x", Malformed::Unknown),
        ("t@2-.x", "t@2*.x", Malformed::Unknown),
        ("t@2-.x", "o256@2-.x", Malformed::Number),
        ("t@2-.x", "*", Malformed::Quantity),
        ("by far 1 t", "by near", Malformed::Short),
        ("by far 1 t", "by far 1 t t", Malformed::Trailing),
        ("by far 1 t", "by nearest 1 t", Malformed::Unknown),
        ("by far 1 t", "by sum 1", Malformed::Short),
        ("by far 1 t", "by sum 1.5 far 1 t", Malformed::Number),
        ("by far 1 t", "by sum 1 sum 1 far 1 t", Malformed::Unknown),
    ] {
        assert!(good.contains(from), "{from}");
        assert_eq!(
            text_read(&good.replacen(from, to, 1)),
            Err(why),
            "{from} -> {to}"
        );
    }
    let late = text::read(&good.replace("by far", "by fur")).expect_err("no such rule");
    assert_eq!((late.line, late.reason), (17, Malformed::Unknown));
}

#[test]
fn what_cannot_be_written() {
    let good = proof(HEADER, STEPS);
    let mut open = good.clone();
    open.items.pop();
    assert_eq!(binary::write(&open), Err(Malformed::Short));
    let mut more = good.clone();
    more.items.extend(good.items.clone());
    assert_eq!(binary::write(&more), Err(Malformed::Trailing));
    let mut reversed = good.clone();
    if let Some(Item::Step(step)) = reversed.items.first_mut() {
        step.claim = balk_checker::proof::Claim::Within(Span { lo: 1, hi: 0 });
    }
    assert_eq!(binary::write(&reversed), Err(Malformed::Reversed));
}

#[test]
fn damaged_bytes_are_refused() {
    let good = binary::write(&proof(HEADER, ALL)).expect("a closed tree");
    for length in 0..good.len() {
        assert!(binary::read(&good[..length]).is_err());
    }
    for place in 0..good.len() {
        let mut bytes = good.clone();
        bytes[place] ^= 0x10;
        assert!(binary::read(&bytes).is_err());
    }
    let body = &good[..good.len() - 32];
    assert_eq!(
        binary::read(&sealed(&[body, &[0]].concat())),
        Err(Malformed::Trailing)
    );
    assert_eq!(
        binary::read(&sealed(&body[..body.len() - 1])),
        Err(Malformed::Short)
    );
}

/// Bytes that are changed and sealed again are either refused or the one way to write what they say.
#[test]
fn one_spelling_for_each_proof() {
    let good = binary::write(&proof(HEADER, ALL)).expect("a closed tree");
    let body = &good[..good.len() - 32];
    let mut accepted = 0;
    for place in 0..body.len() {
        for byte in 0..=255 {
            let mut changed = body.to_vec();
            changed[place] = byte;
            let changed = sealed(&changed);
            if let Ok(proof) = binary::read(&changed) {
                assert_eq!(binary::write(&proof), Ok(changed));
                accepted += 1;
            }
        }
    }
    assert!(accepted > 256 * 32);
}

#[test]
fn numbers_in_the_shortest_way_only() {
    let header = |frames: &[u8]| {
        let mut body = b"balk\x01".to_vec();
        body.extend_from_slice(&[0; 32]);
        // No name, a target without fields.
        body.extend_from_slice(b"\x00\x02{}");
        body.extend_from_slice(&[0; 32]);
        body.extend_from_slice(frames);
        body
    };
    // No frames, no variables, an empty sum.
    let least = [0, 0, 172, 0, 0];
    let proof = binary::read(&sealed(&header(&least))).expect("the least proof");
    assert_eq!(proof.items.len(), 1);
    let cases: [(&[u8], Malformed); 6] = [
        (&[0x80, 0, 0, 172, 0, 0], Malformed::Number),
        (&[0, 0, 172, 0x80, 0, 0], Malformed::Number),
        // 2^64 - 1 frames, or a number of more than 64 bits.
        (
            &[255, 255, 255, 255, 255, 255, 255, 255, 255, 1],
            Malformed::Short,
        ),
        (
            &[255, 255, 255, 255, 255, 255, 255, 255, 255, 2],
            Malformed::Number,
        ),
        (&[0, 0, 255], Malformed::Unknown),
        // A bound without a quantity.
        (&[0, 0, 169, 0, 0, 0], Malformed::Quantity),
    ];
    for (bytes, why) in cases {
        assert_eq!(binary::read(&sealed(&header(bytes))), Err(why), "{bytes:?}");
    }
}

/// Deep nesting needs no stack.
#[test]
fn a_million_splits() {
    let mut open = proof(HEADER, STEPS);
    let last = open.items.pop().expect("items");
    let split = Item::Split { variable: 1, at: 0 };
    open.items = std::iter::repeat_n(split, 1_000_000).collect();
    open.items.extend(std::iter::repeat_n(last, 1_000_001));
    let bytes = binary::write(&open).expect("a closed tree");
    assert_eq!(binary::read(&bytes), Ok(open));
}
