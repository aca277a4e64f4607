import type { Decision } from '../decisions.js';
import type { RareInput } from '../inputs.js';
import { DECISION_FIELDS, INPUT_SCHEMAS, OTHER_SCHEMAS, objectSchema } from './jsonSchemas.js';
import { SAMPLE_SCHEMA_NAME, sampleDescriptorSet, sampleProtoText } from './sampleSchema.js';

/**
 * The channels of a record, in the order of their MCAP ids (from 1). Inputs first, one list of them
 * in all; then what the host sent; then what it decided, each kind on a channel of its own.
 */
export interface ChannelSpec {
  readonly id: number;
  readonly topic: string;
  readonly messageEncoding: 'json' | 'protobuf';
  readonly schemaName: string;
  readonly schemaEncoding: 'jsonschema' | 'protobuf';
  readonly schema: () => Uint8Array;
  readonly metadata: ReadonlyMap<string, string>;
}

/** The version of the layout of a record; a reader refuses a newer one. */
export const RECORD_FORMAT = 1;

const specs: ChannelSpec[] = [];

function json(topic: string, schemaName: string, schema: object): number {
  const id = specs.length + 1;
  specs.push({
    id,
    topic,
    messageEncoding: 'json',
    schemaName: 'lapwing.' + schemaName,
    schemaEncoding: 'jsonschema',
    schema: () => new TextEncoder().encode(JSON.stringify(schema)),
    metadata: new Map(),
  });
  return id;
}

export const SEGMENT_CHANNEL = json('/segment', 'Segment', OTHER_SCHEMAS.segment);

specs.push({
  id: specs.length + 1,
  topic: '/inputs/samples',
  messageEncoding: 'protobuf',
  schemaName: SAMPLE_SCHEMA_NAME,
  schemaEncoding: 'protobuf',
  schema: sampleDescriptorSet,
  metadata: new Map([['proto', sampleProtoText()]]),
});
export const SAMPLES_CHANNEL = specs.length;

const edges = json('/inputs/edges', 'Edge', INPUT_SCHEMAS.edges);
const outcomes = json('/inputs/outcomes', 'Outcome', INPUT_SCHEMAS.outcomes);
const faults = json('/inputs/faults', 'Fault', INPUT_SCHEMAS.faults);
const clocks = json('/inputs/clocks', 'Clock', INPUT_SCHEMAS.clocks);
const link = json('/inputs/link', 'Link', INPUT_SCHEMAS.link);
const operator = json('/inputs/operator', 'OperatorInput', INPUT_SCHEMAS.operator);
const notices = json('/inputs/notices', 'Notice', INPUT_SCHEMAS.notices);

export const INPUT_CHANNEL: { readonly [K in RareInput['kind']]: number } = {
  edge: edges,
  outcome: outcomes,
  fault: faults,
  clock: clocks,
  'link up': link,
  'link down': link,
  operator,
  gap: notices,
  'bad frame': notices,
  resume: notices,
  begin: notices,
  alarm: notices,
};

export const COMMAND_CHANNEL = json('/commands', 'Command', OTHER_SCHEMAS.command);

function decisionChannels(): { readonly [K in Decision['kind']]: number } {
  const ids: Record<string, number> = {};
  for (const [kind, fields] of Object.entries(DECISION_FIELDS)) {
    const words = kind.split(' ');
    const name = words.map((word) => word[0]!.toUpperCase() + word.slice(1)).join('');
    ids[kind] = json('/decisions/' + words.join('_'), name, objectSchema(kind, fields));
  }
  return ids as { [K in Decision['kind']]: number };
}
export const DECISION_CHANNEL = decisionChannels();

export const CHANNELS: readonly ChannelSpec[] = specs;
