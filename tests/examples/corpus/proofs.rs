//! Proofs: one written by hand for two links in a plane, flawed in one place each, and what the
//! prover writes for an arm.

#[path = "proofs/flaws.rs"]
mod flaws;

use super::{Corpus, Said, beside, hex, targets};
use balk::evidence::{Evidence, NoProof};
use balk::prove::Subject;
use balk::read::{Line, machine, target};
use balk_checker::{Checker, binary, text};
use flaws::{ACCEPTED, BYTES, REJECTED, TEXT};
use sha2::{Digest, Sha256};

/// The tip is 0.3 m from the elbow, so at most 0.7 m from the shoulder, but 0.799 m are asked.
const STEPS: &str = "step t@2+.x in [0.3, 0.3] by out.x 2 t
step t@2+.y in [0, 0] by out.y 2 t
step t@2+.z in [0, 0] by out.z 2 t
step t@2.r in [0.09, 0.09] by plane+ 2 t
step t@2+.s in [0.09, 0.09] by length 2+ t
step t@2-.s in [0.09, 0.09] by turn.s 2 t
step t@2-.x <= 0.3 by plane- 2 t
step t@1+.s <= 0.49 by far 1 t
step t@1-.s <= 0.49 by turn.s 1 t
step t@1-.x >= 0.799 by in.x 0 t
step t@1-.s none by length 1- t
";

