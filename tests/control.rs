//! A running daemon as people and a supervisor meet it: control socket, `tell`, `status`, readiness, watchdog. The score
//! thread is the real one on ports in memory and real time; so are the binary, the sockets and the signals.

/// A daemon on ports in memory.
pub mod stand;

/// Clients that mean no good, or are merely broken.
mod hostile;

/// A supervisor: what it hears and when.
pub mod supervisor;

/// The binary from its first word to its last: readiness, reloads, signals, exit codes, a bad file at the start.
mod evening;

/// Daemons of one name that start at one moment.
mod racing;

/// The unit file, looked at by systemd's own tools.
mod unit;

use stand::{Folder, Stand, patiently, trued};
use std::os::unix::fs::PermissionsExt;

#[test]
fn tell_does_it_and_says_what_was_done() {
    let folder = Folder::new("tell");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let socket = stand.socket();
    let tell = |words: &str| {
        let mut arguments = vec!["tell", "--socket", &socket];
        arguments.extend(words.split(' '));
        trued(&folder, &arguments)
    };
    let done = |words: &str, text: &str| {
        assert_eq!(tell(words), (0, format!("{text}\n"), String::new()));
    };
    done("next", "song 2 of 3: Ballad");
    done("song 3", "song 3 of 3: Harbour tag");
    done("song Lantern hymn", "song 1 of 3: Lantern hymn");
    done("resend organ", "organ is set up again");
    // Two steps in quick succession are taken for one press.
    patiently("another step", || {
        let (code, out, err) = tell("next from Lantern hymn");
        assert!(
            code == 0 || err.contains("a double press; still song 1"),
            "{err}"
        );
        out == "song 2 of 3: Ballad\n"
    });
    done("pitch +1.5 c", "all is +1.500 c from its pitch");
    done("transpose -2", "keys are moved by -2");
    done("plain", "plain: equal temperament");
    let (_, text, _) = trued(&folder, &["status", "--socket", &socket]);
    for sentence in [
        "All is +1.5 c from its pitch.",
        "Keys are moved by -2.",
        "Plain: equal temperament, whatever the song says.",
    ] {
        assert!(text.lines().any(|line| line == sentence), "{text}");
    }
    done("fresh", "as if started anew: song 1 of 3: Lantern hymn");
    done("reload", "read again");
    stand.forget();
    done("panic", "all is silenced, and every synth set up again");
    patiently("all notes off on the wire", || {
        stand.has_heard(&[0xB0, 123, 0])
    });

    let refused = |words: &str, says: &str| {
        let (code, out, err) = tell(words);
        assert_eq!((code, out.as_str()), (64, ""), "{words}: {err}");
        assert!(err.contains(says), "{words}: {err}");
    };
    refused("back", "nothing comes before song 1 of 3: Lantern hymn");
    refused("nxt", "did you mean `next`?");
    refused(
        "song 4",
        "there is no song 4; the songs of the set are 1 to 3",
    );
    refused("next from Ballad", "Ballad is not the song now");
    refused("next from Balad", "did you mean `Ballad`?");
    refused("resend flute", "no synth is called `flute`");
    refused("turn saba", "");

    done("stop", "stopping: notes off, then tails die away");
    patiently("the end", || stand.has_ended());
    drop(stand);
    let (code, _, err) = tell("next");
    assert_eq!(code, 69, "{err}");
    assert!(err.starts_with("No daemon answers at "), "{err}");
}

#[test]
fn what_the_hands_have_changed_is_said_and_what_a_song_has_not_is_refused() {
    let folder = Folder::new("hands");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let socket = stand.socket();
    let tell = |words: &str| {
        let mut arguments = vec!["tell", "--socket", &socket];
        arguments.extend(words.split(' '));
        trued(&folder, &arguments)
    };
    for (words, says) in [
        (
            "inflect D low",
            "that key has no such place, or is as far from it as it goes, in song 1",
        ),
        (
            "tonic D",
            "the tuning goes by letter: its keys keep their pitches whatever the tonic",
        ),
        (
            "black-key Ab",
            "give the song both names, as in `black_keys: [G# or Ab]`",
        ),
        ("turn saba", "no tuning has a turn `saba`"),
    ] {
        let (code, out, err) = tell(words);
        assert_eq!((code, out.as_str()), (64, ""), "{words}");
        assert!(err.contains(says), "{words}: {err}");
    }
    let done = |words: &str, text: &str| {
        assert_eq!(tell(words), (0, format!("{text}\n"), String::new()));
    };
    done("song 3", "song 3 of 3: Harbour tag");
    done("inflect D low", "D is at low.");
    done("inflect E +5 c", "D is at low. E is +5.0 c from its place.");
    done(
        "inflect D4 -2 c",
        "D is at low. E is +5.0 c from its place. Some D go alone.",
    );
    // G is 3/2 where A is 5/3: A at 440 Hz would put it 9/8 below, a comma lower.
    let moved = "The tonic is G, +21.5 c from home. E is +5.0 c from its place. Some D go alone.";
    done("tonic G pivot", moved);
    let (_, text, _) = trued(&folder, &["status", "--json", "--socket", &socket]);
    let object: serde_json::Value = serde_json::from_str(&text).expect("JSON");
    assert_eq!(
        object["tonic"],
        serde_json::json!({"key": "G", "from_home_cents": 21.506})
    );
    assert_eq!(
        object["inflections"],
        serde_json::json!([{"key": "E", "place": "home", "nudge_cents": 5.0}])
    );
    done("inflect home", "The tonic is G, +21.5 c from home.");
    done("tonic home", "nothing is changed by hand");
}

