# In the guest. First: aplaymidi -> trued -> aseqdump, then SIGTERM while a chord and a pedal are held.
export NO_COLOR=1
UNPLUGS=$(cat /guest/unplugs)
ready() { for _ in $(seq 100); do grep -q "$1" "$2" && return; sleep 0.1; done; echo "never: $1" >> /out/missing.txt; }

/guest/trued run /guest/stage.yaml 2> /out/trued.log &
trued=$!
ready ready: /out/trued.log
aseqdump -p trued:1 > /out/heard.txt &
dump=$!
ready "organ is set up" /out/trued.log
sleep 0.5
aplaymidi -p trued:0 -d 0 /guest/evening.mid || exit 3
sleep 1
aplaymidi -p trued:0 -d 0 /guest/held.mid &
held=$!
sleep 2
kill -TERM $trued
wait $trued
echo $? > /out/trued.exit
kill $held
sleep 0.5
kill $dump

# Second: raw MIDI ports found by name, that come and go.
/guest/trued ports /guest/plugged.yaml > /out/ports.txt
/guest/trued ports --stage > /out/starter.yaml
/guest/trued ports /out/starter.yaml --json > /out/ports.json
card=$(ls /dev/snd | sed -n 's/^midiC\([0-9]*\)D0$/\1/p')
keys=/dev/snd/midiC${card}D0 organ=/dev/snd/midiC${card}D1
driver=/sys/bus/platform/drivers/snd_virmidi
. /guest/alsa_ports.sh
. /guest/alsa_edits.sh

# Third: one of two synths stops reading in the middle of a run of notes, then reads again.
/guest/trued run /guest/layer.yaml 2> /out/layer.log &
trued=$!
ready ready: /out/layer.log
aseqdump -p trued:1 > /out/stuck.txt &
stuck=$!
aseqdump -p trued:2 > /out/free.txt &
free=$!
ready "organ is set up" /out/layer.log
ready "bells is set up" /out/layer.log
sleep 0.5
kill -STOP $stuck
aplaymidi -p trued:0 -d 0 /guest/run.mid
kill -CONT $stuck
ready "organ did not read" /out/layer.log
sleep 1
aplaymidi -p trued:0 -d 0 /guest/few.mid
sleep 0.5
kill -TERM $trued
wait $trued
echo $? > /out/layer.exit
sleep 0.3
kill $stuck $free

# Fourth: gestures, from the same raw port.
/guest/trued ports --watch /guest/plugged.yaml > /out/watch.txt 2> /out/watch.log &
watch=$!
ready "press a pedal" /out/watch.log
printf '\260\122\177\260\122\000\317\004' > $keys
sleep 0.5
kill $watch

# Last: without a sequencer.
rm /dev/snd/seq
/guest/trued ports 2> /out/without.txt
echo $? >> /out/without.txt
/guest/trued run /guest/stage.yaml 2>> /out/without.txt
echo $? >> /out/without.txt
exit 0
