/** What is wrong with a record, or with one of its files. */
export type Trouble =
  /** The file stops in mid-chunk; what came before is whole. */
  | {
      readonly kind: 'torn';
      readonly file: string;
      readonly lastInput: number;
      readonly bytesLost: number;
    }
  /** Bytes are not what was written: their chunk is left out, and reading goes on after it. */
  | {
      readonly kind: 'damaged';
      readonly file: string;
      /** What is missing lies between these, microseconds since 1970; null: not known. */
      readonly fromUs: number | null;
      readonly toUs: number | null;
      readonly bytes: number;
    }
  /** Numbered messages are missing. */
  | {
      readonly kind: 'missing';
      readonly file: string;
      readonly messages: number;
      /** The inputs on both sides of what is missing. */
      readonly lastInput: number;
      readonly nextInput: number | null;
      readonly fromUs: number | null;
      readonly toUs: number | null;
    }
  /**
   * The file stops after a whole chunk, but was never closed: its program died, or still runs.
   * `complete`: its last chunk says that nothing was to follow, and only the closing bytes are bad.
   */
  | {
      readonly kind: 'open';
      readonly file: string;
      readonly lastInput: number;
      readonly complete: boolean;
    };

/** What a record is found to be once it has been read through. */
export interface RecordState {
  /** The worst that was found; `whole` is a record closed properly with nothing missing. */
  readonly state: 'whole' | 'open' | 'torn' | 'damaged';
  /** Rewritten with compression and indexes. */
  readonly finished: boolean;
  readonly messages: number;
  /** The newest input that could be read; -1: none. */
  readonly lastInput: number;
  /** Known when the record was finished, then found in the files as they are now. */
  readonly troubles: readonly Trouble[];
  /** How many of them, at the end of the list, were found in the files as they are now. */
  readonly found: number;
}

export function worstOf(troubles: readonly Trouble[]): RecordState['state'] {
  let worst: RecordState['state'] = 'whole';
  for (const { kind } of troubles) {
    if (kind === 'damaged' || kind === 'missing') return 'damaged';
    if (kind === 'torn') worst = 'torn';
    else if (worst === 'whole') worst = 'open';
  }
  return worst;
}

/** One sentence for each thing that is wrong; empty for a whole record. */
export function describeTroubles({ troubles }: RecordState): string[] {
  return troubles.map(describe);
}

function describe(trouble: Trouble): string {
  switch (trouble.kind) {
    case 'torn':
      return `${trouble.file} stops in the middle of a chunk: its last ${trouble.bytesLost} bytes cannot be read; everything up to input ${trouble.lastInput} is there.`;
    case 'open':
      if (trouble.complete)
        return `${trouble.file} holds everything that was recorded, but its closing bytes are missing or damaged.`;
      return `${trouble.file} was never closed: everything up to input ${trouble.lastInput} is there, and up to the last 20 ms of the session may be missing.`;
    case 'damaged':
      return `${trouble.file} has ${trouble.bytes} damaged bytes: what was recorded ${span(trouble.fromUs, trouble.toUs)} cannot be read.`;
    case 'missing':
      return `${trouble.file}: ${trouble.messages} messages are missing ${span(trouble.fromUs, trouble.toUs)}, after input ${trouble.lastInput}${trouble.nextInput === null ? '' : ` and before input ${trouble.nextInput}`}.`;
  }
}

function span(fromUs: number | null, toUs: number | null): string {
  const at = (us: number) => new Date(us / 1000).toISOString();
  if (fromUs === null) return toUs === null ? 'there' : `before ${at(toUs)}`;
  return toUs === null ? `after ${at(fromUs)}` : `from ${at(fromUs)} to ${at(toUs)}`;
}
