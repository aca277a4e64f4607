import { createHash } from 'node:crypto';
import { type Dataset, type File, type Group, Module, ready } from 'h5wasm/node';

export type Parent = File | Group;
type Numbers = Float64Array | Float32Array | Int32Array | Uint8Array | Uint32Array | BigInt64Array;
type Typed = { create_attribute: Group['create_attribute'] };

const CHUNK = 32_768;

/** Loads the library, and makes its errors (a full disk) throw instead of going to stderr. */
export async function loadHdf5(): Promise<void> {
  await ready;
  (
    Module as unknown as { activate_throwing_error_handler(): void }
  ).activate_throwing_error_handler();
}

/** The parts of an NWB file as the standard words them, over h5wasm. */
export class NwbBuilder {
  readonly #name: string;

  /** @param name of the session: object ids are made from it, so that they are the same each time */
  constructor(name: string) {
    this.#name = name;
  }

  /** A UUID of version 8 (RFC 9562 section 5.8): a hash of the session and the object's path. */
  uuid(path: string): string {
    const hex = createHash('sha256').update(`${this.#name}\n${path}`).digest('hex');
    const variant = ((Number.parseInt(hex[16]!, 16) & 3) | 8).toString(16);
    const parts = [hex.slice(0, 8), hex.slice(8, 12), `8${hex.slice(13, 16)}`];
    return [...parts, `${variant}${hex.slice(17, 20)}`, hex.slice(20, 32)].join('-');
  }

  typed(object: Typed, path: string, type: string, namespace = 'core'): void {
    text(object, 'namespace', namespace);
    text(object, 'neurodata_type', type);
    text(object, 'object_id', this.uuid(path));
  }

  group(parent: Parent, name: string, type?: string, namespace?: string): Group {
    const group = parent.create_group(name) as Group;
    if (type !== undefined) this.typed(group, group.path, type, namespace);
    return group;
  }

  text(parent: Parent, name: string, value: string): Dataset {
    return parent.create_dataset({ name, data: value }) as Dataset;
  }

  texts(parent: Parent, name: string, values: string[], shape = [values.length]): Dataset {
    return parent.create_dataset({ name, data: values, shape, dtype: 'S' }) as Dataset;
  }

  /** A compressed column of numbers that may be extended; an empty one is stored plainly. */
  numbers(parent: Parent, name: string, data: Numbers): Dataset {
    const { length } = data;
    const layout = {
      ...{ name, data, shape: [length], maxshape: [null as unknown as number] },
      chunks: [Math.max(1, Math.min(length, CHUNK))],
    };
    if (length === 0) return parent.create_dataset(layout) as Dataset;
    return parent.create_dataset({
      ...{ ...layout, compression: 'gzip', compression_opts: 4 },
    }) as Dataset;
  }

  /** A time series; without `timestamps`, those of the series at `timestampsOf` are linked. */
  series(parent: Parent, name: string, s: Series): Group {
    const group = this.group(parent, name, s.type ?? 'TimeSeries');
    text(group, 'description', s.description);
    const data = this.numbers(group, 'data', s.data);
    text(data, 'unit', s.unit);
    float(data, 'conversion', 1);
    float(data, 'offset', 0);
    float(data, 'resolution', s.resolution ?? -1);
    text(data, 'continuity', s.continuity);
    if (s.timestampsOf !== undefined) {
      group.create_soft_link(`${s.timestampsOf}/timestamps`, 'timestamps');
    } else {
      const times = this.numbers(group, 'timestamps', s.timestamps!);
      times.create_attribute('interval', 1, null as never, '<i');
      text(times, 'unit', 'seconds');
    }
    return group;
  }

  /** A table (`EventsTable`, `TimeIntervals`) with a row for each id. */
  table(parent: Parent, name: string, t: TableSpec): Group {
    const group = this.group(parent, name, t.type);
    text(group, 'description', t.description);
    const names = t.columns.map((column) => column.name);
    group.create_attribute('colnames', names, null as never, 'S');
    const ids = BigInt64Array.from({ length: t.rows }, (_, i) => BigInt(i));
    const id = group.create_dataset({ name: 'id', data: ids, shape: [t.rows], dtype: '<q' });
    this.typed(id as Dataset, `${group.path}/id`, 'ElementIdentifiers', 'hdmf-common');
    for (const column of t.columns) this.#column(group, column);
    return group;
  }

  #column(group: Group, { name, data, meaning, kind }: ColumnSpec): void {
    const set = Array.isArray(data)
      ? this.texts(group, name, data)
      : this.numbers(group, name, data as Numbers);
    const path = `${group.path}/${name}`;
    if (kind === 'timestamp') this.typed(set, path, 'TimestampVectorData');
    else if (kind === 'duration') this.typed(set, path, 'DurationVectorData');
    else this.typed(set, path, 'VectorData', 'hdmf-common');
    text(set, 'description', meaning);
    if (kind !== undefined) text(set, 'unit', 'seconds');
    if (kind === 'timestamp') float(set, 'resolution', 1e-6);
  }
}

export interface Series {
  readonly type?: string;
  readonly description: string;
  readonly data: Numbers;
  readonly timestamps?: Float64Array;
  readonly timestampsOf?: string;
  readonly unit: string;
  readonly continuity: 'continuous' | 'instantaneous' | 'step';
  readonly resolution?: number;
}
export interface ColumnSpec {
  readonly name: string;
  readonly data: Numbers | string[];
  readonly meaning: string;
  readonly kind?: 'timestamp' | 'duration';
}
export interface TableSpec {
  readonly type: 'EventsTable' | 'TimeIntervals';
  readonly description: string;
  readonly rows: number;
  readonly columns: readonly ColumnSpec[];
}

export function text(object: Typed, name: string, value: string): void {
  // HDF5 through this library has no empty text attribute.
  object.create_attribute(name, value === '' ? 'none' : value);
}

/** A whole number such as 1 would be stored as an integer unless its type is said. */
export function float(object: Typed, name: string, value: number): void {
  object.create_attribute(name, value, null as never, '<f');
}
