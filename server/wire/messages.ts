/**
 * Every message of the wire, each one a row of named fields: the encoder, the decoder, the wire
 * page and its test all read this table, so that they cannot disagree.
 *
 * A frame before stuffing is `type u8, sequence u8, tag u16, payload, crc u16`, little-endian.
 */

export const PROTOCOL_VERSION = 1;
/** Longest frame before stuffing, header and CRC included: what an 8-bit board can buffer. */
export const MAX_FRAME_BYTES = 64;
export const HEADER_BYTES = 4;
export const CRC_BYTES = 2;

export type FieldType = 'u8' | 'u16' | 'u32' | 'i32' | 'text16';
export const FIELD_BYTES: Record<FieldType, number> = { u8: 1, u16: 2, u32: 4, i32: 4, text16: 16 };

/** What the board says. */
export interface Identity {
  /** The number of the `identify` that this answers; 0 when the board speaks first after reset. */
  nonce: number;
  protocol: number;
  firmware: number;
  /** Drawn anew at every reset. */
  bootId: number;
  /** The unit's own number, kept over resets; 0 when it has none. */
  boardId: number;
  previousTag: number;
  capabilities: number;
  outputs: number;
  inputs: number;
  slots: number;
  /** How many outcomes are kept and follow this frame, oldest first. */
  outcomesKept: number;
  boardUs: number;
  wraps: number;
  resetCause: number;
  model: string;
}

export interface Sample {
  boardUs: number;
  count: number;
  /** Input levels, bit n for input n; 1 is the active level. */
  inputs: number;
  /** Output states, bit n for output n; 1 is on. */
  outputs: number;
  /** Illegal quadrature transitions since reset, modulo 2^16. */
  illegal: number;
  /** Frames dropped for their CRC or form since reset, modulo 2^8. */
  badFrames: number;
  /** Received bytes lost since reset, modulo 2^8. */
  overruns: number;
}

export interface Edge {
  boardUs: number;
  count: number;
  input: number;
  level: number;
}

export interface Outcome {
  id: number;
  kind: number;
  reason: number;
  output: number;
  /** 1: told before under an earlier tag, and repeated now. */
  repeated: number;
  /** When it happened: the rise for `fired`, the fall for `done`. */
  boardUs: number;
  count: number;
  /** Microseconds the output has been on for this id, so far or in all. */
  onUs: number;
}

export interface Fault {
  fault: number;
  boardUs: number;
  detail: number;
}

/** Once a second: board time with its wraps. */
export interface Clock {
  boardUs: number;
  wraps: number;
}

/** What the host says. */
export interface Identify {
  nonce: number;
  protocol: number;
  /** The tag that every later frame carries, both ways; never 0. */
  newTag: number;
}

export interface Configure {
  output: number;
  /** Bit 0: idle level; bit 1: a bounded pulse already begun may finish on silence. */
  flags: number;
  longestOnUs: number;
  leastGapUs: number;
  allowanceUs: number;
  allowanceRises: number;
  leastCounts: number;
}

export interface Pulse {
  id: number;
  output: number;
  /** Bit 0: start at `startUs`; bit 1: check the count window at the first rise. */
  flags: number;
  widthUs: number;
  /** Rise to rise; 0 with one repeat. */
  periodUs: number;
  repeats: number;
  startUs: number;
  expiryUs: number;
  countFrom: number;
  countTo: number;
}

export interface Arm {
  id: number;
  slot: number;
  output: number;
  /** 1: fires when the count rises to the target; 0: when it falls to it. */
  rising: number;
  count: number;
  widthUs: number;
  periodUs: number;
  repeats: number;
}

export interface Quiet {
  /** Bit n: end what output n does, and clear the slots it owns; 0xFFFF is everything. */
  outputs: number;
}

export interface Beat {
  /** The newest stamp that the engine has finished with. */
  finishedUs: number;
  /** Bit n: slot n is still wanted. */
  wanted: number;
}

/** A train of pulses at random intervals that the board sends by itself, host or no host. */
export interface Sync {
  output: number;
  /** 0 stops it. */
  running: number;
  widthUs: number;
  leastGapUs: number;
  mostGapUs: number;
  seed: number;
}

export interface MessageOf {
  identity: Identity;
  sample: Sample;
  edge: Edge;
  outcome: Outcome;
  fault: Fault;
  clock: Clock;
  identify: Identify;
  configure: Configure;
  pulse: Pulse;
  arm: Arm;
  quiet: Quiet;
  beat: Beat;
  sync: Sync;
}
export type MessageName = keyof MessageOf;
export type BoardMessageName = 'identity' | 'sample' | 'edge' | 'outcome' | 'fault' | 'clock';
export type HostMessageName = Exclude<MessageName, BoardMessageName>;

type Layout<T> = { readonly [K in keyof T]: T[K] extends string ? 'text16' : FieldType };
export interface MessageSpec<N extends MessageName = MessageName> {
  readonly type: number;
  readonly from: 'board' | 'host';
  readonly fields: Layout<MessageOf[N]>;
}

