/**
 * The protobuf schema of a block of samples, kept as one table: the schema stored in each record,
 * the `.proto` text beside it and the field numbers of the encoder all come from here.
 *
 * Encoding rules: https://protobuf.dev/programming-guides/encoding/
 * Descriptors: google/protobuf/descriptor.proto (field numbers cited where they are written).
 */

/** `type` is the number of `FieldDescriptorProto.Type`: 4 uint64, 13 uint32, 17 sint32. */
interface FieldSpec {
  readonly number: number;
  readonly name: string;
  readonly type: 'uint64' | 'uint32' | 'sint32';
  readonly repeated: boolean;
  readonly comment: string;
}
const TYPE_NUMBER = { uint64: 4, uint32: 13, sint32: 17 } as const;

export const SAMPLE_SCHEMA_NAME = 'lapwing.SampleBlock';

const ABOUT = `Samples in a row with nothing between them, as the board sent them.
Sample i (from 0) of the block is input number \`input + i\`. Its time is
\`board_us + board_us_deltas[0] + ... + board_us_deltas[i - 1]\` modulo 2^32 (the board's clock is 32
bits of microseconds and wraps), its count \`count + count_deltas[0] + ... + count_deltas[i - 1]\`,
wrapped to a signed 32-bit number. Every other field holds for all samples of the block: a change
begins a new block, as does any other input, command or decision. The message's log time is the time
of its last sample.`;

export const SAMPLE_FIELDS = {
  input: field(1, 'uint64', 'Sequence number of the first sample among all engine inputs.'),
  boardUs: field(2, 'uint32', 'Board time of the first sample, microseconds, modulo 2^32.'),
  count: field(3, 'sint32', 'Encoder count of the first sample.'),
  inputs: field(4, 'uint32', 'Input levels: bit n is input n, 1 is active.'),
  outputs: field(5, 'uint32', 'Output states: bit n is output n, 1 is on.'),
  illegal: field(6, 'uint32', 'Illegal quadrature transitions since reset, modulo 2^16.'),
  badFrames: field(7, 'uint32', 'Frames the board dropped since reset, modulo 2^8.'),
  overruns: field(8, 'uint32', 'Bytes the board lost since reset, modulo 2^8.'),
  samples: field(9, 'uint32', 'How many samples the block holds.'),
  boardUsDeltas: field(
    10,
    'uint32',
    'From each sample to the next, microseconds, modulo 2^32: one fewer than samples.',
    true,
  ),
  countDeltas: field(11, 'sint32', 'From each sample to the next, counts.', true),
  beatAfter: field(
    12,
    'uint32',
    'Host heartbeats sent within the block: each went out after the sample of this index.',
    true,
  ),
  beatFinishedUs: field(
    13,
    'sint32',
    "Each heartbeat's `finishedUs`, less the board time of the sample it followed.",
    true,
  ),
  beatWanted: field(14, 'uint32', "Each heartbeat's mask of wanted slots.", true),
} as const;

function field(
  number: number,
  type: FieldSpec['type'],
  comment: string,
  repeated = false,
): Omit<FieldSpec, 'name'> & { readonly tag: number } {
  // Wire type 2 for packed fields, 0 for varints; every tag here fits one byte.
  return { number, type, comment, repeated, tag: (number << 3) | (repeated ? 2 : 0) };
}

const FIELDS: readonly FieldSpec[] = Object.entries(SAMPLE_FIELDS).map(([name, spec]) => ({
  ...spec,
  name: name.replace(/[A-Z]/g, (letter) => '_' + letter.toLowerCase()),
}));

/** The schema as a person reads it; stored as metadata of the samples channel. */
export function sampleProtoText(): string {
  const comment = (text: string, indent: string) =>
    text
      .split('\n')
      .map((line) => `${indent}// ${line}\n`)
      .join('');
  let text = `syntax = "proto3";\npackage lapwing;\n\n${comment(ABOUT, '')}message SampleBlock {\n`;
  for (const { name, number, type, repeated, comment: about } of FIELDS)
    text += `${comment(about, '  ')}  ${repeated ? 'repeated ' : ''}${type} ${name} = ${number};\n`;
  return text + '}\n';
}

/** The schema as MCAP stores it: a serialised `google.protobuf.FileDescriptorSet`. */
export function sampleDescriptorSet(): Uint8Array {
  const fields = FIELDS.flatMap((spec) => [
    // DescriptorProto.field = 2; FieldDescriptorProto: name 1, number 3, label 4, type 5.
    bytes(2, [
      text(1, spec.name),
      varint(3, spec.number),
      varint(4, spec.repeated ? 3 : 1),
      varint(5, TYPE_NUMBER[spec.type]),
    ]),
  ]);
  // SourceCodeInfo.location = 1; Location: path 1, span 2, leading_comments 3. Path 4,0 is the
  // first message of the file, and 4,0,2,i its i-th field.
  const location = (path: readonly number[], line: number, comment: string) =>
    bytes(1, [packed(1, path), packed(2, [line, 0, 1]), text(3, ' ' + comment + '\n')]);
  const comments = [
    location([4, 0], 0, ABOUT),
    ...FIELDS.map((spec, i) => location([4, 0, 2, i], i + 1, spec.comment)),
  ];
  // FileDescriptorProto: name 1, package 2, message_type 4, source_code_info 9, syntax 12.
  const file = [
    text(1, 'lapwing/sampleBlock.proto'),
    text(2, 'lapwing'),
    bytes(4, [text(1, 'SampleBlock'), ...fields]),
    bytes(9, comments),
    text(12, 'proto3'),
  ];
  return Uint8Array.from(bytes(1, file));
}

function number(value: number): number[] {
  const out: number[] = [];
  let left = value;
  for (; left > 0x7f; left = Math.floor(left / 128)) out.push((left % 128) | 0x80);
  out.push(left);
  return out;
}
function varint(fieldNumber: number, value: number): number[] {
  return [...number(fieldNumber << 3), ...number(value)];
}
function bytes(fieldNumber: number, parts: readonly (readonly number[])[]): number[] {
  const content = parts.flat();
  return [...number((fieldNumber << 3) | 2), ...number(content.length), ...content];
}
function text(fieldNumber: number, value: string): number[] {
  return bytes(fieldNumber, [[...new TextEncoder().encode(value)]]);
}
function packed(fieldNumber: number, values: readonly number[]): number[] {
  return bytes(fieldNumber, values.map(number));
}
