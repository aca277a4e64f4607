/** Amounts as the guard's reasons say them: at most three figures behind the point, no zeros. */

/** `nl` nanolitres in uL, or in mL from 1 mL on. */
export function volumeWords(nl: number): string {
  return nl >= 1_000_000 ? `${short(nl / 1_000_000)} mL` : `${short(nl / 1000)} uL`;
}

/** Microseconds in us, ms, s or min. */
export function timeWords(us: number): string {
  if (us < 1000) return `${us} us`;
  if (us < 1_000_000) return `${short(us / 1000)} ms`;
  if (us < 60_000_000) return `${short(us / 1_000_000)} s`;
  return `${short(us / 60_000_000)} min`;
}

export function pulsesWords(count: number): string {
  return count === 1 ? '1 pulse' : `${count} pulses`;
}

function short(value: number): string {
  return `${Number(value.toFixed(3))}`;
}
