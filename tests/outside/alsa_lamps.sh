# In the guest, after alsa_guest.sh has set $keys and $driver: a controller with lights, pulled out with its button down.
lights() { # lights FILE: what the controller is told, from the moment it is there; $! is the eye
  (until [ -e $keys ]; do :; done; exec cat $keys) > "$1" 2> /dev/null &
}
# A status byte is written once for all messages of its kind.
told() { [ "$(hexdump -v -e '1/1 "%02x"' "$2" 2> /dev/null | grep -c "$1")" -ge 1 ]; } # told HEX FILE
log=/out/lamps.log
lights /out/lamps.before
eye=$!
/guest/trued run /guest/lamps.yaml 2> $log &
trued=$!
await "the lamps" told b01405 /out/lamps.before
printf '\220\046\144' > $keys
await "the lamp of the button" told 90287f /out/lamps.before
unplug
await "the lamps have gone" lines 1 "keys lamps has gone" $log
kill $eye 2> /dev/null
lights /out/lamps.after
eye=$!
plug
await "the lamps again" told b01405 /out/lamps.after
kill -TERM $trued
wait $trued
echo $? > /out/lamps.exit
await "the lamps go out" told 14051400 /out/lamps.after
kill $eye 2> /dev/null
