# In the guest, after alsa_guest.sh has set $keys, $organ and $driver: ports that come and go, stops of all kinds, loops.
# Nothing plugged in at the start; then in and out, again and again, under a held chord and pedal. The organ goes and
# comes with the keyboard; the bells, a port of our own, stay and hear what becomes of the notes.
in_and_out() { # in_and_out BACKEND PORT: trued goes on running as $trued; $bells hears its bells, at PORT
  log=/out/$1.log
  unplug
  /guest/trued run --backend "$1" /guest/ports.yaml 2> $log &
  trued=$!
  await "ready without a rig, $1" lines 1 ready: $log
  aseqdump -p "$(address "$2")" > /out/$1.bells.txt &
  bells=$!
  await "bells are heard, $1" linked "$2"
  await "bells are set up, $1" lines 1 "bells is set up" $log
  : > /out/$1.cycles.txt
  for n in $(seq "$UNPLUGS"); do
    listen /out/$1.ear.$n
    ear=$!
    plug
    began=$(now)
    await "organ is set up, $1, time $n" lines $n "organ is set up" $log
    set_up=$(($(now) - began))
    await "keyboard, $1, time $n" linked "VirMIDI .-0"
    printf "$chord" > $keys
    await "the chord at the organ, $1, time $n" onsets 3 /out/$1.ear.$n
    await "the chord at the bells, $1, time $n" lines $((3 * n)) "Note on" /out/$1.bells.txt
    began=$(now)
    unplug
    await "let go, $1, time $n" lines $((3 * n)) "Note off" /out/$1.bells.txt
    echo "$set_up $(($(now) - began))" >> /out/$1.cycles.txt
    await "organ has gone, $1, time $n" lines $n "organ has gone" $log
    await "keyboard has gone, $1, time $n" lines $n "keyboard keys has gone" $log
    kill $ear 2> /dev/null
  done
  cp /out/$1.bells.txt /out/$1.bells_in_and_out.txt
}

# First through midir, to a clean stop under a held chord and pedal.
in_and_out midir "trued synth bells"
listen /out/midir.ear.last
ear=$!
plug
await "organ before the stop, midir" lines $((UNPLUGS + 1)) "organ is set up" $log
await "keyboard before the stop, midir" linked "VirMIDI .-0"
printf "$chord" > $keys
await "the chord before the stop, midir" onsets 3 /out/midir.ear.last
/guest/trued status --json > /out/midir.json
kill -TERM $trued
wait $trued
echo $? > /out/midir.exit
await "the last at the organ, midir" left_plain /out/midir.ear.last
await "the last at the bells, midir" heard_all /out/midir.bells.txt
kill $ear $bells

in_and_out alsa bells

# Input lost, and with it the news that the ports have gone: trued sleeps while more comes than its queue holds.
plug
n=$((UNPLUGS + 1))
await "organ before the flood" lines $n "organ is set up" $log
await "keyboard before the flood" linked "VirMIDI .-0"
printf "$single" > $keys
await "a note before the flood" lines $((3 * UNPLUGS + 1)) "Note on" /out/alsa.bells.txt
kill -STOP $trued
aplaymidi -p trued:1 -d 0 /guest/flood.mid
unplug
kill -CONT $trued
await "the loss is told" lines 1 "faster than it could be read" $log
await "organ has gone in the flood" lines $n "organ has gone" $log
listen /out/alsa.ear.flood
ear=$!
plug
await "organ after the flood" lines $((n + 1)) "organ is set up" $log
await "keyboard after the flood" linked "VirMIDI .-0"
printf "$single" > $keys
await "a note after the flood" onsets 1 /out/alsa.ear.flood
printf '\200\100\100' > $keys
await "its end" lines $((3 * UNPLUGS + 2)) "Note off" /out/alsa.bells.txt
cp /out/alsa.bells.txt /out/alsa.bells_before_kill.txt

# Killed under a held chord and pedal, started again; then a clean stop under the same.
printf "$chord" > $keys
await "a chord before the kill" onsets 4 /out/alsa.ear.flood
kill -KILL $trued
wait $trued
log=/out/again.log
/guest/trued run /guest/ports.yaml 2> $log &
trued=$!
await "organ after the kill" lines 1 "organ is set up" $log
await "keyboard after the kill" linked "VirMIDI .-0"
printf "$chord" > $keys
await "a chord after the kill" onsets 7 /out/alsa.ear.flood
kill -INT $trued # Ctrl-C
wait $trued
echo $? > /out/again.exit
await "the last at the organ, after the kill" left_plain /out/alsa.ear.flood
kill $ear $bells

# Several keyboards as one: each has its hands and its half-said messages to itself.
/guest/trued run /guest/many.yaml 2> /out/many.log &
trued=$!
await "many are ready" lines 1 ready: /out/many.log
aseqdump -p trued:1 > /out/many.txt &
dump=$!
await "the synth of many" lines 1 "organ is set up" /out/many.log
other=${keys%D0}D2
heard() { await "$1 times $2 of many" lines "$1" "$2" /out/many.txt; }
exec 3> $keys
{ printf '\360\175'; head -c 300 /dev/zero; } >&3 # a long system exclusive message, cut in the middle
printf "$single" > $other
heard 1 "Note on"
{ head -c 40 /dev/zero; printf '\367'; } >&3
heard 1 "F7"
exec 3>&-
aplaymidi -p trued:0 -d 0 /guest/held.mid &
held=$!
heard 5 "Note on" # and a pedal
kill -KILL $held
await "the player has gone" lines 1 "keyboard all has gone" /out/many.log
heard 4 "Note off"
heard 1 "controller 64, value 0"
cp /out/many.txt /out/many_gone.txt
printf '\200\100\100' > $other
heard 5 "Note off"

# Loops: our own notes come back, straight or through Midi Through. A note is played before the desk can cut them.
aconnect trued:1 trued:0
printf "\220\101\144\200\101\100" > $keys
heard 6 "Note off"
await "the first loop is cut" lines 1 "round and round" /out/many.log
aconnect trued:1 14:0
aconnect 14:0 trued:0
printf "\220\102\144\200\102\100" > $keys
heard 7 "Note off"
await "the second loop is cut" lines 2 "round and round" /out/many.log
printf "\220\103\144\200\103\100" > $keys
heard 8 "Note off"
aconnect -l > /out/connections.txt
kill -TERM $trued
wait $trued
echo $? > /out/many.exit
await "the last of many" heard_all /out/many.txt
kill $dump
