# In the guest: what its scenes wait for. Nothing counts on how long the guest takes.
now() { read up rest < /proc/uptime; echo "${up%.*}${up#*.}"; } # hundredths of a second
await() { # await WHAT COMMAND...: until it is true; what never comes ends the guest, for all else would only wait too
  what=$1
  shift
  tries=0
  until "$@"; do
    tries=$((tries + 1))
    [ $tries -lt 3000 ] || { echo "never: $what" | tee -a /out/missing.txt; exit 4; }
    sleep 0.02
  done
}
lines() { [ "$(grep -c "$2" "$3" 2> /dev/null || :)" -ge "$1" ] 2> /dev/null; } # lines COUNT PATTERN FILE: at least so many
raw() { # raw KIND COUNT FILE: at least so many of 8 (note-offs) or 9 (note-ons of velocity 100) among raw bytes
  found=$(hexdump -v -e '1/1 "%d\n"' "$3" 2> /dev/null | awk -v kind="$1" '
    $1 > 127 {status = int($1 / 16); got = 0; next}
    {got++}
    got == 2 || status == 12 || status == 13 {got = 0; if (status == kind && (kind == 8 || $1 == 100)) count++}
    END {print count + 0}')
  [ "$found" -ge "$2" ]
}
onsets() { raw 9 "$@"; } # onsets COUNT FILE
offs() { raw 8 "$@"; } # offs COUNT FILE
linked() { # linked PORT: the kernel says that what the port of this name sends reaches somebody
  awk -v port="\"$1\"" '/^ *Port/ {name = $0} /Connecting To/ && name ~ port {found = 1} END {exit !found}' /proc/asound/seq/clients
}
address() { # address PORT: client and number of the port of this name
  awk -v port="\"$1\"" '/^Client/ {client = $2} /^ *Port/ && $0 ~ port {print client ":" $2 + 0; exit}' /proc/asound/seq/clients
}
unplug() { echo snd_virmidi.0 > $driver/unbind; }
plug() { echo snd_virmidi.0 > $driver/bind; }
listen() { # listen FILE: from the moment the port is there, until it goes; $! is the ear
  (until [ -e $organ ]; do :; done; exec cat $organ) > "$1" 2> /dev/null &
}
chord='\260\100\177\220\074\144\220\100\144\220\103\144' # pedal, C E G
single='\220\100\144'
heard_all() { lines 1 "Port unsubscribed" "$1"; } # heard_all FILE: aseqdump's; its source has gone, and this came last
left_plain() { # left_plain FILE: the last of what a raw ear hears as a synth is left: the bend of channel 16 centred
  [ "$(tail -c 3 "$1" | hexdump -v -e '1/1 "%02x"')" = ef0040 ]
}
