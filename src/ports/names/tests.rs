//! Names and wishes against made-up machines.

use super::*;

fn port(client: i32, device: &str, name: &str, ways: &str) -> Port {
    Port {
        address: Address { client, port: 0 },
        device: device.to_string(),
        name: name.to_string(),
        aliases: Vec::new(),
        socket: None,
        sends: ways.contains('s'),
        hears: ways.contains('h'),
        ours: ways.contains('o'),
    }
}

fn named(name: &str, globs: &[&str]) -> Wanted {
    Wanted {
        name: name.to_string(),
        wish: Wish::Named {
            globs: globs.iter().map(|glob| glob.to_string()).collect(),
            socket: None,
        },
    }
}

fn any(name: &str) -> Wanted {
    Wanted {
        name: name.to_string(),
        wish: Wish::Any,
    }
}

fn chosen(ports: &[Port], keyboards: &[Wanted], synths: &[Wanted]) -> (Vec<Vec<i32>>, Vec<i32>) {
    let choice = choose(ports, keyboards, synths, &Choice::default());
    clients(&choice)
}

fn clients(choice: &Choice) -> (Vec<Vec<i32>>, Vec<i32>) {
    let keyboards = choice.keyboards.iter();
    (
        keyboards
            .map(|all| all.iter().map(|a| a.client).collect())
            .collect(),
        choice
            .synths
            .iter()
            .map(|a| a.map_or(-1, |a| a.client))
            .collect(),
    )
}

#[test]
fn globs() {
    for (glob, name, fits) in [
        ("*Keys*", "Stage keys mk2", true),
        ("keys", "Keys", true),
        ("keys", "Keys 2", false),
        ("*", "", true),
        ("a*b*c", "a-b-b-c", true),
        ("a*b*c", "a-b-b-d", false),
        ("?ey", "Key", true),
        ("?ey", "ey", false),
        ("*É*", "bébé", true),
        ("[abc]", "a", false),
    ] {
        assert_eq!(matches(glob, name), fits, "{glob} on {name}");
    }
    assert_eq!(without_numbers("Keys MIDI 1"), "Keys MIDI");
    assert_eq!(without_numbers("Keys 24:0"), "Keys");
    assert_eq!(without_numbers("1234"), "1234");
}

#[test]
fn a_star_takes_no_port_of_ours_no_through_port_and_no_synth() {
    let ports = [
        port(14, "Midi Through", "Midi Through Port-0", "sh"),
        port(20, "Wharf Keys", "Wharf Keys MIDI 1", "sh"),
        port(24, "Small Pads", "Small Pads MIDI 1", "s"),
        port(28, "Loft Organ", "Loft Organ MIDI 1", "sh"),
        port(128, "trued", "keys", "sho"),
    ];
    // The organ is named, so a star for keyboards leaves it alone.
    assert_eq!(
        chosen(&ports, &[any("all")], &[named("organ", &["*organ*"])]),
        (vec![vec![20, 24]], vec![28])
    );
    assert_eq!(
        chosen(
            &ports,
            &[named("one", &["*"])],
            &[named("organ", &["*organ*"])]
        ),
        (vec![vec![20]], vec![28])
    );
    // Named outright, one device is both; a through port must be called by its name.
    assert_eq!(
        chosen(
            &ports,
            &[named("keys", &["*organ*"]), named("t", &["*through*"])],
            &[named("organ", &["*organ*"])]
        ),
        (vec![vec![28], vec![14]], vec![28])
    );
    // Never one of our own, even by name.
    assert_eq!(
        chosen(&ports, &[named("k", &["trued"])], &[]),
        (vec![vec![]], vec![])
    );
}

#[test]
fn any_synth_is_the_first_that_hears_and_rather_one_that_is_no_keyboard() {
    let ports = [
        port(14, "Midi Through", "Midi Through Port-0", "sh"),
        port(20, "Wharf Keys", "Wharf Keys MIDI 1", "sh"),
        port(130, "Loft Organ", "Loft Organ", "h"),
    ];
    assert_eq!(
        chosen(&ports, &[any("all")], &[any("synth")]),
        (vec![vec![20]], vec![130])
    );
    assert_eq!(
        chosen(&ports[..2], &[], &[any("synth")]),
        (vec![], vec![20])
    );
    assert_eq!(
        chosen(&ports[..1], &[], &[any("synth")]),
        (vec![], vec![-1])
    );
}

