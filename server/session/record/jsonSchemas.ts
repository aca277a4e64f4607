/**
 * What each JSON message of a record holds, as JSON Schema (2020-12), stored in the record so that a
 * general reader can show it. A kind of decision without an entry here does not compile.
 */
import type { FieldType, MessageName } from '../../wire/messages.js';
import { MESSAGES } from '../../wire/messages.js';
import type { Decision } from '../decisions.js';

type Schema = Readonly<Record<string, unknown>>;
type Fields = Readonly<Record<string, Schema>>;

const whole = (description: string): Schema => ({ type: 'integer', description });
const number = (description: string): Schema => ({ type: 'number', description });
const text = (description: string): Schema => ({ type: 'string', description });
const yes = (description: string): Schema => ({ type: 'boolean', description });
const orNull = (schema: Schema): Schema => ({ ...schema, type: [schema.type, 'null'] });
const oneOf = (description: string, ...values: string[]): Schema => ({
  type: 'string',
  enum: values,
  description,
});
const list = (items: Schema, description: string): Schema => ({
  type: 'array',
  items,
  description,
});
const numberOrText = (description: string): Schema => ({ type: ['number', 'string'], description });
const texts = (description: string): Schema => ({
  type: 'object',
  additionalProperties: { type: 'string' },
  description,
});

function object(description: string, properties: Fields, required = Object.keys(properties)) {
  return { type: 'object', description, properties, required };
}

const INPUT = whole('Sequence number among all engine inputs, from 0.');
const CAUSE = whole('Sequence number of the engine input that caused this.');

/** Where and when a decision was taken: in front of every decision's own fields. */
const STAMP: Fields = {
  input: CAUSE,
  boardUs: number('Board time with its wraps, microseconds.'),
  lap: whole('Lap, from 1; 0 before the first.'),
  positionCm: orNull(number('Position along the belt, cm; null while unknown.')),
  speedCmPerS: number('Signed belt speed, cm/s.'),
};

const RULE = text('The rule, by its name in the rules file.');
const SERIAL = whole('Which firing of the rule this is, from 1.');
const REASON = text('Why, in words.');

const asked: Fields = {
  rule: RULE,
  serial: SERIAL,
  ids: list(whole('A command id on the wire.'), 'The commands it was sent as.'),
  placeCm: orNull(number('The place intended, cm; null without one.')),
  expiryUs: orNull(
    number('Board time after which the board refuses it, microseconds; null in a slot.'),
  ),
};
const notFired: Fields = { rule: RULE, serial: SERIAL, reason: REASON };

export const DECISION_FIELDS: { readonly [K in Decision['kind']]: Fields } = {
  'session began': {
    title: text("The rules file's title."),
    seed: text('What every draw is made from, with its name and place.'),
  },
  'session ended': { reason: REASON },
  'lap began': { lap: whole('The lap that began.') },
  seam: {
    event: oneOf('What the mark meant.', 'first', 'accepted', 'ignored', 'missed', 'rehomed'),
    slipMm: orNull(number('Where it was met, less where it was expected, mm.')),
  },
  trust: {
    trust: oneOf('How far position is to be trusted.', 'unknown', 'trusted', 'doubtful'),
    reason: REASON,
  },
  lick: { artefact: yes('Began within 5 ms of an output change: perhaps no lick.') },
  'lick sensor': { state: oneOf('What the sensor does.', 'stuck', 'released', 'too fast') },
  asked,
  armed: asked,
  disarmed: notFired,
  fired: {
    rule: RULE,
    serial: SERIAL,
    sham: yes('Everything but the pulse.'),
    armed: yes("Started by the board's own slot, not by the host."),
    output: orNull(text('The output that rose; null for a sham.')),
    riseUs: orNull(number('Board time of the rise, microseconds.')),
    placeCm: orNull(number('The place intended, cm.')),
    riseCm: orNull(number('Where the rise was, cm.')),
    errorMm: orNull(number('The rise, less the place intended, mm.')),
  },
  'pulse done': {
    rule: orNull(RULE),
    output: text('The output that fell.'),
    onUs: number('How long it had been on, microseconds.'),
    volumeNl: number('Of a valve: how much was given, nl; else 0.'),
    reason: text('Why it ended before its time; `none` when it did not.'),
  },
  withheld: notFired,
  missed: notFired,
  refused: notFired,
  uncertain: notFired,
  drawn: {
    draw: text("The draw's name in the rules file."),
    scope: text('What it is drawn anew for.'),
    index: whole('Which drawing within the scope.'),
    value: numberOrText('What came out.'),
  },
  'phase began': {
    phase: text("The phase's name."),
    index: whole('Which phase of the session, from 0.'),
    reason: REASON,
  },
  'cell began': {
    index: whole('Which cell of the session.'),
    fields: texts('What the operator noted of it.'),
  },
  note: {
    text: text('The note; empty for a mark without words.'),
    mark: orNull(whole('Number of the mark that it is, or puts into words.')),
    markedUs: orNull(number('Board time of that mark, microseconds.')),
  },
  'field predicted': {
    rule: text('The inducing rule.'),
    serial: whole('Which asking of this rule.'),
    onsetCm: number('Where the animal was at the onset, cm.'),
    peakCm: number('Where the predicted field is highest, cm.'),
    centreCm: number('Its centre of mass between its edges, cm.'),
    widthCm: number('Between the places where it falls to a fifth of its peak, cm.'),
    asymmetry: number('Above 0 when it reaches further back from its peak than ahead; -1 to 1.'),
    shiftCm: number('How far the peak lies before the onset, cm.'),
    curve: {
      type: 'array',
      items: { type: 'number' },
      description: 'The prediction over the belt in even bins from 0 cm, as a share of its peak.',
    },
  },
  'end foreseen': {
    laps: orNull(whole('Laps left, the present one counted in; null while no pace is known.')),
    s: orNull(number('Seconds left, where a time ends the session.')),
    exact: yes('Reckoned in laps alone, and not by the pace so far.'),
    reason: text('What will end it.'),
  },
  choice: {
    name: text("The operator's choice."),
    value: numberOrText('What it is now; amounts in base units.'),
    state: oneOf('Counts, or is armed on the board besides.', 'in force', 'armed anew'),
  },
  alarm: {
    alarm: text('Which alarm.'),
    state: oneOf('Which way.', 'raised', 'cleared'),
    level: oneOf('How grave.', 'note', 'warn', 'bad'),
    text: text('What is the matter, in words.'),
    remedy: text('What to do about it.'),
  },
  operator: {
    act: { type: 'object', description: 'What was done.' },
    who: text('Who did it.'),
    from: text('From where.'),
  },
  link: { state: oneOf('The link to the board.', 'up', 'down', 'resumed'), reason: REASON },
  'board fault': {
    fault: text('What the board reported.'),
    detail: whole('Its detail, as on the wire.'),
  },
  'frames lost': { frames: whole('How many.'), why: REASON },
};