#[test]
fn status_in_sentences_and_as_an_object() {
    let folder = Folder::new("status");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let socket = stand.socket();
    assert_eq!(trued(&folder, &["tell", "--socket", &socket, "next"]).0, 0);
    let (code, text, err) = trued(&folder, &["status", "--socket", &socket]);
    assert_eq!((code, err.as_str()), (0, ""));
    let lines: Vec<&str> = text.lines().collect();
    assert_eq!(
        lines[..4],
        [
            "Three songs is the stage, from stage.yaml.",
            "Now song 2 of 3: Ballad. Next comes Harbour tag.",
            "Keyboard keys is not connected; it waits for *Keys*.",
            "Synth organ is connected.",
        ]
    );
    let about_itself = lines[4];
    assert!(
        about_itself.starts_with("trued has been up for ")
            && about_itself.ends_with(
                " s on loopback, without real-time priority: notes may be late on a busy machine."
            ),
        "{text}"
    );
    assert_eq!(lines.len(), 5, "counters at zero are not shown: {text}");

    let (code, text, _) = trued(&folder, &["status", "--json", "--socket", &socket]);
    assert_eq!(code, 0);
    let object: serde_json::Value = serde_json::from_str(&text).expect("JSON");
    assert_eq!(object["song"]["number"], 2);
    assert_eq!(object["song"]["title"], "Ballad");
    assert_eq!(object["next"]["title"], "Harbour tag");
    assert_eq!(object["keyboards"][0]["connected"], false);
    assert_eq!(object["keyboards"][0]["waits_for"], "*Keys*");
    assert_eq!(object["synths"][0]["connected"], true);
    assert_eq!(object["complaint"], serde_json::Value::Null);
    for counter in ["stolen", "tails_cut", "refused", "clipped", "overruns"] {
        assert_eq!(object["counters"][counter], 0, "{counter}");
    }
    assert!(object["uptime_s"].is_u64() && object["real_time"].is_boolean());
}

#[test]
fn follow_says_each_change_and_finds_the_daemon_again() {
    let folder = Folder::new("follow");
    let path = folder.at("trued.sock");
    let stand = Stand::begin(&path);
    let socket = stand.socket();
    let follower = stand::Running::trued(&folder, &["status", "--follow", "--socket", &socket]);
    let objects = stand::Running::trued(
        &folder,
        &["status", "--follow", "--json", "--socket", &socket],
    );
    let hears = |follower: &stand::Running, text: &str| {
        patiently(text, || follower.said().contains(text));
    };
    hears(&follower, "Now song 1 of 3: Lantern hymn.");
    hears(&objects, "\"title\":\"Lantern hymn\"");
    assert_eq!(trued(&folder, &["tell", "--socket", &socket, "next"]).0, 0);
    hears(
        &follower,
        "\nNow song 2 of 3: Ballad. Next comes Harbour tag.\n",
    );
    hears(&objects, "\"song\":{\"number\":2,\"title\":\"Ballad\"}");
    drop(stand);
    let _again = Stand::begin(&path);
    patiently("the first song once more", || {
        follower.said().matches("Now song 1 of 3").count() == 2
    });
    let objects = objects.said();
    assert!(objects.lines().all(|line| line.starts_with('{')));
}

#[test]
fn several_daemons_by_name_and_a_socket_for_user_and_group() {
    let folder = Folder::new("names");
    let place = |name: &str| folder.at(&format!("trued/{name}.sock"));
    std::fs::create_dir(folder.at("trued")).unwrap();
    let left = Stand::begin(&place("left"));
    let right = Stand::begin(&place("right"));
    let mode = std::fs::metadata(place("left"))
        .unwrap()
        .permissions()
        .mode();
    assert_eq!(mode & 0o777, 0o660);
    assert_eq!(trued(&folder, &["tell", "--name", "left", "next"]).0, 0);
    let song = |name: &str| {
        let (code, text, err) = trued(&folder, &["status", "--json", "--name", name]);
        assert_eq!(code, 0, "{err}");
        let object: serde_json::Value = serde_json::from_str(&text).expect("JSON");
        object["song"]["number"].as_u64().expect("a number")
    };
    assert_eq!((song("left"), song("right")), (2, 1));
    let (code, _, err) = trued(&folder, &["status", "--name", "pedals"]);
    assert_eq!(code, 69);
    assert!(err.contains("No daemon called pedals is running"), "{err}");
    let (code, _, err) = trued(&folder, &["status", "--name", "../left"]);
    assert_eq!(code, 64, "{err}");

    // One that lives keeps its place, also against the binary.
    let taken = stand::open(&place("right"));
    assert!(matches!(taken, Err(trued::daemon::socket::Unopened::Taken)));
    std::fs::write(folder.at("stage.yaml"), stand::STAGE).unwrap();
    let (code, _, err) = trued(&folder, &["run", "--name", "right", "stage.yaml"]);
    assert_eq!(code, 69);
    assert!(
        err.contains("A daemon of this name is running already"),
        "{err}"
    );
    drop((left, right));
    assert!(!place("left").exists(), "the place is left clean");
}

#[test]
fn what_a_dead_daemon_left_is_replaced_and_a_file_is_not() {
    let folder = Folder::new("dead");
    let path = folder.at("trued.sock");
    drop(std::os::unix::net::UnixListener::bind(&path).unwrap());
    assert!(path.exists(), "as after SIGKILL");
    let socket = stand::open(&path).expect("replaced");
    drop(socket);
    std::fs::write(&path, "somebody's notes").unwrap();
    assert!(stand::open(&path).is_err());
    assert_eq!(std::fs::read_to_string(&path).unwrap(), "somebody's notes");
}
