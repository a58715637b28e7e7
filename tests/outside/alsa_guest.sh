# In the guest. First: aplaymidi -> trued -> aseqdump, then SIGTERM while a chord and a pedal are held.
export NO_COLOR=1
read -r UNPLUGS NOTES FEW < /guest/counts
. /guest/alsa_waits.sh

/guest/trued run /guest/stage.yaml 2> /out/trued.log &
trued=$!
await "ready" lines 1 ready: /out/trued.log
aseqdump -p trued:1 > /out/heard.txt &
dump=$!
await "the organ" lines 1 "organ is set up" /out/trued.log
aplaymidi -p trued:0 -d 0 /guest/evening.mid || exit 3
await "the evening" lines $NOTES "Note on" /out/heard.txt
aplaymidi -p trued:0 -d 0 /guest/held.mid &
held=$!
await "the held chord" lines $((NOTES + 4)) "Note on" /out/heard.txt
sleep 0.3 # its wheel
kill -TERM $trued
wait $trued
echo $? > /out/trued.exit
kill $held
await "the last of the evening" heard_all /out/heard.txt
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
. /guest/alsa_lamps.sh

# Third: one of two synths stops reading in the middle of a run of notes, then reads again.
log=/out/layer.log
/guest/trued run /guest/layer.yaml 2> $log &
trued=$!
await "both synths" lines 1 ready: $log
aseqdump -p trued:1 > /out/stuck.txt &
stuck=$!
aseqdump -p trued:2 > /out/free.txt &
free=$!
await "the organ of both" lines 1 "organ is set up" $log
await "the bells of both" lines 1 "bells is set up" $log
await "the organ is quiet" lines 1 " 15, controller 123" /out/stuck.txt
kill -STOP $stuck
aplaymidi -p trued:0 -d 0 /guest/run.mid
kill -CONT $stuck
await "the loss" lines 1 "organ did not read" $log
await "the organ is quiet again" lines 2 " 15, controller 123" /out/stuck.txt
before=$(grep -c "Note off" /out/stuck.txt)
aplaymidi -p trued:0 -d 0 /guest/few.mid
await "a few notes more" lines $((before + FEW)) "Note off" /out/stuck.txt
kill -TERM $trued
wait $trued
echo $? > /out/layer.exit
await "the last of the organ" heard_all /out/stuck.txt
await "the last of the bells" heard_all /out/free.txt
kill $stuck $free

# Fourth: the same where two hear one port, and one of them stops reading.
log=/out/pair.log
/guest/trued run /guest/layer.yaml 2> $log &
trued=$!
await "the pair's synths" lines 1 ready: $log
aseqdump -p trued:1 > /out/slow.txt &
slow=$!
await "the first of the pair is quiet" lines 1 " 15, controller 123" /out/slow.txt
aseqdump -p trued:1 > /out/quick.txt &
quick=$!
await "the second of the pair is set up" lines 1 " 15, controller 100, value 127" /out/quick.txt
kill -STOP $slow
aplaymidi -p trued:0 -d 0 /guest/run.mid
kill -CONT $slow
await "the first of the pair is quiet again" lines 2 " 15, controller 123" /out/slow.txt
before=$(grep -c "Note off" /out/slow.txt)
aplaymidi -p trued:0 -d 0 /guest/few.mid
await "a few notes more at the first" lines $((before + FEW)) "Note off" /out/slow.txt
kill -TERM $trued
wait $trued
echo $? > /out/pair.exit
await "the last of the first" heard_all /out/slow.txt
await "the last of the second" heard_all /out/quick.txt
kill $slow $quick

# Fifth: gestures, from the same raw port.
/guest/trued ports --watch /guest/plugged.yaml > /out/watch.txt 2> /out/watch.log &
watch=$!
await "the watch" lines 1 "press a pedal" /out/watch.log
printf '\260\122\177\260\122\000\317\004' > $keys
await "both gestures" lines 2 "do: next" /out/watch.txt
kill $watch

# Last: without a sequencer.
rm /dev/snd/seq
/guest/trued ports 2> /out/without.txt
echo $? >> /out/without.txt
/guest/trued run /guest/stage.yaml 2>> /out/without.txt
echo $? >> /out/without.txt
exit 0