/// One way to change the text of a proof.
#[derive(Clone, Copy)]
pub enum Change {
    /// The first place of a text becomes another.
    Replace(&'static str, &'static str),
    /// The items become these; `{STEPS}` stands for those of the untouched proof.
    Items(&'static str),
    /// The items become two splits a level, this deep.
    Deep(usize),
    /// Nothing changes, but the proof is given for another target of that name.
    GivenFor(&'static str),
    /// The proof says that it is for the target of that name, and is given for it.
    For(&'static str),
    /// The machine's digest becomes another.
    OtherMachine,
    /// The whole text becomes this.
    Whole(&'static str),
}

/// The untouched proof of a target of two links.
fn base(line: &str) -> String {
    let checker = Checker::new(&beside("links.toml"), "cup").expect("well written");
    let digest: String = checker
        .digest()
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect();
    let search = "0".repeat(64);
    format!(
        "balk-proof 1\nmachine {digest}\ntip \"cup\"\ntarget {line}\nsearch {search}\n\
         frame 1 1 0 0 0 0\nframe 2 1 0 0 0 0\n\
         root 1 -2.617993877992 2.617993877992\nroot 2 -2.443460952793 2.443460952793\n{STEPS}end\n"
    )
}

/// The changed proof's text, and the name of the target it is given for.
fn changed(change: Change) -> (String, &'static str) {
    let all = targets("links");
    let line = |id: &str| {
        all.iter()
            .find(|(of, _)| of == id)
            .expect("there is one")
            .1
            .clone()
    };
    let far = base(&line("far"));
    let replaced = |from: &str, to: &str| {
        assert!(far.contains(from), "the proof has {from:?}");
        far.replacen(from, to, 1)
    };
    match change {
        Change::Replace(from, to) => (replaced(from, to), "far"),
        Change::Items(items) => (replaced(STEPS, &items.replace("{STEPS}", STEPS)), "far"),
        Change::Deep(depth) => {
            let splits = "split 1 at 0\n".repeat(depth);
            (
                replaced(STEPS, &format!("{splits}{}", STEPS.repeat(depth + 1))),
                "far",
            )
        }
        Change::GivenFor(id) => (far, id),
        Change::For(id) => (base(&line(id)), id),
        Change::OtherMachine => {
            let digest = far.split_whitespace().nth(3).unwrap_or_default();
            (far.replace(digest, &"ab".repeat(32)), "far")
        }
        Change::Whole(text) => (text.to_owned(), "far"),
    }
}

/// What is said of a proof in a file with these lines, given for a target.
fn say(machine: &str, line: &str, proof: Result<balk_checker::proof::Proof, String>) -> Said {
    let checker = Checker::new(&beside(&format!("{machine}.toml")), "cup").expect("well written");
    match proof {
        Err(reason) => Said::Malformed(reason),
        Ok(proof) => match checker.check(&proof, line) {
            Ok(_) => Said::Accepted,
            Err(rejection) => Said::Rejected(rejection.to_string()),
        },
    }
}

fn header(machine: &str, id: &str) -> String {
    format!("# machine: {machine}\n# target: {id}\n")
}

/// Writes a proof's text.
fn write_text(corpus: &mut Corpus, class: &str, name: &str, machine: &str, id: &str, proof: &str) {
    let of = targets(machine);
    let line = &of
        .iter()
        .find(|(other, _)| other == id)
        .expect("there is one")
        .1;
    let rest = format!("{}{proof}", header(machine, id));
    // Lines are counted in the file, which has one more above these.
    let read = text::read(&format!("#\n{rest}")).map_err(|error| error.to_string());
    corpus.write(
        class,
        &format!("{name}.proof"),
        &say(machine, line, read),
        &rest,
    );
}

/// Writes a proof's bytes, given for the target of two links that is too far.
fn write_bytes(
    corpus: &mut Corpus,
    class: &str,
    name: &str,
    machine: &str,
    id: &str,
    proof: &[u8],
) {
    let of = targets(machine);
    let line = &of
        .iter()
        .find(|(other, _)| other == id)
        .expect("there is one")
        .1;
    let read = binary::read(proof).map_err(|error| error.to_string());
    let rest = format!("{}{}", header(machine, id), hex(proof));
    corpus.write(
        class,
        &format!("{name}.hex"),
        &say(machine, line, read),
        &rest,
    );
}

/// The bytes with the digest made right again.
fn sealed(body: &[u8]) -> Vec<u8> {
    [body, Sha256::digest(body).as_slice()].concat()
}

pub fn write(corpus: &mut Corpus) {
    for (class, changes) in [
        ("accepted", ACCEPTED),
        ("rejected", REJECTED),
        ("malformed", TEXT),
    ] {
        for (name, change) in changes {
            let (proof, id) = changed(*change);
            write_text(corpus, class, name, "links", id, &proof);
        }
    }
    let untouched = text::read(&changed(Change::GivenFor("far")).0).expect("it is a proof");
    let bytes = binary::write(&untouched).expect("it has a binary form");
    write_bytes(corpus, "accepted", "by-hand", "links", "far", &bytes);
    let body = &bytes[..bytes.len() - 32];
    for (name, from, to) in BYTES {
        let places = body.windows(from.len()).filter(|part| part == from).count();
        assert!(places > 0, "{name}: the bytes are there");
        let at = body
            .windows(from.len())
            .position(|part| part == *from)
            .unwrap_or(0);
        let new = [&body[..at], to, &body[at + from.len()..]].concat();
        write_bytes(corpus, "malformed", name, "links", "far", &sealed(&new));
    }
    let mut turned = bytes.clone();
    turned[60] ^= 4;
    write_bytes(
        corpus,
        "malformed",
        "digest-of-a-flipped-bit",
        "links",
        "far",
        &turned,
    );
    write_bytes(corpus, "malformed", "digest-missing", "links", "far", body);
    write_bytes(corpus, "malformed", "nothing", "links", "far", &[]);
    write_bytes(
        corpus,
        "malformed",
        "cut-short",
        "links",
        "far",
        &sealed(&body[..body.len() - 1]),
    );
    write_bytes(
        corpus,
        "malformed",
        "byte-at-the-end",
        "links",
        "far",
        &sealed(&[body, &[0]].concat()),
    );
    write_proved(corpus);
}

/// What is shown as proof for every target of the arm that has one.
fn write_proved(corpus: &mut Corpus) {
    let file = beside("arm.toml");
    let arm = machine(file.as_bytes(), "arm.toml").expect("well written");
    let evidence = Evidence::new(&arm, 0, &file).expect("well written");
    for (number, (id, line)) in targets("arm").into_iter().enumerate() {
        let written = Line {
            number,
            bytes: Some(line.clone().into_bytes()),
        };
        let target = target(&written, "arm.jsonl", &arm).expect("well written");
        let subject = Subject {
            target: &target,
            line: &line,
            search: [7; 32],
        };
        match evidence.prove(&subject) {
            Err(NoProof::Unproved(_)) => {}
            Err(fault) => corpus.wrong.push(format!("{id}: {fault}")),
            Ok(proof) => {
                let name = format!("arm-{id}");
                let words = text::write(&proof).expect("the format holds it");
                write_text(corpus, "accepted", &name, "arm", &id, &words);
                let bytes = binary::write(&proof).expect("the format holds it");
                write_bytes(corpus, "accepted", &name, "arm", &id, &bytes);
            }
        }
    }
}
