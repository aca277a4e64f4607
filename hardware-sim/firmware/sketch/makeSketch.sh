#!/bin/sh
# Puts the sketch together: one flat folder, as the usual hobby IDE opens it.
# usage: makeSketch.sh FOLDER     makes FOLDER/lapwing with lapwing.ino in it
set -e
here=$(cd "$(dirname "$0")" && pwd)
[ -n "$1" ] || { echo "usage: makeSketch.sh FOLDER" >&2; exit 2; }
mkdir -p "$1/lapwing"
cp "$here"/../core/*.c "$here"/../core/*.h "$here"/layer.c "$here"/layer_board.h "$here"/lapwing.ino "$1/lapwing"
echo "$1/lapwing/lapwing.ino"
