# In the guest, after alsa_guest.sh has set $keys, $organ and $driver: ports that come and go, stops of all kinds, loops.
# Every wait is for something to be seen; nothing counts on how long the guest takes.
now() { read up rest < /proc/uptime; echo "${up%.*}${up#*.}"; } # hundredths of a second
await() { # await WHAT COMMAND...: until it is true; what never comes ends the guest, for all else would only wait too
  what=$1
  shift
  tries=0
  until "$@"; do
    tries=$((tries + 1))
    [ $tries -lt 600 ] || { echo "never: $what" | tee -a /out/missing.txt; exit 4; }
    sleep 0.02
  done
}
lines() { [ "$(grep -c "$2" "$3")" -ge "$1" ]; } # lines COUNT PATTERN FILE: at least so many
onsets() { # onsets COUNT FILE: at least so many note-ons of velocity 100 among raw bytes
  [ "$(hexdump -v -e '1/1 " %02x"' "$2" 2> /dev/null | grep -o " 9[0-9a-f] .. 64" | wc -l)" -ge "$1" ]
}
linked() { # the kernel says that the raw port's keys reach somebody
  awk '/^ *Port/ {name = $0} /Connecting To/ && name ~ /VirMIDI .-0"/ {found = 1} END {exit !found}' /proc/asound/seq/clients
}
unplug() { echo snd_virmidi.0 > $driver/unbind; }
plug() { echo snd_virmidi.0 > $driver/bind; }
listen() { # listen FILE: from the moment the port is there, until it goes; $! is the ear
  (until [ -e $organ ]; do :; done; exec cat $organ) > "$1" 2> /dev/null &
}
chord='\260\100\177\220\074\144\220\100\144\220\103\144' # pedal, C E G
single='\220\100\144'
log=/out/ports.log

# Nothing plugged in at the start; then in and out, again and again, under a held chord and pedal. The organ goes and
# comes with the keyboard; the bells, a port of our own, stay and hear what becomes of the notes.
unplug
/guest/trued run /guest/ports.yaml 2> $log &
trued=$!
await "ready without a rig" lines 1 ready: $log
aseqdump -p trued:3 > /out/bells.txt &
bells=$!
await "bells are set up" lines 1 "bells is set up" $log
: > /out/cycles.txt
for n in $(seq "$UNPLUGS"); do
  listen /out/ear.$n
  ear=$!
  plug
  began=$(now)
  await "organ is set up, time $n" lines $n "organ is set up" $log
  set_up=$(($(now) - began))
  await "keyboard, time $n" linked
  printf "$chord" > $keys
  await "the chord at the organ, time $n" onsets 3 /out/ear.$n
  await "the chord at the bells, time $n" lines $((3 * n)) "Note on" /out/bells.txt
  began=$(now)
  unplug
  await "let go, time $n" lines $((3 * n)) "Note off" /out/bells.txt
  echo "$set_up $(($(now) - began))" >> /out/cycles.txt
  await "organ has gone, time $n" lines $n "organ has gone" $log
  await "keyboard has gone, time $n" lines $n "keyboard keys has gone" $log
  kill $ear 2> /dev/null
done

# Input lost, and with it the news that the ports have gone: trued sleeps while more comes than its queue holds.
plug
n=$((UNPLUGS + 1))
await "organ before the flood" lines $n "organ is set up" $log
await "keyboard before the flood" linked
printf "$single" > $keys
await "a note before the flood" lines $((3 * UNPLUGS + 1)) "Note on" /out/bells.txt
kill -STOP $trued
aplaymidi -p trued:1 -d 0 /guest/flood.mid
unplug
kill -CONT $trued
await "the loss is told" lines 1 "faster than it could be read" $log
await "organ has gone in the flood" lines $n "organ has gone" $log
listen /out/ear.flood
ear=$!
plug
await "organ after the flood" lines $((n + 1)) "organ is set up" $log
await "keyboard after the flood" linked
printf "$single" > $keys
await "a note after the flood" onsets 1 /out/ear.flood
printf '\200\100\100' > $keys
await "its end" lines $((3 * UNPLUGS + 2)) "Note off" /out/bells.txt
cp /out/bells.txt /out/bells_before_kill.txt

# Killed under a held chord and pedal, started again; then a clean stop under the same.
printf "$chord" > $keys
await "a chord before the kill" onsets 4 /out/ear.flood
kill -KILL $trued
wait $trued
log=/out/again.log
/guest/trued run /guest/ports.yaml 2> $log &
trued=$!
await "organ after the kill" lines 1 "organ is set up" $log
await "keyboard after the kill" linked
printf "$chord" > $keys
await "a chord after the kill" onsets 7 /out/ear.flood
kill -INT $trued # Ctrl-C
wait $trued
echo $? > /out/again.exit
sleep 0.3 # what is still on its way to the ear
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
sleep 0.3
kill $dump
