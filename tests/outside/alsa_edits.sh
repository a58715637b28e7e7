# In the guest, after alsa_ports.sh: the stage file is edited while a chord and a pedal are held. What stays plays on,
# what is not the same any more is let go, what is new plays. Snapshots of what was heard are judged outside.
third=${keys%D0}D2 fourth=${keys%D0}D3
log=/out/edits.log
edits=0
edit() { # edit FILE: and it is in force
  edits=$((edits + 1))
  cp "/guest/$1" /guest/edited.yaml
  await "$1 is in force" lines $edits "edited.yaml is in force" $log
}
snapshot() { for ear in organ flute bells.txt chimes.txt; do cp "/out/edits.$ear" "/out/edits.$1.$ear" 2> /dev/null; done; }
strike() { printf '\220\110\144' > "$1"; } # the C an octave up
release() { printf '\200\110\100' > "$1"; }

cp /guest/edits_start.yaml /guest/edited.yaml
/guest/trued run /guest/edited.yaml 2> $log &
trued=$!
cat $organ > /out/edits.organ &
organ_ear=$!
cat $third > /out/edits.flute &
flute_ear=$!
await "edits are ready" lines 1 ready: $log
aseqdump -p "$(address bells)" > /out/edits.bells.txt &
bells=$!
await "organ of the edits" lines 1 "organ is set up" $log
await "bells of the edits" lines 1 "bells is set up" $log
await "keyboard of the edits" linked "VirMIDI .-0"
printf "$chord" > $keys
await "the chord at the organ" onsets 3 /out/edits.organ
await "the chord at the bells" lines 3 "Note on" /out/edits.bells.txt

# One more keyboard and one more synth, behind those that play.
edit edits_more.yaml
await "flute is set up" lines 1 "flute is set up" $log
await "the second keyboard" linked "VirMIDI .-3"
strike $fourth
await "a note at the flute" onsets 1 /out/edits.flute
await "the same at the organ" onsets 4 /out/edits.organ
await "the same at the bells" lines 4 "Note on" /out/edits.bells.txt
release $fourth
await "its end at the flute" offs 1 /out/edits.flute
await "its end at the organ" offs 1 /out/edits.organ
await "its end at the bells" lines 1 "Note off" /out/edits.bells.txt
snapshot more

# The bells get another name, and with it another port; organ and flute do not notice.
edit edits_renamed.yaml
await "the bells are let go" lines 4 "Note off" /out/edits.bells.txt
aseqdump -p "$(address chimes)" > /out/edits.chimes.txt &
chimes=$!
await "chimes are set up" lines 1 "chimes is set up" $log
strike $keys
await "a note at the chimes" lines 1 "Note on" /out/edits.chimes.txt
await "the same at the organ" onsets 5 /out/edits.organ
release $keys
await "its end at the chimes" lines 1 "Note off" /out/edits.chimes.txt
await "its end at the organ" offs 2 /out/edits.organ
snapshot renamed

# The first keyboard is another one now: what the old one holds is let go, and it is heard no more.
edit edits_other_keys.yaml
await "the chord's end at the organ" offs 5 /out/edits.organ
snapshot other_keys
await "the other keyboard" linked "VirMIDI .-3"
printf '\220\074\144\220\074\000' > $keys
printf "$chord" > $fourth
await "the other keyboard's chord" onsets 8 /out/edits.organ
await "the other keyboard's chord at the chimes" lines 4 "Note on" /out/edits.chimes.txt

# The flute goes, the other two change places: all is let go, and plays again.
edit edits_turned.yaml
await "the other chord's end at the organ" offs 8 /out/edits.organ
await "the other chord's end at the chimes" lines 4 "Note off" /out/edits.chimes.txt
await "organ is back" lines 2 "organ is set up" $log
await "chimes are back" lines 2 "chimes is set up" $log
snapshot turned
strike $fourth
await "a note after all" onsets 9 /out/edits.organ
release $fourth
await "its end" offs 9 /out/edits.organ

# What is said to it from outside, and a bad edit.
/guest/trued tell next > /out/edits.tell.txt
echo $? >> /out/edits.tell.txt
/guest/trued status --json > /out/edits.json
/guest/trued tell reload >> /out/edits.tell.txt
echo $? >> /out/edits.tell.txt
await "nothing new, by tell" lines 1 "as it is being played" $log
kill -HUP $trued
await "nothing new, by SIGHUP" lines 2 "as it is being played" $log
echo "stage: [" > /guest/edited.yaml
await "a bad edit" lines 1 "cannot be used" $log
/guest/trued status > /out/edits.status.txt
strike $fourth
await "a note all the same" onsets 10 /out/edits.organ
kill -TERM $trued
wait $trued
echo $? > /out/edits.exit
await "the last at the organ, edits" left_plain /out/edits.organ
await "the last at the chimes" heard_all /out/edits.chimes.txt
kill $organ_ear $flute_ear $chimes