export const MESSAGES: { readonly [N in MessageName]: MessageSpec<N> } = {
  identity: {
    type: 0x01,
    from: 'board',
    fields: {
      nonce: 'u32',
      protocol: 'u8',
      firmware: 'u16',
      bootId: 'u32',
      boardId: 'u32',
      previousTag: 'u16',
      capabilities: 'u16',
      outputs: 'u8',
      inputs: 'u8',
      slots: 'u8',
      outcomesKept: 'u8',
      boardUs: 'u32',
      wraps: 'u16',
      resetCause: 'u8',
      model: 'text16',
    },
  },
  sample: {
    type: 0x02,
    from: 'board',
    fields: {
      boardUs: 'u32',
      count: 'i32',
      inputs: 'u16',
      outputs: 'u16',
      illegal: 'u16',
      badFrames: 'u8',
      overruns: 'u8',
    },
  },
  edge: {
    type: 0x03,
    from: 'board',
    fields: { boardUs: 'u32', count: 'i32', input: 'u8', level: 'u8' },
  },
  outcome: {
    type: 0x04,
    from: 'board',
    fields: {
      id: 'u32',
      kind: 'u8',
      reason: 'u8',
      output: 'u8',
      repeated: 'u8',
      boardUs: 'u32',
      count: 'i32',
      onUs: 'u32',
    },
  },
  fault: { type: 0x05, from: 'board', fields: { fault: 'u8', boardUs: 'u32', detail: 'u32' } },
  clock: { type: 0x06, from: 'board', fields: { boardUs: 'u32', wraps: 'u16' } },
  identify: { type: 0x41, from: 'host', fields: { nonce: 'u32', protocol: 'u8', newTag: 'u16' } },
  configure: {
    type: 0x42,
    from: 'host',
    fields: {
      output: 'u8',
      flags: 'u8',
      longestOnUs: 'u32',
      leastGapUs: 'u32',
      allowanceUs: 'u32',
      allowanceRises: 'u16',
      leastCounts: 'u32',
    },
  },
  pulse: {
    type: 0x43,
    from: 'host',
    fields: {
      id: 'u32',
      output: 'u8',
      flags: 'u8',
      widthUs: 'u32',
      periodUs: 'u32',
      repeats: 'u16',
      startUs: 'u32',
      expiryUs: 'u32',
      countFrom: 'i32',
      countTo: 'i32',
    },
  },
  arm: {
    type: 0x44,
    from: 'host',
    fields: {
      id: 'u32',
      slot: 'u8',
      output: 'u8',
      rising: 'u8',
      count: 'i32',
      widthUs: 'u32',
      periodUs: 'u32',
      repeats: 'u16',
    },
  },
  quiet: { type: 0x45, from: 'host', fields: { outputs: 'u16' } },
  beat: { type: 0x46, from: 'host', fields: { finishedUs: 'u32', wanted: 'u32' } },
  sync: {
    type: 0x47,
    from: 'host',
    fields: {
      output: 'u8',
      running: 'u8',
      widthUs: 'u32',
      leastGapUs: 'u32',
      mostGapUs: 'u32',
      seed: 'u32',
    },
  },
};

/** What became of an id. `fired` is followed by `done`; every other kind is an end. */
export const OUTCOME = {
  fired: 1,
  done: 2,
  disarmed: 3,
  expired: 4,
  passed: 5,
  refused: 6,
} as const;
export type OutcomeKind = keyof typeof OUTCOME;

/** Why an id was refused, or why it ended before its time; the wire page has a line for each. */
export const REASON = {
  none: 0,
  busy: 1,
  leastGap: 2,
  leastCounts: 3,
  allowance: 4,
  longestOn: 5,
  notConfigured: 6,
  countWindow: 7,
  badSlot: 8,
  slotTaken: 9,
  badShape: 10,
  oldId: 11,
  badExpiry: 12,
  sharedLowByte: 13,
  silence: 14,
  cut: 15,
  unwanted: 16,
  newTag: 17,
} as const;
export type RefusalReason = keyof typeof REASON;

export const FAULT = {
  watchdogSlots: 1,
  watchdogOutputs: 2,
  queueFull: 3,
  wrongTag: 4,
  badProtocol: 5,
  brownOut: 6,
  syncRefused: 7,
} as const;
export type FaultKind = keyof typeof FAULT;

/** What made the board start, as far as its chip can tell. */
export const RESET_CAUSE = {
  unknown: 0,
  powerOn: 1,
  resetPin: 2,
  brownOut: 3,
  chipWatchdog: 4,
  software: 5,
} as const;

/** In `edge.input`: not an input but an output that a sync train moves; the low bits say which. */
export const SYNC_EDGE = 0x80;

export const CAPABILITY = {
  /** No wire leaves this board: its outputs are a model's. */
  simulated: 1,
  /** Slots are compared in the encoder's own interrupt. */
  slots: 2,
  /** Sends a sync train by itself. */
  sync: 4,
} as const;

export const CONFIGURE_FLAG = { idleHigh: 1, finishOnSilence: 2 } as const;
export const PULSE_FLAG = { startAt: 1, countWindow: 2 } as const;

/** Times that both sides hold to, in microseconds. */
export const WIRE_TIMES = {
  /** A sample goes out at least this often, and at most once per `sampleLeastUs`. */
  sampleMostUs: 5_000,
  sampleLeastUs: 1_000,
  beatUs: 25_000,
  clockUs: 1_000_000,
  /** Since the newest finished stamp: armed slots end, then outputs. */
  slotSilenceUs: 150_000,
  outputSilenceUs: 250_000,
  /** An expiry further ahead than this is a stale or a broken command. */
  expiryMostUs: 10_000_000,
} as const;

/** The name of a value in one of the tables above, or `unknown (n)`. */
export function nameOf(table: Readonly<Record<string, number>>, value: number): string {
  for (const name in table) if (table[name] === value) return name;
  return `unknown (${value})`;
}
