/**
 * Chance without a stream: each value is a hash of what it is for, so that changing one draw leaves
 * every other as it was. The hash is MurmurHash3_x86_32 (Austin Appleby, public domain), taken
 * twice with different seeds for 53 bits.
 */
const encoder = new TextEncoder();

/** MurmurHash3_x86_32 of the text's UTF-8 bytes, as an unsigned 32-bit number. */
export function murmur3(text: string, seed: number): number {
  const bytes = encoder.encode(text);
  let hash = seed | 0;
  const whole = bytes.length & ~3;
  for (let at = 0; at < whole; at += 4) {
    const block =
      bytes[at]! | (bytes[at + 1]! << 8) | (bytes[at + 2]! << 16) | (bytes[at + 3]! << 24);
    hash ^= scramble(block);
    hash = (hash << 13) | (hash >>> 19);
    hash = (Math.imul(hash, 5) + 0xe6546b64) | 0;
  }
  let tail = 0;
  for (let at = bytes.length - 1; at >= whole; at--) tail = (tail << 8) | bytes[at]!;
  hash ^= scramble(tail);
  hash ^= bytes.length;
  hash = Math.imul(hash ^ (hash >>> 16), 0x85ebca6b);
  hash = Math.imul(hash ^ (hash >>> 13), 0xc2b2ae35);
  return (hash ^ (hash >>> 16)) >>> 0;
}

function scramble(block: number): number {
  const mixed = Math.imul(block, 0xcc9e2d51);
  return Math.imul((mixed << 15) | (mixed >>> 17), 0x1b873593);
}

/**
 * A number in [0, 1) that depends on these five alone.
 * @param seed the session's seed
 * @param name the draw's or the rule's name
 * @param scope what kind of value under that name, such as `chance` or `block 3`
 * @param index which value within the scope, from 0
 * @param attempt which try at that value, from 0
 */
export function uniform(
  seed: string,
  name: string,
  scope: string,
  index: number,
  attempt: number,
): number {
  const key = `${seed}\n${name}\n${scope}\n${index}\n${attempt}`;
  // 27 + 26 bits fill a double exactly; no rounding can reach 1.
  const high = murmur3(key, 0x6c617077) >>> 5;
  const low = murmur3(key, 0x696e6721) >>> 6;
  return (high * 67108864 + low) / 9007199254740992;
}
