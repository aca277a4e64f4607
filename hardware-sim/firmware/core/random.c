#include "board.h"

/* Marsaglia's xorshift, shifts 13, 17, 5 (Journal of Statistical Software 8(14), 2003). */
uint32_t xorshift32(uint32_t *state) {
  uint32_t x = *state;
  x ^= x << 13;
  x ^= x >> 17;
  x ^= x << 5;
  return *state = x;
}

/* WIRE.md, rule 31: least + floor(x * (most - least + 1) / 2^32). */
uint32_t scaled(uint32_t x, uint32_t least, uint32_t most) {
  return least + (uint32_t)(((uint64_t)x * (most - least + 1)) >> 32);
}
