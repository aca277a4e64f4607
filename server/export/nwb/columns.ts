import type { ColumnSpec } from './hdf5.js';

type Of<T, V> = (row: T) => V;

/** Columns of a table over the same rows: each says what a row has in it. */
export class Columns<T> {
  readonly list: ColumnSpec[] = [];
  readonly #rows: readonly T[];

  constructor(rows: readonly T[]) {
    this.#rows = rows;
  }

  /** Seconds, of a kind that the standard has a type for. */
  time(kind: 'timestamp' | 'duration', meaning: string, of: Of<T, number | null>): this {
    return this.#add({ name: kind, kind, meaning, data: this.#float(of) });
  }

  /** Not known is NaN. */
  number(name: string, meaning: string, of: Of<T, number | null>): this {
    return this.#add({ name, meaning, data: this.#float(of) });
  }

  whole(name: string, meaning: string, of: Of<T, number>): this {
    return this.#add({ name, meaning, data: Int32Array.from(this.#rows, of) });
  }

  /** 1 or 0: the library has no truth values. */
  flag(name: string, meaning: string, of: Of<T, boolean>): this {
    return this.#add({ name, meaning, data: Uint8Array.from(this.#rows, (r) => (of(r) ? 1 : 0)) });
  }

  /** An empty text is written as `none`. */
  text(name: string, meaning: string, of: Of<T, string | null>): this {
    return this.#add({ name, meaning, data: this.#rows.map((row) => of(row) || 'none') });
  }

  #float(of: Of<T, number | null>): Float64Array {
    return Float64Array.from(this.#rows, (row) => of(row) ?? Number.NaN);
  }

  #add(column: ColumnSpec): this {
    this.list.push(column);
    return this;
  }
}

export const metres = (cm: number | null) => (cm === null ? null : cm / 100);
export const INPUT_MEANING = 'Number of the input of the record that it came from';