#[test]
fn globs_are_tried_in_order_and_twins_are_told() {
    let ports = [
        port(20, "Rental", "Rental MIDI 1", "s"),
        port(24, "Wharf Keys", "Wharf Keys MIDI 1", "s"),
        port(28, "Wharf Keys", "Wharf Keys MIDI 1", "s"),
    ];
    let keys = [named("keys", &["*Keys*", "*Rental*"])];
    let choice = choose(&ports, &keys, &[], &Choice::default());
    assert_eq!(clients(&choice).0, [[24]]);
    assert_eq!(
        choice.remarks,
        [
            "*Keys* for keys fits several ports: \"Wharf Keys MIDI 1\" is taken, not \"Wharf Keys MIDI 1\""
        ]
    );
    assert_eq!(chosen(&ports[..1], &keys, &[]).0, [[20]]);

    let mut twins = ports.to_vec();
    twins[1].socket = Some("1-1.2".to_string());
    twins[2].socket = Some("1-1.3".to_string());
    let by_place = [Wanted {
        name: "keys".to_string(),
        wish: Wish::Named {
            globs: vec!["*Keys*".to_string()],
            socket: Some("1-1.3".to_string()),
        },
    }];
    let choice = choose(&twins, &by_place, &[], &Choice::default());
    assert_eq!(
        (clients(&choice).0, choice.remarks.len()),
        (vec![vec![28]], 0)
    );
}

#[test]
fn what_is_held_stays_until_it_goes() {
    let rental = port(20, "Rental", "Rental MIDI 1", "s");
    let wharf = port(24, "Wharf Keys", "Wharf Keys MIDI 1", "s");
    let organ = port(30, "Loft Organ", "Loft Organ", "h");
    let first_organ = port(29, "Other Organ", "Other Organ", "h");
    let keys = [named("keys", &["*Keys*", "*Rental*"])];
    let synths = [any("synth")];
    let one = choose(
        &[rental.clone(), organ.clone()],
        &keys,
        &synths,
        &Choice::default(),
    );
    let all = [rental, wharf.clone(), first_organ, organ];
    let two = choose(&all, &keys, &synths, &one);
    assert_eq!(clients(&two), (vec![vec![20]], vec![30]));
    let three = choose(&[wharf], &keys, &synths, &two);
    assert_eq!(clients(&three), (vec![vec![24]], vec![-1]));
}

#[test]
fn who_stands_where_another_stood_is_not_taken_for_it() {
    let wharf = port(24, "Wharf Keys", "Wharf Keys MIDI 1", "s");
    let organ = port(28, "Loft Organ", "Loft Organ MIDI 1", "sh");
    let keys = [named("keys", &["*Keys*"])];
    let synths = [named("organ", &["*Organ*"])];
    let one = choose(
        &[wharf.clone(), organ.clone()],
        &keys,
        &synths,
        &Choice::default(),
    );
    assert_eq!(clients(&one), (vec![vec![24]], vec![28]));
    // Both out and in again, in the other order.
    let swapped = [
        port(24, &organ.device, &organ.name, "sh"),
        port(28, &wharf.device, &wharf.name, "s"),
    ];
    let two = choose(&swapped, &keys, &synths, &one);
    assert_eq!(clients(&two), (vec![vec![28]], vec![24]));
}

#[test]
fn twins_come_back_to_their_places() {
    let twin = |client: i32, socket: &str| Port {
        socket: Some(socket.to_string()),
        ..port(client, "Wharf Keys", "Wharf Keys MIDI 1", "s")
    };
    let at = |name: &str, socket: &str| Wanted {
        name: name.to_string(),
        wish: Wish::Named {
            globs: vec!["*".to_string()],
            socket: Some(socket.to_string()),
        },
    };
    let keys = [at("left", "1-1.2"), at("right", "1-1.3")];
    let before = [twin(24, "1-1.2"), twin(28, "1-1.3")];
    let one = choose(&before, &keys, &[], &Choice::default());
    assert_eq!(clients(&one).0, [[24], [28]]);
    let after = [twin(24, "1-1.3"), twin(32, "1-1.2")];
    let two = choose(&after, &keys, &[], &one);
    assert_eq!(clients(&two).0, [[32], [24]]);
}