/** The schema of one kind of decision. Fields may be added; those named are always there. */
export function objectSchema(kind: string, fields: Fields): Schema {
  return object(`Decision: ${kind}.`, {
    ...STAMP,
    kind: { type: 'string', const: kind },
    ...fields,
  });
}

const WIRE_RANGE: { readonly [T in FieldType]: Schema } = {
  u8: { type: 'integer', minimum: 0, maximum: 0xff },
  u16: { type: 'integer', minimum: 0, maximum: 0xffff },
  u32: { type: 'integer', minimum: 0, maximum: 0xffff_ffff },
  i32: { type: 'integer', minimum: -0x8000_0000, maximum: 0x7fff_ffff },
  text16: { type: 'string', maxLength: 16 },
};

/** A message of the wire: its fields are what the wire page says they are. */
function wireMessage(name: MessageName): Schema {
  const fields = Object.entries(MESSAGES[name].fields) as [string, FieldType][];
  return object(
    `The board's \`${name}\` message, as on the wire.`,
    Object.fromEntries(fields.map(([field, type]) => [field, WIRE_RANGE[type]])),
  );
}

function wireInput(name: MessageName): Schema {
  return object(`Engine input: ${name}.`, {
    input: INPUT,
    kind: { type: 'string', const: name },
    message: wireMessage(name),
  });
}

export const INPUT_SCHEMAS = {
  edges: wireInput('edge'),
  outcomes: wireInput('outcome'),
  faults: wireInput('fault'),
  clocks: wireInput('clock'),
  link: object(
    'Engine input: the link to the board came up or went down.',
    {
      input: INPUT,
      kind: oneOf('Which.', 'link up', 'link down'),
      identity: wireMessage('identity'),
      tag: whole('Up: the tag every frame of this connection carries.'),
      sameBoot: yes('Up: the board had not restarted since it was last heard.'),
      overNetwork: yes('Up: the board is reached over a network.'),
      reason: text('Down: why.'),
    },
    ['input', 'kind'],
  ),
  operator: object('Engine input: the operator did something.', {
    input: INPUT,
    kind: { type: 'string', const: 'operator' },
    act: object('What was done.', { act: text('Its name; the other fields depend on it.') }),
    by: object('By whom.', { who: text('Who.'), from: text('From where.') }),
  }),
  notices: object(
    'Engine input: something befell the session or the line.',
    {
      input: INPUT,
      kind: oneOf('What.', 'begin', 'resume', 'gap', 'bad frame', 'alarm'),
      frames: whole('Gap: how many frames the sequence numbers say were lost.'),
      why: text('Bad frame: what was wrong with it.'),
      note: text('Resume: what was known and what was not.'),
      firstId: whole('Begin: the first id that this session sends to the board.'),
      alarm: text('Alarm: which one.'),
      raised: yes('Alarm: raised, not cleared.'),
      level: oneOf('Alarm: how grave.', 'note', 'warn', 'bad'),
      text: text('Alarm: what is the matter.'),
      remedy: text('Alarm: what to do about it.'),
    },
    ['input', 'kind'],
  ),
} as const;

export const OTHER_SCHEMAS = {
  segment: object(
    'Where this file stands among those of its session; opens and closes each file.',
    {
      input: whole('The newest engine input recorded before this; -1 before any.'),
      event: oneOf('Which end this is.', 'open', 'close'),
      format: whole('Version of the layout.'),
      segment: whole('Which file of the session, from 1.'),
      messages: whole('How many messages were numbered before this one.'),
      continues: yes('The same recording as in the file before, not a resumed one.'),
      session: text("The session's name: its folder's."),
      startedAt: text('Wall time of the session start, RFC 3339: what log times count from.'),
      software: text('What wrote it.'),
      seed: text("The session's seed."),
      reason: text('Why the file was begun or ended.'),
      joined: whole('Of a finished file: how many files it was made from.'),
      losses: list(
        { type: 'object' },
        'Of a finished file: what was missing from the files it was made from.',
      ),
    },
    ['input', 'event', 'format', 'segment', 'messages'],
  ),
  command: object('A message the host sent to the board.', {
    input: CAUSE,
    name: oneOf(
      'Its name on the wire page.',
      ...Object.entries(MESSAGES)
        .filter(([, spec]) => spec.from === 'host')
        .map(([name]) => name),
    ),
    message: { type: 'object', description: 'Its fields, as on the wire page.' },
  }),
} as const;
