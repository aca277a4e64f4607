#!/bin/sh
# Builds the firmware with gcc-avr, avr-libc and binutils-avr (Debian's packages of these names).
# usage: build.sh [folder for the .hex files; default: hex/ beside this script]
# The same sources give the same bytes, wherever they lie: no path and no time goes into them.
set -e
here=$(cd "$(dirname "$0")" && pwd)
out=${1:-$here/hex}
mkdir -p "$out"
out=$(cd "$out" && pwd)
elf=$(mktemp)
trap 'rm -f "$elf"' EXIT
cd "$here"
for chip in atmega328p atmega2560; do
  avr-gcc -mmcu=$chip -DF_CPU=16000000UL -std=gnu11 -O2 -flto -fshort-enums -fno-tree-switch-conversion \
    -Wall -Wextra -Werror -fdebug-prefix-map="$here"=. -Icore -Iavr \
    -ffixed-r2 -ffixed-r3 -ffixed-r4 -ffixed-r5 -ffixed-r6 \
    avr/encoder.S avr/service.S avr/main.c core/*.c -o "$elf"
  avr-nm "$elf" | grep -q '^0080..00 D slots$' || { echo "$chip: slots lie across pages" >&2; exit 1; }
  avr-objcopy -O ihex -R .eeprom "$elf" "$out/$chip.hex"
  [ -z "$LAPWING_KEEP_ELF" ] || cp "$elf" "$LAPWING_KEEP_ELF/$chip.elf"
  avr-size "$elf" | tail -1 | awk -v chip=$chip '{ print chip ": " $1 + $2 " bytes of flash, " $2 + $3 " of RAM" }'
done
