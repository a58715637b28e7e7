#!/usr/bin/env bash
# Runs a shell script on a real Linux ALSA sequencer: a Debian kernel with the sound modules under qemu's software
# emulation (no KVM, no root, no sound card needed), with busybox and alsa-utils. About 7 s to boot.
#
#   alsa_vm.sh SCRIPT OUT [FILE ...]   SCRIPT runs as root in the guest. Each FILE lies in /guest there with its shared
#                                      libraries. What the guest leaves in /out comes back into the folder OUT.
#                                      Exit status: that of SCRIPT; 124 if the guest did not finish in time.
#   VM_TIMEOUT_S=120                   the guest is stopped after this long
#
# Inside: /dev/snd/seq, 'Midi Through' and four virtual raw MIDI ports (card 'VirMIDI').
# The kernel package is fetched once, by apt-get download, into ALSA_VM_CACHE (default ~/.cache/trued/alsa-vm).
# With no arguments the script only does that.
# Needs (Debian): qemu-system-x86 busybox-static cpio alsa-utils. Timing in the guest is not real time.
set -euo pipefail
cache=${ALSA_VM_CACHE:-${XDG_CACHE_HOME:-$HOME/.cache}/trued/alsa-vm}
modules="soundcore snd snd-timer snd-seq-device snd-rawmidi snd-seq snd-seq-midi-event snd-seq-virmidi \
         snd-virmidi snd-seq-midi snd-seq-dummy snd-hrtimer"
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

if [ ! -e "$cache/vmlinuz" ]; then
  package=$(apt-cache depends linux-image-amd64 | sed -n 's/.*Depends: \(linux-image-[0-9].*\)/\1/p' | head -n 1)
  [ -n "$package" ] || { echo "alsa_vm.sh: apt knows no linux-image-amd64; run apt-get update" >&2; exit 1; }
  (cd "$work" && apt-get download -qq "$package" && dpkg-deb -x "$package"_*.deb kernel)
  mkdir -p "$cache/modules"
  for module in $modules; do
    find "$work/kernel/lib/modules" -name "$module.ko*" -exec cp {} "$cache/modules/" \;
  done
  find "$cache/modules" -name '*.xz' -exec xz -d -f {} +
  cp "$work"/kernel/boot/vmlinuz-* "$cache/vmlinuz.part" && mv "$cache/vmlinuz.part" "$cache/vmlinuz"
fi
[ $# -gt 0 ] || exit 0

script=$1 out=$2
shift 2
root=$work/root
mkdir -p "$root"/{bin,proc,sys,dev,tmp,run,root,modules,guest,out,usr/bin,usr/share}
cp /bin/busybox "$root/bin/"
cp "$cache"/modules/*.ko "$root/modules/"
cp -r /usr/share/alsa "$root/usr/share/"
add() { # add FILE DEST: the file and the shared libraries that it needs
  cp -L "$1" "$2"
  { ldd "$1" 2>/dev/null || true; } | { grep -oE '/[^ )]+' || true; } | while read -r library; do
    mkdir -p "$root$(dirname "$library")"
    cp -L "$library" "$root$library"
  done
}
for tool in aconnect aseqdump aplaymidi; do add "$(command -v "$tool")" "$root/usr/bin/"; done
for file in "$@"; do
  add "$file" "$root/guest/"
  strip -g "$root/guest/$(basename "$file")" 2>/dev/null || true # a program's debug part would only make booting slow
done
cp "$script" "$root/guest/script.sh"
cat > "$root/init" <<INIT
#!/bin/busybox sh
/bin/busybox --install -s /bin
export PATH=/bin:/usr/bin HOME=/root
mount -t proc proc /proc; mount -t sysfs sys /sys; mount -t devtmpfs dev /dev; mount -t tmpfs run /run
ip link set lo up
for m in $modules; do insmod /modules/\$m.ko; done
cd /guest; sh /guest/script.sh; echo "guest-exit:\$?"
echo guest-files-begin; tar -C /out -c . | gzip | base64; echo guest-files-end
poweroff -f
INIT
chmod +x "$root/init"
(cd "$root" && find . | cpio -o -H newc --quiet | gzip -1 > "$work/initrd.gz")

timeout "${VM_TIMEOUT_S:-120}" qemu-system-x86_64 -accel tcg -cpu max -smp 2 -m 1024 -nographic -no-reboot -nic none \
  -kernel "$cache/vmlinuz" -initrd "$work/initrd.gz" -append "console=ttyS0 quiet panic=-1" </dev/null \
  | tr -d '\r' > "$work/console" || true
sed -n '/Booting from ROM/,/^guest-exit:/p' "$work/console" | sed '1d;/^guest-exit:/d'
mkdir -p "$out"
sed -n '/^guest-files-begin$/,/^guest-files-end$/p' "$work/console" | sed '1d;$d' | base64 -d | tar -xz -C "$out" || true
exit "$(sed -n 's/.*guest-exit:\([0-9]*\).*/\1/p' "$work/console" | tail -n 1 | grep . || echo 124)"