#[test]
fn one_device_is_keyboard_and_synth_but_midi_through_is_not() {
    let piano = port(20, "Wharf Piano", "Wharf Piano MIDI 1", "sh");
    let through = port(14, "Midi Through", "Midi Through Port-0", "sh");
    let ports = [through, piano];
    let both = |glob: &str| {
        let keys = [named("keys", &[glob])];
        choose(
            &ports,
            &keys,
            &[named("synth", &[glob])],
            &Choice::default(),
        )
    };
    assert_eq!(clients(&both("*piano*")), (vec![vec![20]], vec![20]));
    assert_eq!(both("*piano*").remarks, [""; 0]);
    let through = both("*through*");
    assert_eq!(clients(&through), (vec![vec![]], vec![14]));
    assert!(
        through.remarks[0].starts_with("keyboard keys is not connected to Midi Through"),
        "{:?}",
        through.remarks
    );
}

fn back_to(keyboard: usize) -> Wanted {
    Wanted {
        name: "lamps".to_string(),
        wish: Wish::BackTo(keyboard),
    }
}

#[test]
fn lamps_go_back_to_the_device_that_plays_as_their_keyboard() {
    // A port that goes both ways is its own way back, also of the second of two twins.
    let ports = [
        port(20, "Small Pads", "Small Pads MIDI 1", "sh"),
        port(24, "Small Pads", "Small Pads MIDI 1", "sh"),
        port(28, "Loft Organ", "Loft Organ MIDI 1", "sh"),
    ];
    let pads = named("pads", &["*Pads*"]);
    let rig = [pads.clone(), any("all")];
    let outs = [named("organ", &["*Organ*"]), back_to(0), back_to(1)];
    let held = Choice {
        keyboards: vec![vec![ports[1].address], Vec::new()],
        ..Choice::default()
    };
    let choice = choose(&ports, &rig, &outs, &held);
    assert_eq!(clients(&choice).1, [28, 24, 20]);
    // The organ's port is no less a keyboard's because lamps were there before.
    let again = choose(&ports, &rig, &outs, &choice);
    assert_eq!(clients(&again), clients(&choice));
    // Where the device has gone, so has the way back.
    let choice = choose(&ports[2..], &rig, &outs, &choice);
    assert_eq!(clients(&choice).1, [28, -1, -1]);
}

/// As a JACK server names them: each port goes one way.
#[test]
fn where_ports_go_one_way_the_way_back_has_the_other_name_or_fits_the_globs() {
    let ports = [
        port(1, "system", "midi_capture_1", "s"),
        port(2, "system", "midi_capture_2", "s"),
        port(3, "system", "midi_playback_1", "h"),
        port(4, "system", "midi_playback_2", "h"),
        port(5, "Pads", "buttons", "s"),
        port(6, "Pads", "more buttons", "s"),
        port(7, "Pads", "lights", "h"),
        port(8, "Pads", "more lights", "h"),
        port(9, "trued", "Pads lights", "ho"),
    ];
    let back = |keyboard: Wanted| {
        let choice = choose(&ports, &[keyboard], &[back_to(0)], &Choice::default());
        choice.synths[0].map(|address| address.client)
    };
    assert_eq!(back(named("k", &["midi_capture_2"])), Some(4));
    assert_eq!(back(named("k", &["Pads*"])), Some(7));
    assert_eq!(
        back(named("k", &["*buttons"])),
        None,
        "no light is called so"
    );
    let choice = choose(
        &ports[4..],
        &[named("k", &["Pads: more*"])],
        &[back_to(0)],
        &Choice::default(),
    );
    assert_eq!(choice.synths[0].map(|address| address.client), Some(8));
}
